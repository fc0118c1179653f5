"""The parts of a ratio in words: its units, and what it reaches beside the ideal one."""

from __future__ import annotations

from tcplan.made import FilmLeg
from tcplan.parts.record import MadeRatio
from tcplan.ratio.check import RatioCheck
from tcplan.spec import numbers
from tcplan.spec.parts_text import unit_sentences
from tcplan.spec.spec import CAUTIONS

ROUNDING = 1e-13  # of a ratio; a figure below it is none

Fact = tuple[str, tuple[str, ...]]


def ratio_facts(made: MadeRatio) -> tuple[Fact, ...]:
    """Return the labels and sentences of the parts of a ratio."""
    brief = made.ideal.brief
    own = [leg for leg in (*made.first, *made.second) if isinstance(leg, FilmLeg)]
    found: tuple[Fact, ...] = (
        ("Reaches", against_ideal(made)),
        ("Units", unit_sentences(own, brief.by_name, brief.over.reference)),
        ("Assumed", ("Figures are design estimates, to be confirmed on silicon or hardware.", *CAUTIONS[1:])),
    )
    return tuple((label, texts) for label, texts in found if texts)


def against_ideal(made: MadeRatio) -> tuple[str, ...]:
    """Return what the made ratio reaches beside the ideal one."""
    ideal, checked = made.ideal, made.checked
    error = checked.value / ideal.value - 1.0
    error = error if abs(error) > ROUNDING else 0.0
    sentences = [
        f"The ratio as made is {numbers.number(checked.value, 7)}, "
        f"{numbers.signed(float(f'{error * 1e6:.3g}'))} ppm off {numbers.number(ideal.value, 7)}.",
        f"Ideal {_ppm(ideal.nominal.figure)} nominal, as made {_ppm(checked.nominal.figure)}.",
    ]
    if ideal.worst is not None and checked.worst is not None:
        before, after = ideal.worst.upper, checked.worst.upper
        sentences.append(f"Ideal {_ppm(before)} in the worst case, as made {_ppm(after)}.")
    sentences.append(_mismatch(checked))
    return tuple(sentences)


def _mismatch(checked: RatioCheck) -> str:
    if checked.mismatch.value is None:
        return "Its mismatch is not known: a film states no matching."
    return f"Mismatch of the ratio as made: {_ppm(checked.mismatch.value)}, 1 sigma."


def _ppm(figure: float) -> str:
    return f"{numbers.worst(figure * 1e6 if figure > ROUNDING else 0.0)} ppm"
