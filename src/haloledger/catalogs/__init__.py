"""Catalogues: canonical tables and their checks, readers, cards."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from haloledger.catalogs.footprints import read_footprint
    from haloledger.catalogs.readers import read_bursts, read_galaxies, read_groups

__all__ = ["read_bursts", "read_footprint", "read_galaxies", "read_groups"]


def __getattr__(name: str) -> Any:
    """The readers, imported when first asked for."""
    if name == "read_footprint":
        from haloledger.catalogs.footprints import read_footprint

        return read_footprint
    if name in __all__:
        from haloledger.catalogs import readers

        return getattr(readers, name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
