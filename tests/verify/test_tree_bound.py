"""Proof for mixed networks: what is ruled out is not there, and what is there is not ruled out."""

import numpy as np
import pytest
from makers import grid, leg, need_of, over, random_films, six_films
from scipy.optimize import minimize

from tcplan.goal import Limit, Window
from tcplan.plan import Sizes, Space
from tcplan.search.mixed_search import mixed_proposals
from tcplan.trees import assigned_trees, is_mixed, leaves
from tcplan.verify.option import Case, nominal_figure
from tcplan.verify.tree_bound import MixedBound, mixed_bound, none_within, question, space_trees

INF = float("inf")
T = grid(count=96)  # 2 K apart, the reference and the edges of the mask among them
MASK = Limit(
    kind="mask",
    value=0.001,
    windows=(Window(low=273.15, high=343.15, limit=0.001), Window(low=233.15, high=423.15, limit=0.004)),
)
GOALS = {
    "drift": Limit(kind="drift", value=0.005),
    "band": Limit(kind="band", value=0.005),
    "chord": Limit(kind="chord_tcr", value=10e-6),
    "mask": MASK,
}


def space(names, most=3, legs=3, min_share=0.0, **more):
    return Space(
        arrangement="mixed",
        materials=tuple(names),
        most=most,
        min_share=min_share,
        legs=legs,
        ohms=1000.0,
        **more,
    )


# --- networks by hand: shares from any numbers, one node at a time ----------------------------


def evaluated(tree, numbers, laws, top=None):
    """Return ratio (points, T), and share and value of every leg over those of the whole.

    The shares of a node are in the ratios exp(number) of its children, the first of them 1; ``top``
    is the given share of the first child of the top node.
    """
    if isinstance(tree, int):
        one = np.ones((1, 1))
        return laws[tree][None, :], [one], [one]
    kind, children = tree
    parts = [np.ones((1, 1)), *(np.exp(next(numbers))[:, None] for _ in children[1:])]
    if top is None:
        whole = sum(parts)
    else:
        whole = sum(parts[1:]) / (1.0 - top)
        parts[0] = top * whole
    parts = [part / whole for part in parts]
    below = [evaluated(child, numbers, laws) for child in children]
    if kind == "series":
        ratio = sum(p * curve for p, (curve, _, _) in zip(parts, below, strict=True))
    else:
        ratio = 1.0 / sum(p / curve for p, (curve, _, _) in zip(parts, below, strict=True))
    share = [p * s for p, (_, own, _) in zip(parts, below, strict=True) for s in own]
    ohms = [
        (p if kind == "series" else 1.0 / p) * v for p, (_, _, own) in zip(parts, below, strict=True) for v in own
    ]
    return ratio, share, ohms


def figure_by_hand(kind, drift):
    """Return each goal from its own definition, for drifts of shape (points, T)."""
    if kind == "band":
        return np.ptp(drift, axis=1)
    if kind == "chord":
        return np.maximum(np.abs(drift[:, 0]) / 65.0, np.abs(drift[:, -1]) / 125.0) * 125.0
    if kind == "mask":
        inner = (T >= 273.15) & (T <= 343.15)
        return np.maximum(np.max(np.abs(drift[:, inner]), axis=1), np.max(np.abs(drift), axis=1) / 4.0)
    return np.max(np.abs(drift), axis=1)


def costs(tree, numbers, of, kind, laws):
    """Return the figures of some points of a tree, large where a leg breaks a limit."""
    top = of.fixed_share[0] if of.fixed else None
    ratio, share, ohms = evaluated(tree, iter(numbers), laws, top)
    cost = figure_by_hand(kind, ratio - 1.0)
    broken, area = np.zeros(len(cost)), 0.0
    for k, s, v in zip(leaves(tree), share, ohms, strict=True):
        if k == len(of.materials):
            continue
        if of.min_share > 0:
            broken = np.maximum(broken, (of.min_share / s - 1.0)[:, 0])
        if of.sizes is not None:
            least, most = of.sizes.least_ohms[k] / of.ohms, of.sizes.most_ohms[k] / of.ohms
            broken = np.maximum(broken, np.maximum(least / v - 1.0, v / most - 1.0)[:, 0])
            area = area + of.sizes.area_per_ohm[k] * of.ohms * v[:, 0]
    if of.sizes is not None:
        broken = np.maximum(broken, area / of.sizes.max_area - 1.0)
    return cost + np.where(broken > 1e-9, 0.1 + broken, 0.0)


def best_by_hand(trees, of, kind, laws, polished=4):
    """Return the least figure: random points of every tree, the best of them by Nelder-Mead."""
    rng, starts = np.random.default_rng(0), []
    for tree in trees:
        count = len(leaves(tree)) - 1 + sum(1 for _ in nodes(tree)) * 0
        numbers = rng.normal(0.0, 1.7, (count, 1500))
        found = costs(tree, numbers, of, kind, laws)
        at = int(np.argmin(found))
        starts.append((float(found[at]), repr(tree), tree, numbers[:, at]))
    best = INF
    for figure, _, tree, z in sorted(starts, key=lambda row: row[:2])[:polished]:

        def cost(z, tree=tree):
            return float(costs(tree, z[:, None], of, kind, laws)[0])

        for size in (0.5, 0.05):
            corners = np.vstack([z, z + size * np.eye(len(z))])
            options = {"initial_simplex": corners, "maxfev": 250, "xatol": 1e-9, "fatol": 1e-13}
            result = minimize(cost, z, method="Nelder-Mead", options=options)
            z, figure = result.x, min(figure, float(result.fun))
        best = min(best, figure)
    return best


def nodes(tree):
    if not isinstance(tree, int):
        yield tree
        for child in tree[1]:
            yield from nodes(child)
