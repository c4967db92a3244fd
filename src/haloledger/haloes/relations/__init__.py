"""Relations between the mass of a halo and what is seen of it, one TOML file each.

A file says what it gives: `proxy given mass` (a mass drawn from it needs the halo mass function as prior) or `mass
given the proxy` (used as it stands). A new relation is a new file; a new shape is a function in `forms.py`.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.errors import InputError
from haloledger.haloes.relations.forms import FORMS

FOLDER = Path(__file__).parent
STELLAR_TO_HALO = ("behroozi2013", "behroozi2019", "kravtsov2018", "moster2013")
"""What the nuisance `relation` chooses from, each as likely as the other."""
PAIRS = ("scatter_dex", "z_range", "log_mass_range", "one_minus_b")
GIVES = ("proxy given mass", "mass given the proxy")


@dataclass(frozen=True, eq=False)
class Relation:
    """One relation, as its file states it. Masses are log10 Msun in `mass_def`."""

    name: str
    summary: str
    gives: str
    proxy: str
    form: str
    mass_def: str
    scatter_dex: tuple[float, float]  # at a = 1, slope with (a - 1); of what the relation gives
    z_range: tuple[float, float]
    log_mass_range: tuple[float, float]
    imf: str
    source: str
    confidence: str
    parameters: Mapping[str, Any]
    one_minus_b: tuple[float, float] = (1.0, 0.0)  # hydrostatic bias of the relation's masses, and its error
    mean_is_linear: bool = False  # the mean is that of the mass, not of its logarithm

    @property
    def median_step(self) -> float:
        """What to add to the mean [dex] for the median of a log-normal scatter."""
        return -0.5 * np.log(10) * self.scatter_dex[0] ** 2 if self.mean_is_linear else 0.0

    @property
    def needs_prior(self) -> bool:
        """True where the relation gives the proxy at fixed mass."""
        return self.gives == GIVES[0]

    def mean(self, x, z, cosmos: Cosmos) -> np.ndarray:
        """log10 of what the relation gives at x (log10 of its argument) and z; shapes broadcast."""
        return FORMS[self.form](x, z, self.parameters, cosmos)

    def scatter(self, z) -> np.ndarray:
        """Scatter [dex] of what the relation gives."""
        return self.scatter_dex[0] + self.scatter_dex[1] * (1 / (1 + np.asarray(z, dtype=float)) - 1)


@lru_cache(maxsize=64)
def load_relation(name: str) -> Relation:
    """The relation `name`; InputError lists the names there are. `same-DEF` is the mass itself in definition DEF."""
    if name.startswith("same-"):
        return _same(name.removeprefix("same-"))
    path = FOLDER / f"{name}.toml"
    if not path.is_file():
        raise InputError(f"relation '{name}' is not known. Write one of: {', '.join(relation_names())}.")
    text = tomllib.loads(path.read_text(encoding="utf-8"))
    pairs: dict[str, Any] = {k: tuple(text.pop(k)) for k in PAIRS if k in text}
    return Relation(**text, **pairs)


def relation_names() -> list[str]:
    """Names of all relation files, in alphabetical order."""
    return sorted(p.stem for p in FOLDER.glob("*.toml"))


def _same(mass_def: str) -> Relation:
    return Relation(
        name=f"same-{mass_def}",
        summary=f"the catalogue's mass, measured with an error, definition {mass_def}",
        gives=GIVES[0],
        proxy="log_mass",
        form="identity",
        mass_def=mass_def,
        scatter_dex=(0.0, 0.0),
        z_range=(0.0, 4.0),
        log_mass_range=(8.5, 16.0),
        imf="",
        source="",
        confidence="",
        parameters={},
    )
