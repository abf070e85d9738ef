"""One-port calibration from three or more known reflections."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.linalg import inverse

__all__ = ["reflection_terms", "seen_reflection"]

# A tracking below this share of the terms whose difference it is holds no digit that counts.
_NO_TRACKING = 1e-11


def reflection_terms(
    measured: Sequence[NDArray], known: Sequence[NDArray], weights: Sequence[NDArray | float] | None = None
) -> tuple[NDArray, NDArray, NDArray]:
    """Directivity, source match and reflection tracking from known reflections.

    Parameters
    ----------
    measured : sequence over standards of complex arrays of shape (...)
        Readings, three or more.
    known : sequence over standards of complex arrays of shape (...)
        True reflections.
    weights : sequence over standards of arrays of shape (...), optional
        Weight of each equation in the least squares (inverse standard deviation); equal when not given.

    Returns
    -------
    directivity, source_match, reflection_tracking : complex arrays of shape (...)
        Exact for three standards, least squares for more; NaN where the standards do not differ enough.

    References
    ----------
    Rytting 2001, ARFTG short course: M = e00 + G M e11 - G (e00 e11 - e10e01), linear in its unknowns.
    """
    with np.errstate(all="ignore"):
        if len(measured) == 3:
            directivity, source_match, rest = _three(measured, known)
        else:
            directivity, source_match, rest = _many(measured, known, weights)
        product = directivity * source_match
        tracking = product - rest
        # Two standards that are alike, or read alike, leave no tracking at all: linear equations do not see that.
        good = np.abs(tracking) > _NO_TRACKING * (np.abs(product) + np.abs(rest))
    if good.all():
        return directivity, source_match, tracking
    directivity, source_match, tracking = (
        np.where(good, v, np.nan) for v in (directivity, source_match, tracking)
    )
    return directivity, source_match, tracking


def _three(measured: Sequence[NDArray], known: Sequence[NDArray]) -> tuple[NDArray, NDArray, NDArray]:
    """The third equation taken off the other two leaves a_i e11 - g_i (e00 e11 - e10e01) = m_i."""
    (m1, m2, m3), (g1, g2, g3) = measured, known
    last = g3 * m3
    a1, a2 = g1 * m1 - last, g2 * m2 - last
    g1, g2, m1, m2 = g1 - g3, g2 - g3, m1 - m3, m2 - m3
    scale = 1.0 / (a2 * g1 - a1 * g2)
    source_match = (g1 * m2 - g2 * m1) * scale
    rest = (a1 * m2 - a2 * m1) * scale
    return m3 - last * source_match + g3 * rest, source_match, rest


def _many(
    measured: Sequence[NDArray], known: Sequence[NDArray], weights: Sequence[NDArray | float] | None
) -> tuple[NDArray, NDArray, NDArray]:
    m, g = np.broadcast_arrays(
        np.stack(np.broadcast_arrays(*measured), -1), np.stack(np.broadcast_arrays(*known), -1)
    )
    rows, right = np.stack([np.ones_like(m), g * m, -g], axis=-1), m[..., None]
    if weights is not None:
        w = np.stack(np.broadcast_arrays(*weights), axis=-1)[..., None]
        rows, right = rows * w, right * w
    adjoint = rows.conj().swapaxes(-1, -2)
    x = (inverse(adjoint @ rows) @ (adjoint @ right))[..., 0]
    return x[..., 0], x[..., 1], x[..., 2]


def seen_reflection(
    measured: NDArray, directivity: NDArray, source_match: NDArray, reflection_tracking: NDArray
) -> NDArray:
    """True reflection behind an error box: ``(M - e00) / (e10e01 + e11 (M - e00))``, broadcast."""
    rest = measured - directivity
    with np.errstate(divide="ignore", invalid="ignore"):
        return rest / (reflection_tracking + source_match * rest)
