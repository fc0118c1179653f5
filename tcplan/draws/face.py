"""Draws of a network: the quantile, the yield, and what causes the spread of its figure."""

from __future__ import annotations

from collections.abc import Mapping
from concurrent.futures import Executor
from dataclasses import dataclass

import numpy as np

from tcplan.arrays import FloatArray
from tcplan.draws.blocks import Account, Engine, engine_of
from tcplan.draws.curves import curves_at
from tcplan.draws.sampling import BLOCK, sampler
from tcplan.draws.statistics import clopper_pearson, quantile_ranks, variance_shares
from tcplan.errors import InputError, Problem
from tcplan.goal import Requirement
from tcplan.material.model import Material
from tcplan.material.spread import Spread
from tcplan.network import Network, used_materials
from tcplan.process import Parameter, Process

MOST_DRAWS = 1_000_000_000
SECONDS_PER_DRAW = 5e-7  # of a mixed network, on a slow machine
BYTES_PER_DRAW = 8


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawn:
    """What draws say of one network; every figure is a fraction.

    Parameters
    ----------
    draws, seed : int
        How many lots, and the seed that gives them again.
    screened : bool
        Whether normals were cut at their limits.
    quantile : float
        The fraction that ``quantile_figure`` holds.
    quantile_figure : float
        The judged figure that this fraction of lots does not exceed.
    quantile_low, quantile_high : float, float or None
        95 % interval from order statistics, whatever the distribution; ``quantile_high`` is None when
        there are too few draws for an upper bound.
    mean, sigma : float
        Of the figures.
    largest : float
        The largest figure drawn.
    limit : float, optional
        What the figures were counted against.
    inside : int, optional
        How many lots are within the limit.
    yield_fraction, yield_low, yield_high : float, optional
        inside/draws with its exact 95 % binomial interval.
    cpk : float, optional
        The least over temperature of (limit - |mean|)/(3 sigma) of the signed drift, from the first 4096
        lots; None without a limit or scatter, and of a band.
    histogram : (edges, counts)
        From the least to the largest figure.
    shares : tuple of (Parameter, float)
        The fraction of the variance of the drift at ``shares_at`` that each parameter explains, largest
        first: squared standardised regression coefficients. What materials share (tracking, etch)
        is divided equally among them.
    shares_at : float
        The temperature [K] at which the drift is largest in root mean square.
    """

    draws: int
    seed: int
    screened: bool
    quantile: float
    quantile_figure: float
    quantile_low: float
    quantile_high: float | None
    mean: float
    sigma: float
    largest: float
    limit: float | None
    inside: int | None
    yield_fraction: float | None
    yield_low: float | None
    yield_high: float | None
    cpk: float | None
    histogram: tuple[tuple[float, ...], tuple[int, ...]]
    shares: tuple[tuple[Parameter, float], ...]
    shares_at: float


def draw(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    need: Requirement,
    *,
    count: int = 20_000,
    seed: int = 1,
    quantile: float = 0.9973,
    limit: float | None = None,
    screened: bool = False,
    executor: Executor | None = None,
) -> Drawn:
    """Draw lots of a network and judge each of them over the continuous range.

    Parameters
    ----------
    network : Network
    materials, spreads : mapping of name to Material, Spread
        Spreads as stated; every material of the network has one.
    process : Process
        Correlations and tracking.
    need : Requirement
    count, seed : int
        How many lots, and from which seed. The first lots of a seed are the same for every count.
    quantile : float
        Above 0 and below 1.
    limit : float, optional
        A figure, as a fraction.
    screened : bool
        Whether normals are cut at their limits.
    executor : concurrent.futures.Executor, optional
        Shares the work; the result is the same.

    Returns
    -------
    Drawn

    Raises
    ------
    ValueError
        When a material has no spread.
    InputError
        For a count or a quantile that makes no sense, or correlations that contradict each other.
    Stopped
        When it is interrupted.
    """
    check_draws(count)
    _check_quantile(quantile)
    engine = engine_of(network, materials, spreads, process, need, seed=seed, limit=limit, screened=screened)
    account = Account(engine)
    account.draw_up_to(count, executor)
    return _drawn(account, quantile)


def draw_until(
    network: Network,
    materials: Mapping[str, Material],
    spreads: Mapping[str, Spread],
    process: Process,
    need: Requirement,
    *,
    precision: float,
    most: int = 10_000_000,
    seed: int = 1,
    quantile: float = 0.9973,
    limit: float | None = None,
    screened: bool = False,
    executor: Executor | None = None,
) -> Drawn:
    """Draw lots until the 95 % interval of the quantile is narrow enough, or ``most`` are drawn.

    Whether it is narrow enough is in the answer: (quantile_high - quantile_low)/quantile_figure.

    Parameters
    ----------
    network, materials, spreads, process, need
        As for `draw`.
    precision : float
        Width of the interval over the quantile, above 0.
    most : int
        Where it ends in any case.
    seed, quantile, limit, screened, executor
        As for `draw`.

    Returns
    -------
    Drawn

    Raises
    ------
    ValueError, InputError, Stopped
        As for `draw`; also for a precision that is not above 0.
    """
    check_draws(most)
    _check_quantile(quantile)
    if not precision > 0.0:
        raise InputError(Problem(where="precision", found=f"{precision:g}", expected="a fraction above zero"))
    engine = engine_of(network, materials, spreads, process, need, seed=seed, limit=limit, screened=screened)
    account = Account(engine)
    count = min(2 * BLOCK, most)
    while True:
        account.draw_up_to(count, executor)
        width = _relative_width(account, quantile)
        if width <= precision or count >= most:
            return _drawn(account, quantile)
        # The width falls with the root of the count.
        growth = min(4.0, 1.1 * (width / precision) ** 2)
        count = min(most, BLOCK * int(np.ceil(count * max(growth, 1.1) / BLOCK)))


def draw_curves(
    network: Network,
    materials: Mapping[str, Material],
    process: Process,
    need: Requirement,
    T: FloatArray,
    count: int,
    seed: int = 1,
    *,
    spreads: Mapping[str, Spread] | None = None,
    screened: bool = False,
) -> FloatArray:
    """Return the drift of the first lots of a seed, shape (count, T): those that `draw` judges.

    Parameters
    ----------
    network, materials, process, need
        As for `draw`.
    T : array, shape (T,)
        Temperatures [K].
    count, seed : int
    spreads : mapping of name to Spread, optional
        By default those of the materials.
    screened : bool

    Returns
    -------
    array, shape (count, T)
        Fractions.
    """
    check_draws(count)
    names = used_materials(network)
    stated = spreads or {n: s for n in names if (s := materials[n].spread) is not None}
    lots = sampler(names, materials, stated, process, screened=screened)
    curves = curves_at(network, lots, materials, need, np.asarray(T, dtype=np.float64))
    blocks = []
    for block in range(-(-count // BLOCK)):
        rows = lots.fill_rows(lots.draw_columns(seed, block)[:, : count - block * BLOCK])
        blocks.append(curves.drift(rows).T)
    return np.concatenate(blocks)


def check_draws(count: int) -> None:
    """Refuse a number of draws that is not above zero, or beyond 1e9.

    Raises
    ------
    InputError
        With the time and the memory that so many would need.
    """
    if 0 < count <= MOST_DRAWS:
        return
    found = f"{count}"
    if count > 0:
        hours = count * SECONDS_PER_DRAW / 3600.0
        size = count * BYTES_PER_DRAW / 1e9
        found = f"{count}, which need about {hours:.3g} hours and, to keep their figures, {size:.3g} GB"
    raise InputError(
        Problem(
            where="draws",
            found=found,
            expected=f"1 to {MOST_DRAWS:,}".replace(",", " "),
            todo="20 000 tell a 99.73 % quantile to a few percent.",
        )
    )


def _check_quantile(quantile: float) -> None:
    if not 0.0 < quantile < 1.0:
        raise InputError(
            Problem(where="quantile", found=f"{quantile:g}", expected="a fraction above 0 and below 1")
        )


def _interval(account: Account, quantile: float) -> tuple[float, float, float | None]:
    """Return the quantile and the two ends of its interval."""
    tally = account.tally
    rank, low, high = quantile_ranks(account.count, quantile)
    figure, lower, upper = tally.order_statistics((rank, low, high)).tolist()
    return figure, lower if low else 0.0, upper if high <= account.count else None


def _relative_width(account: Account, quantile: float) -> float:
    figure, low, high = _interval(account, quantile)
    if high is None:
        return float("inf")
    return (high - low) / figure if figure > 0.0 else 0.0


def _drawn(account: Account, quantile: float) -> Drawn:
    tally, engine = account.tally, account.engine
    figure, low, high = _interval(account, quantile)
    limit, count = engine.limit, account.count
    ends = (None, None) if limit is None else clopper_pearson(account.inside, count)
    return Drawn(
        draws=count,
        seed=engine.seed,
        screened=engine.lots.screened,
        quantile=quantile,
        quantile_figure=figure,
        quantile_low=low,
        quantile_high=high,
        mean=tally.moments.mean,
        sigma=tally.moments.sigma,
        largest=tally.largest,
        limit=limit,
        inside=None if limit is None else account.inside,
        yield_fraction=None if limit is None else account.inside / count,
        yield_low=ends[0],
        yield_high=ends[1],
        cpk=engine.cpk,
        histogram=tally.coarse(),
        shares=_shares(engine, account.products),
        shares_at=engine.probe_at,
    )


def _shares(engine: Engine, products: FloatArray | None) -> tuple[tuple[Parameter, float], ...]:
    """Return the shares by parameter, largest first."""
    if products is None:
        return ()
    found: dict[Parameter, float] = {}
    for column, share in zip(engine.lots.columns, variance_shares(products), strict=True):
        for parameter in column.parameters:
            found[parameter] = found.get(parameter, 0.0) + float(share) / len(column.parameters)
    return tuple(sorted(found.items(), key=lambda item: (-item[1], item[0])))
