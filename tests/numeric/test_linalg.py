"""Inverse and solve of stacks: right where there is an inverse, NaN where there is none."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from deembed.numeric.linalg import diagonal_matrix, inverse, solve


def stack(rng, n, shape=(7,)):
    return rng.normal(size=(*shape, n, n)) + 1j * rng.normal(size=(*shape, n, n))


@given(n=st.integers(1, 7), seed=st.integers(0, 10_000))
def test_it_inverts(n, seed):
    a = stack(np.random.default_rng(seed), n, (2, 3))
    np.testing.assert_allclose(inverse(a), np.linalg.inv(a), rtol=1e-9, atol=1e-9)


@pytest.mark.parametrize("n", range(1, 6))
def test_a_singular_matrix_is_nan_and_its_neighbours_are_not(n, rng):
    a = stack(rng, n)
    a[3, :, 0] = 0 if n == 1 else a[3, :, -1]
    a[5] = np.nan
    out = inverse(a)
    bad = np.isnan(out).all(axis=(-2, -1))
    np.testing.assert_array_equal(bad, [False, False, False, True, False, True, False])


def test_scale_does_not_make_a_matrix_singular(rng):
    for n in range(1, 6):
        a = stack(rng, n) * 1e-30
        np.testing.assert_allclose(inverse(a) @ a, np.broadcast_to(np.eye(n), a.shape), atol=1e-9)


@pytest.mark.parametrize("n", [1, 2, 3, 5])
def test_it_solves(n, rng):
    a, b = stack(rng, n), stack(rng, n)[..., :1]
    np.testing.assert_allclose(a @ solve(a, b), b, atol=1e-10)


def test_diagonals():
    d = diagonal_matrix(np.array([[1, 2], [3, 4j]]))
    np.testing.assert_array_equal(d, [[[1, 0], [0, 2]], [[3, 0], [0, 4j]]])


def test_nothing_in_nothing_out():
    assert inverse(np.zeros((0, 2, 2))).shape == (0, 2, 2)
