"""The Markdown spec sheet: every expression of its template is escaped unless it says it is Markdown."""

from __future__ import annotations

import re
from importlib import resources
from typing import Any

from tcplan.plan import Plan
from tcplan.spec.formula import coefficients, composite_formula
from tcplan.spec.numbers import number
from tcplan.spec.spec import spec_of

_SPECIAL = re.compile(r"([\\`*_\[\]|#~$!])")
_ENTITIES = str.maketrans({"&": "&amp;", "<": "&lt;", ">": "&gt;"})
_LIST_MARK = re.compile(r"^([-+]|[0-9]+[.)])(?=\s|$)")


class Markdown(str):
    """Text that is Markdown already and is printed as it is."""

    __slots__ = ()


def escaped(text: object) -> Markdown:
    """Return text that Markdown and the HTML made of it show as it is, on one line."""
    if isinstance(text, Markdown):
        return text
    line = " ".join(str(text).split())
    plain = _SPECIAL.sub(r"\\\1", line.translate(_ENTITIES))
    return Markdown(_LIST_MARK.sub(lambda mark: f"{mark[1][:-1]}\\{mark[1][-1]}", plain))


def code(text: object) -> Markdown:
    """Return text as a code span, fit for a table cell too."""
    line = " ".join(str(text).split())
    return Markdown(f"{_ticks(line, 1)}{_padded(line)}{_ticks(line, 1)}")


def cell(text: object) -> Markdown:
    """Return text as a code span in a table, where a bar would end the cell."""
    return Markdown(code(text).replace("|", r"\|"))


def fenced(text: str, language: str = "") -> Markdown:
    """Return text as a block of code."""
    fence = _ticks(text, 3)
    return Markdown(f"{fence}{language}\n{text}\n{fence}")


def spec_markdown(plan: Plan) -> str:
    """Return the spec sheet of a plan as Markdown.

    Parameters
    ----------
    plan : Plan

    Returns
    -------
    str
        With relative links to the figures.
    """
    from jinja2 import Environment, StrictUndefined

    environment = Environment(
        autoescape=False,  # for HTML; ``finalize`` escapes every expression for Markdown and HTML
        finalize=escaped,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.filters.update({"code": code, "cell": cell})
    template = resources.files("tcplan.spec").joinpath("templates", "spec.md.j2")
    return environment.from_string(template.read_text(encoding="utf-8")).render(_content(plan))


def _content(plan: Plan) -> dict[str, Any]:
    text, latex = composite_formula(plan, plan.best)
    tc1, tc2, tc3 = (number(c) for c in coefficients(plan, plan.best))
    return {
        "spec": spec_of(plan),
        "formula": fenced(text),
        "latex": fenced(latex, "math"),
        "effective": f"TC1 {tc1} ppm/K, TC2 {tc2} ppm/K^2, TC3 {tc3} ppm/K^3",
        "reference": number(plan.range.reference_degC),
    }


def _ticks(text: str, least: int) -> str:
    """Return a run of backticks that is not in the text."""
    longest = max((len(run) for run in re.findall(r"`+", text)), default=0)
    return "`" * max(least, longest + 1)


def _padded(line: str) -> str:
    return f" {line} " if not line or "`" in (line[0], line[-1]) else line
