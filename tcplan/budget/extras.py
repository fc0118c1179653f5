"""What moves the value beside the network's own materials: ends, mismatch, power, stated allowances."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.brief.model import Allowance
from tcplan.budget.case import Case
from tcplan.budget.model import Nature
from tcplan.draws.sampling import leg_mismatch
from tcplan.material.model import Material
from tcplan.network import Leg, Network, leg_shares, legs, resistance, shares, used_materials, value
from tcplan.operating import OperatingPoint, operating_point

SIGMAS = 3.0
ENDS, MISMATCH = "ends (not in the plan)", "mismatch"
HEATING, VOLTAGE = "self-heating", "voltage coefficient"
NO_FILMS = "no films"


@dataclass(frozen=True, slots=True)
class Extra:
    """One row over temperature: what it adds to either side, as a fraction; None when not known."""

    name: str
    kind: Nature
    up: FloatArray | None
    down: FloatArray | None
    note: str = ""


def extras(network: Network, case: Case, T: FloatArray) -> tuple[Extra, ...]:
    """Return the rows beside the spreads of the materials, at temperatures T [K]."""
    stated = tuple(allowance_row(a, T, case.over.reference) for a in case.allowances)
    # As made, the ends are leaves of the network, so in its rows already.
    ends = (end_row(network, case, T),) if case.elements is None else ()
    return (
        *ends,
        mismatch_row(network, case, T),
        *operating_rows(network, case, T),
        *stated,
    )


def allowance_row(allowance: Allowance, T: FloatArray, reference: float) -> Extra:
    """Return the row of an allowance: its size on the sides it is for, 0 on the other."""
    size = allowance.size * (np.abs(T - reference) if allowance.per_kelvin else np.ones_like(T))
    return Extra(
        allowance.name,
        allowance.kind,
        size if allowance.sides != "down" else np.zeros_like(T),
        -size if allowance.sides != "up" else np.zeros_like(T),
        allowance.source,
    )


# --- ends ---------------------------------------------------------------------------------------------


def end_row(network: Network, case: Case, T: FloatArray) -> Extra:
    """Return an estimate of what the ends of the films add, each leg drawn as one body.

    A leg of share p whose two ends are the part s = 2 E/(W R) of it moves the whole by
    p s [(e - a) x -/+ the spread of s and of e], with e the TC1 of the ends, a that of the leg.
    """
    films = [leg for leg in legs(network) if case.materials[leg.material].kind == "film"]
    unknown = [leg.material for leg in films if _end_share(leg, case.materials[leg.material]) is None]
    if not films or len(unknown) == len(films):
        return Extra(ENDS, "estimate", None, None, _end_note(films, unknown))
    x = T - case.over.reference
    shift, half = np.zeros_like(T), np.zeros_like(T)
    for leg, share in zip(legs(network), shares(network), strict=True):
        material = case.materials[leg.material]
        s = _end_share(leg, material)
        if s is not None and material.film is not None and material.film.end_tc1 is not None:
            away = material.film.end_tc1 - material.referred_taylor(case.over.reference, 1)[0]
            own, tc1 = _end_spread(material)
            shift += share * s * away * x
            half += share * s * (abs(away) * own + (1.0 + own) * tc1) * np.abs(x)
    return Extra(ENDS, "estimate", shift + half, shift - half, _end_note(films, unknown))


def _end_share(leg: Leg, material: Material) -> float | None:
    """Return the part of a leg that its two ends are; None when that is not known."""
    film, width = material.film, material.width
    if film is None or width is None or film.end_resistance is None or film.end_tc1 is None:
        return None
    return 2.0 * film.end_resistance / width / leg.ohms


def _end_spread(material: Material) -> tuple[float, float]:
    """Return the half-widths, as limits, of the end resistance (a fraction) and its TC1 [1/K]."""
    if material.spread is None:
        return 0.0, 0.0
    limits = material.spread.limits()
    return limits.end_resistance or 0.0, limits.end_tc1 or 0.0


def _end_note(films: list[Leg], unknown: list[str]) -> str:
    if not films:
        return NO_FILMS
    names = ", ".join(dict.fromkeys(unknown))
    return f"end_resistance, end_tc1 or width not stated: {names}" if names else "one body a leg"


# --- mismatch -----------------------------------------------------------------------------------------


def mismatch_row(network: Network, case: Case, T: FloatArray) -> Extra:
    """Return what the mismatch of the legs adds, random, at 3 sigma.

    A leg of area W L is off by matching / sqrt(2 W L), 1 sigma, and that moves the drift by
    (p(T) - p(T_ref)) R(T)/R(T_ref), p the share of the leg; the legs are independent.
    """
    sigmas = leg_mismatch(network, case.materials, case.over.reference)
    own = zip(legs(network), sigmas, case.made_of(network), strict=True)
    names = [leg.material for leg, sigma, element in own if sigma is None and not element.ends]
    missing = f"film.matching not stated: {', '.join(dict.fromkeys(names))}" if names else "by area"
    if all(sigma is None for sigma in sigmas):
        return Extra(MISMATCH, "random", None, None, missing)
    moved = share_changes(network, case, T)
    parts = [sigma * move for sigma, move in zip(sigmas, moved, strict=True) if sigma is not None]
    size = SIGMAS * np.sqrt(np.sum(np.square(parts), axis=0))
    return Extra(MISMATCH, "random", size, -size, missing)


def share_changes(network: Network, case: Case, T: FloatArray) -> tuple[FloatArray, ...]:
    """Return d drift/d ln R of every leg, shape (T,) each: (p(T) - p(T_ref)) R(T)/R(T_ref)."""
    names = used_materials(network)
    ratios = {name: case.materials[name].ratio(T, case.over.reference) for name in names}
    ratio = resistance(network, ratios) / value(network)
    pairs = zip(leg_shares(network, ratios), shares(network), strict=True)
    return tuple(np.asarray((at - own) * ratio) for at, own in pairs)


# --- the operating point ------------------------------------------------------------------------------


def operating_rows(network: Network, case: Case, T: FloatArray) -> tuple[Extra, ...]:
    """Return what power adds to the drift of the nominal device; no rows without an operating point.

    First by how much heating alone moves R from the cold one at each ambient temperature, then what the
    voltage coefficients add to that: together they are the whole change, over the cold R at the reference.
    """
    operating = case.operating
    if operating is None:
        return ()
    elements, reference = case.made_of(network), case.over.reference
    hot = operating_point(network, case.materials, elements, operating, reference, T, by_heat_only=True)
    whole = operating_point(network, case.materials, elements, operating, reference, T)
    own = value(network)
    pairs = zip(legs(network), elements, strict=True)
    names = {leg.material for leg, element in pairs if not element.ends}
    known = not whole.no_length and set(whole.not_stated) < names
    heated = (hot.ohms - hot.cold_ohms) / own if operating.heats else None
    stretched = (whole.ohms - hot.ohms) / own if known else None
    return (
        Extra(HEATING, "systematic", heated, heated, _heat_note(whole, heats=operating.heats)),
        Extra(VOLTAGE, "systematic", stretched, stretched, _voltage_note(whole, known=known)),
    )


def _heat_note(point: OperatingPoint, *, heats: bool) -> str:
    if not heats:
        return "thermal_resistance not stated"
    still = f"; not heated: {', '.join(point.not_heated)}" if point.not_heated else ""
    return f"of the nominal device; the value at the reference is that without power{still}"


def _voltage_note(point: OperatingPoint, *, known: bool) -> str:
    law = "R = V/I, R(V) = R(0) (1 + k |V|), V across one unit" if known else ""
    unknown = f"length of a unit not known: {', '.join(point.no_length)}" if point.no_length else ""
    missing = f"voltage_coefficient not stated: {', '.join(point.not_stated)}" if point.not_stated else ""
    return "; ".join(note for note in (law, unknown, missing) if note)
