"""Complex values brought onto another frequency grid: delay removed, local cubic, never beyond the ends."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["delay_of", "onto_grid"]


def delay_of(values: NDArray, frequency: NDArray) -> NDArray:
    """Delay whose phase -2 pi f tau follows the values best from point to point.

    Parameters
    ----------
    values : complex array of shape (..., frequency)
    frequency : array of shape (frequency,)
        [Hz], increasing.

    Returns
    -------
    array of shape (...)
        Median delay [s]; 0 where nothing can be said.
    """
    if frequency.size < 2:
        return np.zeros(values.shape[:-1])
    turn = np.angle(values[..., 1:] * np.conj(values[..., :-1])) / (2 * np.pi * np.diff(frequency))
    nothing = ~np.isfinite(turn).any(axis=-1, keepdims=True)
    return -np.nanmedian(np.where(nothing, 0.0, turn), axis=-1)


def onto_grid(values: NDArray, frequency: NDArray, target: NDArray) -> NDArray:
    """Values at other frequencies: delay removed, cubic through the four nearest points, delay put back.

    Parameters
    ----------
    values : complex array of shape (..., frequency)
    frequency : array of shape (frequency,)
        [Hz], increasing.
    target : array of shape (target,)
        [Hz], within the range of `frequency`.

    Returns
    -------
    complex array of shape (..., target)
        Equal to the values where a target is a point of the grid; NaN spreads no further than four points.
    """
    delay = delay_of(values, frequency)[..., None]
    straight = values * np.exp(2j * np.pi * frequency * delay)
    count = min(4, frequency.size)
    first = np.clip(np.searchsorted(frequency, target, side="right") - 2, 0, frequency.size - count)
    index = first[:, None] + np.arange(count)
    nodes = frequency[index]
    # Lagrange weights, product over the other nodes.
    above = target[:, None, None] - nodes[:, None, :]
    below = nodes[:, :, None] - nodes[:, None, :]
    own = np.eye(count, dtype=bool)
    weights = np.where(own, 1.0, above / np.where(own, 1.0, below)).prod(axis=-1)
    out = (straight[..., index] * weights).sum(axis=-1) * np.exp(-2j * np.pi * target * delay)
    place = np.clip(np.searchsorted(frequency, target), 0, frequency.size - 1)
    return np.where(frequency[place] == target, values[..., place], out)
