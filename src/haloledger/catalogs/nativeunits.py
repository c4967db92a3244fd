"""Units of native cells, as cards write them: a factor, an astropy unit, and powers of h."""

from __future__ import annotations

import re
import warnings
from functools import lru_cache
from typing import Any

import numpy as np

from haloledger.catalogs.frames import C_KM_S
from haloledger.catalogs.schema import Field
from haloledger.errors import InputError

SHARE = "share"  # unit of an error column: the error is this share of the value
_ALIASES = {
    "degrees": "deg",
    "degree": "deg",
    "msol": "Msun",
    "solmass": "Msun",
    "pc cm-3": "pc/cm3",
    "pc / cm3": "pc/cm3",
}
_NO_UNIT = ("", "none", "-", "--", "dimensionless", "1")
_H = re.compile(r"littleh|(?<![A-Za-z])h(?:\d{0,3}|_?-?1|\^-?1)?(?![A-Za-z0-9])|h_?inv", re.I)


@lru_cache(maxsize=256)
def parse(unit: str) -> Any:
    """astropy unit of a string; None for no unit. ValueError where astropy does not know it."""
    import astropy.units as u

    text = unit.strip()
    text = _ALIASES.get(text.lower(), text)
    if text.lower() in _NO_UNIT:
        return None
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        return u.Unit(text, parse_strict="raise")


def carries_h(unit: str) -> bool:
    """Whether a unit string of a mass, distance or luminosity holds the Hubble parameter ("Msun/h", "h-1 Mpc")."""
    return bool(_H.search(unit))


def split_h(unit: str) -> tuple[str, int]:
    """'1e12 Msun/h2' -> ('1e12 Msun', 2): the unit without h and the power of h it is divided by."""
    found = re.fullmatch(r"(.*?)\s*/\s*h(\d?)\s*", unit)
    return (found[1], int(found[2] or 1)) if found else (unit, 0)


def factor(unit: str, spec: Field, h: float) -> float:
    """Number that brings a native cell in `unit` to our unit of that column. ValueError where it cannot."""
    import astropy.units as u

    bare, power = split_h(unit)
    over_h = h ** (-power) if power else 1.0
    if power and not np.isfinite(h):
        raise ValueError(
            "the unit holds h but the card does not say which: add h = 0.7 (or what the catalogue used) at the top"
        )
    native = parse(bare)
    if native is None:
        return over_h
    if spec.unit == "" and native.is_equivalent(u.km / u.s):  # a redshift given as cz
        return float((1 * native).to_value(u.km / u.s)) / C_KM_S
    if spec.unit == "dex":
        return 1.0
    ours = parse(spec.unit) or u.dimensionless_unscaled
    return float((1 * native).to_value(ours)) * over_h


def check_unit(unit: str, spec: Field, where: str, h: float) -> None:
    """InputError where a card's unit cannot become ours."""
    if spec.text or unit == SHARE:
        return
    if spec.unit == "dex" and unit not in ("", "dex"):
        spec = Field("Msun", spec.what)  # the error of a logarithm may be given on the linear mass
    try:
        factor(unit, spec, h)
    except ValueError as fault:  # astropy's UnitConversionError is one too
        raise InputError(
            f"{where} = '{unit}' does not convert to '{spec.unit}' ({fault}). Write the unit of the native cells."
        ) from None
