"""Error terms of an analyzer with any number of ports: correct, predict, check, convert.

One-index terms have shape ``(..., n)`` (drive last), two-index terms ``(..., n, n)`` (receive, drive); the diagonal
of a two-index term means nothing and is ignored.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.linalg import NO_DIGITS, inverse

__all__ = ["Terms", "correct", "from_boxes", "implied_switch_terms", "part_waves", "predict", "redundancy"]


@dataclass(frozen=True)
class Terms:
    """Error terms of an n-port analyzer.

    Parameters
    ----------
    directivity, source_match, reflection_tracking : complex arrays of shape (..., n)
    load_match, transmission_tracking, isolation : complex arrays of shape (..., n, n)
        Receive, drive; the diagonal is ignored.
    """

    directivity: NDArray
    source_match: NDArray
    reflection_tracking: NDArray
    load_match: NDArray
    transmission_tracking: NDArray
    isolation: NDArray


def part_waves(terms: Terms, raw: NDArray) -> tuple[NDArray, NDArray]:
    """Waves at the part, per drive, scaled to a unit incident wave of the ideal source.

    Parameters
    ----------
    terms : Terms
    raw : complex array of shape (..., n, n)
        Readings, receive by drive.

    Returns
    -------
    a, b : complex arrays of shape (..., n, n)
        Waves into and out of the part's ports (rows) for each drive (columns).

    References
    ----------
    Rytting 2001, ARFTG short course (twelve-term model), written per drive d and receive r:
    b_d = (M_dd - directivity_d) / reflection_tracking_d, a_d = 1 + source_match_d b_d,
    b_r = (M_rd - isolation_rd) / transmission_tracking_rd, a_r = load_match_rd b_r.
    """
    n = raw.shape[-1]
    own = np.arange(n)
    with np.errstate(divide="ignore", invalid="ignore"):
        b = (raw - terms.isolation) / terms.transmission_tracking
        b[..., own, own] = (raw[..., own, own] - terms.directivity) / terms.reflection_tracking
        a = terms.load_match * b
        a[..., own, own] = 1.0 + terms.source_match * b[..., own, own]
    return a, b


def correct(terms: Terms, raw: NDArray) -> NDArray:
    """S-parameters from readings with every port driven in turn: ``S = B A^-1``.

    Parameters
    ----------
    terms : Terms
    raw : complex array of shape (..., n, n)

    Returns
    -------
    complex array of shape (..., n, n)
        NaN where a term is NaN or the waves do not determine S.
    """
    a, b = part_waves(terms, raw)
    return _two_ports(a, b) if raw.shape[-1] == 2 else b @ inverse(a)


def _two_ports(a: NDArray, b: NDArray) -> NDArray:
    """``B A^-1`` written out: a third of the time of inverse and product."""
    a11, a12, a21, a22 = a[..., 0, 0], a[..., 0, 1], a[..., 1, 0], a[..., 1, 1]
    with np.errstate(divide="ignore", invalid="ignore"):
        determinant = a11 * a22 - a12 * a21
        size = np.hypot(np.abs(a11), np.abs(a12)) * np.hypot(np.abs(a21), np.abs(a22))
        below = 1.0 / np.where(np.abs(determinant) > NO_DIGITS * size, determinant, np.nan)
        s = np.empty_like(b)
        for port in range(2):
            b1, b2 = b[..., port, 0], b[..., port, 1]
            s[..., port, 0] = (b1 * a22 - b2 * a21) * below
            s[..., port, 1] = (b2 * a11 - b1 * a12) * below
    return s


def predict(terms: Terms, s: NDArray) -> NDArray:
    """What the analyzer would read of a part: the inverse of `correct`.

    Parameters
    ----------
    terms : Terms
    s : complex array of shape (..., n, n)

    Returns
    -------
    complex array of shape (..., n, n)
        Readings, receive by drive; NaN columns for drives without terms.

    Notes
    -----
    For drive d the waves leaving the part obey b = S (e_d + C b), with C the diagonal of what each port sends
    back: source match at the driven port, load match at the others.
    """
    n = s.shape[-1]
    own = np.arange(n)
    columns = []
    for drive in range(n):
        back = terms.load_match[..., :, drive].copy()
        back[..., drive] = terms.source_match[..., drive]
        b = inverse(np.eye(n) - s * back[..., None, :]) @ s[..., :, drive, None]
        b = b[..., 0]
        column = terms.isolation[..., :, drive] + terms.transmission_tracking[..., :, drive] * b
        at_drive = terms.directivity[..., drive] + terms.reflection_tracking[..., drive] * b[..., drive]
        columns.append(np.where(own == drive, at_drive[..., None], column))
    return np.stack(columns, axis=-1)


def redundancy(terms: Terms, d: int, r: int) -> NDArray:
    """The relation that the terms of a port pair hold in excess, as ratio minus 1 (0 when they agree).

    Parameters
    ----------
    terms : Terms
    d, r : int
        Positions of the two ports.

    Returns
    -------
    complex array of shape (...)

    Notes
    -----
    With D_r = load_match_rd - source_match_r and q_r = 1 + directivity_r D_r / reflection_tracking_r,
    (transmission_tracking_rd / q_r)(transmission_tracking_dr / q_d) = reflection_tracking_d reflection_tracking_r;
    it follows from the terms of two boxes and their switch terms (Marks 1997, 50th ARFTG).
    """
    tracking = terms.transmission_tracking
    # q_r reflection_tracking_r = reflection_tracking_r + directivity_r D_r: one division for the whole relation.
    excess = _tracking_with_load(terms, d, r) * _tracking_with_load(terms, r, d)
    with np.errstate(divide="ignore", invalid="ignore"):
        return tracking[..., r, d] * tracking[..., d, r] / excess - 1.0


def _tracking_with_load(terms: Terms, port: int, drive: int) -> NDArray:
    mismatch = terms.load_match[..., port, drive] - terms.source_match[..., port]
    return terms.reflection_tracking[..., port] + terms.directivity[..., port] * mismatch


def implied_switch_terms(terms: Terms, r: int, d: int) -> NDArray:
    """The switch term a_r / b_r at port r while d drives that the terms imply, shape (...).

    ``G_r = D_r / (reflection_tracking_r + directivity_r D_r)``, the inverse of `from_boxes`' load match.
    """
    mismatch = terms.load_match[..., r, d] - terms.source_match[..., r]
    with np.errstate(divide="ignore", invalid="ignore"):
        return mismatch / (terms.reflection_tracking[..., r] + terms.directivity[..., r] * mismatch)


def from_boxes(e00: NDArray, e11: NDArray, e10e01: NDArray, forward: NDArray, switch_terms: NDArray) -> Terms:
    """Error terms from one two-port error box per port and the switch terms.

    Parameters
    ----------
    e00, e11, e10e01 : complex arrays of shape (..., n)
        Reflection terms of each port's box: directivity, source match, reflection tracking.
    forward : complex array of shape (..., n, n)
        e10 of the driving port's box times e01 of the receiving one's (receive, drive).
    switch_terms : complex array of shape (..., n)
        a_r / b_r at port r while another port drives.

    Returns
    -------
    Terms
        Isolation is zero.

    References
    ----------
    Marks 1997, 50th ARFTG: load_match_rd = e11_r + e10e01_r G_r / (1 - e00_r G_r),
    transmission_tracking_rd = e10_d e01_r / (1 - e00_r G_r).
    """
    turn = 1.0 - e00 * switch_terms
    load = (e11 + e10e01 * switch_terms / turn)[..., :, None]
    load_match = np.broadcast_to(load, forward.shape).copy()
    return Terms(e00, e11, e10e01, load_match, forward / turn[..., :, None], np.zeros_like(forward))
