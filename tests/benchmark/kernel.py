"""Time the column kernel against two other ways of the same work, and check it against hand integrals.

    python tests/benchmark/kernel.py

(a) scipy.integrate.quad, once for each halo and draw
(b) the best numpy we could write: 64-node Gauss-Legendre for all draws of one halo, closed-form normalisation,
    in place, sampling included; what the columns alone cost stands in a further line
The kernel and (a) are given arrays of impact parameter, mass, redshift, concentration and r200c. Speeds are the best of
several runs in one process; the ratios are what counts.
"""

from __future__ import annotations

import time

import numpy as np
from scipy.integrate import quad

from haloledger.cosmos import electrons
from haloledger.cosmos.background import cosmology
from haloledger.cosmos.concentration import concentration
from haloledger.gas.models import load_model, model_names
from haloledger.gas.projection import DM_UNIT, projection

N_DRAWS = 1000
N_HALOES = 1000
KEPT = 0.75
NODES, WEIGHTS = np.polynomial.legendre.leggauss(64)
NODES2, WEIGHTS = (0.5 * (NODES + 1)) ** 2, 0.5 * WEIGHTS
BUFFERS = np.empty((N_DRAWS, 64)), np.empty((N_DRAWS, 64))


def draws_of_one_halo(rng, cosmos, log_m=12.0, z=0.1, impact_kpc=60.0):
    """Impact parameter [r200c], log M200c, redshift, concentration and r200c [kpc] of N_DRAWS draws."""
    mass = log_m + 0.2 * rng.standard_normal(N_DRAWS)
    redshift = np.full(N_DRAWS, z)
    c200c = concentration("dutton2014", mass, redshift, cosmos) * 10 ** (0.11 * rng.standard_normal(N_DRAWS))
    r200c = cosmos.r200c_kpc(mass, redshift)
    return np.minimum(impact_kpc / r200c, 0.999), mass, redshift, c200c, r200c


def by_quad(impact, mass, c200c, r200c, baryon_share) -> float:
    """One column of the textbook model by adaptive quadrature."""

    def density(x):
        return c200c * x / (2 + c200c * x) ** 4

    inside, _ = quad(lambda x: x**2 * density(x), 0, 1)
    column, _ = quad(lambda s: density(np.hypot(impact, s)), 0, np.sqrt(1 - impact**2))
    return DM_UNIT * baryon_share * KEPT * 10**mass / (4 * np.pi * r200c**2) * 2 * column / inside


def by_numpy(impact, mass, c200c, r200c, baryon_share) -> np.ndarray:
    """All columns of one halo of the textbook model by fixed quadrature."""
    y, low = BUFFERS
    half2 = 1 - impact * impact
    c2 = c200c * c200c
    np.multiply((c2 * half2)[:, None], NODES2, out=y)
    y += (c2 * impact * impact)[:, None]
    np.sqrt(y, out=y)
    np.add(y, 2.0, out=low)
    low *= low
    low *= low
    y /= low
    column = y @ WEIGHTS
    a = 2 / (2 + c200c)
    inside = (-np.log(a) + 3 * a - 1.5 * a**2 + a**3 / 3 - 11 / 6) / (c2 * c200c)
    unit = DM_UNIT * baryon_share * KEPT / (4 * np.pi)
    return unit * 10**mass / (r200c * r200c) * 2 * np.sqrt(half2) * column / inside


def by_numpy_any(model, cosmos, draws):
    """The same for any model, from its own density; the amplitudes are worked out beforehand, not timed."""
    impact, mass, z, c200c, r200c = draws
    impact = impact * model.boundary_r200c
    parts = [
        ((weight * part.amplitude(mass, z, c200c, cosmos))[:, None], part.shape)
        for weight, part in zip(model.weights(mass), model.components, strict=True)
    ]

    def work() -> np.ndarray:
        half2 = model.boundary_r200c**2 - impact * impact
        x = np.sqrt((impact * impact)[:, None] + half2[:, None] * NODES2)
        density = sum(scale * shape.density(x, mass[:, None], z[:, None], c200c[:, None]) for scale, shape in parts)
        unit = DM_UNIT * cosmos.baryon_share / (4 * np.pi)
        return unit * 10**mass / (r200c * r200c) * 2 * np.sqrt(half2) * (density @ WEIGHTS)

    return work


def best_of(function, repeats: int, inner: int = 1) -> float:
    """Shortest time of one call [s]."""
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        for _ in range(inner):
            function()
        times.append((time.perf_counter() - start) / inner)
    return min(times)


def main() -> None:
    cosmos = cosmology("Planck18")
    share = cosmos.baryon_share
    rng = np.random.default_rng(1)
    textbook = projection(load_model("textbook-modified-nfw"), cosmos)
    haloes = [draws_of_one_halo(rng, cosmos, rng.uniform(11, 14)) for _ in range(N_HALOES)]
    joined = [np.concatenate([h[k] for h in haloes]) for k in range(5)]
    b, m, z, c, r = haloes[0]

    kernel = best_of(lambda: textbook.dm_rest(*joined), 25) / joined[0].size
    numpy_ = best_of(lambda: by_numpy(b, m, c, r, share), 9, 50) / N_DRAWS
    quad_ = best_of(lambda: [by_quad(*row, share) for row in zip(b[:50], m, c, r, strict=False)], 3) / 50
    drawing = best_of(lambda: draws_of_one_halo(rng, cosmos), 9, 20) / N_DRAWS
    print(f"one column of the textbook model, {joined[0].size} given:")
    print(f"  kernel                        {1e9 * kernel:12.1f} ns")
    print(f"  (a) scipy.integrate.quad      {1e9 * quad_:12.1f} ns   ratio {quad_ / kernel:10.0f}   (target 1000)")
    whole = numpy_ + drawing
    print(f"  (b) numpy, sampling included  {1e9 * whole:12.1f} ns   ratio {whole / kernel:10.1f}   (target 20)")
    print(f"      of that the columns alone {1e9 * numpy_:12.1f} ns   ratio {numpy_ / kernel:10.1f}")
    print(f"      and drawing the arguments {1e9 * drawing:12.1f} ns")

    columns = textbook.dm_rest(b, m, z, c, r)
    worst_quad = max(abs(columns[k] / by_quad(b[k], m[k], c[k], r[k], share) - 1) for k in range(50))
    worst_numpy = np.max(np.abs(columns / by_numpy(b, m, c, r, share) - 1))
    print(f"  largest difference of the kernel from (a) {worst_quad:.1e}, from (b) {worst_numpy:.1e}")

    print("every model, the same arguments scaled to its boundary, against 64 nodes in numpy on its own density:")
    for name in model_names():
        start = time.perf_counter()
        table = projection(load_model(name), cosmos)
        made = time.perf_counter() - start
        impact = joined[0] * table.model.boundary_r200c
        each = best_of(lambda t=table, i=impact: t.dm_rest(i, *joined[1:]), 4) / impact.size
        other = best_of(by_numpy_any(table.model, cosmos, haloes[0]), 5, 5) / N_DRAWS
        size = sum(t.cells.nbytes for term in table.terms for t in term) / 1e6
        speed = f"{1e9 * each:6.1f} ns, numpy {1e9 * other:7.1f} ns, ratio {other / each:6.1f}"
        print(f"  {name:28s} {speed}   tables {size:5.1f} MB, made in {made:.2f} s")

    print("reference columns at z = 0.1, b = 0.3 r200c (kernel, reference, difference):")
    for log_m, c200c, expected in ((12, 8, 74.7012), (13, 6, 151.2749), (14, 5, 311.3967)):
        got = float(textbook.dm_rest(0.3, log_m, 0.1, c200c, cosmos.r200c_kpc(log_m, 0.1)))
        print(f"  1e{log_m}: {got:10.4f} {expected:10.4f} {got / expected - 1:+.1e}")
    print(f"electrons per proton mass {electrons.PER_PROTON}, numpy {np.__version__}")


if __name__ == "__main__":
    main()
