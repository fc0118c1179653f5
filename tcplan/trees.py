"""Every distinct series/parallel tree of some materials, and none of them twice.

A tree is a material's position, or ``(kind, children)`` with kind ``"series"`` or ``"parallel"``. Kinds
alternate from level to level, and children are sorted, so that each tree has one form only. Two
legs of one material in one node are one leg, so a node holds each material at most once.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from math import comb
from typing import TypeAlias

Tree: TypeAlias = int | tuple[str, tuple["Tree", ...]]
SERIES, PARALLEL = "series", "parallel"


def opposite(kind: str) -> str:
    """Return the other kind of node."""
    return PARALLEL if kind == SERIES else SERIES


def leaves(tree: Tree) -> tuple[int, ...]:
    """Return the materials of the legs from left to right."""
    if isinstance(tree, int):
        return (tree,)
    return tuple(leaf for child in tree[1] for leaf in leaves(child))


def _partitions(total: int, largest: int) -> Iterator[tuple[int, ...]]:
    """Yield the ways to write a number as a sum of parts, largest first."""
    if total == 0:
        yield ()
        return
    for part in range(min(total, largest), 0, -1):
        for rest in _partitions(total - part, part):
            yield (part, *rest)


def _order(tree: Tree) -> tuple[int, str]:
    """Return a key that sorts trees: legs first, then by form."""
    return len(leaves(tree)), repr(tree)


def _multisets(pool: tuple[Tree, ...], count: int, start: int = 0) -> Iterator[tuple[Tree, ...]]:
    """Yield sorted choices of ``count`` members of a pool, each as often as wanted."""
    if count == 0:
        yield ()
        return
    for k in range(start, len(pool)):
        for rest in _multisets(pool, count - 1, k):
            yield (pool[k], *rest)


def _sets(pool: tuple[Tree, ...], count: int, start: int = 0) -> Iterator[tuple[Tree, ...]]:
    """Yield sorted choices of ``count`` different members of a pool."""
    if count == 0:
        yield ()
        return
    for k in range(start, len(pool)):
        for rest in _sets(pool, count - 1, k + 1):
            yield (pool[k], *rest)


@lru_cache(maxsize=256)
def _nodes(kind: str, size: int, materials: int, most: int, merging: bool) -> tuple[Tree, ...]:
    """Return every node of a kind with ``size`` legs of at most ``most`` materials."""
    found: list[Tree] = []
    for parts in _partitions(size, size - 1):
        groups = [(part, parts.count(part)) for part in sorted(set(parts))]
        for children in _children(kind, groups, materials, most, merging):
            if len(set(leaves((kind, children)))) <= most:
                found.append((kind, tuple(sorted(children, key=_order))))
    return tuple(found)


def _children(
    kind: str, groups: list[tuple[int, int]], materials: int, most: int, merging: bool
) -> Iterator[tuple[Tree, ...]]:
    """Yield the children of a node: ``count`` members of each size of the groups."""
    if not groups:
        yield ()
        return
    (size, count), *rest = groups
    if size == 1:
        pool: tuple[Tree, ...] = tuple(range(materials))
        choices = _sets(pool, count) if merging else _multisets(pool, count)
    else:
        choices = _multisets(_nodes(opposite(kind), size, materials, most, merging), count)
    for chosen in choices:
        for others in _children(kind, rest, materials, most, merging):
            yield (*chosen, *others)


def shapes(size: int) -> tuple[Tree, ...]:
    """Return the distinct trees of ``size`` equal legs: 1, 2, 4, 10, 24, 66 of them."""
    if size == 1:
        return (0,)
    return (*_nodes(SERIES, size, 1, 1, False), *_nodes(PARALLEL, size, 1, 1, False))


def assigned_trees(size: int, materials: int, most: int) -> tuple[Tree, ...]:
    """Return the distinct trees of ``size`` legs over some materials, at most ``most`` of them in each.

    Parameters
    ----------
    size : int
        Number of legs.
    materials : int
        Number of materials on offer; a leaf is a position 0 .. materials - 1.
    most : int
        Number of different materials in one tree at most.
    """
    if size == 1:
        return tuple(range(materials))
    return (
        *_nodes(SERIES, size, materials, most, True),
        *_nodes(PARALLEL, size, materials, most, True),
    )


def with_fixed(tree: Tree, kind: str, fixed: int) -> Tree:
    """Return a tree with the fixed members (a leaf) as first child of a top node of a kind."""
    if not isinstance(tree, int) and tree[0] == kind:
        return kind, (fixed, *tree[1])
    return kind, (fixed, tree)


def tree_count(size: int, materials: int, most: int) -> int:
    """Return the number of trees of ``size`` legs of at most ``most`` materials, without listing them."""
    # With j materials each in use: all trees of j materials, less those of fewer (inclusion, exclusion).
    total = 0
    for j in range(1, min(most, size, materials) + 1):
        in_use = sum((-1) ** (j - i) * comb(j, i) * _trees_of(size, i) for i in range(1, j + 1))
        total += comb(materials, j) * in_use
    return total


def _trees_of(size: int, materials: int) -> int:
    """Return the number of trees of ``size`` legs of any of the materials.

    A series node is a set of materials and a multiset of parallel nodes: its generating function is
    (1 + x)^m times the product of (1 - x^n)^-P(n), with P(n) the parallel nodes of n legs, of which there
    are as many as series nodes.
    """
    if size == 1:
        return materials
    series = [comb(materials, n) for n in range(size + 1)]
    for legs in range(2, size):
        nodes = series[legs]  # no later factor changes it
        times = [_multisets_of(nodes, n // legs) if n % legs == 0 else 0 for n in range(size + 1)]
        series = [sum(series[n - k] * times[k] for k in range(n + 1)) for n in range(size + 1)]
    return 2 * series[size]


def _multisets_of(kinds: int, count: int) -> int:
    """Return in how many ways ``count`` things are chosen of some kinds, each as often as wanted."""
    return 1 if count == 0 else comb(kinds + count - 1, count) if kinds else 0


def is_mixed(tree: Tree) -> bool:
    """Whether a tree has a node inside a node."""
    return not isinstance(tree, int) and any(not isinstance(child, int) for child in tree[1])


def shape_of(tree: Tree) -> Tree:
    """Return the tree with its leaves numbered from left to right: what its assignments share."""
    count = 0

    def numbered(node: Tree) -> Tree:
        nonlocal count
        if isinstance(node, int):
            count += 1
            return count - 1
        return node[0], tuple(numbered(child) for child in node[1])

    return numbered(tree)


@dataclass(frozen=True, slots=True)
class Pair:
    """Two members and the position of the share of the first."""

    series: bool
    share: int
    first: Pair | int
    second: Pair | int


def paired(shape: Tree) -> Pair | int:
    """Return a shape (leaves numbered from the left) as nested pairs; shares numbered from the root."""
    count = 0

    def node(tree: Tree) -> Pair | int:
        nonlocal count
        if isinstance(tree, int):
            return tree
        kind, children = tree
        return nested(kind == SERIES, list(children))

    def nested(series: bool, children: list[Tree]) -> Pair | int:
        nonlocal count
        if len(children) == 1:
            return node(children[0])
        mine, count = count, count + 1
        first = node(children[0])
        return Pair(series, mine, first, nested(series, children[1:]))

    return node(shape)
