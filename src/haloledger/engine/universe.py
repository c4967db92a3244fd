"""One universe a draw: random numbers that depend on names, not on the order of work.

Draw k of every quantity belongs to one universe. A number is keyed by (seed, parameter) when the whole universe shares
it, by (seed, parameter, halo id) when it belongs to one halo, and by (seed, parameter, burst) when it belongs to one
sightline. Adding a burst, changing the order or splitting the work therefore changes no number, to the last bit.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np


@dataclass(frozen=True)
class Universe:
    """The random numbers of a run.

    seed     any integer
    n_draws  number of universes; forced to 1 when `fixed`
    fixed    every spread off: normals are 0, uniforms are 0.5
    held     nuisance name -> value, as the user gave it; a package that draws the nuisance looks here first
    """

    seed: int = 1
    n_draws: int = 1000
    fixed: bool = False
    held: Mapping[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        if self.fixed:
            object.__setattr__(self, "n_draws", 1)

    def normals(self, parameter: str, ids: Sequence[str] | np.ndarray = ("",)) -> np.ndarray:
        """Standard normals, shape (len(ids), n_draws); row i depends on (seed, parameter, ids[i]) alone."""
        if self.fixed:
            return np.zeros((len(ids), 1))
        return self._rows(parameter, ids, lambda rng: rng.standard_normal(self.n_draws))

    def uniforms(self, parameter: str, ids: Sequence[str] | np.ndarray = ("",)) -> np.ndarray:
        """Uniforms in [0, 1), shape (len(ids), n_draws), keyed as `normals`."""
        if self.fixed:
            return np.full((len(ids), 1), 0.5)
        return self._rows(parameter, ids, lambda rng: rng.random(self.n_draws))

    def shared_normal(self, parameter: str) -> np.ndarray:
        """Standard normal of a global nuisance, shape (n_draws,)."""
        return self.normals(parameter)[0]

    def shared_uniform(self, parameter: str) -> np.ndarray:
        """Uniform of a global nuisance, shape (n_draws,)."""
        return self.uniforms(parameter)[0]

    def _rows(self, parameter, ids, draw) -> np.ndarray:
        rows = np.empty((len(ids), self.n_draws))
        for i, name in enumerate(ids):
            rows[i] = draw(np.random.Generator(np.random.Philox(key=_key(self.seed, parameter, str(name)))))
        return rows


def _key(seed: int, parameter: str, name: str) -> int:
    # the lengths keep ("ab", "c") and ("a", "bc") apart
    text = f"{seed}|{len(parameter)}|{parameter}|{name}"
    return int.from_bytes(hashlib.blake2b(text.encode(), digest_size=16).digest(), "little")
