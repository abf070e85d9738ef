"""Pairs followed through third ports, on plain arrays made from boxes and switch terms."""

import numpy as np
import pytest

from deembed.numeric.error_terms import Terms, from_boxes
from deembed.numeric.thru_chain import complete_pairs, load_match_spread


def true_terms(rng, n=4, f=5):
    def draw(*shape, size=0.3):
        return size * (rng.normal(size=shape) + 1j * rng.normal(size=shape))

    e10, e01 = 1 + draw(f, n), 1 + draw(f, n)
    forward = e01[..., :, None] * e10[..., None, :]
    return from_boxes(draw(f, n), draw(f, n), e10 * e01, forward, draw(f, n))


def hidden(terms, known):
    def hide(a):
        return np.where(known, a, np.nan)

    return Terms(
        terms.directivity,
        terms.source_match,
        terms.reflection_tracking,
        hide(terms.load_match),
        hide(terms.transmission_tracking),
        terms.isolation,
    )


@pytest.mark.parametrize(
    "pairs", [[(0, 1), (1, 2), (2, 3)], [(0, 1), (0, 2), (0, 3)], [(0, 3), (3, 1), (1, 2), (2, 0)]]
)
def test_a_connected_set_gives_every_pair(rng, pairs):
    terms = true_terms(rng)
    known = np.zeros((4, 4), dtype=bool)
    for a, b in pairs:
        known[a, b] = known[b, a] = True
    found = complete_pairs(hidden(terms, known), known)
    off = ~np.eye(4, dtype=bool)
    for name in ("load_match", "transmission_tracking"):
        np.testing.assert_allclose(getattr(found, name)[..., off], getattr(terms, name)[..., off], atol=1e-10)


def test_what_is_not_connected_stays_unknown(rng):
    known = np.zeros((4, 4), dtype=bool)
    known[0, 1] = known[1, 0] = known[2, 3] = known[3, 2] = True
    found = complete_pairs(hidden(true_terms(rng), known), known)
    assert np.isnan(found.transmission_tracking[..., 0, 2]).all()


def test_spread_is_the_largest_difference_to_the_mean(rng):
    terms = true_terms(rng, n=3)
    known = ~np.eye(3, dtype=bool)
    np.testing.assert_allclose(load_match_spread(terms, known), 0, atol=1e-15)
    terms.load_match[:, 0, 1] += 0.2
    np.testing.assert_allclose(load_match_spread(terms, known)[:, 0], 0.1, atol=1e-12)
    known[0, 2] = False
    assert (load_match_spread(terms, known)[:, 0] == 0).all()
