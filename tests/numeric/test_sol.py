"""One-port terms from known reflections."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.numeric import sol
from deembed.numeric.sol import seen_reflection

SEEDS = st.integers(0, 2**32 - 1)


def reflection_terms(measured, known, weights=None):
    """The solver, standards last."""
    split = [
        None if x is None else list(np.moveaxis(np.asarray(x), -1, 0)) for x in (measured, known, weights)
    ]
    return sol.reflection_terms(*split)


def disk(rng, shape, radius=0.9):
    return radius * np.sqrt(rng.uniform(size=shape)) * np.exp(2j * np.pi * rng.uniform(size=shape))


def box(rng, shape):
    turn = np.exp(2j * np.pi * rng.uniform(size=shape))
    return disk(rng, shape), disk(rng, shape), rng.uniform(0.3, 1.5, shape) * turn


def seen_through(known, e00, e11, tracking):
    """A load behind a two-port: e00 + e10e01 G / (1 - e11 G)."""
    e00, e11, tracking = (x[..., None] for x in (e00, e11, tracking))
    return e00 + tracking * known / (1 - e11 * known)


def standards(rng, shape, count):
    """Well apart: near open, short, load and two quarter turns, 0.35 around each."""
    base = np.array([0.9, -0.9, 0.0, 0.9j, -0.9j][:count])
    return base + disk(rng, (*shape, count), 0.35)


@given(SEEDS, st.sampled_from([(6,), (2, 3)]), st.integers(3, 5))
@settings(max_examples=150)
def test_random_boxes_are_recovered(seed, shape, count):
    rng = np.random.default_rng(seed)
    terms = box(rng, shape)
    known = standards(rng, shape, count)
    measured = seen_through(known, *terms)
    found = reflection_terms(measured, known)
    for ours, true in zip(found, terms, strict=True):
        np.testing.assert_allclose(ours, true, rtol=0, atol=1e-9)
    unknown = disk(rng, shape)
    back = seen_reflection(seen_through(unknown[..., None], *terms)[..., 0], *found)
    np.testing.assert_allclose(back, unknown, rtol=0, atol=1e-9)


def test_more_than_three_standards_are_a_least_squares_fit(rng):
    """numpy's own least squares, frequency by frequency, equal weights and given ones."""
    terms, known = box(rng, (4,)), standards(rng, (4,), 5)
    measured = seen_through(known, *terms) + 0.01 * disk(rng, known.shape)
    for weights in (None, rng.uniform(0.5, 2.0, 5)):
        found = np.stack(reflection_terms(measured, known, weights), axis=-1)
        for k in range(4):
            rows = np.stack([np.ones(5), known[k] * measured[k], -known[k]], axis=-1)
            w = np.ones(5) if weights is None else weights
            e00, e11, d = np.linalg.lstsq(rows * w[:, None], measured[k] * w, rcond=None)[0]
            np.testing.assert_allclose(found[k], [e00, e11, e00 * e11 - d], rtol=0, atol=1e-10)


def test_equal_standards_or_readings_give_nan(rng):
    terms = box(rng, (3,))
    known = np.array([[1.0, -1.0, 0.0], [1.0, -1.0, 0.5], [1.0, 0.7, 0.0]])
    measured = seen_through(known, *terms)
    measured[1, 0] = np.nan
    alike = known.copy()
    alike[2, 1] = alike[2, 0]  # said to be alike, read apart
    for found in reflection_terms(measured, alike):
        np.testing.assert_array_equal(np.isfinite(found), [True, False, False])
    measured[2, 1] = measured[2, 0]  # read alike, said to be apart
    for found in reflection_terms(measured, known):
        np.testing.assert_array_equal(np.isfinite(found), [True, False, False])
    for found in reflection_terms(measured, alike):
        np.testing.assert_array_equal(np.isfinite(found), [True, False, False])


def test_definitions_broadcast_over_a_leading_dim_of_their_own(rng):
    terms = box(rng, (4,))
    measured = seen_through(np.array([1.0, -1.0, 0.0]), *terms)
    known = np.broadcast_to([1.0, -1.0, 0.0], (7, 1, 3)).copy()
    known[3, 0, 2] = 0.02
    found = reflection_terms(measured, known)
    assert all(x.shape == (7, 4) for x in found)
    np.testing.assert_allclose(found[0][0], terms[0], rtol=0, atol=1e-12)
    assert np.abs(found[0][3] - terms[0]).min() > 1e-4
