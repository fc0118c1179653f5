"""``tcplan ranges``: the named temperature ranges."""

from __future__ import annotations

import click

from tcplan.cli.talk import say, say_json

EXAMPLES = """\
\b
Example, in a brief:
  [temperature]
  range = "automotive-1"
"""


@click.command("ranges", short_help="List the named temperature ranges.", epilog=EXAMPLES)
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
def command(as_json: bool) -> None:
    """List the named temperature ranges, with their numbers and where these come from."""
    from tcplan.ranges import GRADES

    if as_json:
        say_json(
            [
                {"name": g.name, "low_degC": g.low_degC, "high_degC": g.high_degC, "standard": g.standard}
                for g in GRADES.values()
            ]
        )
        return
    name = max(len(grade.name) for grade in GRADES.values())
    rows = [
        f"{grade.name:<{name}}  {grade.low_degC:>4g} to {grade.high_degC:>3g} degC  {grade.standard}"
        for grade in GRADES.values()
    ]
    say("\n".join(rows))
