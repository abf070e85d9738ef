"""Thru-reflect-line on plain arrays: random boxes recovered, roots chosen, what is singular named NaN."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.numeric import trl
from deembed.numeric.error_terms import correct, from_boxes

SEEDS = st.integers(0, 2**32 - 1)
SHAPES = st.sampled_from([(5,), (2, 3)])


def disk(rng, shape, radius=0.9):
    return radius * np.sqrt(rng.uniform(size=shape)) * np.exp(2j * np.pi * rng.uniform(size=shape))


def tracking(rng, shape):
    return rng.uniform(0.3, 1.5, shape) * np.exp(2j * np.pi * rng.uniform(size=shape))


def read(boxes, s, switch):
    """Boxes around s, then switch terms at the port that does not drive (waves, drive by drive)."""
    e00, e11, e10, e01 = boxes
    eye = np.eye(2)
    core = s @ np.linalg.inv(eye - e11[..., :, None] * s)
    inside = e00[..., :, None] * eye + e01[..., :, None] * core * e10[..., None, :]
    raw = np.empty_like(inside)
    for d in range(2):
        back = switch.copy()
        back[..., d] = 0.0
        raw[..., d] = (np.linalg.inv(eye - inside * back[..., None, :]) @ inside)[..., d]
    return raw


def anti_diagonal(value):
    out = np.zeros((*value.shape, 2, 2), dtype=complex)
    out[..., 0, 1] = out[..., 1, 0] = value
    return out


def case(rng, shape):
    port = (*shape, 2)
    boxes = disk(rng, port), disk(rng, port), tracking(rng, port), tracking(rng, port)
    switch = disk(rng, port, 0.3)
    phase = np.radians(rng.uniform(20, 160, shape))
    line = rng.uniform(0.8, 1.0, shape) * np.exp(-1j * phase)
    reflect = rng.uniform(0.5, 0.9, shape) * rng.choice([-1, 1]) * np.exp(1j * rng.uniform(-1, 1, shape))
    return boxes, switch, line, reflect


def solved(boxes, switch, line, reflect, **guesses):
    one = np.ones_like(line)
    standards = anti_diagonal(one), anti_diagonal(line), reflect[..., None, None] * np.eye(2)
    free = [trl.remove_switch_terms(read(boxes, s, switch), switch) for s in standards]
    options = {"line_guess": line, "reflect_guess": np.sign(reflect.real)} | guesses
    return trl.solve(*free, **options)


@given(SEEDS, SHAPES)
@settings(max_examples=100)
def test_random_boxes_lines_and_reflects_are_recovered(seed, shape):
    rng = np.random.default_rng(seed)
    boxes, switch, line, reflect = case(rng, shape)
    found = solved(boxes, switch, line, reflect)
    e00, e11, e10, e01 = boxes
    np.testing.assert_allclose(found.line, line, rtol=0, atol=1e-9)
    np.testing.assert_allclose(found.reflect, reflect, rtol=0, atol=1e-9)
    np.testing.assert_allclose(found.e00, e00, rtol=0, atol=1e-9)
    np.testing.assert_allclose(found.e11, e11, rtol=0, atol=1e-9)
    np.testing.assert_allclose(found.e10e01, e10 * e01, rtol=0, atol=1e-9)
    for r, d in ((0, 1), (1, 0)):
        np.testing.assert_allclose(found.forward[..., r, d], e01[..., r] * e10[..., d], rtol=0, atol=1e-9)
    part = disk(rng, (*shape, 2, 2))
    part *= 0.98 / np.linalg.norm(part, 2, axis=(-2, -1))[..., None, None]
    terms = from_boxes(found.e00, found.e11, found.e10e01, found.forward, switch)
    np.testing.assert_allclose(correct(terms, read(boxes, part, switch)), part, rtol=0, atol=1e-9)


@given(SEEDS)
@settings(max_examples=50)
def test_guesses_need_only_be_nearer_than_the_other_root(seed):
    rng = np.random.default_rng(seed)
    boxes, switch, line, reflect = case(rng, (6,))
    off = np.exp(1j * np.radians(rng.uniform(-15, 15, 6)))
    found = solved(boxes, switch, line, reflect, line_guess=line * off * 1.1)
    np.testing.assert_allclose(found.line, line, rtol=0, atol=1e-9)
    mirrored = solved(boxes, switch, line, reflect, reflect_guess=-np.sign(reflect.real))
    np.testing.assert_allclose(mirrored.reflect, -reflect, rtol=0, atol=1e-9)


@pytest.mark.parametrize("at", ["directivity", "source match", "both"])
def test_boxes_without_reflection_lose_no_digits(at, rng):
    """The roots' quadratic degenerates for a perfect directivity or source match."""
    boxes, switch, line, reflect = case(rng, (5,))
    boxes = [b.copy() for b in boxes]
    if at != "source match":
        boxes[0][:] = 0
    if at != "directivity":
        boxes[1][:] = 0
    found = solved(boxes, switch, line, reflect)
    np.testing.assert_allclose(found.e00, boxes[0], rtol=0, atol=1e-9)
    np.testing.assert_allclose(found.e11, boxes[1], rtol=0, atol=1e-9)
    np.testing.assert_allclose(found.line, line, rtol=0, atol=1e-9)


def test_line_equal_to_the_thru_or_half_a_wave_longer_is_nan(rng):
    boxes, switch, line, reflect = case(rng, (4,))
    line[1], line[2] = 1.0, -1.0
    found = solved(boxes, switch, line, reflect)
    np.testing.assert_array_equal(np.isfinite(found.line), [True, False, False, True])
    for values in (found.e00, found.e11, found.e10e01):
        np.testing.assert_array_equal(np.isfinite(values).all(axis=-1), [True, False, False, True])


def test_switch_terms_are_taken_out_of_any_reading(rng):
    boxes, switch, _, _ = case(rng, (4,))
    s = 0.5 * disk(rng, (4, 2, 2))
    free = trl.remove_switch_terms(read(boxes, s, switch), switch)
    np.testing.assert_allclose(free, read(boxes, s, 0 * switch), rtol=0, atol=1e-12)


def test_all_readings_count_where_they_disagree(rng):
    """Twelve equations, seven unknowns: a change of any one reading must move the boxes."""
    boxes, switch, line, reflect = case(rng, (3,))
    one = np.ones_like(line)
    readings = [
        trl.remove_switch_terms(read(boxes, s, switch), switch)
        for s in (anti_diagonal(one), anti_diagonal(line), reflect[..., None, None] * np.eye(2))
    ]
    known = [{(0, 1): one, (1, 0): one}, {(0, 1): line, (1, 0): line}, {(0, 0): reflect, (1, 1): reflect}]
    exact = trl.eight_terms(readings, known)
    for number in range(3):
        for i in range(2):
            for j in range(2):
                moved = [r.copy() for r in readings]
                moved[number][..., i, j] += 1e-3
                change = max(
                    np.abs(a - b).max() for a, b in zip(trl.eight_terms(moved, known), exact, strict=True)
                )
                assert change > 1e-6, (number, i, j)


@pytest.mark.parametrize("size", [0.9, 1e-2, 3e-4, 2e-5])
def test_a_faint_reflect_still_serves_and_only_nothing_is_nan(size, rng):
    boxes, switch, line, _ = case(rng, (20,))
    reflect = np.full(20, size, dtype=complex)
    found = solved(boxes, switch, line, reflect)
    np.testing.assert_allclose(found.reflect, reflect, atol=1e-9)
    np.testing.assert_allclose(found.e00[:, 0], boxes[0][:, 0], atol=1e-6)
    assert np.isnan(solved(boxes, switch, line, 0 * reflect, reflect_guess=np.ones(20)).e00).all()
