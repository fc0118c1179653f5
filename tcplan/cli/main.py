"""The ``tcplan`` command: a group whose commands are loaded only when they are used."""

from __future__ import annotations

import sys
from functools import partial
from importlib import import_module
from typing import Any

import click

from tcplan import __version__
from tcplan.cli.exits import exit_code
from tcplan.names import nearest_name

COMMANDS = ("plan", "budget", "parts", "fit", "compare", "materials", "ranges", "coefficients", "new")

START = """\
\b
Start here:
  tcplan new demo                    an example that runs as it is
  tcplan plan demo/brief.toml        the main job
  tcplan budget demo/brief.toml      what moves the value, against the limit
  tcplan materials published:alloys  what comes with tcplan
  tcplan ranges                      named temperature ranges
"""


class Commands(click.Group):
    """Commands by name, each ``command`` in the module of its name; errors become exit codes."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the names, the main one first."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Return a command, its module loaded now."""
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = import_module(f"tcplan.cli.{cmd_name}").command
        return command

    def resolve_command(self, ctx: click.Context, args: list[str]) -> Any:
        """Return the command of the arguments; refuse an unknown one with the nearest known."""
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            near = nearest_name(args[0], COMMANDS)
            hint = f"Did you mean {near}?" if near else f"Choose one of {', '.join(COMMANDS)}."
            raise click.UsageError(f"no such command {args[0]!r}. {hint}", ctx)
        return super().resolve_command(ctx, args)

    def main(self, *args: Any, **kwargs: Any) -> Any:
        """Run, and turn every error into an exit code; see `tcplan.cli.exits`."""
        standalone = kwargs.pop("standalone_mode", True)
        run = partial(super().main, *args, **{**kwargs, "standalone_mode": False})
        code = exit_code(run)
        if standalone:
            sys.exit(code)
        return code


@click.group(
    "tcplan",
    cls=Commands,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 80},
    epilog=START,
)
@click.version_option(__version__, prog_name="tcplan", message="%(prog)s %(version)s")
def cli() -> None:
    """Plan resistors whose drift over temperature stays inside a limit.

    From a brief (what is wanted) and the laws of the materials at hand, tcplan finds the mix of
    legs, proves how good it is, judges it over the spread of the process, and writes a spec sheet.

    Exit codes: 0 the limit is met, or none was given; 1 not met or not judged; 2 wrong input;
    3 proved that no network of these materials can meet it; 4 stopped; 5 a fault of tcplan.
    """
