"""Trees: counted against the known sequence, and none twice."""

from itertools import product

import numpy as np
import pytest

from tcplan.trees import assigned_trees, is_mixed, leaves, shape_of, shapes, tree_count


# Number of series-parallel networks with n unlabelled edges: sequence A000084 of the OEIS (from memory).
@pytest.mark.parametrize(("size", "count"), [(1, 1), (2, 2), (3, 4), (4, 10), (5, 24), (6, 66)])
def test_shapes_are_those_of_the_known_sequence(size, count):
    assert len(shapes(size)) == count
    assert len(set(shapes(size))) == count


# Independent prototype: six materials 30 / 220 / 1260 trees of 2 / 3 / 4 legs (at most 3
# materials), twelve 132 /
# 2024 / 12672.
@pytest.mark.parametrize(("materials", "counts"), [(6, (30, 220, 1260)), (12, (132, 2024))])
def test_assignments(materials, counts):
    for size, count in enumerate(counts, start=2):
        trees = assigned_trees(size, materials, 3)
        assert len(trees) == count
        assert len(set(trees)) == count
        assert all(len(leaves(tree)) == size for tree in trees)
        assert all(len(set(leaves(tree))) <= 3 for tree in trees)


def value_of(tree, ohms):
    """Return the resistance when the legs, from left to right, have these values."""
    values = iter(ohms)

    def node(part):
        if isinstance(part, int):
            return next(values)
        parts = [node(child) for child in part[1]]
        return sum(parts) if part[0] == "series" else 1 / sum(1 / p for p in parts)

    return node(tree)


@pytest.mark.parametrize("size", [2, 3, 4, 5])
def test_no_two_shapes_are_the_same_network(size):
    """Each shape reaches a set of values over permuted legs that no other shape reaches."""
    ohms = [1.0, 2.3, 5.1, 11.7, 23.9][:size]
    from itertools import permutations

    seen = {}
    for shape in shapes(size):
        values = tuple(sorted({round(value_of(shape, order), 9) for order in permutations(ohms)}))
        assert values not in seen
        seen[values] = shape


def test_shape_numbers_its_leaves():
    tree = ("series", (4, ("parallel", (2, 4))))
    assert shape_of(tree) == ("series", (0, ("parallel", (1, 2))))
    assert is_mixed(tree)
    assert not is_mixed(("series", (1, 2)))


def test_two_materials_merge_inside_a_node_only():
    trees = assigned_trees(3, 2, 2)
    assert ("series", (0, ("parallel", (0, 1)))) in trees
    assert all(
        len([c for c in tree[1] if isinstance(c, int)]) == len({c for c in tree[1] if isinstance(c, int)})
        for tree in trees
    )
    rng = np.random.default_rng(0)
    assert len(trees) == 4
    for tree, _ in product(trees, range(2)):
        assert value_of(tree, rng.uniform(1, 9, 3)) > 0


@pytest.mark.parametrize("size", [1, 2, 3, 4, 5])
def test_the_count_is_that_of_the_list(size):
    for materials in range(1, 6):
        for most in range(1, 5):
            listed = len(assigned_trees(size, materials, most))
            assert tree_count(size, materials, most) == listed, (materials, most)


def test_many_are_counted_without_a_list():
    """Twelve films: 132, 2024 and 12672 trees of 2, 3 and 4 legs (an independent prototype)."""
    assert [tree_count(size, 12, 3) for size in (2, 3, 4)] == [132, 2024, 12672]
    assert tree_count(6, 300, 300) > 10**15
