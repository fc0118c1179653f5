"""Campaigns for the tests of what is fitted: text of sweeps, all invented, all from a seed."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np

from tcplan.measure.fitted import FittedMaterial, fitted
from tcplan.measure.model import CommonErrors
from tcplan.measure.reading import parse_sweep
from tcplan.measure.request import SpreadRules, SweepRequest

NINE = tuple(np.linspace(-55.0, 140.0, 9).tolist())


def sweep_text(
    lots: int,
    devices: int,
    temperatures: Sequence[float] = NINE,
    *,
    seed: int = 1,
    ohms: float = 1e4,
    tc1: float = -350e-6,
    tc2: float = 0.8e-6,
    noise: float = 50e-6,
    lot: float = 0.015,
    names: Callable[[int, int], tuple[str, str]] = lambda lot, device: (f"L{lot}", f"D{device}"),
    outliers: Sequence[int] = (),
    stated: bool = False,
) -> str:
    """Return the text of a sweep: ``outliers`` are lines of the file, 0.1 % too high."""
    rng = np.random.Generator(np.random.Philox(seed))
    head = "T [degC],R [ohm],device,lot" + (",u(R) [ppm]" if stated else "")
    rows = [head]
    for n in range(lots):
        of_lot = rng.normal(0.0, lot)
        for k in range(devices):
            own = ohms * (1.0 + of_lot + rng.normal(0.0, 0.3 * lot))
            a = tc1 + rng.normal(0.0, 3e-6)
            for t in temperatures:
                x = t - 25.0
                R = own * (1.0 + a * x + tc2 * x * x) * (1.0 + rng.normal(0.0, noise))
                R *= 1.001 if len(rows) + 1 in outliers else 1.0
                name, device = names(n, k)
                u = f",{noise * 1e6:g}" if stated else ""
                rows.append(f"{float(t)!r},{float(R)!r},{device},{name}{u}")
    return "\n".join(rows) + "\n"


def fitted_text(text: str, rules: SpreadRules | None = None, **request: object) -> FittedMaterial:
    """Return what the text of a sweep says of a material named film."""
    asked = {"name": "film", "file": Path("film.csv"), "source": "invented"} | request
    read = parse_sweep(text.encode(), "film.csv")
    return fitted(
        SweepRequest(**asked),
        read.sweep,
        CommonErrors(chamber_offset=0.1),
        rules or SpreadRules(),
        read.notes,
    )
