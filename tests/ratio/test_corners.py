"""The quick figure of a ratio: from below, and near the worst case."""

import numpy as np
import pytest
from makers import need_of
from ratio_pairs import DRIFT, devices, drift_of, films, pair

from tcplan.goal import Limit
from tcplan.process import Process, Tracking
from tcplan.ratio import corners
from tcplan.ratio.corners import corner_figure
from tcplan.ratio.worst import worst_of

T = np.linspace(-40, 150, 33) + 273.15
TRACKED = Process(trackings=(Tracking(materials=("a", "b"), within=15e-6),))
CASES = [
    ("gain", "a 9k + b 1k", "a 1k + b 2k", Process()),
    ("divider", "a 9k + b 4k", "b 1k", Process()),
    ("gain", "a 3k || b 1k", "a 1k", TRACKED),
]


@pytest.mark.parametrize(("kind", "first", "second", "process"), CASES)
def test_it_is_near_the_worst_case_and_never_above_its_bound(kind, first, second, process):
    one = pair(kind, first, second, films(np.random.default_rng(6), ("a", "b")), 3e-6, process)
    quick, worst = corner_figure(one), worst_of(one)
    assert 0.99 * worst.judged.figure <= quick <= worst.upper * (1 + 1e-12)


@pytest.mark.parametrize("limit", ["drift", "band"])
def test_no_corner_is_worse(limit):
    """Corners by scalars, from the definition: those of random devices, every second of which is one."""
    need = need_of(Limit(kind=limit, value=1e-3))
    rng = np.random.default_rng(8)
    one = pair("gain", "a 9k + b 1k", "a 1k + b 2k", films(rng, ("a", "b")), 3e-6, need=need)
    found = corner_figure(one)
    for k, (factors, shifts, apart) in enumerate(devices(one, rng, 400)):
        drift = drift_of(one, factors, shifts, apart, T)
        size = np.ptp(drift) if limit == "band" else np.abs(drift).max()
        assert k % 2 == 0 or size <= found * (1 + 1e-9)


def test_of_many_corners_some_are_taken(monkeypatch):
    one = pair(
        "gain", "a 9k + b 1k", "a 1k + b 2k", films(np.random.default_rng(6), ("a", "b")), 3e-6, TRACKED
    )
    every = corner_figure(one)
    monkeypatch.setattr(corners, "MOST", 200)
    some = corner_figure(one)
    assert 0.5 * every < some <= every * (1 + 1e-12)


def test_without_spreads_it_is_the_nominal_figure():
    one = pair("gain", "a 9k", "b 2k", films(np.random.default_rng(1), ("a", "b")))
    bare = type(one)(ratio=one.ratio, materials=one.materials, spreads={}, need=DRIFT)
    assert corner_figure(bare) == pytest.approx(bare.judge(bare.nominal()).figure, rel=1e-3)
