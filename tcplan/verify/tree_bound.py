"""Proof for mixed networks: no tree of these materials stays within a limit that is asked.

Each tree starts as one cell, its inner shares anywhere; the shares of its top node are free. Over a
cell the children of the top node are hulls, the goal at a limit U is linear in the top shares, and one
vector y >= 0 that is positive on every (shifted) column proves that no top shares work: the cell is gone.
Vectors that worked are tried on all cells at once, a small game makes a new one where none works, and
what is left is cut in two along its widest share. When no cell is left, no network is within U.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import groupby

import numpy as np

from tcplan.arrays import FloatArray, IntArray
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.minimax import solve_game
from tcplan.trees import Pair, Tree, leaves, paired, shape_of
from tcplan.verify.hull import Cells, hull_of, shares_in, top_members

NODES = 17  # temperatures a piece
MARGIN = 1e-12  # floating point without directed rounding
BATCH = 2048
GAMES = 48  # new vectors a batch
OLD = 400  # vectors kept in a bank
EDGE = 0.0


@dataclass(frozen=True, slots=True)
class Question:
    """The goal at a limit, on nodes: is any network within it?"""

    T: FloatArray
    high: FloatArray
    low: FloatArray
    free: FloatArray
    ratios: FloatArray
    reach: float
    min_share: float


def question(
    need: Requirement,
    materials: Mapping[str, Material],
    names: Sequence[str],
    limit: float,
    min_share: float,
    more: Sequence[float] = (),
) -> Question:
    """Return the question whether a network is within ``limit`` (a figure, as a fraction).

    ``more`` are temperatures [K] that join the nodes.
    """
    T, weight, free = [], [], []
    z = np.cos(np.pi * np.arange(NODES) / (NODES - 1))
    for piece in need.pieces:
        points = 0.5 * (piece.low + piece.high) - 0.5 * (piece.high - piece.low) * z
        inside = [t for t in more if piece.low <= t <= piece.high]
        points = np.unique(np.clip(np.r_[points, inside], piece.low, piece.high))
        T.append(points)
        weight.append(np.full(len(points), piece.weight))
        free.append(np.full(len(points), 1.0 if piece.centred else 0.0))
    at, w, f = np.concatenate(T), np.concatenate(weight), np.concatenate(free)
    wanted = need.wanted(at)
    reach = next((p.weight * limit for p in need.pieces if p.centred), 0.0)
    ratios = np.stack([materials[name].ratio(at, need.reference) for name in names])
    return Question(at, wanted + limit * w, wanted - limit * w, f, ratios, reach, min_share)


@dataclass(slots=True)
class Bank:
    """Vectors that proved something, newest last; each of shape (2 nodes,)."""

    rows: list[FloatArray] = field(default_factory=list)

    def add(self, y: FloatArray) -> None:
        """Keep a vector; the oldest goes when there are many."""
        self.rows.append(y)
        del self.rows[:-OLD]


@dataclass(frozen=True, slots=True)
class Answer:
    """Whether all cells are gone, and how many were looked at."""

    proved: bool
    cells: int


def _columns(pair: Pair, cells: Cells, ask: Question, centre: FloatArray) -> list[FloatArray]:
    """Return for each child of the top node its columns, shape (cells, vertices, 2 nodes).

    A column is by how much a child alone is outside the goal at each node, at least: above it in
    the first half, below it in the second. ``centre`` holds the cells' bounds on the centre of a band.
    """
    found = []
    high = ask.high + centre[:, 1:2] * ask.free
    low = ask.low + centre[:, 0:1] * ask.free
    for member in top_members(pair):
        hull = hull_of(member, cells, conductance=not pair.series)
        lowest = hull.vertices - hull.below[:, None, :]
        highest = hull.vertices + hull.above[:, None, :]
        if pair.series:
            above, below = lowest - high[:, None, :], low[:, None, :] - highest
        else:
            above = 1.0 - high[:, None, :] * highest
            below = np.where(low[:, None, :] > 0, low[:, None, :] * lowest - 1.0, -1.0)
        found.append(np.nan_to_num(np.concatenate([above, below], axis=2), posinf=-1e6, neginf=-1e6))
    return found


def _least_shares(pair: Pair, cells: Cells, ask: Question) -> FloatArray:
    """Return the least share of each child of the top node, shape (cells, children).

    Every leg holds ``min_share`` of the whole, and at most the product of the highest shares on its
    way of its child.
    """
    found = []
    for member in top_members(pair):
        found.append(_least_share(member, cells, np.ones(len(cells.low)), ask.min_share))
    return np.stack(found, axis=1)


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


def _gone(columns: list[FloatArray], least: FloatArray | None, bank: FloatArray) -> FloatArray:
    """Return which cells some vector of the bank rules out, shape (cells,)."""
    worst = np.stack([np.min(c @ bank.T, axis=1) for c in columns], axis=1)
    if least is None:
        value = worst.min(axis=1)
    else:
        rest = np.maximum(0.0, 1.0 - least.sum(axis=1))
        value = np.einsum("cj,cjm->cm", least, worst) + rest[:, None] * worst.min(axis=1)
    return np.asarray((value > MARGIN).any(axis=1))


@dataclass(slots=True)
class _Open:
    """Cells of one shape that are still open."""

    tree: IntArray
    low: FloatArray
    high: FloatArray
    centre: FloatArray


def _start(count: int, shares: int, ask: Question) -> _Open:
    centre = np.tile([-ask.reach, ask.reach], (count, 1))
    return _Open(
        np.arange(count), np.full((count, shares), EDGE), np.full((count, shares), 1.0 - EDGE), centre
    )


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


def _sift(pair: Pair, group: IntArray, cells: _Open, ask: Question, bank: Bank) -> FloatArray:
    """Return which of a batch of cells are left, after the bank and some new vectors."""
    legs = tuple(ask.ratios[group[cells.tree, leg]] for leg in range(group.shape[1]))
    boxes = Cells(legs, cells.low, cells.high)
    columns = _columns(pair, boxes, ask, cells.centre)
    least = _least_shares(pair, boxes, ask) if ask.min_share > 0 else None
    left = np.ones(len(cells.tree), dtype=bool)
    if least is not None:
        left &= least.sum(axis=1) <= 1.0 + 1e-12
    if bank.rows:
        at = np.nonzero(left)[0]
        left[at] = ~_gone([c[at] for c in columns], None if least is None else least[at], np.stack(bank.rows))
    for _ in range(GAMES):
        at = np.nonzero(left)[0]
        if not len(at):
            break
        chosen = at[len(at) // 2]
        payoff = np.concatenate([c[chosen] for c in columns]).T
        game = solve_game(payoff)
        left[chosen] = False
        if game.lower <= MARGIN:
            cells_left = left.copy()
            cells_left[chosen] = True
            left = cells_left
            break
        bank.add(game.rows)
        at = np.nonzero(left)[0]
        if len(at):
            left[at] = ~_gone([c[at] for c in columns], None if least is None else least[at], game.rows[None, :])
    return left


def none_within(
    trees: Sequence[Tree], ask: Question, bank: dict[bool, Bank], most_cells: int
) -> Answer:
    """Return whether every tree is ruled out.

    Parameters
    ----------
    trees : sequence of Tree
        Of two legs at least; leaves are positions among the materials of the question.
    ask : Question
    bank : dict of bool to Bank
        Vectors for a series top (True) and a parallel top; they grow.
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
        inner = tuple(k for member in top_members(pair) for k in shares_in(member))
        cells = _start(len(group), len(own), ask)
        while len(cells.tree):
            count += len(cells.tree)
            if count > most_cells:
                return Answer(False, count)
            kept = []
            for k in range(0, len(cells.tree), BATCH):
                part = _Open(*(side[k : k + BATCH] for side in (cells.tree, cells.low, cells.high, cells.centre)))
                kept.append(_sift(pair, group, part, ask, bank.setdefault(pair.series, Bank())))
            left = np.concatenate(kept)
            if not left.any():
                break
            if not inner and ask.reach == 0:
                return Answer(False, count)
            cells = _cut(
                _Open(cells.tree[left], cells.low[left], cells.high[left], cells.centre[left]), inner, ask.reach
            )
    return Answer(True, count)
