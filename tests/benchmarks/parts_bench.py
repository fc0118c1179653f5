"""The time to choose stock parts, and its ratio to a plain enumeration of the same combinations.

Run it by hand: ``python tests/benchmarks/parts_bench.py``. It prints times and ratios and asserts nothing,
since a shared machine is noisy; each of our times is the least of several runs.
"""

from __future__ import annotations

import itertools
import math
import sys
import time
from collections.abc import Callable, Mapping
from dataclasses import replace
from pathlib import Path

ROOT = Path(__file__).parents[2]
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]
RUNS = 3
LOWEST, HIGHEST = 10.0, 10e6  # ohm
REFERENCE, LOW, HIGH = 298.15, 233.15, 423.15  # K
LAWS = {"up": (800e-6, 0.9e-6), "down": (-700e-6, 1.4e-6), "free": (120e-6, 0.3e-6)}
# (up + down) || free || (up + (down || free)), 1/K and ohm: six legs, four of them from stock.
LEGS = (("up", 8123.0), ("down", 9511.0), ("free", 31e3), ("up", 4711.3), ("down", 15555.0), ("free", 21e3))


def least_seconds(work: Callable[[], object]) -> float:
    times = []
    for _ in range(RUNS):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def joined(v: tuple[float, ...]) -> float:
    """Return the whole of the six values, at one temperature."""
    inner = v[3] + 1.0 / (1.0 / v[4] + 1.0 / v[5])
    return 1.0 / (1.0 / (v[0] + v[1]) + 1.0 / v[2] + 1.0 / inner)


def plain_candidates(wanted: float, values: tuple[float, ...], few: int) -> list[float]:
    """Return the nearest few single values and the nearest few of all, by looking at every pair."""
    every = list(values)
    for a, b in itertools.combinations_with_replacement(values, 2):
        every += (a + b, a * b / (a + b))

    def error(ohms: float) -> float:
        return abs(ohms / wanted - 1.0)

    different = sorted({float(f"{ohms:.12g}") for ohms in every}, key=error)
    return list(dict.fromkeys([*sorted(values, key=error)[:few], *different[:few]]))


def plain_best(few: int, values: tuple[float, ...]) -> tuple[float, int]:
    """Return the least figure of all combinations, one combination and one temperature at a time."""
    middle, half = 0.5 * (LOW + HIGH), 0.5 * (HIGH - LOW)
    nodes = [LOW, *(middle + half * math.cos(math.pi * (k + 0.5) / 17) for k in range(17)), HIGH]
    rows = []
    for t in nodes:
        x = t - REFERENCE
        at = {name: 1.0 + a * x + b * x * x for name, (a, b) in LAWS.items()}
        rows.append(tuple(at[name] for name, _ in LEGS))
    tried = [[ohms] if name == "free" else plain_candidates(ohms, values, few) for name, ohms in LEGS]
    best, count = math.inf, 0
    for chosen in itertools.product(*tried):
        total, figure = joined(chosen), 0.0
        for row in rows:
            warm = joined(tuple(v * r for v, r in zip(chosen, row, strict=True)))
            figure = max(figure, abs(warm / total - 1.0))
        best, count = min(best, figure), count + 1
    return best, count


def materials() -> Mapping[str, object]:
    from makers import by_name, film

    made = [film(name, a * 1e6, b * 1e6) for name, (a, b) in LAWS.items()]
    return by_name(
        *(m if m.name == "free" else replace(m, kind="part", ohm_per_square=None, series="E96") for m in made)
    )


def main() -> None:
    from makers import leg, need_of

    from tcplan.goal import Limit
    from tcplan.network import Parallel, Series, value
    from tcplan.parts.stock import stock_values
    from tcplan.parts.stock_choice import stock_choices

    a, b, c, d, e, f = (leg(name, ohms) for name, ohms in LEGS)
    network = Parallel((Series((a, b)), c, Series((d, Parallel((e, f))))))
    need, target, values = (
        need_of(Limit(kind="drift", value=0.01)),
        value(network),
        stock_values("E96", LOWEST, HIGHEST),
    )
    print(f"six legs, four from E96 with pairs, {len(values)} values each (limit 5 s):")
    for few, compared in ((5, True), (10, False)):

        def work(few: int = few) -> object:
            return stock_choices(
                network,
                materials(),  # type: ignore[arg-type]
                need,
                target,
                lowest=LOWEST,
                highest=HIGHEST,
                few=few,
            )

        ours = least_seconds(work)
        best = work()[0]  # type: ignore[index]
        print(
            f"few = {few}: {ours:.3f} s; best figure {best.figure * 1e6:.2f} ppm, "
            f"value error {best.value_error * 1e6:.0f} ppm, {best.parts} parts"
        )
        if compared:
            start = time.perf_counter()
            figure, count = plain_best(few, values)
            plain = time.perf_counter() - start
            print(
                f"  plain Python, {count} combinations: {plain:.2f} s, {plain / ours:.0f} times ours; "
                f"best figure {figure * 1e6:.2f} ppm"
            )


if __name__ == "__main__":
    main()
