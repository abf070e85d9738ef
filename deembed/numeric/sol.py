"""One-port calibration from three or more known reflections."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.linalg import inverse

__all__ = ["reflection_terms", "seen_reflection"]

# A tracking below this share of the terms whose difference it is holds no digit that counts.
_NO_TRACKING = 1e-11


def reflection_terms(
    measured: NDArray, known: NDArray, weights: NDArray | None = None
) -> tuple[NDArray, NDArray, NDArray]:
    """Directivity, source match and reflection tracking from known reflections.

    Parameters
    ----------
    measured : complex array of shape (..., standard)
        Readings.
    known : complex array of shape (..., standard)
        True reflections.
    weights : array of shape (..., standard), optional
        Weight of each equation in the least squares (inverse standard deviation); equal when not given.

    Returns
    -------
    directivity, source_match, reflection_tracking : complex arrays of shape (...)
        Exact for three standards, least squares for more; NaN where the standards do not differ enough.

    References
    ----------
    Rytting 2001, ARFTG short course: M = e00 + G M e11 - G (e00 e11 - e10e01), linear in its unknowns.
    """
    measured, known = np.broadcast_arrays(measured, known)
    rows = np.stack([np.ones_like(measured), known * measured, -known], axis=-1)
    right = measured[..., None]
    if weights is not None:
        rows, right = rows * weights[..., None], right * weights[..., None]
    if rows.shape[-2] > 3:
        adjoint = rows.conj().swapaxes(-1, -2)
        rows, right = adjoint @ rows, adjoint @ right
    x = (inverse(rows) @ right)[..., 0]
    directivity, source_match = x[..., 0], x[..., 1]
    product = directivity * source_match
    tracking = product - x[..., 2]
    # Two standards that are alike, or read alike, leave no tracking at all: the linear equations do not see that.
    with np.errstate(invalid="ignore"):
        lost = np.abs(tracking) <= _NO_TRACKING * (np.abs(product) + np.abs(x[..., 2]))
    directivity, source_match, tracking = (
        np.where(lost, np.nan, v) for v in (directivity, source_match, tracking)
    )
    return directivity, source_match, tracking


def seen_reflection(
    measured: NDArray, directivity: NDArray, source_match: NDArray, reflection_tracking: NDArray
) -> NDArray:
    """True reflection behind an error box: ``(M - e00) / (e10e01 + e11 (M - e00))``, broadcast."""
    rest = measured - directivity
    with np.errstate(divide="ignore", invalid="ignore"):
        return rest / (reflection_tracking + source_match * rest)
