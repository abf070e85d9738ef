"""Sparse rows solved at every frequency at once, against numpy's least squares at each."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.numeric.least_squares import solve_rows


def dense(rows, right, order, shape):
    matrix = np.zeros((*shape, len(rows), order), dtype=complex)
    for i, row in enumerate(rows):
        for j, value in row.items():
            matrix[..., i, j] = value
    known = np.stack([np.broadcast_to(np.asarray(r, dtype=complex), shape) for r in right], axis=-1)
    return matrix, known


def drawn(rng, shape, order, extra):
    """A sparse system: own unknown strong, two others weak, so that it is well scaled."""
    rows, right = [], []
    for i in range(order + extra):
        row = {i % order: np.exp(2j * np.pi * rng.uniform(size=shape)) * rng.uniform(1, 2, shape)}
        for j in rng.choice(order, 2, replace=False):
            if j != i % order:
                row[int(j)] = 0.4 * (rng.normal(size=shape) + 1j * rng.normal(size=shape)) / np.sqrt(2)
        rows.append(row)
        right.append(0.0 if i % 4 == 3 else rng.normal(size=shape) + 1j * rng.normal(size=shape))
    return rows, right


@given(st.integers(0, 2**32 - 1), st.sampled_from([(4,), (2, 3)]), st.integers(1, 7), st.integers(0, 5))
@settings(max_examples=80)
def test_it_is_the_least_squares_solution(seed, shape, order, extra):
    if order == 1:
        extra = max(extra, 1)
    rng = np.random.default_rng(seed)
    rows, right = drawn(rng, shape, max(order, 2), extra)
    order = max(order, 2)
    found = np.stack(solve_rows(rows, right, order), axis=-1)
    matrix, known = dense(rows, right, order, shape)
    best = (np.linalg.pinv(matrix) @ known[..., None])[..., 0]
    well = np.linalg.cond(matrix) < 1e3
    assert well.mean() > 0.9
    np.testing.assert_allclose(found[well], best[well], rtol=0, atol=1e-9)


def test_undetermined_unknowns_are_nan_at_that_frequency_alone():
    one, other = np.array([1.0, 1.0, 1.0]), np.array([1.0, 2.0, np.nan])
    rows = [{0: one, 1: one}, {0: one, 1: other}, {0: 2 * one, 1: 2 * one}]
    x = solve_rows(rows, [one * 3, 3 * one + (other - 1), 6 * one], 2)
    np.testing.assert_allclose([x[0][1], x[1][1]], [2.0, 1.0], atol=1e-12)
    assert np.isnan(x[0][[0, 2]]).all() and np.isnan(x[1][[0, 2]]).all()


def test_rows_broadcast_against_each_other():
    x = solve_rows([{0: np.full((3, 1), 2.0)}, {1: np.arange(1.0, 5.0)}], [np.ones((3, 1)), 1.0], 2)
    assert np.broadcast_shapes(x[0].shape, x[1].shape) == (3, 4)
    assert x[0] == pytest.approx(0.5)
    np.testing.assert_allclose(
        np.broadcast_to(x[1], (3, 4)), np.broadcast_to(1 / np.arange(1.0, 5.0), (3, 4))
    )
