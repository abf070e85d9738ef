"""Small linear least squares at every frequency at once, for sparse rows.

The unknowns are few and the frequencies many, so the loops run over unknowns and every operation is on a whole sweep.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["solve_rows"]


def solve_rows(
    row_terms: Sequence[Mapping[int, NDArray | float]], right_terms: Sequence[NDArray | float], order: int
) -> list[NDArray]:
    """Least-squares solution of linear equations given row by row.

    Parameters
    ----------
    row_terms : sequence of mappings unknown -> complex array of shape (...) or number
        The coefficients that are not zero, one mapping per equation.
    right_terms : sequence of complex arrays of shape (...) or numbers
        Right-hand sides.
    order : int
        Number of unknowns.

    Returns
    -------
    list of complex arrays of shape (...)
        NaN where the equations do not determine the unknowns.

    Notes
    -----
    Normal equations and Cholesky: fit for well scaled equations of a calibration (condition below about 1e4,
    which leaves eight digits and more).
    """
    shape = np.broadcast_shapes(*(np.shape(c) for terms in row_terms for c in terms.values()))
    gram: dict[tuple[int, int], Any] = {}
    right = [np.zeros(shape, dtype=complex) for _ in range(order)]
    for terms, known in zip(row_terms, right_terms, strict=True):
        for column, coefficient in terms.items():
            conjugate = np.conj(coefficient)
            if not (np.isscalar(known) and known == 0):
                right[column] = right[column] + conjugate * known
            for other_column, other in terms.items():
                if other_column <= column:
                    product: Any = conjugate * other
                    key = (column, other_column)
                    gram[key] = gram[key] + product if key in gram else product
    return _cholesky_solve(gram, right, order, shape)


def _cholesky_solve(
    gram: Mapping[tuple[int, int], Any],
    right: Sequence[NDArray],
    order: int,
    shape: tuple[int, ...],
) -> list[NDArray]:
    lower: dict[tuple[int, int], NDArray] = {}
    upper: dict[tuple[int, int], NDArray] = {}  # its conjugates
    good = np.ones(shape, dtype=bool)
    # A complex division costs as much as ten products: the pivots are inverted once, as real numbers.
    scale: list[NDArray] = []
    with np.errstate(all="ignore"):
        for j in range(order):
            whole = np.real(gram[j, j])
            pivot = whole
            for k_order in range(j):
                if (j, k_order) in lower:
                    part = lower[j, k_order]
                    pivot = pivot - (part.real**2 + part.imag**2)
            good &= pivot > 1e-13 * whole
            scale.append(1.0 / np.sqrt(pivot))
            for i_order in range(j + 1, order):
                total = gram.get((i_order, j))
                for k_order in range(j):
                    if (i_order, k_order) in lower and (j, k_order) in lower:
                        product = lower[i_order, k_order] * upper[j, k_order]
                        total = -product if total is None else total - product
                if total is not None:
                    lower[i_order, j] = np.asarray(total * scale[j])
                    upper[i_order, j] = np.conj(lower[i_order, j])
        terms = list(right)
        for j in range(order):
            for k_order in range(j):
                if (j, k_order) in lower:
                    terms[j] = terms[j] - lower[j, k_order] * terms[k_order]
            terms[j] = terms[j] * scale[j]
        for j in reversed(range(order)):
            for k_order in range(j + 1, order):
                if (k_order, j) in lower:
                    terms[j] = terms[j] - upper[k_order, j] * terms[k_order]
            terms[j] = terms[j] * scale[j]
        if good.all():
            return terms
        return [np.where(good, value, np.nan) for value in terms]
