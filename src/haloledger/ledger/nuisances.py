"""The global nuisances a user can hold, and what a held value means."""

from __future__ import annotations

import difflib
from collections.abc import Mapping

from haloledger.errors import InputError
from haloledger.haloes.relations import STELLAR_TO_HALO
from haloledger.sightlines.terms import mw_halo_laws

NUISANCES = {
    "relation": f"stellar-to-halo relation: {', '.join(STELLAR_TO_HALO)}",
    "zero_point": "offset of measured stellar masses [dex]; drawn with 0.1",
    "hydrostatic_bias": "(1-b) of X-ray and SZ masses; drawn as the card says",
    "kept": "offset of the kept fraction of all haloes [dex]; drawn as the model says",
    "membership": "0: a galaxy is in a listed halo or not, and no host beyond the lists is drawn",
    "mw_disc": "scale of the Milky Way disc; 1 leaves it as given",
    "mw_halo": "DM of the Milky Way halo [pc cm-3], or a law by name, where the table gives none",
    "host_rest": "rest-frame DM of every host [pc cm-3], where the table gives none",
}
POSITIVE = ("hydrostatic_bias", "mw_disc")
LARGEST = {"kept": 1.0, "zero_point": 1.0, "membership": 0.0}
"""Larger values, either sign, are mistakes: a fraction written for a dex."""


def checked(hold: Mapping[str, object]) -> dict[str, str]:
    """The held nuisances as text, names and values checked. InputError names what can be held."""
    return {name: _checked_value(name, str(value)) for name, value in hold.items()}


def _checked_value(name: str, value: str) -> str:
    if name not in NUISANCES:
        near = difflib.get_close_matches(name, NUISANCES, n=1, cutoff=0.4)
        hint = f" Did you mean --hold {near[0]}={value}?" if near else ""
        raise InputError(f"--hold {name}: no such nuisance among {', '.join(NUISANCES)}.{hint}")
    if name == "relation":
        if value not in STELLAR_TO_HALO:
            raise InputError(f"--hold relation={value}: not known. Write one of {', '.join(STELLAR_TO_HALO)}.")
        return value
    if name == "mw_halo" and value in mw_halo_laws():
        return value
    try:
        number = float(value)
    except ValueError:
        laws = f" Laws: {', '.join(mw_halo_laws())}." if name == "mw_halo" else ""
        raise InputError(f"--hold {name}={value}: not a number. It is the {NUISANCES[name]}.{laws}") from None
    if not abs(number) <= LARGEST.get(name, 1e6) or (name in POSITIVE and number <= 0):
        raise InputError(f"--hold {name}={value}: out of range. It is the {NUISANCES[name]}.")
    return value


def shared_columns(universe) -> list:
    """Standard normals and relation flags of the nuisances that are drawn, (n_draws,) each, for the variance shares."""
    columns = [universe.shared_normal(n) for n in ("zero_point", "hydrostatic_bias", "kept") if n not in universe.held]
    if "relation" not in universe.held:
        choice = (universe.shared_uniform("relation") * len(STELLAR_TO_HALO)).astype(int)
        columns += [(choice == j).astype(float) for j in range(len(STELLAR_TO_HALO) - 1)]
    return columns
