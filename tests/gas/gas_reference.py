"""Second roads for the tests of gas: columns by quadrature over the electron density; model files made on the spot."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from scipy.integrate import quad

from haloledger.gas.models import Model, load_model

PC_PER_KPC = 1000.0
HEAD = """
name = "{name}"
summary = "For a test."
status = "scenario"
phases = "hot"
boundary = {boundary}
concentration = "dutton2014"
source = "none"
[validity]
log_m200c = [10.0, 15.5]
z = [0.0, 4.0]
"""


def write_model(folder: Path, body: str, boundary: float = 1.0, name: str = "mine") -> Model:
    """A model from the text of its [shape], [kept], ... tables."""
    path = folder / f"{name}.toml"
    path.write_text(HEAD.format(name=name, boundary=boundary) + body, encoding="utf-8")
    return load_model(str(path))


def column_by_quad(model: Model, cosmos, impact: float, log_m: float, z: float, c: float) -> float:
    """Rest-frame column [pc cm-3] of one halo by adaptive quadrature, in the variable w of s = b sinh w."""
    half = np.sqrt(model.boundary_r200c**2 - impact**2)
    soft = max(impact, 1e-6)

    def integrand(w):
        x = min(np.hypot(impact, soft * np.sinh(w)), model.boundary_r200c)
        return float(model.density_cm3(x, log_m, z, c, cosmos)) * soft * np.cosh(w)

    value, _ = quad(integrand, 0.0, np.arcsinh(half / soft), epsabs=0, epsrel=1e-9, limit=200)
    return 2 * PC_PER_KPC * float(cosmos.r200c_kpc(log_m, z)) * value


def columns_by_rule(model: Model, cosmos, impact, log_m, z, c, n_nodes: int = 160) -> np.ndarray:
    """The same for many haloes at once by Gauss-Legendre in w; checked against `column_by_quad` where it is used."""
    v, weights = np.polynomial.legendre.leggauss(n_nodes)
    v, weights = 0.5 * (v + 1), 0.5 * weights
    half = np.sqrt(np.maximum(model.boundary_r200c**2 - impact**2, 0.0))
    soft = np.maximum(impact, 1e-6)
    top = np.arcsinh(half / soft)
    w = top[:, None] * v
    x = np.sqrt(impact[:, None] ** 2 + (soft[:, None] * np.sinh(w)) ** 2)
    n_e = _density(model, cosmos, np.minimum(x, model.boundary_r200c), log_m, z, c)
    return (
        2 * PC_PER_KPC * cosmos.r200c_kpc(log_m, z) * top * np.sum(n_e * soft[:, None] * np.cosh(w) * weights, axis=1)
    )


def _density(model: Model, cosmos, x, log_m, z, c) -> np.ndarray:
    """`density_cm3` with amplitudes worked out once a halo: at x and at one radius, shape by shape."""
    total = 0.0
    for weight, part in zip(model.weights(log_m), model.components, strict=True):
        scale = weight * part.amplitude(log_m, z, c, cosmos)
        total = total + scale[:, None] * part.shape.density(x, log_m[:, None], z[:, None], c[:, None])
    at = np.full(1, 0.5)
    one = slice(0, 1)
    unit = model.density_cm3(at, log_m[one], z[one], c[one], cosmos) / model.relative_density(
        at, log_m[one], z[one], c[one], cosmos
    )
    return total * (unit * cosmos.critical_density(z) / cosmos.critical_density(z[0]))[:, None]


def random_haloes(n: int, boundary: float, seed: int = 3):
    """Impact parameter [r200c], log M200c, z, c200c; a sixth of the lines near the centre, a sixth near the edge."""
    rng = np.random.default_rng(seed)
    u = rng.random(n)
    u[: n // 6] = 10 ** rng.uniform(-5, -1, n // 6)
    u[n // 6 : n // 3] = 1 - 10 ** rng.uniform(-6, -1, n // 3 - n // 6)
    log_m, z = rng.uniform(9.5, 15.8, n), rng.uniform(0, 3, n)
    return u * boundary, log_m, z, np.exp(rng.uniform(np.log(1.5), np.log(35), n))
