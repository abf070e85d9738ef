"""Electrical lengths against lines of known delay."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.views.lengths import delay_over, group_delay

F = np.linspace(10e6, 6e9, 401)


def line(seconds, f=F):
    return np.exp(-2j * np.pi * f * seconds)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(st.floats(0.0, 55e-9), st.floats(0, 6.28))
def test_the_delay_of_a_line_is_exact(seconds, turn):
    """Up to 0.9 turns per step: 15 MHz steps hold 60 ns."""
    assert delay_over(line(seconds) * np.exp(1j * turn), F) == pytest.approx(seconds, abs=1e-15)


def test_noise_and_dead_stretches_move_it_little():
    rng = np.random.default_rng(3)
    values = line(5e-9) + 0.02 * (rng.normal(size=401) + 1j * rng.normal(size=401))
    values[100:140] *= 1e-4
    values[200] = np.nan
    assert delay_over(values, F) == pytest.approx(5e-9, abs=3e-12)


def test_uneven_grids_do_not_matter():
    f = np.sort(np.random.default_rng(1).uniform(1e7, 6e9, 500))
    assert delay_over(line(1e-9, f), f) == pytest.approx(1e-9, rel=1e-9)


def test_a_little_negative_delay_stays_negative():
    assert delay_over(line(-3e-12), F) == pytest.approx(-3e-12, rel=1e-6)


@pytest.mark.parametrize("values", [np.ones(1), np.full(401, np.nan), np.zeros(401)])
def test_nothing_to_go_by_gives_no_number(values):
    assert np.isnan(delay_over(values, F[: values.size]))


def test_group_delay_of_a_line_is_flat_at_any_aperture():
    for aperture in (1, 4, 50):
        assert group_delay(line(700e-12), F, aperture=aperture) == pytest.approx(700e-12, rel=1e-9)


def test_group_delay_of_a_resonance_matches_its_closed_form():
    """1 / (1 + j w t) has the delay t / (1 + (w t)^2)."""
    f, t = np.linspace(1e6, 2e9, 4001), 200e-12
    w = 2 * np.pi * f
    got = group_delay(1 / (1 + 1j * w * t), f)[1:-1]
    assert got == pytest.approx((t / (1 + (w * t) ** 2))[1:-1], rel=1e-4)


def test_group_delay_has_no_number_near_a_point_without_a_value():
    values = line(1e-9)
    values[50] = np.nan
    lost = np.flatnonzero(np.isnan(group_delay(values, F, aperture=2)))
    assert lost.tolist() == [48, 49, 50, 51, 52]
    assert np.all(np.isnan(group_delay(np.ones(1), F[:1])))
