"""``tcplan materials``: what a materials file, or a published set, holds."""

from __future__ import annotations

import textwrap
from typing import TYPE_CHECKING, Any

import click

from tcplan.cli.talk import say, say_json, width

if TYPE_CHECKING:
    from tcplan.material.model import Material

LABEL = 12

EXAMPLES = """\
\b
Examples:
  tcplan materials
  tcplan materials films.toml
  tcplan materials published:metals --json
  tcplan materials process.lib --valid "-40 degC" "150 degC" --block
"""


@click.command(
    "materials", short_help="Show the materials of a file, or the published sets.", epilog=EXAMPLES
)
@click.argument("file", required=False)
@click.option(
    "--lines", is_flag=True, help="Read FILE as parameter lines (SPICE text form), whatever its name."
)
@click.option("--block", is_flag=True, help="Print parameter lines as a materials file (TOML).")
@click.option(
    "--valid",
    nargs=2,
    metavar="LOW HIGH",
    help="Range of the laws of parameter lines; -40 to 125 degC is assumed.",
)
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
def command(file: str | None, lines: bool, block: bool, valid: tuple[str, str] | None, as_json: bool) -> None:
    """Show the materials of FILE, or of a set that comes with tcplan (published:NAME).

    Without FILE the published sets are listed. A file named .lib, .mod, .cir, .sp or .spi holds parameter
    lines: resistor lines and models in the common SPICE text form. What is not understood is listed.
    """
    from tcplan.workflow.conversions import PARAMETER_SUFFIXES, materials_of

    if lines or (file is not None and file.lower().endswith(PARAMETER_SUFFIXES)):
        from tcplan.cli.parameter_screen import show_lines

        show_lines(file, valid, material_text, block=block, as_json=as_json)
        return
    if block or valid is not None:
        raise click.UsageError("--block and --valid are for parameter lines; add --lines.")
    if file is None:
        _published(as_json=as_json)
        return
    found = materials_of(file)
    if as_json:
        say_json({name: material.to_dict() for name, material in found.items()})
    else:
        say("\n\n".join(material_text(material) for material in found.values()))


def _published(*, as_json: bool) -> None:
    from tcplan.material.files import published, published_names

    sets = {f"published:{name}": list(published(name)) for name in published_names()}
    if as_json:
        say_json(sets)
        return
    lines = [line for name, held in sets.items() for line in (name, *_labelled("", ", ".join(held)))]
    say("\n".join(lines))


def material_text(material: Material) -> str:
    """Return what is known of a material, a label a fact."""
    from tcplan.spec.rows import material_row

    row = material_row(material)
    facts: tuple[tuple[str, Any], ...] = (
        ("law", f"{material.law.kind}: {row.law}"),
        ("TC", f"{row.coefficients}, at {row.reference}"),
        ("valid", row.valid),
        ("size", row.size),
        ("spread", row.spread),
        ("source", row.source),
    )
    head = textwrap.wrap(f"{row.name}: {row.label}", width(), subsequent_indent="    ")
    return "\n".join([*head, *(line for label, text in facts for line in _labelled(label, text))])


def _labelled(label: str, text: str) -> list[str]:
    return textwrap.wrap(
        text,
        width(),
        initial_indent=f"    {label}".ljust(LABEL),
        subsequent_indent=" " * LABEL,
        break_on_hyphens=False,
    )
