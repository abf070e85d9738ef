"""What S-parameters in real reference impedances say of a part: gain, loss, reciprocity, three-way law."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "dissipation",
    "dissipation_floor",
    "lossless_error",
    "power_balance",
    "reciprocity_error",
    "reflection_sum",
    "singular_values",
    "three_way_floor",
]


def singular_values(s: NDArray) -> NDArray:
    """Singular values, largest first; the largest is the gain ceiling of the part.

    Parameters
    ----------
    s : complex array of shape (..., n, n)

    Returns
    -------
    array of shape (..., n)
        NaN where s holds anything that is not a number.
    """
    finite = np.isfinite(s).all(axis=(-2, -1))
    values = np.linalg.svd(np.where(finite[..., None, None], s, 0.0), compute_uv=False)
    return np.where(finite[..., None], values, np.nan)


def power_balance(s: NDArray) -> NDArray:
    """Power that leaves all ports for unit power into one, ``sum_r |S_rd|^2``, shape (..., n)."""
    return (np.abs(s) ** 2).sum(axis=-2)


def lossless_error(values: NDArray) -> NDArray:
    """Spectral norm of ``S^H S - 1`` from the singular values: ``max |s_i^2 - 1|``, shape (...)."""
    return np.abs(values**2 - 1.0).max(axis=-1)


def dissipation(values: NDArray) -> NDArray:
    """Share of power lost inside, mean over driven ports: ``1 - sum s_i^2 / n``, shape (...)."""
    return 1.0 - (values**2).mean(axis=-1)


def reciprocity_error(s: NDArray) -> NDArray:
    """``|S_rd - S_dr|``, shape (..., n, n)."""
    return np.abs(s - s.swapaxes(-1, -2))


def reflection_sum(s: NDArray) -> NDArray:
    """Sum of the reflection magnitudes, shape (...)."""
    return np.abs(np.diagonal(s, axis1=-2, axis2=-1)).sum(axis=-1)


def three_way_floor(values: NDArray) -> NDArray:
    """Least sum of reflection magnitudes of a reciprocal three-port with these singular values.

    Parameters
    ----------
    values : array of shape (..., 3)
        Largest first.

    Returns
    -------
    array of shape (...)
        ``s2 + s3 - s1``; 1 for a lossless part, negative where it says nothing.

    References
    ----------
    Thompson 1979, Linear Algebra Appl. 26: singular values and diagonal of a complex symmetric matrix.
    """
    return values[..., 1] + values[..., 2] - values[..., 0]


def dissipation_floor(reflections: NDArray) -> NDArray:
    """Least mean dissipation of a reciprocal, passive three-port, ``(1 - m^2) / 3``.

    Parameters
    ----------
    reflections : array of shape (...)
        Sum m of the reflection magnitudes.

    Returns
    -------
    array of shape (...)
        Share of power, mean over driven ports; 0 for m >= 1. From `three_way_floor`: with s1 <= 1 the largest
        sum of squares is reached at s = (1, 1, m).
    """
    return np.maximum(0.0, 1.0 - reflections**2) / 3.0
