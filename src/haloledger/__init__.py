"""haloledger: the account of every halo in front of a fast radio burst.

import haloledger
ledgers = haloledger.audit("bursts.ecsv", galaxies=["galaxies.ecsv"], groups=["groups.ecsv"])
ledgers.sightlines      # a row a burst and model
ledgers.entries         # a row a burst, model and halo
"""

__version__ = "0.1.0"
__all__ = ["InputError", "__version__", "audit", "card_names", "load_model", "model_names"]

_HOMES = {
    "audit": "haloledger.audit",
    "InputError": "haloledger.errors",
    "load_model": "haloledger.gas.models",
    "model_names": "haloledger.gas.models",
    "card_names": "haloledger.catalogs.cards",
}


def __getattr__(name: str):
    """Public names are imported when they are first used, so that `import haloledger` costs nothing."""
    from importlib import import_module

    if name not in _HOMES:
        raise AttributeError(f"module 'haloledger' has no attribute '{name}'; it has {', '.join(__all__)}")
    home = import_module(_HOMES[name])
    return home if name == "audit" else getattr(home, name)


def __dir__() -> list[str]:
    return __all__
