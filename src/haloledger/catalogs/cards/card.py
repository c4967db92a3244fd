"""What a catalogue card holds. Each class is one section of the TOML file, each field one key of it."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any


@dataclass(frozen=True)
class FileOptions:
    """[file]: how to open it, where the content does not tell."""

    format: str = ""
    delimiter: str = ""


@dataclass(frozen=True)
class NativeColumn:
    """[columns.OURS]: the native column(s) behind one of ours.

    column   native name; two names for an error that is given upward and downward
    unit     of the native cell, a number in front and "/h", "/h2" behind allowed: "1e14 Msun", "Mpc/h", "km/s" (of a
             redshift: cz), "share" (of an error: share of the value)
    log10    the native cell is already log10 of the unit
    missing  marks that mean "no value"
    valid    [lowest, highest] in our unit; a value outside counts as missing
    add      added after the conversion (dex for logarithms)
    """

    column: str | list[str]
    unit: str = ""
    log10: bool = False
    missing: list[Any] = field(default_factory=list)
    valid: list[float] = field(default_factory=list)
    add: float = 0.0
    why: str = ""

    @property
    def names(self) -> list[str]:
        return [self.column] if isinstance(self.column, str) else list(self.column)


@dataclass(frozen=True)
class Redshift:
    """[redshift]: frame of the native column, error where no column gives one, what the number is."""

    frame: str = "heliocentric"
    sum_of: str = "redshifts"  # or "velocities": how the catalogue went from one frame to the other
    kind: str = "spec"
    error: float = 0.0
    error_per_one_plus_z: float = 0.0
    taken_as: str = "likelihood"
    outliers: float = 0.05  # share of outliers among photometric redshifts of galaxies; 3 to 10%: common practice
    source: str = ""


@dataclass(frozen=True)
class Distance:
    """[distance]: error where none is given; distance of rows that have a velocity only."""

    error_share: float = 0.1
    velocity: str = ""  # native column [km/s] that gives the distance where there is no measured one
    hubble: float = 0.0  # km/s/Mpc of that velocity distance
    measured: str = ""  # native column that is 0 or empty where the distance column holds a velocity distance
    peculiar_km_s: float = 300.0
    largest_error_share: float = 0.5
    source: str = ""


@dataclass(frozen=True)
class Mass:
    """[mass]: definition, origin and error of log_mass (groups) or log_mstar (galaxies)."""

    definition: str = ""
    made_from: str = ""
    taken_as: str = ""  # "likelihood" or "posterior"; "" = likelihood for log_mstar, posterior for log_mass
    error_dex: float = 0.2
    error_holds_redshift: bool = False
    imf: str = "Chabrier"
    one_minus_b: list[float] = field(default_factory=lambda: [1.0, 0.0])
    source: str = ""


@dataclass(frozen=True)
class Proxy:
    """[proxy]: what stands for the mass where there is none, and the relation file that turns it into one."""

    use: str = ""
    relation: str = ""
    source: str = ""


@dataclass(frozen=True)
class Centre:
    """[centre]: 1 sigma of the centre on each axis, proper kpc; at most a share of r200c."""

    error_kpc: float = 0.0
    largest_share: float = float("inf")
    single_kpc: float = float("nan")  # of a group with one member
    source: str = ""


@dataclass(frozen=True)
class Magnitudes:
    """[magnitudes]: system band by band; whether they are already in the rest frame."""

    system: dict[str, str] = field(default_factory=dict)
    rest_frame: bool = False
    source: str = ""


@dataclass(frozen=True)
class Position:
    """[position]: burst tables; whether axes in the wrong order and without an angle mean a circle ("" = a mistake)."""

    without_angle: str = ""
    source: str = ""


@dataclass(frozen=True)
class Depth:
    """[depth]: how faint the catalogue goes; band and limit where that is one number."""

    text: str = ""
    band: str = ""
    limit: float = float("nan")


@dataclass(frozen=True)
class Footprint:
    """[footprint]: where on the sky, in words; a map is given to the audit beside the table."""

    text: str = ""


@dataclass(frozen=True)
class Drop:
    """[[drop]]: rows to leave out and why.

    column  a native column; or `ours`, one of ours after conversion
    op      == != < <= > >= in missing
    unless  one of ours: the rule passes over rows that have it
    """

    op: str
    why: str
    column: str = ""
    ours: str = ""
    value: Any = None
    unless: str = ""


@dataclass(frozen=True)
class Card:
    """One public catalogue, explained."""

    name: str
    kind: str
    title: str
    reference: str
    sure: str  # "checked on the table" or "from memory"
    path: Path
    columns: dict[str, NativeColumn]
    match: list[str] = field(default_factory=list)  # native columns that give the catalogue away
    file: FileOptions = field(default_factory=FileOptions)
    redshift: Redshift = field(default_factory=Redshift)
    distance: Distance = field(default_factory=Distance)
    mass: Mass = field(default_factory=Mass)
    proxy: Proxy = field(default_factory=Proxy)
    centre: Centre = field(default_factory=Centre)
    magnitudes: Magnitudes = field(default_factory=Magnitudes)
    position: Position = field(default_factory=Position)
    depth: Depth = field(default_factory=Depth)
    footprint: Footprint = field(default_factory=Footprint)
    drop: list[Drop] = field(default_factory=list)
    h: float = float("nan")  # what "/h" in a unit stands for
    precedence: int = 50
    notes: list[str] = field(default_factory=list)

    def explain(self) -> str:
        """The card in plain words: columns with units, frames, errors, rows left out and why, reference."""
        from haloledger.catalogs.cards.words import explain

        return explain(self)
