"""A group whose commands are imported when they are called, so that help is instant; and options in named groups."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Sequence
from importlib import import_module
from typing import Any

import click

from haloledger.cli import exit_codes
from haloledger.cli.guard import leave, noticing_the_reader

LAST = "Talk"  # the heading that stands last, with --help under it
Section = Sequence[tuple[str, str] | str]


class LazyGroup(click.Group):
    """Commands by name: module and one line of help. The module is imported only to run or explain the command."""

    def __init__(self, *args: Any, lazy: dict[str, tuple[str, str]], **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.lazy = lazy

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(self.lazy)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in self.lazy:
            return None
        return import_module(self.lazy[cmd_name][0]).command

    def resolve_command(self, ctx: click.Context, args: list[str]) -> tuple[Any, Any, list[str]]:
        name = args[0]
        if name not in self.lazy and not name.startswith("-"):
            close = difflib.get_close_matches(name, self.lazy, n=1, cutoff=0.5)
            hint = f"Did you mean '{close[0]}'?" if close else f"Commands: {', '.join(self.lazy)}."
            raise click.UsageError(f"No command '{name}'. {hint}", ctx)
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, text) for name, (_, text) in self.lazy.items()])

    def make_context(self, *args: Any, **kwargs: Any) -> click.Context:
        with noticing_the_reader():
            return super().make_context(*args, **kwargs)

    def invoke(self, ctx: click.Context) -> Any:
        with noticing_the_reader():
            return super().invoke(ctx)

    def main(self, args: Any = None, prog_name: str | None = None, **extra: Any) -> Any:  # type: ignore[override]
        """Run and leave with one of the exit statuses; see `haloledger.cli.guard`."""
        extra.pop("standalone_mode", None)
        leave(lambda: super(LazyGroup, self).main(args, prog_name, standalone_mode=False, **extra))


class GroupedOption(click.Option):
    """An option that stands under a heading of its own in the help: `group="Input"`."""

    def __init__(self, *args: Any, group: str = LAST, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.group = group


class Command(click.Command):
    """A command with options under headings, an example, and the exit statuses in its help.

    more      sections for the end of the help, heading -> (name, text) pairs or sentences; called only for the help
    statuses  what the help says of exit statuses
    """

    def __init__(
        self,
        *args: Any,
        example: str,
        more: Callable[[], dict[str, Section]] = dict,
        statuses: str = exit_codes.PAGES,
        **kwargs: Any,
    ) -> None:
        kwargs.setdefault("no_args_is_help", False)
        super().__init__(*args, **kwargs)
        self.example, self.more, self.statuses = example, more, statuses

    def format_options(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        sections: dict[str, list[tuple[str, str]]] = {}
        for parameter in self.get_params(ctx):
            record = None if isinstance(parameter, click.Argument) else parameter.get_help_record(ctx)
            if record:
                sections.setdefault(getattr(parameter, "group", LAST), []).append(record)
        for name, records in sorted(sections.items(), key=lambda item: item[0] == LAST):
            with formatter.section(name):
                formatter.write_dl(records)

    def format_epilog(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        for heading, content in self.more().items():
            with formatter.section(heading):
                for part in content:
                    if isinstance(part, str):
                        formatter.write_text(part)
                pairs = [part for part in content if not isinstance(part, str)]
                if pairs:
                    formatter.write_dl(pairs)
        formatter.write_paragraph()
        with formatter.section("Example"):
            for line in self.example.strip("\n").splitlines():
                formatter.write(f"{'':{formatter.current_indent}}{line}\n")
        formatter.write_paragraph()
        formatter.write_text(self.statuses)


def option(*names: str, group: str = LAST, **kwargs: Any) -> Any:
    """`click.option` with a heading."""
    return click.option(*names, cls=GroupedOption, group=group, **kwargs)
