"""Error-term algebra on plain arrays, against wave equations solved one unknown at a time."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.numeric.error_terms import (
    Terms,
    correct,
    from_boxes,
    implied_switch_terms,
    predict,
    redundancy,
)

SEEDS = st.integers(0, 2**32 - 1)
SHAPES = st.sampled_from([(5,), (1,), (3, 4), (2, 1, 3)])


def disk(rng, shape, radius=0.9):
    return radius * np.sqrt(rng.uniform(size=shape)) * np.exp(2j * np.pi * rng.uniform(size=shape))


def tracking(rng, shape):
    return rng.uniform(0.3, 1.5, shape) * np.exp(2j * np.pi * rng.uniform(size=shape))


def random_terms(rng, shape, n):
    one, two = (*shape, n), (*shape, n, n)
    return Terms(
        disk(rng, one),
        disk(rng, one),
        tracking(rng, one),
        disk(rng, two),
        tracking(rng, two),
        disk(rng, two, 0.1),
    )


def random_part(rng, shape, n):
    s = disk(rng, (*shape, n, n))
    norm = np.linalg.norm(s, 2, axis=(-2, -1))[..., None, None]
    return s * rng.uniform(0.2, 0.98, (*shape, 1, 1)) / norm


def waves_solved(terms, s):
    """Rytting 2001, drive by drive: a and b at the part from 2n equations, then what each receiver reads."""
    n = s.shape[-1]
    raw = np.empty(np.broadcast_shapes(s.shape, terms.load_match.shape), dtype=complex)
    for d in range(n):
        back = terms.load_match[..., :, d].copy()
        back[..., d] = terms.source_match[..., d]
        system = np.zeros((*raw.shape[:-2], 2 * n, 2 * n), dtype=complex)
        system[..., :n, :n], system[..., :n, n:] = -s, np.eye(n)  # b - S a = 0
        system[..., n:, :n] = np.eye(n)  # a - back b = e_d
        system[..., n:, n:] = -back[..., :, None] * np.eye(n)
        right = np.zeros((2 * n, 1))
        right[n + d] = 1.0
        b = np.linalg.solve(system, np.broadcast_to(right, (*raw.shape[:-2], 2 * n, 1)))[..., n:, 0]
        for r in range(n):
            if r == d:
                raw[..., r, d] = terms.directivity[..., d] + terms.reflection_tracking[..., d] * b[..., r]
            else:
                raw[..., r, d] = (
                    terms.isolation[..., r, d] + terms.transmission_tracking[..., r, d] * b[..., r]
                )
    return raw


@given(SEEDS, SHAPES, st.integers(1, 4))
@settings(max_examples=60)
def test_predict_solves_the_wave_equations(seed, shape, n):
    rng = np.random.default_rng(seed)
    terms, s = random_terms(rng, shape, n), random_part(rng, shape, n)
    np.testing.assert_allclose(predict(terms, s), waves_solved(terms, s), rtol=0, atol=1e-9)


@given(SEEDS, SHAPES, st.integers(1, 4))
@settings(max_examples=100)
def test_correct_recovers_the_part(seed, shape, n):
    rng = np.random.default_rng(seed)
    terms, s = random_terms(rng, shape, n), random_part(rng, shape, n)
    raw = waves_solved(terms, s)
    given_to_it = raw.copy()
    np.testing.assert_allclose(correct(terms, raw), s, rtol=0, atol=1e-9)
    np.testing.assert_array_equal(raw, given_to_it)  # the readings are left alone


def test_terms_and_readings_broadcast_over_different_leading_dims(rng):
    terms, s = random_terms(rng, (3, 1, 5), 2), random_part(rng, (4, 5), 2)
    raw = predict(terms, s)
    assert raw.shape == (3, 4, 5, 2, 2)
    np.testing.assert_allclose(correct(terms, raw), np.broadcast_to(s, raw.shape), rtol=0, atol=1e-9)


def test_the_diagonal_of_two_index_terms_is_ignored(rng):
    terms, s = random_terms(rng, (5,), 3), random_part(rng, (5,), 3)
    own = np.arange(3)
    holed = {}
    for name in ("load_match", "transmission_tracking", "isolation"):
        holed[name] = getattr(terms, name).copy()
        holed[name][..., own, own] = np.nan
    empty = dataclasses.replace(terms, **holed)
    np.testing.assert_array_equal(predict(empty, s), predict(terms, s))
    np.testing.assert_array_equal(correct(empty, predict(terms, s)), correct(terms, predict(terms, s)))


def test_what_is_missing_is_nan_and_only_there(rng):
    terms, s = random_terms(rng, (4,), 2), random_part(rng, (4,), 2)
    raw = predict(terms, s)
    raw[2, 1, 0] = np.nan
    terms.transmission_tracking[3, 0, 1] = 0.0
    fixed = correct(terms, raw)
    assert np.isfinite(fixed[:2]).all()
    assert np.isnan(fixed[2:]).all(axis=(-2, -1)).all()


def boxes_and_switch(rng, shape, n):
    """One reciprocal or non-reciprocal box per port (e00, e11, e10, e01) and the switch terms."""
    port = (*shape, n)
    return disk(rng, port), disk(rng, port), tracking(rng, port), tracking(rng, port), disk(rng, port)


def read_through_boxes(e00, e11, e10, e01, switch, s):
    """Marks 1997: embed in the boxes, then let switch terms send waves back at every port that does not drive."""
    n = s.shape[-1]
    eye = np.eye(n)
    core = s @ np.linalg.inv(eye - e11[..., :, None] * s)
    inside = e00[..., :, None] * eye + e01[..., :, None] * core * e10[..., None, :]
    raw = np.empty_like(inside)
    for d in range(n):
        back = switch.copy()
        back[..., d] = 0.0
        raw[..., d] = (np.linalg.inv(eye - inside * back[..., None, :]) @ inside)[..., d]
    return raw


@given(SEEDS, SHAPES, st.integers(2, 4))
@settings(max_examples=100)
def test_boxes_and_switch_terms_convert_exactly(seed, shape, n):
    rng = np.random.default_rng(seed)
    e00, e11, e10, e01, switch = boxes_and_switch(rng, shape, n)
    switch = switch * (1 / 3)  # switch terms act behind the boxes: |e00 G| stays well below 1
    s = random_part(rng, shape, n)
    forward = e01[..., :, None] * e10[..., None, :]
    terms = from_boxes(e00, e11, e10 * e01, forward, switch)
    raw = read_through_boxes(e00, e11, e10, e01, switch, s)
    np.testing.assert_allclose(correct(terms, raw), s, rtol=0, atol=1e-9)
    for d in range(n):
        for r in range(n):
            if r != d:
                np.testing.assert_allclose(redundancy(terms, d, r), 0, rtol=0, atol=1e-9)
                back = implied_switch_terms(terms, r, d)
                np.testing.assert_allclose(back, switch[..., r], rtol=0, atol=1e-9)


def test_a_wrong_tracking_shows_in_the_redundancy_at_its_own_size(rng):
    e00, e11, e10, e01, switch = boxes_and_switch(rng, (7,), 2)
    terms = from_boxes(e00, e11, e10 * e01, e01[..., :, None] * e10[..., None, :], switch / 3)
    off = 1.02 * np.exp(0.03j)
    terms.transmission_tracking[..., 1, 0] *= off
    np.testing.assert_allclose(redundancy(terms, 0, 1), off - 1, rtol=0, atol=1e-12)
    np.testing.assert_allclose(redundancy(terms, 1, 0), off - 1, rtol=0, atol=1e-12)
    terms.reflection_tracking[
        ..., 1
    ] *= -1  # as when open and short are exchanged; D / tracking is not touched
    terms.directivity[..., 1] *= -1
    np.testing.assert_allclose(redundancy(terms, 0, 1) + 1, -off, rtol=0, atol=1e-12)


def test_no_tracking_gives_nan_not_a_warning():
    zero = np.zeros((1, 2))
    terms = Terms(zero, zero, zero, *(np.zeros((1, 2, 2)) for _ in range(3)))
    assert np.isnan(redundancy(terms, 0, 1)).all()
    assert np.isnan(implied_switch_terms(terms, 0, 1)).all()
    assert correct(terms, np.ones((1, 2, 2))) == pytest.approx(np.nan, nan_ok=True)
