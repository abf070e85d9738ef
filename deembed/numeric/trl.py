"""Thru-reflect-line: error boxes from standards of which only the thru is known."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.blocks import in_blocks
from deembed.numeric.least_squares import solve_rows
from deembed.numeric.linalg import inverse
from deembed.numeric.sparams import s_to_t

__all__ = ["Boxes", "eight_terms", "line_ratio", "reflect_found", "remove_switch_terms", "solve"]


@dataclass(frozen=True)
class Boxes:
    """Error boxes of two ports, and what TRL found besides.

    Parameters
    ----------
    e00, e11, e10e01 : complex arrays of shape (..., 2)
        Reflection terms of each box: directivity, source match, reflection tracking.
    forward : complex array of shape (..., 2, 2)
        e10 of the driving box times e01 of the receiving one (receive, drive).
    line : complex array of shape (...)
        Transmission of the line over that of the thru, ``exp(-gamma (l_line - l_thru))``.
    reflect : complex array of shape (...)
        The reflect's reflection.
    """

    e00: NDArray
    e11: NDArray
    e10e01: NDArray
    forward: NDArray
    line: NDArray
    reflect: NDArray


def remove_switch_terms(raw: NDArray, switch_terms: NDArray) -> NDArray:
    """Readings as an analyzer with perfect terminations would have taken them.

    Parameters
    ----------
    raw : complex array of shape (..., 2, 2)
    switch_terms : complex array of shape (..., 2)
        a_r / b_r at port r while the other drives.

    Returns
    -------
    complex array of shape (..., 2, 2)

    References
    ----------
    Marks 1997, 50th ARFTG. With port d driven, waves into the ports are (1, G_r M_rd): M = B A^-1.
    """
    a = np.zeros(np.broadcast_shapes(raw.shape, (*switch_terms.shape, 2)), dtype=complex)
    a[..., 0, 0] = a[..., 1, 1] = 1.0
    a[..., 1, 0] = switch_terms[..., 1] * raw[..., 1, 0]
    a[..., 0, 1] = switch_terms[..., 0] * raw[..., 0, 1]
    return raw @ inverse(a)


def line_ratio(thru: NDArray, line: NDArray, guess: NDArray) -> tuple[NDArray, NDArray, NDArray]:
    """Transmission of line over thru, and the two ratios of port 1's box that they give.

    Parameters
    ----------
    thru, line : complex arrays of shape (..., 2, 2)
        Wave-transfer matrices of the readings.
    guess : complex array of shape (...)
        Expected ratio, good to within the choice between it and its inverse.

    Returns
    -------
    ratio, directivity, match_ratio : complex arrays of shape (...)
        ``exp(-gamma dl)``; e00 of port 1; e11 / (e00 e11 - e10e01) of port 1.

    References
    ----------
    Engen & Hoer 1979, IEEE Trans. MTT 27(12): Q = M_line M_thru^-1 = X L X^-1; the ratios of the rows of its
    eigenvectors are the roots of q21 v^2 + (q22 - q11) v - q12 = 0, taken in the form that loses no digits.
    """
    q = line @ inverse(thru)
    q11, q12, q21, q22 = q[..., 0, 0], q[..., 0, 1], q[..., 1, 0], q[..., 1, 1]
    half = (q22 - q11) / 2.0
    with np.errstate(all="ignore"):
        root = np.sqrt(half**2 + q12 * q21)
        t = -(half + np.where((half * root.conj()).real < 0, -root, root))
        small, big_inverse = -q12 / t, q21 / t
        at_small, at_big = q22 + q21 * small, q22 + t
        # The box's second column goes with exp(+gamma dl), the inverse of the ratio.
        straight = np.abs(at_big - guess) + np.abs(1 / at_small - guess)
        crossed = np.abs(at_small - guess) + np.abs(1 / at_big - guess)
        keep = straight <= crossed
        # v = q12 / -t is the smaller root: where it is not the directivity, the larger one is.
        directivity = np.where(keep, small, 1 / np.where(big_inverse == 0, np.nan, big_inverse))
        match_ratio = np.where(keep, big_inverse, 1 / np.where(small == 0, np.nan, small))
        return np.where(keep, at_big, at_small), directivity, match_ratio


def reflect_found(
    thru: NDArray,
    reflections: tuple[NDArray, NDArray],
    directivity: NDArray,
    match_ratio: NDArray,
    guess: NDArray,
) -> NDArray:
    """The reflect, the same at both ports, of the sign nearer to a guess, shape (...).

    References
    ----------
    Engen & Hoer 1979: with X = [[a, b], [c, 1]] port 1 gives G a = h1 and port 2 gives G / a = h2; so G^2 = h1 h2.
    """
    w1, w2 = reflections
    m11, m12, m21, m22 = thru[..., 0, 0], thru[..., 0, 1], thru[..., 1, 0], thru[..., 1, 1]
    with np.errstate(all="ignore"):
        h1 = (w1 - directivity) / (1.0 - w1 * match_ratio)
        h2 = (m21 - match_ratio * m11 + (m22 - match_ratio * m12) * w2) / (
            m11 - directivity * m21 + (m12 - directivity * m22) * w2
        )
        g = np.sqrt(h1 * h2)
    return np.where(np.abs(g - guess) <= np.abs(g + guess), g, -g)


def eight_terms(
    readings_of_standards: list[NDArray], standards: list[dict[tuple[int, int], NDArray | float]]
) -> tuple[NDArray, NDArray, NDArray, NDArray]:
    """Two error boxes from two-port standards that are all known, least squares over every reading.

    Parameters
    ----------
    readings_of_standards : list of complex arrays of shape (..., 2, 2)
        Free of switch terms.
    standards : list of mappings (i, j) -> complex array of shape (...) or number
        S-parameters of each standard that are not zero.

    Returns
    -------
    e00, e11, e10e01 : complex arrays of shape (..., 2)
    forward : complex array of shape (..., 2, 2)

    References
    ----------
    Rytting 2001, ARFTG short course (eight-term model): M (T3 S + T4) = T1 S + T2 with diagonal blocks
    T1 = (-D1, -k D2), T2 = (e00_1, k e00_2), T3 = -(e11_1, k e11_2), T4 = (1, k), D = e00 e11 - e10e01:
    twelve equations for seven unknowns where three standards are read.
    """
    row_terms: list[dict[int, NDArray | float]] = []
    right_terms: list[NDArray | float] = []
    for reading, s in zip(readings_of_standards, standards, strict=True):
        m = np.ascontiguousarray(np.moveaxis(reading, (-2, -1), (0, 1)))
        for i in range(2):
            for j in range(2):
                terms: dict[int, NDArray | float] = {}
                if i == j:
                    terms[0 if i == 0 else 3] = 1.0
                if (i, j) in s:
                    terms[2 if i == 0 else 5] = -s[i, j]
                for port in range(2):
                    if (port, j) in s:
                        terms[1 if port == 0 else 4] = m[i, port] * s[port, j]
                if j == 1:
                    terms[6] = -m[i, 1]
                row_terms.append(terms)
                right_terms.append(m[i, 0] if j == 0 else 0.0)
    e00, e11, d1, k_e00, k_e11, k_d2, k = solve_rows(row_terms, right_terms, 7)
    with np.errstate(all="ignore"):
        first = (e00, e11, e00 * e11 - d1)
        second = (k_e00 / k, k_e11 / k, (k_e00 / k) * (k_e11 / k) - k_d2 / k)
        boxes = [np.stack(pair, axis=-1) for pair in zip(first, second, strict=True)]
        forward = np.zeros((*k.shape, 2, 2), dtype=complex)
        forward[..., 1, 0], forward[..., 0, 1] = k * second[2], first[2] / k
    return boxes[0], boxes[1], boxes[2], forward


def solve(
    thru: NDArray, line: NDArray, reflect: NDArray, *, line_guess: NDArray, reflect_guess: NDArray
) -> Boxes:
    """TRL with reference planes in the middle of the thru and the line's impedance as reference.

    Parameters
    ----------
    thru, line, reflect : complex arrays of shape (..., 2, 2)
        Readings free of switch terms.
    line_guess : complex array of shape (...)
        Expected transmission of line over thru.
    reflect_guess : complex array of shape (...)
        Expected reflection; only its sign counts.

    Returns
    -------
    Boxes
        NaN where line and thru do not differ.

    Notes
    -----
    Line and reflect are found in closed form (Engen & Hoer 1979). The readings then hold twelve equations for
    seven unknowns; the boxes are their least-squares solution, so that no reading is thrown away.
    """
    found = in_blocks(_solve, thru, line, reflect, line_guess, reflect_guess, core=(2, 2, 2, 0, 0))
    return Boxes(*found)


def _solve(
    thru: NDArray, line: NDArray, reflect: NDArray, line_guess: NDArray, reflect_guess: NDArray
) -> tuple[NDArray, ...]:
    t_thru, t_line = s_to_t(thru), s_to_t(line)
    ratio, directivity, match_ratio = line_ratio(t_thru, t_line, line_guess)
    own = (reflect[..., 0, 0], reflect[..., 1, 1])
    with np.errstate(all="ignore"):
        # Two eigenvalues that coincide leave the box open: below this difference no digit is left.
        ratio = np.where(np.abs(ratio - 1 / ratio) > 1e-9, ratio, np.nan)
        g = reflect_found(t_thru, own, directivity, match_ratio, reflect_guess)
        # A reflect of nothing: what rounding errors leave of it is below this.
        g = np.where(np.abs(g) > 1e-6, g, np.nan)
    standards: list[dict[tuple[int, int], NDArray | float]] = [{(0, 1): 1.0, (1, 0): 1.0}]
    standards += [{(0, 1): ratio, (1, 0): ratio}, {(0, 0): g, (1, 1): g}]
    return (*eight_terms([thru, line, reflect], standards), ratio, g)
