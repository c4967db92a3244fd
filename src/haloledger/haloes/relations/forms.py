"""The shapes that relation files name: log10 of what a relation gives, from its argument (log10) and redshift.

All take (x, z, parameters, cosmos) with x and z that broadcast, and return log10 of the result.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np

Parameters = Mapping[str, Any]


def double_power_law(log_mass, z, p: Parameters, cosmos) -> np.ndarray:
    """M* = 2 N M / [(M/M1)^-low + (M/M1)^high], each parameter first + second z/(1+z) (Moster et al. 2013, eq. 2)."""
    grown = z / (1 + np.asarray(z, dtype=float))
    log_m1, norm, low, high = (p[k][0] + p[k][1] * grown for k in ("log_m1", "norm", "low_slope", "high_slope"))
    x = np.asarray(log_mass) - log_m1
    return log_mass + np.log10(2 * norm) - np.log10(10 ** (-low * x) + 10 ** (high * x))


def five_parameter(log_mass, z, p: Parameters, cosmos) -> np.ndarray:
    """log M* = log(eps M1) + f(log M/M1) - f(0) (Behroozi et al. 2013, eq. 3).

    f(x) = -log10(10^(alpha x) + 1) + delta [log10(1 + e^x)]^gamma / (1 + exp(10^-x)).
    """
    a = 1 / (1 + np.asarray(z, dtype=float))
    fade = np.exp(-4 * a**2)
    log_m1, log_eps, alpha, delta, gamma = (
        p[k][0] + (p[k][1] * (a - 1) + p[k][2] * z) * fade + p[k][3] * (a - 1)
        for k in ("log_m1", "log_eps", "alpha", "delta", "gamma")
    )

    def f(x):
        # exp(10^-x) overflows below x = -2.8, where the term is nothing
        turn = 1 + np.exp(np.minimum(10 ** np.minimum(-x, 3.0), 700.0))
        return -np.log10(10 ** (alpha * x) + 1) + delta * np.log10(1 + np.exp(x)) ** gamma / turn

    return log_eps + log_m1 + f(np.asarray(log_mass) - log_m1) - f(np.zeros_like(log_m1))


def double_power_law_with_bump(log_mass, z, p: Parameters, cosmos) -> np.ndarray:
    """log(M*/M1) = eps - log10(10^(-alpha x) + 10^(-beta x)) + gamma exp(-(x/delta)^2 / 2) (Behroozi+ 2019, J1)."""
    a = 1 / (1 + np.asarray(z, dtype=float))
    log_m1, eps, alpha, beta, delta, log_gamma = (
        p[k][0] + p[k][1] * (a - 1) + p[k][2] * np.log(a) + p[k][3] * z
        for k in ("log_m1", "log_eps", "alpha", "beta", "delta", "log_gamma")
    )
    x = np.asarray(log_mass) - log_m1
    bump = 10**log_gamma * np.exp(-0.5 * (x / delta) ** 2)
    return log_m1 + eps - np.log10(10 ** (-alpha * x) + 10 ** (-beta * x)) + bump


def power_law_hubble(log_mass, z, p: Parameters, cosmos) -> np.ndarray:
    """norm (h(z) M / pivot)^slope, h(z) = H(z) / (100 km/s/Mpc)."""
    log_h = np.log10(cosmos.h * cosmos.e_of_z(z))
    return np.log10(p["norm"]) + p["slope"] * (log_h + log_mass - np.log10(p["pivot"]))


def power_law_evolving(log_mass, z, p: Parameters, cosmos) -> np.ndarray:
    """E(z)^evolution 10^log_norm (M / pivot)^slope."""
    log_e = np.log10(cosmos.e_of_z(z))
    return p["log_norm"] + p["slope"] * (log_mass - np.log10(p["pivot"])) + p["evolution"] * log_e


def power_law_redshift(log_x, z, p: Parameters, cosmos) -> np.ndarray:
    """norm (x / pivot)^slope ((1 + z) / (1 + z_pivot))^z_slope."""
    log_z = np.log10((1 + np.asarray(z)) / (1 + p["z_pivot"]))
    return np.log10(p["norm"]) + p["slope"] * (log_x - np.log10(p["pivot"])) + p["z_slope"] * log_z


def identity(log_mass, z, p: Parameters, cosmos) -> np.ndarray:
    """The mass itself, for catalogues that measure it with an error."""
    return np.asarray(log_mass) + 0.0 * np.asarray(z)


FORMS: dict[str, Callable[..., np.ndarray]] = {
    f.__name__: f
    for f in (
        double_power_law,
        five_parameter,
        double_power_law_with_bump,
        power_law_hubble,
        power_law_evolving,
        power_law_redshift,
        identity,
    )
}
