"""From what happened to an exit status and a message; a traceback never reaches the screen."""

from __future__ import annotations

import os
import sys
import tempfile
import traceback
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, NoReturn

import click

from haloledger.cli import exit_codes
from haloledger.errors import HaloledgerError, InputError


class ReaderGone(Exception):
    """Nobody reads what is written to stdout. Not an OSError: those click answers itself, with status 1."""


@contextmanager
def noticing_the_reader() -> Iterator[None]:
    """Turn a broken pipe into `ReaderGone`."""
    try:
        yield
    except BrokenPipeError as error:
        raise ReaderGone from error


def leave(run: Callable[[], Any]) -> NoReturn:
    """Run a command and end the process with its status."""
    try:
        status = run()
        sys.stdout.flush()  # so that a reader that went away is noticed here
    except click.exceptions.Exit as end:
        status = end.exit_code
    except click.ClickException as fault:
        fault.show()
        status = exit_codes.BAD_INPUT
    except (click.Abort, KeyboardInterrupt):
        _say("Stopped. Files are written in one go at the end, so none is half written.")
        status = exit_codes.STOPPED
    except (BrokenPipeError, ReaderGone):
        _no_more_output()
        status = exit_codes.PIPE_CLOSED
    except InputError as fault:
        _say(f"Error: {fault}")
        status = exit_codes.BAD_INPUT
    except Exception as fault:
        _say(_report(fault))
        status = exit_codes.FAULT
    sys.exit(status if isinstance(status, int) else exit_codes.DONE)


def _say(message: str) -> None:
    """To stderr, lines kept, control characters out: messages quote what files hold."""
    clean = "".join(c if c.isprintable() or c == "\n" else "?" for c in message)
    click.echo(clean, err=True)


def _no_more_output() -> None:
    """Nobody reads any more: keep Python from complaining about it at exit."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _report(fault: Exception) -> str:
    kind = "" if isinstance(fault, HaloledgerError) else f"{type(fault).__name__}: "
    return (
        f"Error: this is a fault of haloledger, not of your input ({kind}{fault}).\n"
        f"Please report it with the file {_log(fault)}, which says where it happened."
    )


def _log(fault: Exception) -> Path:
    """Write the trace, the command and the versions to a log file."""
    from platform import platform, python_version

    from haloledger import __version__

    lines = [
        f"haloledger {__version__}, Python {python_version()}, {platform()}",
        f"command: {sys.argv}",
        "".join(traceback.format_exception(fault)),
    ]
    with tempfile.NamedTemporaryFile(
        "w", prefix="haloledger-fault-", suffix=".log", delete=False, encoding="utf-8", errors="backslashreplace"
    ) as file:
        file.write("\n".join(lines))
    return Path(file.name)
