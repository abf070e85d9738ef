"""Inverse and solve of stacks of small complex matrices; what is singular becomes NaN, never an exception.

Up to three rows the inverse is written out (adjugate over determinant): at 10 000 frequencies that is several
times faster than one LAPACK call per matrix. Larger ones go to LAPACK.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["NO_DIGITS", "diagonal_matrix", "inverse", "solve"]

# A determinant below this share of Hadamard's bound has no correct digit left in double precision.
NO_DIGITS = 1e-15


def diagonal_matrix(values: NDArray) -> NDArray:
    """Diagonal matrices.

    Parameters
    ----------
    values : array of shape (..., n)
        Diagonals.

    Returns
    -------
    array of shape (..., n, n)
    """
    values = np.asarray(values)
    return values[..., :, None] * np.eye(values.shape[-1], dtype=values.dtype)


def _adjugate(a: NDArray) -> tuple[NDArray, NDArray]:
    n = a.shape[-1]
    adjugate = np.empty_like(a)
    if n == 1:
        adjugate[...] = 1.0
        return adjugate, a[..., 0, 0]
    if n == 2:
        adjugate[..., 0, 0], adjugate[..., 1, 1] = a[..., 1, 1], a[..., 0, 0]
        adjugate[..., 0, 1], adjugate[..., 1, 0] = -a[..., 0, 1], -a[..., 1, 0]
        return adjugate, a[..., 0, 0] * a[..., 1, 1] - a[..., 0, 1] * a[..., 1, 0]
    for i in range(3):
        for j in range(3):
            r, s = (j + 1) % 3, (j + 2) % 3
            p, q = (i + 1) % 3, (i + 2) % 3
            adjugate[..., i, j] = a[..., r, p] * a[..., s, q] - a[..., r, q] * a[..., s, p]
    determinant = (
        a[..., 0, 0] * adjugate[..., 0, 0]
        + a[..., 0, 1] * adjugate[..., 1, 0]
        + a[..., 0, 2] * adjugate[..., 2, 0]
    )
    return adjugate, determinant


def inverse(a: NDArray) -> NDArray:
    """Inverse of each matrix; NaN where a matrix is singular to double precision.

    Parameters
    ----------
    a : complex array of shape (..., n, n)

    Returns
    -------
    complex array of shape (..., n, n)
    """
    a = np.asarray(a, dtype=complex)
    n = a.shape[-1]
    if n == 0 or a.size == 0:
        return a.copy()
    if n > 3:
        return _inverse_lapack(a)
    with np.errstate(all="ignore"):
        adjugate, determinant = _adjugate(a)
        bound = np.sqrt((np.abs(a) ** 2).sum(axis=-1)).prod(axis=-1)
        good = np.abs(determinant) > NO_DIGITS * bound
        reciprocal = np.where(good, 1.0 / np.where(good, determinant, 1.0), np.nan)
        return adjugate * reciprocal[..., None, None]


def _inverse_lapack(a: NDArray) -> NDArray:
    with np.errstate(all="ignore"):
        finite = np.isfinite(a).all(axis=(-2, -1))
        safe = np.where(finite[..., None, None], a, np.eye(a.shape[-1]))
        rows = np.sqrt((np.abs(safe) ** 2).sum(axis=-1)).prod(axis=-1)
        good = finite & (np.abs(np.linalg.det(safe)) > NO_DIGITS * rows)
        safe = np.where(good[..., None, None], safe, np.eye(a.shape[-1]))
        return np.where(good[..., None, None], np.linalg.inv(safe), np.nan)


def solve(a: NDArray, b: NDArray) -> NDArray:
    """Solution x of ``a x = b`` for each matrix; NaN where a matrix is singular.

    Parameters
    ----------
    a : complex array of shape (..., n, n)
    b : complex array of shape (..., n, m)

    Returns
    -------
    complex array of shape (..., n, m)
    """
    with np.errstate(invalid="ignore"):
        return inverse(a) @ b
