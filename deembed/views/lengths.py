"""Electrical lengths from the slope of a phase, robust against noise, notches and coarse grids."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["delay_over", "group_delay"]


def _steps(values: NDArray, frequency: NDArray, lag: int) -> tuple[NDArray, NDArray]:
    """Local delays [s] over `lag` points and their weights."""
    turn = values[lag:] * np.conj(values[:-lag])
    good = np.isfinite(turn) & (np.abs(turn) > 0)
    step = 2 * np.pi * (frequency[lag:] - frequency[:-lag])
    return -np.angle(turn[good]) / step[good], np.abs(turn[good])


def _weighted_median(values: NDArray, weights: NDArray) -> float:
    order = np.argsort(values)
    total = np.cumsum(weights[order])
    return float(values[order][np.searchsorted(total, total[-1] / 2)])


def delay_over(values: ArrayLike, frequency: ArrayLike) -> float:
    """Delay of a response over its whole band: the weighted median of its phase slope.

    Parameters
    ----------
    values : complex array of shape (frequency,)
    frequency : array of shape (frequency,)
        [Hz]

    Returns
    -------
    float
        [s]; NaN with fewer than two usable points. A delay over half a turn per frequency step is ambiguous;
        as cables delay, the answer lies between -0.1 and 0.9 turns per (median) step.

    Notes
    -----
    First from neighbours, then, that delay taken off, from points an eighth of the sweep apart, which divides
    the noise by that distance. Common practice, no source.
    """
    values, frequency = np.asarray(values, dtype=complex), np.asarray(frequency, dtype=float)
    if values.size < 2:
        return float("nan")
    local, weight = _steps(values, frequency, 1)
    if not local.size:
        return float("nan")
    turn = 1 / float(np.median(np.diff(frequency)))
    local = np.where(local < -0.1 * turn, local + turn, local)
    coarse = _weighted_median(local, weight)
    lag = max(values.size // 8, 1)
    left, weight = _steps(values * np.exp(2j * np.pi * frequency * coarse), frequency, lag)
    return coarse + (_weighted_median(left, weight) if left.size else 0.0)


def group_delay(values: ArrayLike, frequency: ArrayLike, *, aperture: int = 1) -> NDArray:
    """Group delay, minus the slope of the phase over angular frequency.

    Parameters
    ----------
    values : complex array of shape (frequency,)
    frequency : array of shape (frequency,)
        [Hz]
    aperture : int
        Grid steps on either side the slope is taken over; one-sided at the ends of the sweep.

    Returns
    -------
    float array of shape (frequency,)
        [s]; NaN where the aperture holds a point without a value, or there is one point only.
    """
    values, frequency = np.asarray(values, dtype=complex), np.asarray(frequency, dtype=float)
    n = values.size
    if n < 2:
        return np.full(n, np.nan)
    turn = values[1:] * np.conj(values[:-1])
    lost = ~np.isfinite(turn) | (np.abs(turn) == 0)
    phase = np.concatenate([[0.0], np.cumsum(np.where(lost, 0.0, np.angle(np.where(lost, 1.0, turn))))])
    holes = np.concatenate([[0], np.cumsum(lost)])
    low = np.maximum(np.arange(n) - aperture, 0)
    high = np.minimum(np.arange(n) + aperture, n - 1)
    slope = -(phase[high] - phase[low]) / (2 * np.pi * (frequency[high] - frequency[low]))
    return np.where(holes[high] > holes[low], np.nan, slope)
