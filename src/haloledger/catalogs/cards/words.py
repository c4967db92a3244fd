"""A card in plain words."""

from __future__ import annotations

from haloledger.catalogs.cards.card import Card, Drop, NativeColumn
from haloledger.catalogs.frames import APEX
from haloledger.catalogs.nativeunits import SHARE
from haloledger.catalogs.schema import FIELDS


def explain(card: Card) -> str:
    """Several paragraphs: what it is, columns, redshift, mass, centre, depth, rows left out, how sure."""
    parts = [
        f"{card.name}: {card.title} ({card.kind})",
        f"Reference: {card.reference}",
        f"How sure: {card.sure}.",
        "",
        "Columns (ours <- theirs):",
        *[_column(card, ours, native) for ours, native in card.columns.items()],
        "",
        *_redshift(card),
        *_distance(card),
        *_mass(card),
        *_rest(card),
        "",
        "Rows left out:" if card.drop else "Rows left out: none by rule.",
        *[f"  {_rule(rule)}: {rule.why}" for rule in card.drop],
        *[f"Note: {note}" for note in card.notes],
    ]
    return "\n".join(parts).rstrip() + "\n"


def _column(card: Card, ours: str, native: NativeColumn) -> str:
    spec = FIELDS[card.kind][ours]
    words = f"  {ours} <- {' and '.join(native.names)}"
    if native.unit == SHARE:
        words += ", a share of the value"
    elif native.unit:
        words += f" in {native.unit}"
    if ours == "z" and native.unit:
        words += ", divided by c"
    if spec.log:
        words += ", already log10" if native.log10 else ", log10 taken"
    if native.missing:
        words += f"; {', '.join(str(m) for m in native.missing)} = missing"
    if native.valid:
        words += f"; outside {native.valid[0]:g}..{native.valid[1]:g} = missing"
    return words + (f" ({native.why})" if native.why else "")


def _redshift(card: Card) -> list[str]:
    if "z" not in card.columns:
        return []
    r = card.redshift
    if card.kind == "bursts":
        return []
    kind = "photometric" if r.kind == "phot" else "spectroscopic"
    words = f"Redshifts: {kind}, {r.frame} frame"
    if r.frame in APEX:
        apex = APEX[r.frame]
        words += (
            f", brought to the heliocentric one with {apex.speed_km_s:g} km/s toward l = {apex.l_deg:g},"
            f" b = {apex.b_deg:g} ({apex.source})"
        )
    words += f"; used as a {r.taken_as}"
    if r.kind == "phot" and card.kind == "galaxies":
        words += f"; {100 * r.outliers:g}% taken as outliers"
    size = " + ".join(
        [f"{r.error:g}"] * bool(r.error) + [f"{r.error_per_one_plus_z:g} (1+z)"] * bool(r.error_per_one_plus_z)
    )
    words += f"; error where none is given: {size or '0'}" + (f" ({r.source})" if r.source else "")
    return [words + "."]


def _distance(card: Card) -> list[str]:
    d = card.distance
    if "distance_mpc" not in card.columns:
        return []
    words = f"Distances: error where none is given {100 * d.error_share:g}%"
    if d.velocity:
        words += (
            f"; without a measured distance {d.velocity}/{d.hubble:g}, with the error that {d.peculiar_km_s:g} km/s"
            f" make, at most {100 * d.largest_error_share:g}%"
        )
    return [words + (f" ({d.source})" if d.source else "") + "."]


def _mass(card: Card) -> list[str]:
    m = card.mass
    lines = []
    if "log_mass" in card.columns:
        words = f"Masses: {'M' + m.definition}, made from {m.made_from or 'an unknown quantity'}"
        words += f"; used as a {m.taken_as or 'posterior'}; error where none is given {m.error_dex:g} dex"
        if m.one_minus_b[0] != 1.0:
            words += f"; divided by (1-b) = {m.one_minus_b[0]:g} ± {m.one_minus_b[1]:g}, the hydrostatic bias"
        lines.append(words + (f" ({m.source})" if m.source else "") + ".")
    if "log_mstar" in card.columns:
        words = f"Stellar masses: {m.imf} IMF; used as a {m.taken_as or 'likelihood'}"
        words += f"; error where none is given {m.error_dex:g} dex"
        words += (
            "; the error holds that of the redshift or distance"
            if m.error_holds_redshift
            else "; the error does not hold that of the redshift"
        )
        lines.append(words + (f" ({m.source})" if m.source else "") + ".")
    if card.proxy.use:
        words = f"Mass proxy: {card.proxy.use}, relation {card.proxy.relation}"
        lines.append(words + (f" ({card.proxy.source})" if card.proxy.source else "") + ".")
    if card.h == card.h:
        lines.append(f"Hubble parameter of the paper: h = {card.h:g}.")
    return lines


def _rest(card: Card) -> list[str]:
    lines = []
    if card.magnitudes.system:
        said = ", ".join(f"{band} {system}" for band, system in card.magnitudes.system.items())
        frame = "already in the rest frame" if card.magnitudes.rest_frame else "as observed"
        source = f" ({card.magnitudes.source})" if card.magnitudes.source else ""
        lines.append(f"Magnitudes: {said}, {frame}{source}.")
    if card.kind == "groups":
        source = f" ({card.centre.source})" if card.centre.source else ""
        most = card.centre.largest_share
        size = f"{card.centre.error_kpc:g} kpc on each axis" + (f", at most {most:g} r200c" if most < 1e3 else "")
        if card.centre.single_kpc == card.centre.single_kpc:
            size += f", {card.centre.single_kpc:g} kpc for a group of one galaxy"
        lines.append(f"Centres: {size}{source}; precedence {card.precedence}.")
    if card.position.without_angle:
        lines.append(f"Axes that differ without an angle: {card.position.without_angle} ({card.position.source}).")
    if card.depth.text:
        number = f" ({card.depth.band} < {card.depth.limit:g})" if card.depth.band else ""
        lines.append(f"Depth: {card.depth.text}{number}.")
    if card.footprint.text:
        lines.append(f"Footprint: {card.footprint.text}.")
    return lines


def _rule(rule: Drop) -> str:
    name = rule.column or rule.ours
    words = f"{name} is missing" if rule.op == "missing" else f"{name} {rule.op} {rule.value}"
    return words + (f" without {rule.unless}" if rule.unless else "")
