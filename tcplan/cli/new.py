"""``tcplan new``: an example brief and its materials file, which run as they are."""

from __future__ import annotations

import shlex
from importlib import resources
from pathlib import Path

import click

from tcplan.cli.talk import complain, say

FILES = ("brief.toml", "films.toml")

EXAMPLES = """\
\b
Example:
  tcplan new demo
"""


@click.command("new", short_help="Write an example brief and materials file to start from.", epilog=EXAMPLES)
@click.argument("folder", default=".", metavar="[DIR]")
@click.option("--force", is_flag=True, help="Replace files that exist.")
def command(folder: str, force: bool) -> None:
    """Write brief.toml and films.toml to DIR (the current folder by default).

    They hold invented data and run as they are; the keys that they use are explained in them.
    """
    from tcplan.output import write_files

    starter = resources.files("tcplan.cli").joinpath("starter")
    contents = {name: starter.joinpath(name).read_bytes() for name in FILES}
    paths = write_files(Path(folder), contents, force=force)
    complain(f"wrote {' and '.join(str(path) for path in paths)}")
    say(f"tcplan plan {shlex.quote(str(paths[0]))}")
