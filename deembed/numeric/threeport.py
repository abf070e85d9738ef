"""An N-port from rounds that each read some of its ports while known reflections close the others.

Positions count from 0. ``reflections`` has one array of shape (..., n) per round; only entries of closed ports count.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.linalg import diagonal_matrix, inverse

__all__ = [
    "Assembled",
    "assemble",
    "common_reflections",
    "from_closed",
    "mean_of_rounds",
    "solve_general",
    "to_closed",
]

# Within this of G^2 = 1 the transform to closed-port waves loses four digits: the general solver takes over.
_SINGULAR = 1e-4
_MOST_STEPS = 30
_SMALL_STEP = 1e-10
# Complex numbers held at once by the general solver, about 100 MB with its intermediates.
_BLOCK_NUMBERS = 1_500_000


@dataclass(frozen=True)
class Assembled:
    """Result of `assemble`.

    Parameters
    ----------
    s : complex array of shape (..., n, n)
        The whole; NaN where it could not be found.
    residuals : tuple of complex arrays of shape (..., k, k)
        Per round, reading minus what the whole says; in the waves of the closing reflections where these are the
        same in all rounds, in the waves of the readings where `general` is true.
    general : bool array of shape (...)
        Where the general solver was used.
    converged : bool array of shape (...)
        False where the general solver found no solution.
    steps : int
        Most steps the general solver took.
    """

    s: NDArray
    residuals: tuple[NDArray, ...]
    general: NDArray
    converged: NDArray
    steps: int


def to_closed(s: NDArray, g: NDArray) -> NDArray:
    """S-parameters in waves for which the reflections g are a match (Tippet & Speciale 1982).

    Parameters
    ----------
    s : complex array of shape (..., n, n)
    g : complex array of shape (..., n)
        Reflection that closes each port.

    Returns
    -------
    complex array of shape (..., n, n)
        ``U = (1 - G)^-1 (S - G)(1 - G S)^-1 (1 - G)``: in these waves closing a port means striking out its row and
        column. NaN where g = 1.

    References
    ----------
    Tippet & Speciale 1982, IEEE Trans. MTT 30(5); written with reflections, so that no root of an impedance is needed.
    """
    with np.errstate(all="ignore"):
        one = 1.0 - g
        u = (s - diagonal_matrix(g)) @ inverse(np.eye(s.shape[-1]) - g[..., :, None] * s)
        return u * (one[..., None, :] / one[..., :, None])


def from_closed(u: NDArray, g: NDArray) -> NDArray:
    """The inverse of `to_closed`, shape (..., n, n); NaN where g = 1 or g = -1, where U holds nothing of S."""
    with np.errstate(all="ignore"):
        one = 1.0 - g
        u = u * (one[..., :, None] / one[..., None, :])
        return inverse(np.eye(u.shape[-1]) + u * g[..., None, :]) @ (u + diagonal_matrix(g))


def _to_orthogonal(s: NDArray, g: NDArray) -> NDArray:
    """As `to_closed`, with b' = b + conj(g) a beside a' = a - g b: regular for every g, but no physical waves."""
    return (s + diagonal_matrix(g.conj())) @ inverse(np.eye(s.shape[-1]) - g[..., :, None] * s)


def _from_orthogonal(v: NDArray, g: NDArray) -> NDArray:
    return inverse(np.eye(v.shape[-1]) + v * g[..., None, :]) @ (v - diagonal_matrix(g.conj()))


def common_reflections(
    reflections: Sequence[NDArray], positions: Sequence[NDArray], n: int
) -> tuple[NDArray, NDArray]:
    """One closing reflection per port, and where all rounds agree on it.

    Parameters
    ----------
    reflections : sequence of complex arrays of shape (..., n)
    positions : sequence of int arrays of shape (k,)
        Ports each round reads.
    n : int
        Ports of the whole.

    Returns
    -------
    complex array of shape (..., n)
        Mean over the rounds that close the port; 0 for a port that no round closes.
    bool array of shape (...)
        True where every port meets the same reflection in all rounds that close it.
    """
    shape = np.broadcast_shapes(*(r.shape[:-1] for r in reflections))
    mean = np.zeros((*shape, n), dtype=complex)
    same = np.ones(shape, dtype=bool)
    for port in range(n):
        met = [r[..., port] for r, kept in zip(reflections, positions, strict=True) if port not in kept]
        if met:
            agrees = np.all([np.broadcast_to(m == met[0], shape) for m in met], axis=0)
            average = sum(met[1:], start=met[0]) / len(met)
            mean[..., port] = np.where(agrees, met[0], average)
            same &= agrees
    return mean, same


def mean_of_rounds(
    readings: Sequence[NDArray], positions: Sequence[NDArray], n: int
) -> tuple[NDArray, list[NDArray]]:
    """Rounds placed in the whole, what was read more than once averaged plainly.

    Parameters
    ----------
    readings : sequence of complex arrays of shape (..., k, k)
    positions : sequence of int arrays of shape (k,)
    n : int

    Returns
    -------
    complex array of shape (..., n, n)
        NaN for what no round read.
    list of complex arrays of shape (..., k, k)
        Reading minus mean, per round.
    """
    shape = np.broadcast_shapes(*(r.shape[:-2] for r in readings))
    total = np.zeros((*shape, n, n), dtype=complex)
    count = np.zeros((n, n))
    for reading, kept in zip(readings, positions, strict=True):
        total[..., kept[:, None], kept] += reading
        count[kept[:, None], kept] += 1
    mean = total / np.where(count > 0, count, np.nan)
    return mean, [m - mean[..., p[:, None], p] for m, p in zip(readings, positions, strict=True)]


def _linearized(s: NDArray, kept: NDArray, g: NDArray) -> tuple[NDArray, NDArray]:
    """What a round reads of s, and its derivative to the elements of s, shapes (m, k, k) and (m, k k, n n).

    With the other ports closed, reading = S_kk + S_kc G (1 - S_cc G)^-1 S_ck, and a change dS shows as P dS Q.
    """
    m, n = s.shape[0], s.shape[-1]
    closed = np.setdiff1d(np.arange(n), kept)
    k = kept.size
    left = np.zeros((m, k, n), dtype=complex)
    right = np.zeros((m, n, k), dtype=complex)
    left[:, np.arange(k), kept] = right[:, kept, np.arange(k)] = 1.0
    seen = s[:, kept[:, None], kept]
    if closed.size:
        gc = g[:, closed]
        loop = gc[:, :, None] * inverse(np.eye(closed.size) - s[:, closed[:, None], closed] * gc[:, None, :])
        left[:, :, closed] = s[:, kept[:, None], closed] @ loop
        right[:, closed, :] = loop @ s[:, closed[:, None], kept]
        seen = seen + left[:, :, closed] @ s[:, closed[:, None], kept]
    derivative = np.einsum("mai,mjb->mabij", left, right).reshape(m, k * k, n * n)
    return seen, derivative


def _least_squares(a: NDArray, b: NDArray) -> NDArray:
    """Least-squares solution of each a x = b through QR, shapes (m, e, u), (m, e); NaN where a lacks rank."""
    finite = np.isfinite(a).all(axis=(-2, -1)) & np.isfinite(b).all(axis=-1)
    q, r = np.linalg.qr(np.where(finite[:, None, None], a, 0.0))
    size = np.abs(np.diagonal(r, axis1=-2, axis2=-1))
    good = finite & (size.min(axis=-1) > 1e-13 * size.max(axis=-1))
    r = np.where(good[:, None, None], r, np.eye(r.shape[-1]))
    x = np.linalg.solve(r, q.conj().swapaxes(-1, -2) @ np.where(finite[:, None], b, 0.0)[..., None])[..., 0]
    return np.where(good[:, None], x, np.nan)


def _gauss_newton(
    readings: Sequence[NDArray], positions: Sequence[NDArray], reflections: Sequence[NDArray], start: NDArray
) -> tuple[NDArray, NDArray, int]:
    """Whole that fits all readings best from a start, where it converged, and the steps taken; flat batches."""
    s = start.copy()
    m, n = s.shape[0], s.shape[-1]
    converged = np.zeros(m, dtype=bool)
    active = np.flatnonzero(np.isfinite(s).all(axis=(-2, -1)))
    taken = 0
    while active.size and taken < _MOST_STEPS:
        taken += 1
        parts = [_linearized(s[active], p, g[active]) for p, g in zip(positions, reflections, strict=True)]
        missing = [
            (r[active] - seen).reshape(active.size, -1) for r, (seen, _) in zip(readings, parts, strict=True)
        ]
        step = _least_squares(
            np.concatenate([d for _, d in parts], axis=-2), np.concatenate(missing, axis=-1)
        )
        s[active] += step.reshape(-1, n, n)
        largest = np.abs(step).max(axis=-1)
        small = largest < _SMALL_STEP * (1.0 + np.abs(s[active]).max(axis=(-2, -1)))
        converged[active[small]] = True
        active = active[~small & np.isfinite(largest) & (largest < 1e6)]
    return s, converged, taken


def solve_general(
    readings: Sequence[NDArray],
    positions: Sequence[NDArray],
    reflections: Sequence[NDArray],
    starts: Sequence[NDArray],
) -> tuple[NDArray, NDArray, int]:
    """The whole that fits all readings best (least squares, Gauss-Newton), whatever closed the ports in each round.

    Parameters
    ----------
    readings : sequence of complex arrays of shape (m, k, k)
    positions : sequence of int arrays of shape (k,)
    reflections : sequence of complex arrays of shape (m, n)
    starts : sequence of complex arrays of shape (m, n, n)
        Tried in turn; a later one only where those before did not converge.

    Returns
    -------
    complex array of shape (m, n, n)
        NaN where no start converged.
    bool array of shape (m,)
        Where it converged.
    int
        Most steps taken.
    """
    m, n = starts[0].shape[0], starts[0].shape[-1]
    s = np.full((m, n, n), np.nan, dtype=complex)
    converged = np.zeros(m, dtype=bool)
    equations = sum(p.size**2 for p in positions)
    block = max(64, _BLOCK_NUMBERS // (equations * n * n))
    most = 0
    for start in starts:
        open_points = np.flatnonzero(~converged)
        for first in range(0, open_points.size, block):
            chosen = open_points[first : first + block]
            found, good, taken = _gauss_newton(
                [r[chosen] for r in readings], positions, [g[chosen] for g in reflections], start[chosen]
            )
            s[chosen[good]] = found[good]
            converged[chosen] = good
            most = max(most, taken)
    return s, converged, most


def assemble(
    readings: Sequence[NDArray], positions: Sequence[NDArray], reflections: Sequence[NDArray], n: int
) -> Assembled:
    """The whole N-port from its rounds.

    Parameters
    ----------
    readings : sequence of complex arrays of shape (..., k, k)
        One per round.
    positions : sequence of int arrays of shape (k,)
        Ports each round read, in the order of its rows.
    reflections : sequence of complex arrays of shape (..., n)
        What closed each port in each round; entries of ports the round reads are ignored.
    n : int
        Ports of the whole; every pair of ports must share a round.

    Returns
    -------
    Assembled
        Exact, with the plain mean of what was read more than once taken in the waves of the closing reflections,
        where each port always met the same reflection; by `solve_general` elsewhere and where such a
        reflection is +1 or -1, at which those waves hold nothing of the part.
    """
    shape = np.broadcast_shapes(*(r.shape[:-2] for r in readings), *(g.shape[:-1] for g in reflections))
    g, same = common_reflections(reflections, positions, n)
    mean, residuals = mean_of_rounds(
        [to_closed(r, g[..., p]) for r, p in zip(readings, positions, strict=True)], positions, n
    )
    s = np.broadcast_to(from_closed(mean, g), (*shape, n, n))
    general = np.broadcast_to(~(same & (np.abs(1.0 - g**2) > _SINGULAR).all(axis=-1)), shape)
    residuals = [np.broadcast_to(r, shape + r.shape[-2:]) for r in residuals]
    converged = np.ones(shape, dtype=bool)
    if not general.any():
        return Assembled(s, tuple(residuals), general, converged, 0)
    return _with_general(
        readings, positions, reflections, g, Assembled(s, tuple(residuals), general, converged, 0)
    )


def _with_general(
    readings: Sequence[NDArray],
    positions: Sequence[NDArray],
    reflections: Sequence[NDArray],
    g: NDArray,
    plain: Assembled,
) -> Assembled:
    """Replace the points marked general by what the general solver finds there."""
    shape, n = plain.general.shape, plain.s.shape[-1]
    where = plain.general
    flat = [np.broadcast_to(r, shape + r.shape[-2:])[where] for r in readings]
    closing = [np.broadcast_to(r, (*shape, n))[where] for r in reflections]
    g = np.broadcast_to(g, (*shape, n))[where]
    placed = mean_of_rounds(
        [_to_orthogonal(r, g[:, p]) for r, p in zip(flat, positions, strict=True)], positions, n
    )[0]
    starts = [_from_orthogonal(placed, g), mean_of_rounds(flat, positions, n)[0]]
    solved, good, steps = solve_general(flat, positions, closing, starts)
    s, converged = plain.s.copy(), plain.converged.copy()
    s[where], converged[where] = solved, good
    residuals = [r.copy() for r in plain.residuals]
    for residual, reading, kept, closed in zip(residuals, flat, positions, closing, strict=True):
        residual[where] = reading - _linearized(solved, kept, closed)[0]
    return Assembled(s, tuple(residuals), where, converged, steps)
