"""Thinning keeps what an eye would see: extremes, ends and gaps."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.views.thin import ENOUGH, thin


def test_short_curves_stay_whole():
    x = np.linspace(0, 1, ENOUGH)
    assert np.array_equal(thin(x, x), np.arange(ENOUGH))


def test_long_curves_are_thinned_to_a_few_points_per_pixel():
    x = np.linspace(0, 1, 100_001)
    kept = thin(x, np.sin(40 * x), pixels=700)
    assert kept.size <= 4 * 700 + 2
    assert kept.size > 700


@settings(max_examples=40, deadline=None, derandomize=True)
@given(st.integers(0, 2**32 - 1))
def test_every_pixel_keeps_its_lowest_and_highest_value(seed):
    rng = np.random.default_rng(seed)
    x = np.sort(rng.uniform(0, 1, 5000))
    y = rng.normal(size=5000)
    kept = thin(x, y, pixels=100)
    column = np.minimum(((x - x[0]) / (x[-1] - x[0]) * 100).astype(int), 99)
    for c in range(100):
        whole, left = y[column == c], y[kept][column[kept] == c]
        assert left.min() == whole.min()
        assert left.max() == whole.max()
    assert kept[0] == 0
    assert kept[-1] == 4999
    assert np.all(np.diff(kept) > 0)


def test_a_lone_spike_and_a_gap_survive():
    x = np.linspace(0, 1, 20_001)
    y = np.zeros(20_001)
    y[12_345] = 7.0
    y[3_000:3_050] = np.nan
    kept = thin(x, y, pixels=200)
    assert 12_345 in kept
    assert {2_999, 3_000, 3_049, 3_050} <= set(kept.tolist())


def test_both_values_of_a_reflection_chart_keep_their_extremes():
    f = np.linspace(0, 1, 10_001)
    x, y = np.zeros(10_001), np.zeros(10_001)
    x[5_001], y[7_003] = 1.0, -1.0
    assert {5_001, 7_003} <= set(thin(f, x, y).tolist())
