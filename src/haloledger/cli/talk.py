"""What a command says while it works: to stderr, less with -q, more with -v, a progress bar only on a terminal."""

from __future__ import annotations

import logging
import os
import sys
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager

import click

Progress = Callable[[int, int, str], None]


def level(quiet: bool, verbose: int) -> int:
    """Logging level: warnings by default, errors with -q, information with -v, everything with -vv."""
    return logging.ERROR if quiet else max(logging.WARNING - 10 * verbose, logging.DEBUG)


def listen(quiet: bool, verbose: int) -> None:
    """Send the log of this package to stderr; warnings of libraries are shown with -v only."""
    logging.basicConfig(level=level(quiet, verbose), format="%(name)s: %(message)s", stream=sys.stderr, force=True)
    logging.captureWarnings(True)
    if not verbose:
        warnings.simplefilter("ignore")
        logging.getLogger("astropy").setLevel(logging.ERROR)


def say(message: str, quiet: bool = False) -> None:
    """One line of talk."""
    if not quiet:
        click.echo(message, err=True)


@contextmanager
def progress_bar(quiet: bool) -> Iterator[Progress | None]:
    """A callback (done, total, what) that moves a bar on stderr; None where nobody would see it."""
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
