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


if __name__ == "__main__":
    start_up()
    search()
