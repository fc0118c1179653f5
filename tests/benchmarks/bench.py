"""Ratios of times from one run: start-up, the whole command, and the search against a general optimiser.

Run it by hand: ``python tests/benchmarks/bench.py``. It prints ratios and asserts nothing, since a
shared machine is noisy; each time is the least of several runs.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from dataclasses import replace
from pathlib import Path

import numpy as np

ROOT = Path(__file__).parents[2]
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]
IMPORTS = "import numpy, scipy.optimize, sympy, matplotlib.figure, pint, pydantic, jinja2"
CAP_SECONDS = 60.0


def least_seconds(command: list[str], runs: int = 5) -> float:
    """Return the least wall time of a command over some runs, after one that warms the caches."""
    times = []
    for _ in range(runs + 1):
        start = time.perf_counter()
        subprocess.run(command, cwd=ROOT, check=True, capture_output=True)
        times.append(time.perf_counter() - start)
    return min(times[1:])


def start_up() -> None:
    python = sys.executable
    click = least_seconds([python, "-c", "import click"])
    version = least_seconds([python, "-m", "tcplan", "--version"])
    print(f"tcplan --version / import click: {version / click:.2f} (limit 3)")
    imports = least_seconds([python, "-c", IMPORTS])
    with tempfile.TemporaryDirectory() as folder:
        command = [python, "-m", "tcplan", "plan", "examples/brake_sensor_films/brief.toml"]
        whole = least_seconds([*command, "-o", folder, "--force"])
    print(f"tcplan plan, figures included / the imports alone: {whole / imports:.2f} (limit 2)")


def differential_evolution_seconds(kind: str, ratios: np.ndarray, optimum: float) -> tuple[float, float]:
    """Return the time that scipy needs to come within 1 % of the optimum, and what it reached."""
    from scipy.optimize import differential_evolution

    inverse = 1.0 / ratios
    start = time.perf_counter()

    def peak(z: np.ndarray) -> float:
        mix = z / z.sum() if z.sum() > 0 else np.full(len(z), 1 / len(z))
        ratio = mix @ ratios if kind == "series" else 1.0 / (mix @ inverse)
        return float(np.max(np.abs(ratio - 1.0)))

    def stop(intermediate_result: object) -> bool:
        reached = intermediate_result.fun  # type: ignore[attr-defined]
        return bool(reached <= 1.01 * optimum or time.perf_counter() - start > CAP_SECONDS)

    result = differential_evolution(
        peak, [(0.0, 1.0)] * len(ratios), seed=1, maxiter=10**6, tol=0, polish=False, callback=stop
    )
    return time.perf_counter() - start, float(result.fun)


def search() -> None:
    from makers import by_name, film, grid, need_of, over

    from tcplan.plan import Space
    from tcplan.search.linear import search_space
    from tcplan.verify.option import Case, check

    rng = np.random.default_rng(40)
    films = by_name(
        *(film(f"m{k:02d}", float(rng.uniform(-1500, 3000)), float(rng.uniform(0.2, 4.0))) for k in range(40))
    )
    need = need_of()
    case = Case(materials=films, spreads={}, over=over(), need=need)
    ratios = np.array([m.ratio(grid(count=201), 298.15) for m in films.values()])
    for kind in ("series", "parallel"):
        for most in (40, 3):
            space = Space(arrangement=kind, materials=tuple(films), most=most, min_share=0.0)  # type: ignore[arg-type]
            times = []
            for _ in range(3):
                start = time.perf_counter()
                option = check(search_space(replace(space, ohms=1.0), need, films, 1)[0], case, "x")
                times.append(time.perf_counter() - start)
            ours = min(times)
            proof = option.proof
            print(
                f"{kind}, {most} of 40: {proof.figure_ppm:.4g} ppm, {proof.kind}, "
                f"gap {proof.gap_ppm:.1e} ppm, {ours * 1e3:.1f} ms with its proof"
            )
            if most == 40:
                slow, reached = differential_evolution_seconds(kind, ratios, proof.figure_ppm * 1e-6)
                print(
                    f"{kind}: differential_evolution / ours: {slow / ours:.0f} (limit 50); "
                    f"it reached {reached * 1e6:.4g} ppm in {slow:.1f} s"
                )


def slsqp_seconds(trees: list, films: dict, need: object, starts: int = 8) -> tuple[float, float]:
    """Return the time of SLSQP in epigraph form with random starts, and the best figure [ppm]."""
    from makers import grid as temperatures
    from scipy.optimize import minimize

    from tcplan.search.curves import ratio
    from tcplan.trees import leaves, paired, shape_of

    T = temperatures(count=41)
    names = sorted(films)
    ratios = [films[name].ratio(T, 298.15) for name in names]
    rng = np.random.default_rng(3)
    best, begin = np.inf, time.perf_counter()
    for tree in trees:
        pair, own = paired(shape_of(tree)), [ratios[leaf] for leaf in leaves(tree)]
        shares = len(own) - 1

        def drift(z: np.ndarray, pair: object = pair, own: list = own) -> np.ndarray:
            return ratio(pair, own, list(z[:-1])) - 1.0  # type: ignore[arg-type]

        sides = [
            {"type": "ineq", "fun": lambda z, d=drift: z[-1] - d(z)},
            {"type": "ineq", "fun": lambda z, d=drift: z[-1] + d(z)},
        ]
        for _ in range(starts):
            start = np.r_[rng.uniform(0.05, 0.95, shares), 0.1]
            bounds = [(1e-6, 1 - 1e-6)] * shares + [(0.0, None)]
            found = minimize(
                lambda z: z[-1],
                start,
                method="SLSQP",
                bounds=bounds,
                constraints=sides,
                options={"maxiter": 60},
            )
            if found.success:
                best = min(best, float(np.max(np.abs(drift(found.x)))) * 1e6)
    return time.perf_counter() - begin, best


def mixed() -> None:
    import resource

    from makers import curved_films, need_of, over, random_films, six_films

    from tcplan.effort import Effort
    from tcplan.plan import Space
    from tcplan.search.mixed_search import mixed_proposals, mixed_trees
    from tcplan.verify.option import Case, nominal_figure
    from tcplan.verify.tree_bound import mixed_bound
    from tcplan.workflow.executors import executor_for

    need = need_of()

    def timed(films: dict, legs: int, most: int, proof: bool = True, effort: Effort | None = None) -> float:
        names = tuple(sorted(films))
        space = Space(arrangement="mixed", materials=names, most=most, min_share=0.0, legs=legs, ohms=1e4)
        case = Case(materials=films, spreads={}, over=over(), need=need)
        start = time.perf_counter()
        found = mixed_proposals(space, need, films, 3, effort)
        ranked = sorted(found, key=lambda p: nominal_figure(p.network, case))
        best = nominal_figure(ranked[0].network, case)
        bound = mixed_bound(space, need, films, [p.network for p in ranked[:4]], best, 0.01) if proof else 0.0
        spent = time.perf_counter() - start
        gap = f"proved to {100 * (1 - bound / best):.2g} %" if proof else "search alone"
        print(
            f"{len(names)} films, {legs} legs, {most} materials: {best * 1e6:.5g} ppm, {gap}, {spent:.2f} s"
        )
        return spent

    six = six_films()
    ours = timed(six, 4, 3)
    space = Space(arrangement="mixed", materials=tuple(sorted(six)), most=3, min_share=0.0, legs=4, ohms=1e4)
    trees = list(mixed_trees(space))
    part = trees[:: max(1, len(trees) // 48)]
    slow, reached = slsqp_seconds(part, six, need)
    whole = slow * len(trees) / len(part)
    print(
        f"SLSQP, 8 starts, {len(part)} of {len(trees)} candidates in {slow:.1f} s: all of them / ours, proof "
        f"included: {whole / ours:.0f} (limit 50); its best of these {reached:.5g} ppm"
    )
    more = curved_films(1, 6)
    counts = (6, 8, 12)
    times = [timed({**six, **dict(list(more.items())[: count - 6])}, 4, 3) for count in counts]
    slope = np.polyfit(np.log(counts), np.log(times), 1)[0]
    print(f"time against films, 4 legs: log-log slope {slope:.2f}; twelve films limit 30 s")
    timed(random_films(5, 12), 4, 3)  # these cancel to a part in a million
    legs = (3, 4, 5)
    by_legs = [timed(six, count, 3, proof=False) for count in legs]
    print(
        f"time against legs, six films: log-log slope {np.polyfit(np.log(legs), np.log(by_legs), 1)[0]:.2f}"
    )
    sixteen = {**six, **curved_films(1, 10)}
    one = timed(sixteen, 5, 3, proof=False)
    with executor_for(2, None) as pool:
        timed(six, 3, 2, proof=False, effort=Effort(executor=pool))  # starts the workers
        two = timed(sixteen, 5, 3, proof=False, effort=Effort(executor=pool))
    print(f"one worker / two workers, 5 legs: {one / two:.2f} (limit 1.6)")
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(f"most memory of this process: {memory:.0f} MB (limit 500)")


if __name__ == "__main__":
    start_up()
    mixed()
    search()
