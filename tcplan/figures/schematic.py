"""A network as a schematic: where boxes, wires, dots and words go, in plain numbers.

Series members lie in a line, parallel members are rungs between two rails. Lengths are points at the
size of the text that was measured; x runs to the right, y upwards. A node inside one of its own kind
is opened: the drawing shows which wires meet, and that is the same. Nothing here draws.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass, field
from itertools import accumulate, pairwise
from typing import TypeAlias

from tcplan.network import Leg, Network, Parallel, Series

Point: TypeAlias = tuple[float, float]
Wire: TypeAlias = tuple[Point, Point]

BOX = (33.0, 11.0)  # a resistor is a plain rectangle, three times as long as high (IEC 60617)
SMALL_BOX = (15.0, 6.0)  # under an id alone
LINE = 9.6  # height of a line of text of 8 points
CLEAR = 2.0  # between a box and its words
STUB = 9.0  # of wire at each end of a box, at least
SMALL_STUB = 4.5
APART = 6.0  # from words to the end of their cell
LEAD = 9.0  # of wire outside the rails
RUNG_GAP = 7.0  # between the words of one rung and of the next
SNAP = 12.0  # a lead this near to a rung is drawn level with it
TERMINAL = 2.4  # radius
EDGE = 1.0  # around all


@dataclass(frozen=True, slots=True, kw_only=True)
class Label:
    """The words of a leg: above its box, below it (empty for none), and the width of the wider."""

    above: str
    below: str
    width: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedLeg:
    """The box of one leg and its words, whose middle is over and under the middle of the box."""

    label: Label
    centre: Point
    size: tuple[float, float]

    @property
    def corner(self) -> Point:
        """The lower left corner of the box."""
        return self.centre[0] - 0.5 * self.size[0], self.centre[1] - 0.5 * self.size[1]

    @property
    def lines(self) -> tuple[tuple[str, Point], ...]:
        """Each line of words with its middle."""
        (x, y), rise = self.centre, 0.5 * self.size[1] + CLEAR + 0.5 * LINE
        lines = ((self.label.above, (x, y + rise)), (self.label.below, (x, y - rise)))
        return tuple((text, at) for text, at in lines if text)


@dataclass(frozen=True, slots=True, kw_only=True)
class Schematic:
    """A drawing: legs from left to right in the text form, wires that meet only at their ends.

    ``dots`` are where three or more wires meet. All lies between (0, 0) and (``width``, ``height``).
    """

    legs: tuple[PlacedLeg, ...]
    wires: tuple[Wire, ...]
    dots: tuple[Point, ...]
    terminals: tuple[Point, Point]
    width: float
    height: float


def schematic(network: Network, labels: Sequence[Label]) -> Schematic:
    """Return the drawing of a network.

    Parameters
    ----------
    network : Network
    labels : sequence of Label
        One for each leg, in the order of ``legs(network)``.

    Returns
    -------
    Schematic
        No box, line of words or wire covers another.
    """
    block = _block(network, iter(labels))
    y, left = block.below + EDGE, 2.0 * TERMINAL + EDGE
    right = left + block.width
    drawn = _Pieces()
    block.place(drawn, left, right, y)
    ends = Counter(end for wire in drawn.wires for end in wire)
    dots = tuple(point for point, count in ends.items() if count > 2)
    return Schematic(
        legs=tuple(drawn.legs),
        wires=_joined(drawn.wires, dots),
        dots=dots,
        terminals=((left - TERMINAL, y), (right + TERMINAL, y)),
        width=right + left,
        height=block.above + block.below + 2.0 * EDGE,
    )


def _joined(wires: Sequence[Wire], dots: Collection[Point]) -> tuple[Wire, ...]:
    """Return the wires with level ones that meet away from a dot made one, so that no seam is seen."""
    upright = [wire for wire in wires if wire[0][0] == wire[1][0]]
    whole: list[Wire] = []
    for start, end in sorted(set(wires) - set(upright), key=lambda wire: (wire[0][1], wire[0][0])):
        if whole and whole[-1][1] == start and start not in dots:
            whole[-1] = (whole[-1][0], end)
        else:
            whole.append((start, end))
    return (*whole, *upright)


# --- blocks: a width, and what lies above and below the line through them ----------------------------


@dataclass(slots=True)
class _Pieces:
    """What has been placed so far."""

    legs: list[PlacedLeg] = field(default_factory=list)
    wires: list[Wire] = field(default_factory=list)

    def wire(self, start: Point, end: Point) -> None:
        """Add a wire, to the right or upwards, unless it has no length."""
        if start != end:
            self.wires.append((min(start, end), max(start, end)))


@dataclass(frozen=True, slots=True, kw_only=True)
class _LegBlock:
    width: float
    above: float
    below: float
    label: Label
    size: tuple[float, float]

    def place(self, drawn: _Pieces, left: float, right: float, y: float) -> None:
        """Put the box in the middle, with wires to both ends."""
        leg = PlacedLeg(label=self.label, centre=(0.5 * (left + right), y), size=self.size)
        start = leg.corner[0]
        drawn.wire((left, y), (start, y))
        drawn.wire((start + self.size[0], y), (right, y))
        drawn.legs.append(leg)


@dataclass(frozen=True, slots=True, kw_only=True)
class _SeriesBlock:
    width: float
    above: float
    below: float
    members: tuple[_Block, ...]

    def place(self, drawn: _Pieces, left: float, right: float, y: float) -> None:
        """Put the members end to end; room that is left over goes to all alike."""
        more = (right - left - self.width) / len(self.members)
        ends = list(accumulate((member.width + more for member in self.members), initial=left))
        ends[-1] = right  # exactly, so that wires meet
        for member, (start, end) in zip(self.members, pairwise(ends), strict=True):
            member.place(drawn, start, end, y)


@dataclass(frozen=True, slots=True, kw_only=True)
class _ParallelBlock:
    width: float
    above: float
    below: float
    members: tuple[_Block, ...]
    levels: tuple[float, ...]  # of the members, above the line of the block

    def place(self, drawn: _Pieces, left: float, right: float, y: float) -> None:
        """Put the members as rungs between two rails, with a lead to each rail."""
        spare = 0.5 * (right - left - self.width) + LEAD
        rails = (left + spare, right - spare)
        heights = [y + level for level in self.levels]
        for rail, end in zip(rails, (left, right), strict=True):
            drawn.wire((rail, y), (end, y))
            for high, low in pairwise(sorted({*heights, y}, reverse=True)):
                drawn.wire((rail, high), (rail, low))
        for member, height in zip(self.members, heights, strict=True):
            member.place(drawn, *rails, height)


_Block: TypeAlias = _LegBlock | _SeriesBlock | _ParallelBlock


def _block(network: Network, labels: Iterator[Label]) -> _Block:
    if isinstance(network, Leg):
        return _leg_block(next(labels))
    members = tuple(_block(member, labels) for member in _opened(network))
    return _series_block(members) if isinstance(network, Series) else _parallel_block(members)


def _opened(network: Series | Parallel) -> Iterator[Network]:
    """Yield the members of a node; those of its own kind give theirs."""
    for member in network.children:
        if isinstance(member, type(network)):
            yield from _opened(member)
        else:
            yield member


def _leg_block(label: Label) -> _LegBlock:
    size, stub = (BOX, STUB) if label.below else (SMALL_BOX, SMALL_STUB)
    half, words = 0.5 * size[1], CLEAR + LINE
    return _LegBlock(
        width=max(size[0] + 2.0 * stub, label.width + 2.0 * APART),
        above=half + words,
        below=half + (words if label.below else 0.0),
        label=label,
        size=size,
    )


def _series_block(members: tuple[_Block, ...]) -> _SeriesBlock:
    return _SeriesBlock(
        width=sum(member.width for member in members),
        above=max(member.above for member in members),
        below=max(member.below for member in members),
        members=members,
    )


def _parallel_block(members: tuple[_Block, ...]) -> _ParallelBlock:
    steps = (upper.below + RUNG_GAP + lower.above for upper, lower in pairwise(members))
    depths = list(accumulate(steps, initial=0.0))
    middle = 0.5 * depths[-1]
    nearest = min(depths, key=lambda depth: abs(depth - middle))
    line = nearest if abs(nearest - middle) <= SNAP else middle
    return _ParallelBlock(
        width=max(member.width for member in members) + 2.0 * LEAD,
        above=members[0].above + line,
        below=members[-1].below + depths[-1] - line,
        members=members,
        levels=tuple(line - depth for depth in depths),
    )
