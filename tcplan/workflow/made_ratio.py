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
from tcplan.parts.placement import Placement, place
from tcplan.parts.record import MadeRatio
from tcplan.parts.stock import candidates
from tcplan.parts.wire import wire_legs
from tcplan.ratio.check import RatioCheck, check_ratio, pair_of
from tcplan.ratio.worst import worst_of
from tcplan.workflow.made_films import combinations, film_choices, film_legs_of
from tcplan.workflow.made_task import NEAR, PartsRules
from tcplan.workflow.ratio import make_ratio

FEW = 5  # nearest stock values of a leg that are tried
MOST_TRIED = 20_000
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
    choices = _best(sides, done, films)
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


def _figure(sides: _Sides, own: Sequence[MadeLeg]) -> float:
    """Return the figure of the worst case of the ratio as made, of the nominal one without spreads."""
    pair = pair_of(_made_brief(sides, own))
    if sides.brief.goal.judge == "nominal" or set(pair.names) - set(pair.spreads):
        return pair.judge(pair.nominal()).figure
    return worst_of(pair).upper


def _best(
    sides: _Sides, done: Mapping[str, MadeLeg], films: Sequence[Sequence[FilmChoice]]
) -> tuple[FilmChoice, ...]:
    """Return the unit cells of least area that keep the limit, else those of the least figure."""
    if not films:
        return ()
    scale = pair_of(sides.brief).need.scale
    least, best = inf, None
    for choices in sorted(combinations(films), key=lambda one: sum(choice.area for choice in one)):
        figure = _figure(sides, sides.whole({**done, **film_legs_of(choices)}))
        if best is None or figure < least:
            least, best = figure, choices
        if scale is not None and figure <= scale * (1.0 + NEAR):
            return choices
    return best or ()


def _stock(sides: _Sides, done: Mapping[str, MadeLeg]) -> dict[str, StockLeg]:
    """Return one stock value for each bought leg: of the nearest, those whose ratio is nearest."""
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
    wanted = _quotient(sides, own)
    tried = (
        {
            leg.id: StockLeg(
                id=leg.id, material=leg.material, wanted_ohms=leg.wanted_ohms, values=c.values, joined="one"
            )
            for leg, c in zip(bought, chosen, strict=True)
        }
        for chosen in product(*found)
    )
    return min(tried, key=lambda legs_: abs(_quotient(sides, sides.whole({**done, **legs_})) / wanted - 1.0))


def _quotient(sides: _Sides, own: Sequence[MadeLeg]) -> float:
    """Return the first resistor over the second."""
    count = len(legs(sides.ratio.first))
    first = _assembly(sides, sides.ratio.first, own[:count]).network
    return value(first) / value(_assembly(sides, sides.ratio.second, own[count:]).network)


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
