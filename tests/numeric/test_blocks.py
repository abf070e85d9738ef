"""Blocks change nothing but the time taken."""

import numpy as np
import pytest

from deembed.numeric.blocks import in_blocks


@pytest.mark.parametrize("size", [1, 4, 7, 100])
def test_results_are_those_of_one_call(size, rng):
    """A matrix that has a leading dim, one that has none, and a number per point."""
    a, b, c = rng.normal(size=(3, 7, 2, 2)), rng.normal(size=(7, 2, 2)), rng.normal(size=(3, 1))
    seen = []

    def work(x, y, z):
        seen.append(len(x))
        return x @ y, z * x[:, 0, 1]

    product, number = in_blocks(work, a, b, c, core=(2, 2, 0), size=size)
    np.testing.assert_array_equal(product, a @ b)
    np.testing.assert_array_equal(number, c * a[..., 0, 1])
    assert sum(seen) == 21 and max(seen) == min(size, 21)


def test_no_points_give_results_of_no_points():
    (out,) = in_blocks(lambda x: (x[:, 0],), np.zeros((0, 5)), core=(1,))
    assert out.shape == (0,)
