"""Time the whole audit of the demo against doing only its columns in two other ways, and say where the time goes.

    python tests/benchmark/whole_audit.py [--draws 1000]

The audit reads files, lists haloes, draws them, projects their gas for three models and sums up. (a) and (b) of
kernel.py do the columns alone, for as many crossed haloes and draws: (a) is timed on a part and scaled.
"""

from __future__ import annotations

import argparse
import resource
import time

import numpy as np
from kernel import by_numpy, by_quad, draws_of_one_halo

from haloledger.audit import audit
from haloledger.cosmos.background import cosmology
from haloledger.paths import data_folder

MODELS = ["textbook-modified-nfw", "blended", "strong-feedback"]
TIMED_BY_QUAD = 300


def timed_audit(draws: int):
    """Ledgers of the demo and the seconds spent, in total and by stage."""
    demo, stages, began = data_folder("demo_sightlines"), {}, time.perf_counter()
    last = [began, "reading"]

    def progress(done: int, total: int, what: str) -> None:
        now = time.perf_counter()
        stages[last[1]] = stages.get(last[1], 0.0) + now - last[0]
        last[:] = [now, what]

    ledgers = audit(
        str(demo / "bursts.ecsv"),
        galaxies=[str(demo / "galaxies.ecsv")],
        groups=[str(demo / "groups.ecsv")],
        models=MODELS,
        draws=draws,
        keep_draws=True,
        progress=progress,
    )
    return ledgers, time.perf_counter() - began, stages


def main() -> None:
    """Run and print."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--draws", type=int, default=1000)
    draws = parser.parse_args().draws
    timed_audit(10)  # tables of models and relations are made once a process
    ledgers, total, stages = timed_audit(draws)
    columns = sum(len(dm) for dm in ledgers.entry_draws.dm)
    cosmos, rng = cosmology(), np.random.default_rng(1)
    impact, mass, _, c200c, r200c = draws_of_one_halo(rng, cosmos)
    began = time.perf_counter()
    for i in range(TIMED_BY_QUAD):
        by_quad(impact[i], mass[i], c200c[i], r200c[i], cosmos.baryon_share)
    quad_each = (time.perf_counter() - began) / TIMED_BY_QUAD
    began = time.perf_counter()
    for _ in range(20):
        impact, mass, _, c200c, r200c = draws_of_one_halo(rng, cosmos)
        by_numpy(impact, mass, c200c, r200c, cosmos.baryon_share)
    numpy_each = (time.perf_counter() - began) / 20 / len(impact)
    print(f"demo: 8 bursts, {len(MODELS)} models, {draws} draws: {columns} columns crossed")
    for what, seconds in stages.items():
        print(f"  {what:32s} {seconds:8.2f} s")
    print(f"  {'whole audit':32s} {total:8.2f} s   {1e9 * total / columns:8.0f} ns a column")
    for name, each in (("(a) scipy.quad, columns alone", quad_each), ("(b) numpy, sampling and columns", numpy_each)):
        print(f"  {name:32s} {each * columns:8.2f} s   {1e9 * each:8.0f} ns a column   {each * columns / total:7.2f} x")
    print(f"  peak memory {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MB")


if __name__ == "__main__":
    main()
