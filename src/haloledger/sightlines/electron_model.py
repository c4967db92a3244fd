"""A published electron-density model of the Milky Way disc, from an optional library."""

from __future__ import annotations

from collections.abc import Callable

from haloledger.errors import InputError

EDGE_KPC = 30.0
"""Distance to which the disc is integrated: past its edge in every direction."""
CHOICES = ("plane", "ne2001", "ne2025")


def electron_model(choice: str) -> Callable[[float, float], float] | None:
    """Function (l_deg, b_deg) -> DM [pc cm-3] of the named model, None for the plane-parallel fallback.

    The models are GPL software of their own authors and are never bundled: `pip install 'haloledger[milkyway]'`.
    Raises InputError where the library is missing or the name is not known.
    """
    if choice == "plane":
        return None
    if choice not in CHOICES:
        raise InputError(f"--disc {choice}: not known. Write one of {', '.join(CHOICES)}.")
    try:
        # one model a process: the library keeps the first model it is asked for, so only the wanted one is imported
        if choice == "ne2001":
            from mwprop.nemod.NE2001 import ne2001 as model
        else:
            from mwprop.nemod.NE2025 import ne2025 as model
    except ImportError:
        raise InputError(
            f"--disc {choice}: the library with the electron model is not installed."
            " Run: pip install 'haloledger[milkyway]', or leave --disc away."
        ) from None

    def dm_to_edge(l_deg: float, b_deg: float) -> float:
        # the library gives tables of names, values, units and descriptions, in this order
        _, values, _, _ = model(ldeg=l_deg, bdeg=b_deg, dmd=EDGE_KPC, ndir=-1, classic=False)
        return float(values["DM"])

    return dm_to_edge
