"""What a command says while it works: to stderr, less with -q, more with -v, a progress bar only on a terminal."""

from __future__ import annotations

import logging
import os
import sys
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from time import perf_counter
from typing import Any

import click

Progress = Callable[[int, int, str], None]
LOG = logging.getLogger("haloledger")


def level(quiet: bool, verbose: int) -> int:
    """Logging level: warnings by default, errors with -q, information with -v, everything with -vv."""
    return logging.ERROR if quiet else max(logging.WARNING - 10 * verbose, logging.DEBUG)


def listen(quiet: bool, verbose: int) -> None:
    """Send the log of this package to stderr; of other libraries only warnings, and those with -v only."""
    chosen = level(quiet, verbose)
    logging.basicConfig(
        level=max(chosen, logging.WARNING), format="%(name)s: %(message)s", stream=sys.stderr, force=True
    )
    LOG.setLevel(chosen)
    logging.captureWarnings(True)
    if not verbose:
        warnings.simplefilter("ignore")
        logging.getLogger("astropy").setLevel(logging.ERROR)


def say(message: str, quiet: bool = False) -> None:
    """One line of talk; "" is none."""
    if message and not quiet:
        click.echo(message, err=True)


class Stages:
    """A progress callback that logs each stage with its seconds once it is over."""

    def __init__(self) -> None:
        self.what, self.total, self.start = "", 0, 0.0

    def __call__(self, done: int, total: int, what: str) -> None:
        if what != self.what:
            self.close()
            self.what, self.start = what, perf_counter()
        self.total = total

    def close(self) -> None:
        """Log the stage that is going on."""
        if self.what:
            many = f" ({self.total})" if self.total > 1 else ""
            LOG.info("%s%s: %.1f s", self.what, many, perf_counter() - self.start)
        self.what = ""


@contextmanager
def progress_bar(quiet: bool, verbose: int = 0) -> Iterator[Progress | None]:
    """A callback (done, total, what): a bar on a terminal, lines with -v; None where nobody would see it."""
    if verbose and not quiet:
        stages = Stages()
        yield stages
        stages.close()
        return
    if quiet or not sys.stderr.isatty() or os.environ.get("TERM") == "dumb":
        yield None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeElapsedColumn

    columns = (TextColumn("{task.description}", markup=False), BarColumn(), MofNCompleteColumn(), TimeElapsedColumn())
    to = Console(stderr=True, no_color=bool(os.environ.get("NO_COLOR")))
    with Progress(*columns, console=to, transient=True) as bar:
        task = bar.add_task("starting", total=None)
        yield lambda done, total, what: bar.update(task, completed=done, total=total, description=what)


def tell_counts(ledgers: Any) -> None:
    """With -v the size of what was done, with -vv every note of every row."""
    if not LOG.isEnabledFor(logging.INFO):
        return
    from haloledger.report.names import plain
    from haloledger.report.text import counted
    from haloledger.report.views import views

    every = views(ledgers)
    for model in ledgers.models:
        entries = [e for v in every if v.model == model.name for e in v.entries]
        haloes = counted(len({e.halo for e in entries}), "halo", "haloes")
        pairs = counted(len(entries), "pair")
        LOG.info("%s: %s of a burst and a halo it meets in some draw, %s in all", model.name, pairs, haloes)
    LOG.info("%s refused", counted(len(ledgers.refused), "row"))
    for view in every:
        if view.note:
            LOG.debug("%s, %s: %s", plain(view.burst), view.model, plain(view.note))
        for e in view.entries:
            if e.note:
                LOG.debug("%s, %s, %s: %s", plain(view.burst), view.model, plain(e.halo), plain(e.note))
