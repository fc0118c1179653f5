"""The spec sheet of a plan: its budget, its words, and the files of every form."""

from __future__ import annotations

from collections.abc import Mapping

from tcplan.plan import Plan
from tcplan.spec.spec import Spec
from tcplan.spec.test_plan import Instruments
from tcplan.workflow.budgeting import budget_of


def make_spec(plan: Plan, *, instruments: Instruments | None = None, date: str | None = None) -> Spec:
    """Return the spec sheet of the chosen option of a plan, with its budget.

    Parameters
    ----------
    plan : Plan
    instruments : Instruments, optional
        What it is tested with; usual ones when not given.
    date : str, optional
        Printed as it is; no date when not given, so that the same plan gives the same bytes.
    """
    from tcplan.spec.sections import spec_of

    (account,) = budget_of(plan)
    return spec_of(plan, account, instruments=instruments, date=date)


def spec_files(spec: Spec, figures: Mapping[str, bytes]) -> dict[str, bytes]:
    """Return spec.md, spec.html and spec.json by name.

    Parameters
    ----------
    spec : Spec
    figures : mapping of str to bytes
        Content of the figure files by name; those that end in .svg go into the page.
    """
    from tcplan.spec.html import spec_html
    from tcplan.spec.markdown import spec_markdown
    from tcplan.spec.spec_json import spec_json

    drawn = {
        name.removesuffix(".svg"): content.decode()
        for name, content in figures.items()
        if name.endswith(".svg")
    }
    texts = {
        "spec.md": spec_markdown(spec),
        "spec.html": spec_html(spec, drawn),
        "spec.json": spec_json(spec),
    }
    return {name: text.encode() for name, text in texts.items()}
