"""Proof for mixed networks: no tree of these materials stays within a limit that is asked.

Each tree starts as one cell, its shares anywhere. Over a cell the subtrees are hulls; with the shares of
the top node left free, the goal at a limit U is linear in them, and one vector y >= 0 that is positive
on every (shifted) column proves that no top shares work: the cell is gone. Vectors that worked are tried
on all cells at once, a small game makes a new one where none works, and what is left is cut in two along
its widest share. When no cell is left, no network is within U.

Where legs are limited in size, the top shares are part of the cells too: a cell whose legs can not be
made is gone as well.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from itertools import groupby

import numpy as np

from tcplan.arrays import BoolArray, FloatArray, IntArray
from tcplan.minimax import solve_game
from tcplan.trees import Pair, Tree, leaves, paired, shape_of
from tcplan.verify.hull import Cells, shares_in, top_members
from tcplan.verify.question import Question, columns_of

MARGIN = 1e-12  # floating point without directed rounding
BATCH = 2048
GAMES = 48  # new vectors a batch
OLD = 400  # vectors kept in a bank


# --- what rules a cell out ------------------------------------------------------------------------


def _least_shares(pair: Pair, cells: Cells, ask: Question) -> FloatArray | None:
    """Return the least part of each chosen child of a free top node, shape (cells, children).

    Every leg holds ``min_share`` of the whole, and at most the product of the highest shares on its
    way of its child. The parts are of what a fixed member, the first child, leaves. None where no
    least share is asked.
    """
    if ask.min_share <= 0:
        return None
    chosen = top_members(pair)[1:] if ask.fixed else top_members(pair)
    one, rest = np.ones(len(cells.low)), 1.0 - ask.fixed_share[0]
    return np.stack([_least_share(m, cells, one, ask.min_share) for m in chosen], axis=1) / rest


def _least_share(member: Pair | int, cells: Cells, most: FloatArray, min_share: float) -> FloatArray:
    if isinstance(member, int):
        with np.errstate(divide="ignore"):
            return np.asarray(min_share / most)
    first = most * cells.high[:, member.share]
    second = most * (1.0 - cells.low[:, member.share])
    return np.maximum(
        _least_share(member.first, cells, first, min_share),
        _least_share(member.second, cells, second, min_share),
    )


def _gone(columns: list[FloatArray], least: FloatArray | None, bank: FloatArray) -> BoolArray:
    """Return which cells some vector of the bank rules out, shape (cells,)."""
    worst = np.stack([np.min(c @ bank.T, axis=1) for c in columns], axis=1)
    if least is None:
        ruled: BoolArray = (worst.min(axis=1) > MARGIN).any(axis=1)
        return ruled
    rest = np.maximum(0.0, 1.0 - least.sum(axis=1))
    mixed = np.einsum("cj,cjm->cm", least, worst) + rest[:, None] * worst.min(axis=1)
    by_share: BoolArray = (mixed > MARGIN).any(axis=1)
    return by_share


# --- sizes ----------------------------------------------------------------------------------------


def _legs(
    node: Pair | int, cells: Cells, low: FloatArray, high: FloatArray, most: FloatArray
) -> Iterator[tuple[int, FloatArray, FloatArray, FloatArray]]:
    """Yield each leg with bounds on ln(ohms/total) and an upper bound on ln(share), by cell."""
    if isinstance(node, int):
        yield node, low, high, most
        return
    with np.errstate(divide="ignore"):
        x_low, x_high = np.log(cells.low[:, node.share]), np.log(cells.high[:, node.share])
        y_low, y_high = np.log(1.0 - cells.high[:, node.share]), np.log(1.0 - cells.low[:, node.share])
    for member, least, greatest in ((node.first, x_low, x_high), (node.second, y_low, y_high)):
        down, up = (least, greatest) if node.series else (-greatest, -least)
        yield from _legs(member, cells, low + down, high + up, most + greatest)


def _log_total(cells: Cells, ask: Question) -> tuple[FloatArray, FloatArray]:
    """Return bounds on ln of the total over the value that logarithms are of, by cell."""
    if ask.total == 0:
        return np.zeros(len(cells.low)), np.zeros(len(cells.low))
    with np.errstate(divide="ignore"):
        ends = [ask.total * np.log(end[:, 0]) for end in (cells.low, cells.high)]
    return np.minimum(*ends), np.maximum(*ends)


def _can_be_made(pair: Pair, group: IntArray, cells: Cells, ask: Question) -> BoolArray:
    """Return which cells may hold a network whose legs can be made, shape (cells,)."""
    zero = np.zeros(len(cells.low))
    least, most_total = _log_total(cells, ask)
    fine = np.ones(len(zero), dtype=bool)
    area = np.zeros(len(zero))
    slack = 1e-9
    for leg, low, high, most in _legs(pair, cells, least, most_total, zero):
        kind = group[:, leg]
        fine &= (high >= ask.least_ohms[kind] - slack) & (low <= ask.most_ohms[kind] + slack)
        chosen = kind < len(ask.area) - 1
        if ask.min_share > 0:
            fine &= ~chosen | (most >= np.log(ask.min_share) - slack)
        area += np.where(chosen, ask.area[kind] * np.exp(np.maximum(low, -700.0)), 0.0)
    return fine & (area <= ask.max_area * (1.0 + slack))


# --- cells ----------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Answer:
    """Whether all cells are gone, and how many were looked at."""

    proved: bool
    cells: int


@dataclass(frozen=True, slots=True)
class _Open:
    """Cells of one shape that are still open: the tree, the box of its shares, and that of the centre."""

    tree: IntArray
    low: FloatArray
    high: FloatArray
    centre: FloatArray

    def take(self, where: IntArray | BoolArray | slice) -> _Open:
        return _Open(self.tree[where], self.low[where], self.high[where], self.centre[where])


def _start(count: int, shares: int, ask: Question) -> _Open:
    low, high = np.zeros((count, shares)), np.ones((count, shares))
    if ask.fixed:
        low[:, 0], high[:, 0] = ask.fixed_share
    return _Open(np.arange(count), low, high, np.tile([-ask.reach, ask.reach], (count, 1)))


def _cut(cells: _Open, inner: tuple[int, ...], reach: float) -> _Open:
    """Cut every cell in two along its widest side (a centre counts by its part of the whole)."""
    rows = np.arange(len(cells.tree))
    widths = [cells.high[:, k] - cells.low[:, k] for k in inner]
    if reach > 0:
        widths.append((cells.centre[:, 1] - cells.centre[:, 0]) / (2.0 * reach))
    widest = np.argmax(np.stack(widths), axis=0)
    low2, high1 = cells.low.copy(), cells.high.copy()
    centre1, centre2 = cells.centre.copy(), cells.centre.copy()
    for position, share in enumerate(inner):
        at = rows[widest == position]
        middle = 0.5 * (cells.low[at, share] + cells.high[at, share])
        high1[at, share], low2[at, share] = middle, middle
    at = rows[widest == len(inner)]
    middle = cells.centre[at].mean(axis=1)
    centre1[at, 1], centre2[at, 0] = middle, middle
    return _Open(
        np.concatenate([cells.tree, cells.tree]),
        np.concatenate([cells.low, low2]),
        np.concatenate([high1, cells.high]),
        np.concatenate([centre1, centre2]),
    )


@dataclass(slots=True)
class _Sieve:
    """One shape: its trees, what is asked, and the vectors that worked so far."""

    pair: Pair
    group: IntArray
    ask: Question
    free_top: bool
    bank: list[FloatArray]
    curves: FloatArray = field(init=False)

    def __post_init__(self) -> None:
        self.curves = self.ask.curves.of(self.group)

    def left(self, cells: _Open) -> BoolArray:
        """Return which cells of a batch are left, after the bank and some new vectors."""
        group = self.group[cells.tree]
        legs = tuple(self.curves[cells.tree, leg] for leg in range(group.shape[1]))
        boxes = Cells(legs, cells.low, cells.high)
        left = np.ones(len(group), dtype=bool)
        if not self.free_top:
            left &= _can_be_made(self.pair, group, boxes, self.ask)
        columns = columns_of(self.pair, boxes, self.ask, cells.centre, free_top=self.free_top)
        least = _least_shares(self.pair, boxes, self.ask) if self.free_top else None
        if least is not None:
            left &= least.sum(axis=1) <= 1.0 + 1e-12
        if self.bank:
            self._sift(left, columns, least, np.stack(self.bank))
        for _ in range(GAMES):
            at = np.nonzero(left)[0]
            if not len(at):
                break
            chosen = at[len(at) // 2]
            game = solve_game(np.concatenate([c[chosen] for c in columns]).T)
            if game.lower <= MARGIN:
                break
            self.bank.append(game.rows)
            del self.bank[:-OLD]
            left[chosen] = False
            self._sift(left, columns, least, game.rows[None, :])
        return left

    def _sift(
        self, left: BoolArray, columns: list[FloatArray], least: FloatArray | None, rows: FloatArray
    ) -> None:
        """Strike out of ``left``, in place, the cells that some of the rows rule out."""
        at = np.nonzero(left)[0]
        if len(at):
            left[at] = ~_gone([c[at] for c in columns], None if least is None else least[at], rows)


def none_within(
    trees: Sequence[Tree],
    ask: Question,
    bank: dict[str, list[FloatArray]],
    *,
    free_top: bool = True,
    most_cells: int,
) -> Answer:
    """Return whether every tree is ruled out.

    Parameters
    ----------
    trees : sequence of Tree
        Of two legs at least; leaves are positions among the rows of ``ask.ratios``.
    ask : Question
    bank : dict
        Vectors that worked, by kind of column; they grow.
    free_top : bool
        Whether the shares of the top node are left free, which makes far fewer cells; sizes are
        looked at only when they are not.
    most_cells : int
        After so many cells the answer is "not proved".
    """
    ordered = sorted(trees, key=lambda tree: (repr(shape_of(tree)), repr(tree)))
    count = 0
    for shape, members in groupby(ordered, key=shape_of):
        pair = paired(shape)
        if isinstance(pair, int):
            continue
        group = np.array([leaves(tree) for tree in members])
        own = shares_in(pair)
        given = {0} if ask.fixed and (free_top or ask.fixed_share[0] == ask.fixed_share[1]) else set()
        within = [k for m in top_members(pair) for k in shares_in(m)] if free_top else own
        inner = tuple(k for k in within if k not in given)
        kind = ("series" if pair.series else "parallel") if free_top else "whole"
        sieve = _Sieve(pair, group, ask, free_top, bank.setdefault(kind, []))
        cells = _start(len(group), len(own), ask)
        while len(cells.tree):
            count += len(cells.tree)
            if count > most_cells:
                return Answer(False, count)
            steps = range(0, len(cells.tree), BATCH)
            left = np.concatenate([sieve.left(cells.take(slice(k, k + BATCH))) for k in steps])
            if left.any() and not inner and ask.reach == 0:
                return Answer(False, count)
            cells = cells.take(left)
            if len(cells.tree):
                cells = _cut(cells, inner, ask.reach)
    return Answer(True, count)
