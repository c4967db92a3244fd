"""What all haloes of a universe share: stellar-to-halo relation, zero point of stellar masses, hydrostatic bias."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr, ndtri

from haloledger.engine.universe import Universe
from haloledger.errors import InputError
from haloledger.haloes.relations import STELLAR_TO_HALO

ZERO_POINT_DEX = 0.1  # spread of stellar-mass zero points between calibrations; common practice
BIAS_RANGE = (0.5, 1.0)
FIXED_RELATION = "moster2013"


@dataclass(frozen=True)
class RelationOfDraw:
    """The stellar-to-halo relation of each draw: names[index[k]] holds in draw k."""

    names: tuple[str, ...]
    index: np.ndarray  # (n_draws,)

    def columns(self):
        """Yield (name, draws that use it)."""
        for i, name in enumerate(self.names):
            columns = np.flatnonzero(self.index == i)
            if columns.size:
                yield name, columns


def relation_of_draw(universe: Universe) -> RelationOfDraw:
    """A uniform choice among `STELLAR_TO_HALO`, or the held one; `moster2013` where everything is fixed."""
    held = universe.held.get("relation")
    if held is None and universe.fixed:
        held = FIXED_RELATION
    if held is None:
        choice = np.floor(universe.shared_uniform("relation") * len(STELLAR_TO_HALO)).astype(int)
        return RelationOfDraw(STELLAR_TO_HALO, choice)
    if held not in STELLAR_TO_HALO:
        raise InputError(f"--hold relation={held}: not known. Write one of: {', '.join(STELLAR_TO_HALO)}.")
    return RelationOfDraw((held,), np.zeros(universe.n_draws, dtype=int))


def zero_point(universe: Universe) -> np.ndarray:
    """Offset [dex] of measured stellar masses from true ones, shape (n_draws,): normal with 0.1 dex, or held."""
    held = held_number(universe, "zero_point")
    if held is not None:
        return np.full(universe.n_draws, held)
    return ZERO_POINT_DEX * universe.shared_normal("zero_point")


def log_one_minus_b(universe: Universe, mean: np.ndarray, err: np.ndarray) -> np.ndarray:
    """log10 of the hydrostatic bias (1-b), shape (n, n_draws).

    One normal per universe moves all catalogues by their own error; cut at 0.5 and 1. Where everything is fixed masses
    stay as given (0), unless a value is held; a catalogue whose mean is 1 without error has no bias.
    """
    biased = (mean != 1.0) | (err > 0)
    held = held_number(universe, "hydrostatic_bias")
    if held is not None:
        if not 0 < held <= 2:
            raise InputError(f"--hold hydrostatic_bias={held}: write (1-b), a number such as 0.8.")
        return np.where(biased[:, None], np.log10(held), np.zeros(universe.n_draws))
    if universe.fixed:
        return np.zeros((len(mean), 1))
    share = ndtr(universe.shared_normal("hydrostatic_bias"))
    wide = np.maximum(err, 1e-9)[:, None]
    low, high = (ndtr((edge - mean[:, None]) / wide) for edge in BIAS_RANGE)
    drawn = mean[:, None] + wide * ndtri(np.clip(low + share * (high - low), 1e-12, 1 - 1e-12))
    return np.where(biased[:, None], np.log10(np.where(err[:, None] > 0, drawn, mean[:, None])), 0.0)


def held_number(universe: Universe, name: str) -> float | None:
    """The held value of a nuisance as a number, None where it is drawn."""
    text = universe.held.get(name)
    if text is None:
        return None
    try:
        return float(text)
    except ValueError:
        raise InputError(f"--hold {name}={text}: not a number. Write for instance --hold {name}=0.") from None
