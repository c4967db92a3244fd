"""From a few numbers to a whole true sky."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_function import mass_function
from haloledger.rehearse.sky import columns, relations
from haloledger.rehearse.sky.galaxies import Light, centrals, satellites, stellar_masses
from haloledger.rehearse.sky.matter import make_box
from haloledger.rehearse.sky.placing import class_bias, class_of, place_haloes
from haloledger.rehearse.sky.population import Population
from haloledger.rehearse.sky.structure import (
    CONCENTRATION_DEX,
    LIGHT_KMS,
    PECULIAR_KMS,
    median_concentration,
    nfw_radius,
    velocity_dispersion_kms,
)
from haloledger.rehearse.sky.truth import Galaxies, Haloes, Lines, Sky, join, pick

Z_BOX = 0.2
NEAREST_Z = 0.03  # tubes of neighbouring lines do not meet beyond it
BOOST = (2.5, 2.5, 3.0, 4.0, 6.0, 8.0, 10.0)  # a class of masses: most haloes that one may have to stand for


@dataclass(frozen=True)
class Truth:
    """What the sky is made of."""

    lines: int = 2000
    z_range: tuple[float, float] = (0.1, 0.4)  # of the bursts
    behind: float = 0.02  # how far behind the bursts the tubes reach, in redshift
    satellites: str = "occupation"  # one of galaxies.SATELLITES
    satellite_share: float = 0.28  # of galaxies of 1e10 Msun, for "subhaloes"
    scatter_factor: float = 1.0  # times the published scatter of stellar mass at fixed halo mass
    relation: str = ""  # one of relations.ALL for all lines; "" draws one a line
    zero_point_dex: float = 0.1
    mass_err: float = 0.15  # dex, of measured stellar masses
    same_counts: bool = True  # every universe shows the same numbers of galaxies: see `population`
    triaxial: float = 0.0  # spread in ln of the depth of haloes along the line, at the cost of their width
    one_universe: bool = False  # all lines share one draw of the nuisances
    host_is_satellite: float = 0.25
    cells: int = 256
    cell_mpc: float = 3.0


def simulate(truth: Truth, seed: int, cosmos: Cosmos) -> Sky:
    """The sky of one seed."""
    draw = _Streams(seed)
    z = draw("lines").uniform(*truth.z_range, truth.lines)
    relation, zero, kept = _nuisances(truth, draw("nuisances"))
    field, masses = _field(truth, z, relation, zero, cosmos, draw)
    hosts, satellite = _hosts(z, truth, cosmos, draw("hosts"))
    haloes = join([hosts, field])  # halo i holds the burst of line i
    light = Light(relation[haloes.line], zero[haloes.line], truth.scatter_factor, truth.mass_err)
    of_hosts = stellar_masses(hosts.log_m200c, hosts.z, light.part(hosts.line), cosmos, draw("host masses"))
    true, measured = (np.concatenate(m) for m in zip(of_hosts, masses, strict=True))
    own = centrals(haloes, (true, measured))
    others = satellites(haloes, light, truth.satellites, truth.satellite_share, Z_BOX, cosmos, draw("satellites"))
    galaxies = join([own, others])
    galaxies, host_row = _satellite_hosts(galaxies, satellite, haloes, cosmos, draw("host orbits"))
    ra, dec = spread_on_sky(truth.lines)
    lines = Lines(ra, dec, z, galaxies.z_seen[host_row], relation, zero, kept, host_row)
    return Sky(lines, haloes, galaxies, true_columns(haloes, z, truth.triaxial, cosmos, draw("shapes")), truth.mass_err)


def _field(truth: Truth, z, relation, zero, cosmos: Cosmos, draw: _Streams):
    """Haloes in front and behind, with the stellar masses of their centrals, true and measured."""
    box = make_box(class_bias(Z_BOX, cosmos), Z_BOX, cosmos, draw("box"), truth.cells, truth.cell_mpc)
    first = np.full(truth.lines, cosmos.comoving_distance_mpc(NEAREST_Z))
    last = cosmos.comoving_distance_mpc(z + truth.behind)
    boost = np.array(BOOST if truth.same_counts else (1.0,) * len(BOOST))
    field = _haloes(place_haloes(box, first, last, boost, cosmos, draw("haloes")), cosmos, draw("structure"))
    light = Light(relation[field.line], zero[field.line], truth.scatter_factor, truth.mass_err)
    masses = stellar_masses(field.log_m200c, field.z, light, cosmos, draw("central masses"))
    if not truth.same_counts:
        return field, masses
    names = (truth.relation,) if truth.relation else relations.NAMES
    population = Population(names, truth.zero_point_dex, truth.mass_err, truth.scatter_factor, cosmos)
    wanted = population.weight(masses[1], field.z, light.relation, light.zero_point)
    keep = draw("counts").random(len(field)) * boost[class_of(field.log_m200c)] < wanted
    return pick(field, keep), tuple(m[keep] for m in masses)


class _Streams:
    """Independent random numbers for each part, so that one part's change leaves the others' numbers."""

    def __init__(self, seed: int) -> None:
        self.seed = seed

    def __call__(self, part: str) -> np.random.Generator:
        return np.random.default_rng([self.seed, *part.encode()])


def _nuisances(truth: Truth, rng: np.random.Generator):
    n = truth.lines
    relation = rng.integers(0, len(relations.NAMES), n)
    zero, kept = truth.zero_point_dex * rng.standard_normal(n), rng.standard_normal(n)
    if truth.one_universe:
        relation, zero, kept = (np.full(n, a[0]) for a in (relation, zero, kept))
    if truth.relation:
        relation = np.full(n, relations.ALL.index(truth.relation))
    return relation, zero, kept


def _haloes(placed, cosmos: Cosmos, rng: np.random.Generator) -> Haloes:
    n = len(placed.line)
    z = cosmos.z_at_comoving_distance(placed.distance_mpc)
    c200c = median_concentration(placed.log_m200c, z, cosmos) * 10 ** (CONCENTRATION_DEX * rng.standard_normal(n))
    return Haloes(
        line=placed.line,
        log_m200c=placed.log_m200c,
        z=z,
        z_seen=(1 + z) * (1 + PECULIAR_KMS / LIGHT_KMS * rng.standard_normal(n)) - 1,
        east_mpc=placed.east_mpc,
        north_mpc=placed.north_mpc,
        c200c=c200c,
        holds_burst=np.zeros(n, dtype=bool),
    )


def _hosts(z, truth: Truth, cosmos: Cosmos, rng: np.random.Generator) -> tuple[Haloes, np.ndarray]:
    """The halo of each burst, and whether the host is a satellite of it.

    Centrals: haloes weighted by the stellar mass of their central; satellites: haloes above 1e12.5 weighted by mass.
    """
    n = len(z)
    m = np.arange(11.0, 15.3, 0.01)
    number = mass_function(m[None], np.full((1, 1), float(np.mean(z))), cosmos)[0]
    by_light = number * 10 ** relations.moster2013(m, float(np.mean(z)))
    by_mass = number * 10**m * (m > 12.5)
    satellite = rng.random(n) < truth.host_is_satellite
    u = rng.random(n)
    log_m = np.where(satellite, _inverse(by_mass, m, u), _inverse(by_light, m, u))
    c200c = median_concentration(log_m, z, cosmos) * 10 ** (CONCENTRATION_DEX * rng.standard_normal(n))
    r200c_mpc = cosmos.r200c_kpc(log_m, z) * (1 + z) / 1e3
    radius = r200c_mpc * nfw_radius(rng.random(n), c200c)
    cosine, turn = 2 * rng.random(n) - 1, 2 * np.pi * rng.random(n)
    near_mpc = 3e-3 * rng.standard_normal((2, n))  # the burst's place in its galaxy
    across = np.where(satellite, radius * np.sqrt(1 - cosine**2), 0.0)
    haloes = Haloes(
        line=np.arange(n),
        log_m200c=log_m,
        z=np.asarray(z),
        z_seen=(1 + z) * (1 + PECULIAR_KMS / LIGHT_KMS * rng.standard_normal(n)) - 1,
        east_mpc=across * np.cos(turn) + near_mpc[0],
        north_mpc=across * np.sin(turn) + near_mpc[1],
        c200c=c200c,
        holds_burst=np.ones(n, dtype=bool),
    )
    return haloes, satellite


def _inverse(weights, x, u) -> np.ndarray:
    grown = np.cumsum(weights)
    return np.interp(u, grown / grown[-1], x)


def _satellite_hosts(galaxies: Galaxies, satellite, haloes: Haloes, cosmos: Cosmos, rng):
    """Hosts that are satellites: a galaxy of some 1e10 Msun, planted at the line, moving in its halo."""
    halo = np.flatnonzero(satellite)
    k = len(halo)
    sigma = velocity_dispersion_kms(haloes.log_m200c[halo], haloes.z[halo], cosmos)
    mstar = 10.2 + 0.3 * rng.standard_normal(k)
    added = Galaxies(
        halo=halo,
        central=np.zeros(k, dtype=bool),
        log_mstar=mstar,
        measured=mstar,
        z_seen=(1 + haloes.z_seen[halo]) * (1 + sigma / LIGHT_KMS * rng.standard_normal(k)) - 1,
        east_mpc=3e-3 * rng.standard_normal(k),
        north_mpc=3e-3 * rng.standard_normal(k),
    )
    host_row = np.arange(len(satellite))
    host_row[halo] = len(galaxies) + np.arange(k)
    return join([galaxies, added]), host_row


def spread_on_sky(n: int) -> tuple[np.ndarray, np.ndarray]:
    """Directions [deg] far from each other: a spiral of equal areas."""
    k = np.arange(n) + 0.5
    return (k * 180 * (3 - 5**0.5)) % 360, np.degrees(np.arcsin(1 - 2 * k / n))


def true_columns(haloes: Haloes, z_burst, triaxial: float, cosmos: Cosmos, rng: np.random.Generator) -> np.ndarray:
    """Observer-frame DM [pc cm-3] of each halo on its line; a halo q times as deep is q^-0.5 times as wide."""
    per_mpc = 1e3 / (1 + haloes.z)
    deep = np.exp(triaxial * rng.standard_normal(len(haloes)))
    impact = np.hypot(haloes.east_mpc, haloes.north_mpc) * per_mpc * np.sqrt(deep)
    r200c = cosmos.r200c_kpc(haloes.log_m200c, haloes.z)
    gap = cosmos.comoving_distance_mpc(z_burst)[haloes.line] - cosmos.comoving_distance_mpc(haloes.z)
    rows = np.flatnonzero(impact < r200c)
    part = pick(haloes, rows)
    dm = np.zeros(len(haloes))
    behind = (gap * per_mpc / deep)[rows]
    dm[rows] = columns.column_rest(impact[rows], r200c[rows], part.log_m200c, part.c200c, behind, cosmos)
    return dm * deep / (1 + haloes.z)
