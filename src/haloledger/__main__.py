"""`python -m haloledger` is the command `haloledger`."""

from haloledger.cli import main

if __name__ == "__main__":
    main()
