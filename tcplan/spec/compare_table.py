"""Many compared devices, one line each, and which of them are worth more lines."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from tcplan.measure.comparison import IMPLAUSIBLE, Compared, FoundDeviation
from tcplan.spec import numbers

TABLE_HEAD = ("device", "R error", "beyond band", "verdict", "strongest deviation")
MOST_DETAILED = 5
LONGEST_NAME = 20
SLOTS = {
    "value": "value",
    "tc1": "TC1",
    "cold": "TCR below its reference",
    "hot": "TCR above its reference",
    "tc2": "TC2",
    "chamber_offset": "chamber offset",
    "chamber_scale": "chamber scale",
    "lead": "lead",
    "meter_scale": "meter scale",
}


def compare_table(devices: Sequence[Compared], planned: float) -> tuple[tuple[str, ...], ...]:
    """Return one row a device.

    Parameters
    ----------
    devices : sequence of Compared
    planned : float
        R at the reference [ohm].

    Returns
    -------
    tuple of tuple of str
        Name, R against the plan, how far the farthest reading is beyond the band in standard
        uncertainties, the verdict, and the deviation of most sigmas.
    """
    return tuple(_row(one, planned) for one in devices)


def shown_devices(devices: Sequence[Compared]) -> tuple[Compared, ...]:
    """Return the devices to show in detail: one alone, else the worst of those outside, worst first."""
    if len(devices) == 1:
        return tuple(devices)
    outside = sorted((one for one in devices if not one.good), key=lambda one: -_beyond(one))
    return tuple(outside[:MOST_DETAILED])


def deviation_name(one: FoundDeviation) -> str:
    """Return the name of a deviation: the material and the parameter."""
    return f"{one.material} {SLOTS[one.slot]}".strip()


def _row(one: Compared, planned: float) -> tuple[str, ...]:
    beyond = _beyond(one)
    return (
        _short(one.device),
        f"{1e2 * (one.ohms / planned - 1.0):+.3f} %",
        f"{numbers.number(beyond, 2)} u" if beyond > 0.0 else "inside",
        _verdict(one),
        _strongest(one),
    )


def _beyond(one: Compared) -> float:
    return one.points[one.farthest].beyond


def _short(name: str) -> str:
    return name if len(name) <= LONGEST_NAME else f"{name[: LONGEST_NAME - 2]}.."


def _verdict(one: Compared) -> str:
    """Return the worst that is said of a device, and how much more there is."""
    first, *more = (*_said(one), "inside")
    return f"{first} (+{len(more) - 1})" if len(more) > 1 else first


def _said(one: Compared) -> Iterator[str]:
    places = (one.place, one.value_place, one.figure.place if one.figure else None)
    words = ("OUTSIDE band", "OUTSIDE tolerance", "OVER limit")
    yield from (word for place, word in zip(places, words, strict=True) if place == "outside")
    if one.explanation.spread.probability < IMPLAUSIBLE:
        yield "NOT PLAUSIBLE"
    if one.explanation.misfit.probability < IMPLAUSIBLE:
        yield "NOT EXPLAINED"
    if "not clear" in places:
        yield "not clear"


def _strongest(one: Compared) -> str:
    explanation = one.explanation
    found = max((*explanation.deviations, *explanation.common), key=lambda d: abs(d.sigmas), default=None)
    return "" if found is None else f"{deviation_name(found)} {found.sigmas:+.1f} sigma"
