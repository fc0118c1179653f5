"""spec.json: the spec sheet as data, every cell with the place that its number comes from."""

from __future__ import annotations

import json
from dataclasses import asdict

from tcplan.spec.spec import Spec

SCHEMA = 1


def spec_json(spec: Spec) -> str:
    """Return a spec sheet as JSON; the text of a cell is what is printed, its source where it comes from.

    Parameters
    ----------
    spec : Spec

    Returns
    -------
    str
        Sources are ``plan.json#`` or ``budget#`` and a JSON Pointer, or empty.

    References
    ----------
    RFC 6901, JavaScript Object Notation (JSON) Pointer.
    """
    return json.dumps({"schema": SCHEMA, **asdict(spec)}, indent=1, ensure_ascii=False) + "\n"
