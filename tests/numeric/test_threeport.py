"""Kernels that put an N-port together from rounds."""

from itertools import combinations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from skrf.network import renormalize_s

from deembed.numeric import threeport
from deembed.numeric.sparams import close_ports
from deembed.numeric.threeport import assemble, from_closed, mean_of_rounds, to_closed

SEEDS = st.integers(0, 2**32 - 1)
FIXED = settings(derandomize=True, deadline=None, max_examples=40)


def random_part(rng, n, points=20, largest=0.95):
    """Random passive parts, not symmetric."""
    a = rng.normal(size=(points, n, n)) + 1j * rng.normal(size=(points, n, n))
    u, _, v = np.linalg.svd(a)
    return u * rng.uniform(0, largest, size=(points, 1, n)) @ v


def reflections(rng, n, size, points=20):
    return size * np.exp(1j * rng.uniform(0, 2 * np.pi, size=(points, n)))


def read(part, kept, closing):
    """One round, the other ports closed; `close_ports` keeps ascending order."""
    free = np.setdiff1d(np.arange(part.shape[-1]), kept)
    seen = close_ports(part, free, closing[..., free])
    order = np.argsort(np.argsort(kept))
    return seen[..., order[:, None], order]


def pairs(n, k=2):
    return [np.array(c) for c in combinations(range(n), k)]


@FIXED
@given(seed=SEEDS, n=st.integers(3, 6), size=st.floats(0, 0.9))
def test_equal_terminations_give_the_part_back(seed, n, size):
    rng = np.random.default_rng(seed)
    part, g = random_part(rng, n), reflections(rng, n, size)
    got = assemble([read(part, p, g) for p in pairs(n)], pairs(n), [g] * len(pairs(n)), n)
    assert not got.general.any() and got.converged.all()
    assert np.abs(got.s - part).max() < 1e-11
    assert max(np.abs(r).max() for r in got.residuals) < 1e-10


@FIXED
@given(seed=SEEDS, shape=st.sampled_from([(4, 2), (5, 2), (5, 3), (6, 2)]))
def test_terminations_of_15_db_different_in_every_round_take_four_steps(seed, shape):
    n, k = shape
    rng = np.random.default_rng(seed)
    part = random_part(rng, n, points=5)
    rounds = pairs(n, k)
    closings = [reflections(rng, n, 10 ** (-15 / 20), points=5) for _ in rounds]
    got = assemble([read(part, p, g) for p, g in zip(rounds, closings, strict=True)], rounds, closings, n)
    assert got.general.all() and got.converged.all() and got.steps <= 4
    assert np.abs(got.s - part).max() < 1e-12
    assert max(np.abs(r).max() for r in got.residuals) < 1e-12


def test_strong_terminations_different_in_every_round_settle_mostly():
    rng = np.random.default_rng(5)
    part, rounds = random_part(rng, 4, points=300), pairs(4)
    closings = [reflections(rng, 4, 0.9, points=300) for _ in rounds]
    got = assemble([read(part, p, g) for p, g in zip(rounds, closings, strict=True)], rounds, closings, 4)
    assert got.converged.mean() > 0.97
    assert np.abs(got.s - part)[got.converged].max() < 1e-9
    assert np.isnan(got.s[~got.converged]).all()


@pytest.mark.parametrize("closing", [1.0, -1.0, 1.0 - 1e-6])
def test_ideal_open_or_short_goes_through_the_general_solver(closing):
    rng = np.random.default_rng(1)
    part = random_part(rng, 3)
    g = reflections(rng, 3, 0.5)
    g[:, 1] = closing
    g[10:, 1] = 0.2
    got = assemble([read(part, p, g) for p in pairs(3)], pairs(3), [g] * 3, 3)
    assert got.general.tolist() == [True] * 10 + [False] * 10
    assert got.steps == 1  # it starts at the exact part, since every port met one reflection
    assert np.abs(got.s - part).max() < 1e-11


def test_rounds_may_list_their_ports_in_any_order():
    rng = np.random.default_rng(2)
    part, g = random_part(rng, 3), reflections(rng, 3, 0.4)
    rounds = [np.array(p) for p in ([1, 0], [2, 1], [2, 0])]
    got = assemble([read(part, p, g) for p in rounds], rounds, [g] * 3, 3)
    assert np.abs(got.s - part).max() < 1e-13


def test_leading_dims_of_rounds_and_terminations_broadcast():
    rng = np.random.default_rng(3)
    part = random_part(rng, 3, points=12).reshape(4, 1, 3, 3, 3)
    g = reflections(rng, 3, 0.6, points=6).reshape(1, 2, 3, 3)
    got = assemble([read(part, p, g) for p in pairs(3)], pairs(3), [g] * 3, 3)
    assert got.s.shape == (4, 2, 3, 3, 3)
    assert np.abs(got.s - part).max() < 1e-12
    assert got.residuals[0].shape == (4, 2, 3, 2, 2)


@FIXED
@given(seed=SEEDS, n=st.integers(2, 5), size=st.floats(0, 0.9))
def test_closing_strikes_out_rows_and_columns(seed, n, size):
    """The identity of Tippet & Speciale 1982 on random parts."""
    rng = np.random.default_rng(seed)
    part, g = random_part(rng, n), reflections(rng, n, size)
    kept = np.arange(n - 1)
    inside = to_closed(read(part, kept, g), g[:, kept])
    assert np.abs(inside - to_closed(part, g)[:, : n - 1, : n - 1]).max() < 1e-10
    assert np.abs(from_closed(to_closed(part, g), g) - part).max() < 1e-10


def test_closed_waves_are_those_of_another_impedance():
    """scikit-rf 2.2, pseudo-wave renormalization to 50 (1 + G) / (1 - G): equal up to the scale of waves."""
    rng = np.random.default_rng(4)
    part = random_part(rng, 3)
    g = reflections(rng, 3, 0.7)
    other = renormalize_s(part, 50.0, 50 * (1 + g) / (1 - g), s_def="pseudo")
    ours = to_closed(part, g)
    diagonal = np.arange(3)
    np.testing.assert_allclose(ours[:, diagonal, diagonal], other[:, diagonal, diagonal], rtol=0, atol=1e-12)
    np.testing.assert_allclose(ours * ours.swapaxes(1, 2), other * other.swapaxes(1, 2), rtol=0, atol=1e-10)


def test_mean_is_plain_and_residual_is_reading_minus_mean():
    first, second = np.array([[1.0, 2.0], [3.0, 4.0]]), np.array([[8.0, 5.0], [6.0, 7.0]])
    mean, (r1, r2) = mean_of_rounds([first, second], [np.array([0, 1]), np.array([1, 2])], 3)
    np.testing.assert_array_equal(mean[:2, :2], [[1, 2], [3, 6]])
    assert np.isnan(mean[0, 2]) and np.isnan(mean[2, 0])
    assert r1[1, 1] == -2 and r2[0, 0] == 2 and r2[0, 1] == 0


def test_matched_terminations_leave_every_digit():
    rng = np.random.default_rng(6)
    part = random_part(rng, 3)
    got = assemble([part[:, p[:, None], p] for p in pairs(3)], pairs(3), [np.zeros((1, 3))] * 3, 3)
    np.testing.assert_array_equal(got.s, part)


def test_noise_in_the_general_solver_is_spread_by_least_squares():
    """With matched ports least squares is the plain mean, whichever solver finds it."""
    rng = np.random.default_rng(7)
    part = random_part(rng, 3)
    rounds = [part[:, p[:, None], p] + 0.01 * rng.normal(size=(20, 2, 2)) for p in pairs(3)]
    start = part + 0.1
    found, good, _ = threeport.solve_general(rounds, pairs(3), [np.zeros((20, 3))] * 3, [start])
    assert good.all()
    assert np.abs(found - mean_of_rounds(rounds, pairs(3), 3)[0]).max() < 1e-13


def test_a_pair_never_read_has_no_solution():
    rng = np.random.default_rng(8)
    part, g = random_part(rng, 3), np.ones((20, 3), dtype=complex)
    rounds = pairs(3)[:2]
    got = assemble([read(part, p, g) for p in rounds], rounds, [g] * 2, 3)
    assert not got.converged.any() and np.isnan(got.s).all()


def test_missing_readings_stay_missing_in_the_general_solver():
    rng = np.random.default_rng(9)
    part, rounds = random_part(rng, 4), pairs(4)
    closings = [reflections(rng, 4, 0.2) for _ in rounds]
    readings = [read(part, p, g) for p, g in zip(rounds, closings, strict=True)]
    readings[2][3] = np.nan
    got = assemble(readings, rounds, closings, 4)
    assert np.flatnonzero(~got.converged).tolist() == [3]
    assert np.isnan(got.s[3]).all() and np.isfinite(np.delete(got.s, 3, axis=0)).all()


def test_blocks_do_not_change_the_answer(monkeypatch):
    rng = np.random.default_rng(10)
    part, rounds = random_part(rng, 4, points=200), pairs(4)
    closings = [reflections(rng, 4, 0.3, points=200) for _ in rounds]
    readings = [read(part, p, g) for p, g in zip(rounds, closings, strict=True)]
    whole = assemble(readings, rounds, closings, 4).s
    monkeypatch.setattr(threeport, "_BLOCK_NUMBERS", 1)
    np.testing.assert_array_equal(assemble(readings, rounds, closings, 4).s, whole)
