"""Curves thinned to the pixels they are drawn on, extremes kept."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["ENOUGH", "thin"]

ENOUGH = 1600
"""Points a curve may have before it is thinned."""


def thin(x: ArrayLike, *values: ArrayLike, pixels: int = 700, enough: int = ENOUGH) -> NDArray:
    """Indices of the points worth drawing.

    In each column of pixels the first and last point and the lowest and highest of every value stay, and so
    do points without a value beside ones that have one: peaks, notches and gaps look as they did.

    Parameters
    ----------
    x : array of shape (point,)
        Increasing.
    *values : arrays of shape (point,)
        Drawn over x, or (reflection chart) against one another.
    pixels : int
        Columns of pixels under the curve.
    enough : int
        Curves of at most so many points stay whole.

    Returns
    -------
    int array of shape (kept,)
        Increasing.
    """
    x = np.asarray(x, dtype=float)
    if x.size <= enough:
        return np.arange(x.size)
    column = np.minimum(((x - x[0]) / (x[-1] - x[0]) * pixels).astype(int), pixels - 1)
    edge = np.flatnonzero(np.diff(column))
    kept = [np.array([0, x.size - 1]), edge, edge + 1]
    for value in values:
        value = np.asarray(value, dtype=float)
        lost = ~np.isfinite(value)
        turn = np.flatnonzero(np.diff(lost))
        kept += [turn, turn + 1]
        for sign in (1.0, -1.0):
            order = np.lexsort((np.where(lost, np.inf, sign * value), column))
            first = np.concatenate([[0], np.flatnonzero(np.diff(column[order])) + 1])
            kept.append(order[first])
    return np.unique(np.concatenate(kept))
