"""Ratios of times from one run, for the worst case: design, certified evaluation, mixed search.

Run it by hand: ``python tests/benchmarks/worst_case_bench.py``; it needs cvxpy, a general-purpose modelling
library, which nothing else here does. It prints ratios and asserts nothing: a shared machine is noisy.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np

ROOT = Path(__file__).parents[2]
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]


def bisection_by_cvxpy(films: dict, T: np.ndarray, steps: int = 24) -> tuple[float, float]:
    """Return the time of the textbook bisection in cvxpy, and the worst case it ends at (a fraction).

    For a fixed e the robust condition is linear in the shares: sum w h(z) <= 0 with h(z) = z + D |z|.
    24 halvings of 0.1 are 1e-6 of the worst case here.
    """
    import cvxpy

    x = T - 298.15
    r = np.stack([m.ratio(T, 298.15) for m in films.values()])
    u = np.stack([m.spread.tc1 * np.abs(x) for m in films.values()])
    half = np.array([m.spread.value for m in films.values()])[:, None]
    start = time.perf_counter()
    w = cvxpy.Variable(len(films), nonneg=True)
    up, down = (cvxpy.Parameter((len(T), len(films))) for _ in range(2))
    slack = cvxpy.Variable()
    problem = cvxpy.Problem(cvxpy.Minimize(slack), [cvxpy.sum(w) == 1, up @ w <= slack, down @ w <= slack])
    low, high = 0.0, 0.1
    for _ in range(steps):
        e = 0.5 * (low + high)
        above, below = r + u - 1.0 - e, 1.0 - e - (r - u)
        up.value, down.value = (above + half * np.abs(above)).T, (below + half * np.abs(below)).T
        problem.solve(solver=cvxpy.HIGHS)
        low, high = (low, e) if slack.value <= 1e-12 else (e, high)
    return time.perf_counter() - start, high


def series_design() -> None:
    from makers import by_name, film, grid, need_of

    from tcplan.plan import Space
    from tcplan.process import Variation
    from tcplan.search.linear import search_space
    from tcplan.verify.bound import arrangement_bound
    from tcplan.worst.evaluation import worst_case

    rng = np.random.default_rng(40)
    films = by_name(
        *(
            film(
                f"m{k:02d}",
                float(rng.uniform(-1500, 3000)),
                float(rng.uniform(0.2, 4.0)),
                value_percent=float(rng.uniform(5, 20)),
                tc1_spread_ppm=float(rng.uniform(20, 80)),
            )
            for k in range(40)
        )
    )
    variation, need = Variation(spreads={n: m.spread for n, m in films.items()}), need_of()
    space = Space(arrangement="series", materials=tuple(films), most=40, min_share=0.0, ohms=1.0, legs=40)
    times, again = [], []
    for _ in range(5):
        start = time.perf_counter()
        best = search_space(space, need, films, 1, variation)[0]
        times.append(time.perf_counter() - start)
        reached = worst_case(best.network, films, variation.spreads, need).judged.figure
        bound = arrangement_bound(best.space, best.certificate, need, films, reached, variation)
        again.append(time.perf_counter() - start)
    slow, other = bisection_by_cvxpy(films, grid(count=65))
    print(
        f"worst-case series optimum of 40 films: {reached * 1e6:.6g} ppm, proved from {bound * 1e6:.6g}, "
        f"{min(times) * 1e3:.1f} ms, {min(again) * 1e3:.1f} ms with its check; "
        f"cvxpy {other * 1e6:.6g} ppm on 65 temperatures, {slow * 1e3:.0f} ms"
    )
    print(f"bisection in cvxpy / ours: {slow / min(times):.1f} (limit 10)")
    print(f"the same with our check included: {slow / min(again):.1f}")
    print(f"relative difference of the two: {abs(other / reached - 1):.1e} (limit 1e-6)")


def certified() -> None:
    from makers import need_of, random_films, random_tree

    from tcplan.network import arrangement
    from tcplan.worst.evaluation import worst_case

    need, times = need_of(), []
    for seed in range(40):
        rng = np.random.default_rng(seed)
        count = int(rng.integers(2, 5))
        films = random_films(seed, count)
        network = random_tree(rng, tuple(films), int(rng.integers(3, 6)))
        if arrangement(network) != "mixed":
            continue
        spreads = {n: m.spread for n, m in films.items()}
        start = time.perf_counter()
        worst_case(network, films, spreads, need)
        times.append(time.perf_counter() - start)
    print(
        f"certified worst case of {len(times)} mixed networks of 2-4 films: "
        f"median {np.median(times) * 1e3:.0f} ms, most {max(times) * 1e3:.0f} ms (limit 50)"
    )


def mixed_design() -> None:
    from makers import need_of, six_films

    from tcplan.plan import Space
    from tcplan.process import Variation
    from tcplan.search.mixed_search import mixed_proposals
    from tcplan.verify.tree_bound import mixed_bound
    from tcplan.worst.evaluation import worst_case

    films, need = six_films(), need_of()
    variation = Variation(spreads={n: m.spread for n, m in films.items()})
    space = Space(
        arrangement="mixed", materials=tuple(sorted(films)), most=3, min_share=0.0, legs=4, ohms=1.0
    )
    start = time.perf_counter()
    found = mixed_proposals(space, need, films, 3, None, variation)
    worst = [worst_case(p.network, films, variation.spreads, need) for p in found]
    searched = time.perf_counter()
    best = min(w.judged.figure for w in worst)
    devices = [(w.judged.at, w.device.factors) for w in sorted(worst, key=lambda w: w.judged.figure)[:4]]
    bound = mixed_bound(space, need, films, [], best, 0.01, variation, devices)
    print(
        f"worst-case mixed search, six films, 4 legs, 3 materials: {best * 1e6:.5g} ppm, "
        f"{searched - start:.1f} s (limit 60); proved to {100 * (1 - bound / best):.2g} % "
        f"in {time.perf_counter() - searched:.1f} s more"
    )


if __name__ == "__main__":
    series_design()
    certified()
    mixed_design()
