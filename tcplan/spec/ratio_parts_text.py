"""The parts of a ratio in words: its units, and what it reaches beside the ideal one."""

from __future__ import annotations

from tcplan.made import FilmLeg, StockLeg
from tcplan.parts.record import MadeRatio
from tcplan.ratio.check import RatioCheck
from tcplan.ratio.worst import RatioWorst
from tcplan.spec import numbers
from tcplan.spec.parts_text import stock_lines, unit_sentences, wire_lines
from tcplan.spec.spec import CAUTIONS
from tcplan.units import format_ohms

ROUNDING = 1e-13  # of a ratio; a figure below it is none

Fact = tuple[str, tuple[str, ...]]


def ratio_facts(made: MadeRatio) -> tuple[Fact, ...]:
    """Return the labels and sentences of the parts of a ratio."""
    brief = made.ideal.brief
    own = (*made.first, *made.second)
    drawn = [leg for leg in own if isinstance(leg, FilmLeg)]
    found: tuple[Fact, ...] = (
        ("Reaches", against_ideal(made)),
        ("Units", unit_sentences(drawn, brief.by_name, brief.over.reference)),
        ("Buy", stock_lines([leg for leg in own if isinstance(leg, StockLeg)], brief.by_name)),
        ("Cut", wire_lines(own, brief.by_name, brief.over.reference_degC)),
        ("Assumed", ("Figures are design estimates, to be confirmed on silicon or hardware.", *CAUTIONS[1:])),
    )
    return tuple((label, texts) for label, texts in found if texts)


def against_ideal(made: MadeRatio) -> tuple[str, ...]:
    """Return what the made ratio reaches beside the ideal one, and what keeps it from being judged."""
    ideal, checked = made.ideal, made.checked
    error = checked.value / ideal.value - 1.0
    error = error if abs(error) > ROUNDING else 0.0
    sentences = [
        f"The ratio as made is {numbers.number(checked.value, 7)}, "
        f"{numbers.signed(float(f'{error * 1e6:.3g}'))} ppm off {numbers.number(ideal.value, 7)}.",
        _legs_off(made),
        f"Ideal {_ppm(ideal.nominal.figure)} nominal, as made {_ppm(checked.nominal.figure)}.",
    ]
    if ideal.worst is not None and checked.worst is not None:
        before, after = _worst(ideal.worst), _worst(checked.worst)
        sentences.append(f"Ideal {before} in the worst case, as made {after}.")
    sentences += [_not_judged(checked), _mismatch(made)]
    return tuple(sentence for sentence in sentences if sentence)


def _legs_off(made: MadeRatio) -> str:
    """Return which legs are off what was asked by more than they may without a word."""
    off = [(leg, leg.ohms / leg.wanted_ohms - 1.0) for leg in (*made.first, *made.second)]
    told = [
        f"{leg.id} {numbers.signed(float(f'{error * 100.0:.3g}'))} %, {format_ohms(leg.ohms)} for "
        f"{format_ohms(leg.wanted_ohms)}"
        for leg, error in off
        if abs(error) > made.error + ROUNDING
    ]
    if not told:
        return ""
    return f"Off what was asked by more than {numbers.percent(made.error)}: {'; '.join(told)}."


def _worst(worst: RatioWorst) -> str:
    """Return the figure of a worst case, with its bound where that is open."""
    if worst.closed:
        return _ppm(worst.upper)
    return f"{_ppm(worst.judged.figure)} found, {_ppm(worst.upper)} at most"


def _not_judged(checked: RatioCheck) -> str:
    """Return why a ratio with a limit is not judged."""
    need = checked.pair.need
    if checked.verdict != "NOT JUDGED" or need.scale is None:
        return ""
    if checked.without_spread:
        return f"Not judged: no spread is stated for {', '.join(checked.without_spread)}."
    if need.goal.judge == "quantile":
        return "Not judged: the limit is inside the 95 % interval of the quantile."
    limit = numbers.stated(need.scale * 1e6)
    return f"Not judged: what is found is within {limit} ppm, what is possible at most is not."


def _mismatch(made: MadeRatio) -> str:
    mismatch = made.checked.mismatch
    films = dict.fromkeys(leg.material for leg in (*made.first, *made.second) if isinstance(leg, FilmLeg))
    unstated = ", ".join(name for name in films if name in mismatch.unstated)
    if not films:
        return "Mismatch is that of films: there is none here."
    if mismatch.value is None:
        return f"Its mismatch is not known: no matching is stated for {unstated}."
    matched = f"; {unstated}, of which no matching is stated, counts as matched" if unstated else ""
    return f"Mismatch of the ratio as made: {_ppm(mismatch.value)}, 1 sigma{matched}."


def _ppm(figure: float) -> str:
    return f"{numbers.worst(figure * 1e6 if figure > ROUNDING else 0.0)} ppm"
