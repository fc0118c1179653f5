"""Ratios of times from one run: draws of a network against the normals that they need.

Run it by hand: ``python tests/benchmarks/draws_bench.py``. It prints ratios and asserts nothing, since
a shared machine is noisy; each time is the least of several runs.
"""

from __future__ import annotations

import resource
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

ROOT = Path(__file__).parents[2]
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]
DRAWS = 1_000_000
RUNS = 5


def least_seconds(work: Callable[[], object]) -> float:
    times = []
    for _ in range(RUNS):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def normals(count: int, source: type[np.random.BitGenerator]) -> float:
    """Return the seconds that numpy takes for ``count`` normals for each draw, block by block."""
    rng, block = np.random.Generator(source(1)), np.empty((count, 8192))

    def work() -> None:
        for _ in range(DRAWS // 8192):
            rng.standard_normal(out=block)

    return least_seconds(work)


def main() -> None:
    from makers import by_name, film, leg, need_of

    from tcplan.draws import draw
    from tcplan.goal import Limit
    from tcplan.network import Parallel, Series
    from tcplan.process import Process

    def spread_film(name: str, tc1: float, tc2: float, value: float, u: float) -> object:
        return film(name, tc1, tc2, value_percent=value, tc1_spread_ppm=u, tc2_spread_ppm=0.1)

    films = by_name(
        spread_film("hi", -1400, 3.0, 15, 80),  # type: ignore[arg-type]
        spread_film("pp", -120, 0.55, 20, 40),  # type: ignore[arg-type]
        spread_film("sp", 3100, 0.4, 10, 60),  # type: ignore[arg-type]
    )
    need = need_of(Limit(kind="drift", value=0.01))
    series = Series((leg("hi", 3000), leg("pp", 9000), leg("sp", 1500)))
    inner = Series((Parallel((leg("hi", 4000), leg("sp", 6000))), leg("pp", 8000)))
    cases = {
        "series of 3 films": (series, 1.5),
        "mixed, 4 legs of 3 films": (Parallel((inner, leg("hi", 90000))), 4.0),
    }
    base, quick = normals(9, np.random.Philox), normals(9, np.random.PCG64)
    print(
        f"9 normals for each of {DRAWS} draws: {base:.3f} s with Philox, which the draws use; "
        f"{quick:.3f} s with PCG64"
    )
    for name, (network, most) in cases.items():
        spreads = {n: m.spread for n, m in films.items()}

        def work(network: object = network, spreads: dict = spreads, count: int = DRAWS) -> object:
            return draw(network, films, spreads, Process(), need, count=count, limit=0.01)  # type: ignore[arg-type]

        ours = least_seconds(work)
        print(
            f"{name}: {ours:.3f} s, draws / their normals: {ours / base:.2f} (limit {most:g}); "
            f"/ those of PCG64: {ours / quick:.2f}"
        )
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    work(count=4 * DRAWS)
    after = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(f"memory with 1 and with 4 million draws: {before:.0f} and {after:.0f} MB")


if __name__ == "__main__":
    main()
