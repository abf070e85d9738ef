"""Shells put on and taken off plain arrays, against connecting waves whole."""

import numpy as np
from hypothesis import assume, given
from hypothesis import strategies as st

from deembed.numeric.shell import embed, strip


@given(seed=st.integers(0, 100_000), n=st.integers(1, 4))
def test_strip_undoes_embed_and_embed_is_the_whole_network(seed, n):
    rng = np.random.default_rng(seed)
    f = 0.3 * (rng.normal(size=(3, 2 * n, 2 * n)) + 1j * rng.normal(size=(3, 2 * n, 2 * n)))
    f[:, :n, n:] += np.eye(n)
    f[:, n:, :n] += np.eye(n)
    s = 0.3 * (rng.normal(size=(2, 3, n, n)) + 1j * rng.normal(size=(2, 3, n, n)))
    blocks = f[:, :n, :n], f[:, :n, n:], f[:, n:, :n], f[:, n:, n:]
    assume(min(np.linalg.cond(b).max() < 1e3 for b in blocks[1:3]))
    m = embed(*blocks, s)
    loop = np.eye(n) - s @ blocks[3]
    by_waves = blocks[0] + blocks[1] @ np.linalg.solve(loop, s @ blocks[2])
    np.testing.assert_allclose(m, by_waves, atol=1e-8 * max(1.0, np.abs(m).max()))
    assume(np.linalg.cond(loop).max() < 1e4)
    np.testing.assert_allclose(strip(*blocks, m), s, atol=1e-9 * np.linalg.cond(loop).max() ** 2)


def test_a_shell_that_passes_nothing_gives_nan():
    zero, one = np.zeros((1, 1, 1)), np.ones((1, 1, 1))
    assert np.isnan(strip(zero, zero, one, zero, 0.5 * one)).all()
