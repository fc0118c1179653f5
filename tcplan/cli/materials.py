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
"""


@click.command(
    "materials", short_help="Show the materials of a file, or the published sets.", epilog=EXAMPLES
)
@click.argument("file", required=False)
@click.option("--json", "as_json", is_flag=True, help="Print JSON.")
def command(file: str | None, as_json: bool) -> None:
    """Show the materials of FILE, or of a set that comes with tcplan (published:NAME).

    Without FILE the published sets are listed.
    """
    if file is None:
        _published(as_json=as_json)
        return
    from tcplan.workflow.conversions import materials_of

    found = materials_of(file)
    if as_json:
        say_json({name: material.to_dict() for name, material in found.items()})
    else:
        say("\n\n".join(_block(material) for material in found.values()))


def _published(*, as_json: bool) -> None:
    from tcplan.material.files import published, published_names

    sets = {f"published:{name}": list(published(name)) for name in published_names()}
    if as_json:
        say_json(sets)
        return
    lines = [line for name, held in sets.items() for line in (name, *_labelled("", ", ".join(held)))]
    say("\n".join(lines))


def _block(material: Material) -> str:
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
