"""The time to choose stock parts and film units, and its ratio to a plain enumeration of the same.

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
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from tcplan.material.model import Material
    from tcplan.parts.films import FilmRules

ROOT = Path(__file__).parents[2]
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]
RUNS = 3
LOWEST, HIGHEST = 10.0, 10e6  # ohm
REFERENCE, LOW, HIGH = 298.15, 233.15, 423.15  # K
LAWS = {"up": (800e-6, 0.9e-6), "down": (-700e-6, 1.4e-6), "free": (120e-6, 0.3e-6)}
# (up + down) || free || (up + (down || free)), 1/K and ohm: six legs, four of them from stock.
LEGS = (("up", 8123.0), ("down", 9511.0), ("free", 31e3), ("up", 4711.3), ("down", 15555.0), ("free", 21e3))

FILM_LEGS = (
    ("a", 14237.0),
    ("b", 3763.0),
    ("c", 812.0),
    ("d", 22345.0),
    ("e", 5111.0),
    ("f", 1234.0),
)  # ohm
UM = 1e-6
# Of an invented film [SI].
SHEET, BIAS, ENDS, SPACING, END, PER_WIDTH = 320.0, 0.05 * UM, 35 * UM, 0.6 * UM, 0.4 * UM, 600.0


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


def drawn_film(grid: float) -> Material:
    from makers import film

    from tcplan.material.model import Film

    drawn = Film(
        min_width=UM,
        width_bias=BIAS,
        end_resistance=ENDS,
        end_tc1=-900e-6,
        end_length=END,
        matching=1.5e-2 * UM,
        spacing=SPACING,
        grid=grid,
        max_current=PER_WIDTH,
    )
    return replace(film("film", 150.0, 0.5, ohm_per_square=SHEET), film=drawn)


def currents(largest: float) -> tuple[tuple[str, float], ...]:
    """Return a current for each film leg [A], each in turn a step more."""
    return tuple((name, largest * (k + 1) / len(FILM_LEGS)) for k, (name, _) in enumerate(FILM_LEGS))


def plain_least_area(width: float, grid: float, rules: FilmRules) -> tuple[float, int]:
    """Return the least area [m^2] of all lengths and counts at one width, and how many were looked at."""
    carried, counts = dict(rules.currents), range(1, rules.most_count + 1)
    least, looked = math.inf, 0
    for step in range(round(width / grid), round(rules.max_length_squares * width / grid) + 1):
        length, units = step * grid, 0.0
        one = SHEET * length / (width - BIAS) + 2.0 * ENDS / width
        for name, ohms in FILM_LEGS:
            fewest = math.inf
            for s, p in itertools.product(counts, counts):
                looked += 1
                if (
                    s * p < fewest
                    and abs(one * s / p / ohms - 1.0) <= rules.error
                    and carried.get(name, 0.0) <= p * width * PER_WIDTH * (1.0 + 1e-9)
                ):
                    fewest = s * p
            units += fewest
        least = min(least, units * (length + 2.0 * END + SPACING) * (width + SPACING))
    return least, looked


def stock() -> None:
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


def films() -> None:
    from tcplan.parts.films import FilmRules, film_legs

    cases = (
        ("no current", FilmRules()),
        ("a mismatch of 0.02 %", FilmRules(mismatch=2e-4)),
        ("90 mA, wide units", FilmRules(currents=currents(90e-3))),
        ("90 mA, an error of 1 %", FilmRules(currents=currents(90e-3), error=1e-2)),
        ("10 A, refused", FilmRules(currents=currents(10.0))),
        ("90 mA, counts up to 256", FilmRules(currents=currents(90e-3), most_count=256)),
    )
    print("six legs of one film, counts up to 64, grid of 5 nm:")
    for name, rules in cases:
        result = film_legs(drawn_film(5e-9), FILM_LEGS, REFERENCE, rules)
        seconds = least_seconds(lambda r=rules: film_legs(drawn_film(5e-9), FILM_LEGS, REFERENCE, r))
        print(f"{name}: {seconds:.3f} s; {len(result.choices)} choices, {len(result.refusals)} refusals")
    grid = 0.1 * UM
    print("the same at one width, counts up to 16, grid of 0.1 um, an error of 2 %:")
    for name, largest in (("no current", 0.0), ("3 mA", 3e-3)):
        rules = FilmRules(most_count=16, error=0.02, max_width=UM, currents=currents(largest))
        result = film_legs(drawn_film(grid), FILM_LEGS, REFERENCE, rules)
        ours = least_seconds(lambda r=rules: film_legs(drawn_film(grid), FILM_LEGS, REFERENCE, r))
        start = time.perf_counter()
        area, count = plain_least_area(UM, grid, rules)
        plain = time.perf_counter() - start
        print(
            f"{name}: {ours:.3f} s; least area {result.choices[0].area / UM**2:.2f} um^2\n"
            f"  plain Python, {count} counts: {plain:.2f} s, {plain / ours:.0f} times ours; "
            f"least area {area / UM**2:.2f} um^2"
        )


def main() -> None:
    stock()
    films()


if __name__ == "__main__":
    main()
