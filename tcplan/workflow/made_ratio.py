"""From a ratio to its parts: both resistors made of common units, placed together, and checked again."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import product
from math import inf

from tcplan.brief import Brief
from tcplan.brief.model import Ratio
from tcplan.errors import InputError, Problem
from tcplan.made import FilmLeg, MadeLeg, PlainLeg, StockLeg
from tcplan.network import Leg, Network, Series, leg_names, legs, used_materials, value
from tcplan.parts.films import FilmChoice
from tcplan.parts.network import Assembly, assembled, made_process
from tcplan.parts.placement import Placement, outline_area, place
from tcplan.parts.record import FilmWay, MadeRatio
from tcplan.parts.stock import Candidate, candidates
from tcplan.parts.wire import wire_legs
from tcplan.ratio.check import RatioCheck, check_ratio, pair_of
from tcplan.ratio.corners import corner_figure
from tcplan.ratio.pair import Pair
from tcplan.ratio.worst import worst_of
from tcplan.workflow.made_films import combinations, film_choices, film_legs_of, front
from tcplan.workflow.made_task import NEAR, PartsRules
from tcplan.workflow.ratio import make_ratio

FEW = 5  # nearest stock values of a leg that are tried
MOST_TRIED = 20_000
DIGITS = 12  # of relative errors that are compared
MOST_BOUNDED = 5  # ways to draw the films whose bounds are closed, where those of the first do not hold
MOST_SPREADING = 4  # materials of the made ratio whose spreads are searched together


def make_ratio_parts(brief: Brief, rules: PartsRules) -> MadeRatio:
    """Return the parts of both resistors of a ratio, and what the made ratio reaches.

    Parameters
    ----------
    brief : Brief
        With a ratio.
    rules : PartsRules

    Raises
    ------
    InputError
        When a leg can not be made, or when its parts are of more materials than a worst case is searched
        over.
    """
    ideal = make_ratio(brief)
    sides = _Sides(brief=brief, ratio=ideal.pair.ratio, rules=rules)
    done: dict[str, MadeLeg] = {}
    films: list[tuple[FilmChoice, ...]] = []
    problems: list[Problem] = []
    for name in used_materials(sides.together):
        try:
            _make(sides, name, done, films)
        except InputError as error:
            problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    choices = _best(sides, {**done, **_stock(sides, done)}, films)
    done.update(film_legs_of(choices))
    done.update(_stock(sides, done))
    own = sides.whole(done)
    count = len(legs(sides.ratio.first))
    return MadeRatio(
        ideal=ideal,
        checked=_checked(sides, own),
        first=own[:count],
        second=own[count:],
        choices=choices,
        placements=_placed(sides, own, count),
        error=rules.films.error,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sides:
    """Both resistors of a ratio, their legs named together."""

    brief: Brief
    ratio: Ratio
    rules: PartsRules

    @property
    def together(self) -> Network:
        """Both as one network."""
        return Series((self.ratio.first, self.ratio.second))

    @property
    def names(self) -> tuple[str, ...]:
        """The ids of the legs, of the first resistor and then of the second."""
        return leg_names(len(legs(self.together)))

    def wanted(self, material: str) -> tuple[tuple[str, float], ...]:
        """Return id and value [ohm] of each leg of a material."""
        pairs = zip(self.names, legs(self.together), strict=True)
        return tuple((name, leg.ohms) for name, leg in pairs if leg.material == material)

    def whole(self, done: Mapping[str, MadeLeg]) -> tuple[MadeLeg, ...]:
        """Return all legs; those that are not made stay as they are."""
        return tuple(
            done.get(name) or PlainLeg(id=name, material=leg.material, wanted_ohms=leg.ohms)
            for name, leg in zip(self.names, legs(self.together), strict=True)
        )


def _make(sides: _Sides, name: str, done: dict[str, MadeLeg], films: list[tuple[FilmChoice, ...]]) -> None:
    """Make what one material needs: the choices of a film, or the lengths of a wire."""
    data, reference = sides.brief.by_name[name], sides.brief.over.reference
    if data.kind == "film" and data.film is not None:
        films.append(film_choices(data, sides.wanted(name), reference, sides.rules.films))
    elif data.kind == "wire":
        cut = wire_legs(data, sides.wanted(name), reference, step=sides.rules.wire_step)
        done.update({leg.id: leg for leg in cut})


# --- what is made, as a ratio ---------------------------------------------------------------------------


def _made_brief(sides: _Sides, own: Sequence[MadeLeg]) -> Brief:
    """Return the brief of the ratio as made: its networks, materials, and what they share."""
    whole = assembled(sides.together, own, sides.brief.by_name, cut_error=sides.rules.cut_error)
    first, second = _networks(sides, own, whole)
    if len(whole.materials) > MOST_SPREADING:
        raise InputError(
            Problem(
                where="parts of a ratio",
                found=f"{len(whole.materials)} materials: {', '.join(m.name for m in whole.materials)}",
                expected=f"{MOST_SPREADING} at most (the ends of a film, and every bought part, count)",
                todo="Make it of fewer parts, or of films without stated ends.",
            )
        )
    return replace(
        sides.brief,
        ratio=replace(sides.ratio, first=first, second=second),
        materials=tuple(sorted(whole.materials, key=lambda material: material.name)),
        process=made_process(sides.brief.process, whole),
    )


def _networks(sides: _Sides, own: Sequence[MadeLeg], whole: Assembly) -> tuple[Network, Network]:
    """Return both networks as made, of the leaves of both together: these name every cut of a wire."""
    count, leaves = len(legs(sides.ratio.first)), iter(legs(whole.network))
    first = _assembly(sides, sides.ratio.first, own[:count]).network
    second = _assembly(sides, sides.ratio.second, own[count:]).network
    return _with_leaves(first, leaves), _with_leaves(second, leaves)


def _with_leaves(network: Network, leaves: Iterator[Leg]) -> Network:
    if isinstance(network, Leg):
        return next(leaves)
    return type(network)(tuple(_with_leaves(child, leaves) for child in network.children))


def _assembly(sides: _Sides, side: Network, own: Sequence[MadeLeg]) -> Assembly:
    return assembled(side, own, sides.brief.by_name, cut_error=sides.rules.cut_error)


def _checked(sides: _Sides, own: Sequence[MadeLeg]) -> RatioCheck:
    return check_ratio(_made_brief(sides, own))


def _quickly(sides: _Sides, own: Sequence[MadeLeg]) -> float:
    """Return the figure of the ratio as made: that of the corner devices, the nominal one without spreads."""
    pair = pair_of(_made_brief(sides, own))
    if not _spreading(sides, pair):
        return pair.judge(pair.nominal()).figure
    return corner_figure(pair)


def _spreading(sides: _Sides, pair: Pair) -> bool:
    """Whether the figure is that of a worst case."""
    return sides.brief.goal.judge != "nominal" and set(pair.names) <= set(pair.spreads)


def _surely(sides: _Sides, own: Sequence[MadeLeg]) -> float:
    """Return the figure of the ratio as made that no device is above."""
    pair = pair_of(_made_brief(sides, own))
    return worst_of(pair).upper if _spreading(sides, pair) else pair.judge(pair.nominal()).figure


# --- films ----------------------------------------------------------------------------------------------


def _best(
    sides: _Sides, done: Mapping[str, MadeLeg], films: Sequence[Sequence[FilmChoice]]
) -> tuple[FilmChoice, ...]:
    """Return the unit cells of least area that keep the limit, else those of the least figure.

    The ways are compared by their corner devices; only of the one that is taken the bound is closed, and
    where that does not keep the limit, of the next larger ones.
    """
    if not films:
        return ()

    def whole(choices: Sequence[FilmChoice]) -> tuple[MadeLeg, ...]:
        return sides.whole({**done, **film_legs_of(choices)})

    ways = front(
        FilmWay(choices=one, figure=_quickly(sides, whole(one)), area=_outlines(sides, one))
        for one in combinations(films)
    )
    scale = pair_of(sides.brief).need.scale
    most = inf if scale is None else scale * (1.0 + NEAR)
    within = [way for way in ways if scale is not None and way.figure <= most]
    least, best = inf, ways[-1].choices
    for way in within[:MOST_BOUNDED]:
        bound = _surely(sides, whole(way.choices))
        if bound <= most:
            return way.choices
        if bound < least:
            least, best = bound, way.choices
    return best


def _outlines(sides: _Sides, choices: Sequence[FilmChoice]) -> float:
    """Return the area of the arrays of all films, both resistors in each, dummies included [m^2]."""
    materials = sides.brief.by_name
    return sum(
        outline_area(c.unit, sum(leg.units for leg in c.legs), materials[c.unit.material]) for c in choices
    )


# --- bought parts ---------------------------------------------------------------------------------------


def _stock(sides: _Sides, done: Mapping[str, MadeLeg]) -> dict[str, StockLeg]:
    """Return one stock value for each bought leg, of the nearest to each.

    Of the values whose ratio is within the error asked, those are taken that are nearest to what was asked
    of the legs; where there are none, those of the nearest ratio.
    """
    own, materials = sides.whole(done), sides.brief.by_name
    bought = [leg for leg in own if materials[leg.material].series is not None and leg.id not in done]
    if not bought:
        return {}
    lowest, highest = sides.brief.rules.stock_values
    few = max(1, min(FEW, int(MOST_TRIED ** (1.0 / len(bought)))))
    found = [
        candidates(leg.wanted_ohms, str(materials[leg.material].series), lowest, highest, False, few)
        for leg in bought
    ]
    wanted = _ratio(sides, sides.whole({}))

    def order(taken: Mapping[str, StockLeg]) -> tuple[float, float]:
        off = round(abs(_ratio(sides, sides.whole({**done, **taken})) / wanted - 1.0), DIGITS)
        legs_off = round(max(abs(leg.ohms / leg.wanted_ohms - 1.0) for leg in taken.values()), DIGITS)
        return (0.0, legs_off) if off <= sides.rules.films.error else (off, legs_off)

    return min((_bought(bought, chosen) for chosen in product(*found)), key=order)


def _bought(own: Sequence[MadeLeg], chosen: Sequence[Candidate]) -> dict[str, StockLeg]:
    return {
        leg.id: StockLeg(
            id=leg.id, material=leg.material, wanted_ohms=leg.wanted_ohms, values=c.values, joined="one"
        )
        for leg, c in zip(own, chosen, strict=True)
    }


def _ratio(sides: _Sides, own: Sequence[MadeLeg]) -> float:
    """Return the ratio of what is made."""
    count = len(legs(sides.ratio.first))
    first = value(_assembly(sides, sides.ratio.first, own[:count]).network)
    second = value(_assembly(sides, sides.ratio.second, own[count:]).network)
    return first / second if sides.ratio.kind == "gain" else second / (first + second)


def _placed(sides: _Sides, own: Sequence[MadeLeg], count: int) -> tuple[Placement, ...]:
    """Return one array for each film, both sides of the ratio in it."""
    drawn = [leg for leg in own if isinstance(leg, FilmLeg)]
    side = {leg.id: int(k >= count) for k, leg in enumerate(own)}
    found = []
    for name in dict.fromkeys(leg.material for leg in drawn):
        mine = [leg for leg in drawn if leg.material == name]
        both = {leg.id: side[leg.id] for leg in mine}
        split = both if len(set(both.values())) == 2 else None
        found.append(place(mine, sides.brief.by_name[name], sides=split))
    return tuple(found)
