"""haloledger: the account of every halo in front of a fast radio burst."""

__version__ = "0.1.0"
