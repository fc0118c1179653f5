"""The work of the draws: blocks of lots turned into counts, here or by an executor, with equal results."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from concurrent.futures import Executor
from dataclasses import dataclass, field

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.curves import Curves, Pool, curves_at
from tcplan.draws.nodes import NodePeaks
from tcplan.draws.peaks import QuadraticPeaks, peaks_of
from tcplan.draws.products import own_products
from tcplan.draws.sampling import BLOCK, Sampler, sampler
from tcplan.draws.statistics import Counts, Moments, Tally, bin_of, capability, moments_of
from tcplan.effort import Effort
from tcplan.errors import Stopped
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, used_materials
from tcplan.process import Process

TASK_BLOCKS = 16
WAVE = 64  # tasks under way at once, so that memory stays flat
SHARE_BLOCKS = 4  # of which the shares are made: they need no more
PROBE_LOTS = 4096
PROBE_POINTS = 33
ROUNDING = 1e-9  # of a limit, as in Requirement.met


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Engine:
    """All that turns a block of lots into figures; ``probe`` is the drift at ``probe_at`` [K]."""

    lots: Sampler
    peaks: QuadraticPeaks | NodePeaks
    probe: Curves
    probe_at: float
    seed: int
    limit: float | None
    cpk: float | None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Part:
    """What some blocks add: bins, moments block by block, how many are inside, products for the shares."""

    first: int
    counts: Counts
    moments: tuple[Moments, ...]
    least: float
    largest: float
    inside: int
    products: tuple[FloatArray, ...]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Task:
    """Lots ``start`` to ``stop`` of an engine; ``start`` is the first of a block."""

    engine: Engine
    start: int
    stop: int

    @property
    def name(self) -> str:
        """What the task is called when it fails."""
        return f"lots {self.start} to {self.stop}"

    def run(self) -> Part:
        """Draw the lots and return what they add."""
        engine = self.engine
        z = np.empty((len(engine.lots.columns), BLOCK))
        rows = np.empty((len(engine.lots.rows), BLOCK))
        figures = np.empty(self.stop - self.start)
        pool, products, moments = Pool(), [], []
        for block in range(self.start // BLOCK, -(-self.stop // BLOCK)):
            count = min(BLOCK, self.stop - block * BLOCK)
            engine.lots.draw_columns(engine.seed, block, z)
            engine.lots.fill_rows(z, rows)
            at = block * BLOCK - self.start
            own = figures[at : at + count]
            own[:] = engine.peaks.figures(rows, pool)[:count]
            moments.append(moments_of(own))
            if block < SHARE_BLOCKS:
                products.append(_products(engine, z, rows, count))
        return _part(figures, moments, products, engine.limit)


def _part(
    figures: FloatArray, moments: list[Moments], products: list[FloatArray], limit: float | None
) -> Part:
    bins = bin_of(figures)
    first = int(bins.min())
    bins -= first
    least, largest = float(figures.min()), float(figures.max())
    inside = 0 if limit is None else int(np.count_nonzero(figures <= limit * (1.0 + ROUNDING)))
    return Part(
        first=first,
        counts=np.bincount(bins),
        moments=tuple(moments),
        least=least,
        largest=largest,
        inside=inside,
        products=tuple(products),
    )


def _products(engine: Engine, z: FloatArray, rows: FloatArray, count: int) -> FloatArray:
    """Return the sums of products of 1, the columns and the drift at the probe."""
    drift = engine.probe.drift(rows[:, :count])
    table = np.concatenate([np.ones((1, count)), z[:, :count], drift])
    return own_products(table)


@dataclass(slots=True)
class Account:
    """What all blocks so far have added up to."""

    engine: Engine
    tally: Tally = field(default_factory=Tally)
    inside: int = 0
    products: FloatArray | None = None

    @property
    def count(self) -> int:
        """How many lots have been drawn."""
        return self.tally.moments.count

    def draw_up_to(self, count: int, executor: Executor | None) -> None:
        """Draw further lots until there are ``count``; those so far fill whole blocks.

        Raises
        ------
        Stopped
            When it is interrupted.
        """
        tasks = list(_tasks(self.engine, self.count, count))
        wave = WAVE if executor is not None else 1
        for k in range(0, len(tasks), wave):
            effort = Effort(executor=executor)
            for part in effort.results(tasks[k : k + wave]):
                self._add(part)
            if effort.stopped:
                raise Stopped(f"stopped after {self.count} of {count} draws")

    def _add(self, part: Part) -> None:
        self.tally.add(part.first, part.counts)
        self.tally.add_moments(part.moments)
        self.tally.least = min(self.tally.least, part.least)
        self.tally.largest = max(self.tally.largest, part.largest)
        self.inside += part.inside
        for products in part.products:
            self.products = products if self.products is None else self.products + products


def _tasks(engine: Engine, start: int, stop: int) -> Iterator[Task]:
    step = TASK_BLOCKS * BLOCK
    for at in range(start, stop, step):
        yield Task(engine=engine, start=at, stop=min(at + step, stop))


def engine_of(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    need: Requirement,
    *,
    seed: int,
    limit: float | None = None,
    screened: bool = False,
) -> Engine:
    """Return what draws the lots of a network and finds their figures."""
    lots = sampler(used_materials(network), materials, spreads, process, screened=screened)
    at, cpk = _probe(network, lots, materials, need, seed, limit)
    return Engine(
        lots=lots,
        peaks=peaks_of(network, lots, materials, need),
        probe=curves_at(network, lots, materials, need, np.array([at])),
        probe_at=at,
        seed=seed,
        limit=limit,
        cpk=cpk,
    )


def _probe(
    network: Network,
    lots: Sampler,
    materials: Mapping[str, Material],
    need: Requirement,
    seed: int,
    limit: float | None,
) -> tuple[float, float | None]:
    """Return where the drift of the first lots is largest in root mean square, and their least Cpk.

    Both over temperature, weighted as it is judged.
    """
    pieces = [np.linspace(p.low, p.high, PROBE_POINTS if p.high > p.low else 1) for p in need.pieces]
    weight = np.concatenate([np.full(len(T), p.weight) for T, p in zip(pieces, need.pieces, strict=True)])
    T = np.concatenate(pieces)
    rows = lots.fill_rows(lots.draw_columns(seed, 0)[:, :PROBE_LOTS])
    drift = curves_at(network, lots, materials, need, T).drift(rows)
    at = float(T[np.argmax(np.square(drift).mean(axis=1) / weight**2)])
    cpk = None if limit is None or need.centred else capability(limit * weight, drift)
    return at, cpk
