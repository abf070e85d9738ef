"""An N-port from rounds that each read some of its ports while known reflections close the others.

Ports count from 0. ``round_closings`` holds what closed each port in each round; only entries of ports that
the round left free count.
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
        Per round, reading minus what the whole says: in the waves of the closing reflections (`to_closed`),
        or in the waves of the readings where `general` is true.
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
        ``U = (1 - G)^-1 (S - G)(1 - G S)^-1 (1 - G)``: in these waves closing a port strikes out its row and
        its column, nothing more. NaN where g = 1.

    References
    ----------
    Tippet & Speciale 1982, IEEE Trans. MTT 30(5); written with reflections, which needs no root of an
    impedance.
    """
    with np.errstate(all="ignore"):
        one = 1.0 - g
        u = (s - diagonal_matrix(g)) @ inverse(np.eye(s.shape[-1]) - g[..., :, None] * s)
        return u * (one[..., None, :] / one[..., :, None])


def from_closed(u: NDArray, g: NDArray) -> NDArray:
    """The inverse of `to_closed`, shape (..., n, n); NaN where g is 1 or -1: U then holds nothing of S."""
    with np.errstate(all="ignore"):
        one = 1.0 - g
        u = u * (one[..., :, None] / one[..., None, :])
        return inverse(np.eye(u.shape[-1]) + u * g[..., None, :]) @ (u + diagonal_matrix(g))


def _to_orthogonal(s: NDArray, g: NDArray) -> NDArray:
    """As `to_closed`, but with b' = b + conj(g) a beside a' = a - g b: regular for every g, if unphysical."""
    return (s + diagonal_matrix(g.conj())) @ inverse(np.eye(s.shape[-1]) - g[..., :, None] * s)


def _from_orthogonal(v: NDArray, g: NDArray) -> NDArray:
    return inverse(np.eye(v.shape[-1]) + v * g[..., None, :]) @ (v - diagonal_matrix(g.conj()))


def common_reflections(
    round_closings: Sequence[NDArray], round_ports: Sequence[NDArray], n: int
) -> tuple[NDArray, NDArray]:
    """One closing reflection per port, and where all rounds agree on it.

    Parameters
    ----------
    round_closings : sequence of complex arrays of shape (..., n)
    round_ports : sequence of int arrays of shape (k,)
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
    shape = np.broadcast_shapes(*(r.shape[:-1] for r in round_closings))
    mean = np.zeros((*shape, n), dtype=complex)
    same = np.ones(shape, dtype=bool)
    for port in range(n):
        met_by_round = [
            closing[..., port]
            for closing, kept in zip(round_closings, round_ports, strict=True)
            if port not in kept
        ]
        if met_by_round:
            agrees = np.all([np.broadcast_to(m == met_by_round[0], shape) for m in met_by_round], axis=0)
            average = sum(met_by_round[1:], start=met_by_round[0]) / len(met_by_round)
            mean[..., port] = np.where(agrees, met_by_round[0], average)
            same &= agrees
    return mean, same


def mean_of_rounds(
    rounds: Sequence[NDArray], round_ports: Sequence[NDArray], n: int
) -> tuple[NDArray, list[NDArray]]:
    """Rounds placed in the whole, what was read more than once averaged plainly.

    Parameters
    ----------
    rounds : sequence of complex arrays of shape (..., k, k)
    round_ports : sequence of int arrays of shape (k,)
    n : int

    Returns
    -------
    complex array of shape (..., n, n)
        NaN for what no round read.
    list of complex arrays of shape (..., k, k)
        Reading minus mean, per round.
    """
    shape = np.broadcast_shapes(*(r.shape[:-2] for r in rounds))
    total = np.zeros((*shape, n, n), dtype=complex)
    count = np.zeros((n, n))
    for reading, kept in zip(rounds, round_ports, strict=True):
        total[..., kept[:, None], kept] += reading
        count[kept[:, None], kept] += 1
    with np.errstate(invalid="ignore"):
        mean = total / np.where(count > 0, count, np.nan)
    return mean, [m - mean[..., p[:, None], p] for m, p in zip(rounds, round_ports, strict=True)]


def _linearized(s: NDArray, kept: NDArray, g: NDArray) -> tuple[NDArray, NDArray]:
    """What a round reads of s, and its derivative to the elements of s: shapes (m, k, k) and (m, k k, n n).

    With the others closed, a round reads S_kk + S_kc G (1 - S_cc G)^-1 S_ck; a change dS shows as P dS Q.
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
    rounds: Sequence[NDArray],
    round_ports: Sequence[NDArray],
    round_closings: Sequence[NDArray],
    start: NDArray,
) -> tuple[NDArray, NDArray, int]:
    """The whole that fits all rounds best, where that converged, and the steps it took (flat batches)."""
    s = start.copy()
    m, n = s.shape[0], s.shape[-1]
    converged = np.zeros(m, dtype=bool)
    active = np.flatnonzero(np.isfinite(s).all(axis=(-2, -1)))
    taken = 0
    for step_number in range(_MOST_STEPS):
        if not active.size:
            break
        taken = step_number + 1
        per_round = [
            _linearized(s[active], p, g[active]) for p, g in zip(round_ports, round_closings, strict=True)
        ]
        missing = [
            (r[active] - seen).reshape(active.size, -1)
            for r, (seen, _) in zip(rounds, per_round, strict=True)
        ]
        step = _least_squares(
            np.concatenate([d for _, d in per_round], axis=-2), np.concatenate(missing, axis=-1)
        )
        s[active] += step.reshape(-1, n, n)
        largest = np.abs(step).max(axis=-1)
        small = largest < _SMALL_STEP * (1.0 + np.abs(s[active]).max(axis=(-2, -1)))
        converged[active[small]] = True
        active = active[~small & np.isfinite(largest) & (largest < 1e6)]
    return s, converged, taken


def solve_general(
    rounds: Sequence[NDArray],
    round_ports: Sequence[NDArray],
    round_closings: Sequence[NDArray],
    starts_in_order: Sequence[NDArray],
) -> tuple[NDArray, NDArray, int]:
    """The whole that fits all rounds best (least squares, Gauss-Newton), whatever closed the ports in each.

    Parameters
    ----------
    rounds : sequence of complex arrays of shape (m, k, k)
    round_ports : sequence of int arrays of shape (k,)
    round_closings : sequence of complex arrays of shape (m, n)
    starts_in_order : sequence of complex arrays of shape (m, n, n)
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
    m, n = starts_in_order[0].shape[0], starts_in_order[0].shape[-1]
    s = np.full((m, n, n), np.nan, dtype=complex)
    converged = np.zeros(m, dtype=bool)
    equations = sum(p.size**2 for p in round_ports)
    block = max(64, _BLOCK_NUMBERS // (equations * n * n))
    most = 0
    for start in starts_in_order:
        open_points = np.flatnonzero(~converged)
        for first in range(0, open_points.size, block):
            chosen = open_points[first : first + block]
            found, good, taken = _gauss_newton(
                [r[chosen] for r in rounds], round_ports, [g[chosen] for g in round_closings], start[chosen]
            )
            s[chosen[good]] = found[good]
            converged[chosen] = good
            most = max(most, taken)
    return s, converged, most


def assemble(
    rounds: Sequence[NDArray], round_ports: Sequence[NDArray], round_closings: Sequence[NDArray], n: int
) -> Assembled:
    """The whole N-port from its rounds.

    Parameters
    ----------
    rounds : sequence of complex arrays of shape (..., k, k)
        One per round.
    round_ports : sequence of int arrays of shape (k,)
        Ports each round read, in the order of its rows.
    round_closings : sequence of complex arrays of shape (..., n)
        What closed each port in each round; entries of ports the round reads are ignored.
    n : int
        Ports of the whole; every pair of ports must share a round.

    Returns
    -------
    Assembled
        Exact where each port always met the same reflection: what was read more than once is the plain mean,
        taken in the waves of those reflections. By `solve_general` elsewhere, and where a reflection is +1 or
        -1, at which those waves hold nothing of the part.
    """
    shape = np.broadcast_shapes(*(r.shape[:-2] for r in rounds), *(g.shape[:-1] for g in round_closings))
    g, same = common_reflections(round_closings, round_ports, n)
    matched = not g.any()  # the transform is then the identity: leave every digit as read
    in_closed = (
        rounds if matched else [to_closed(r, g[..., p]) for r, p in zip(rounds, round_ports, strict=True)]
    )
    mean, residuals_of_rounds = mean_of_rounds(in_closed, round_ports, n)
    s = np.broadcast_to(mean if matched else from_closed(mean, g), (*shape, n, n))
    general = np.broadcast_to(~(same & (np.abs(1.0 - g**2) > _SINGULAR).all(axis=-1)), shape)
    residuals = tuple(np.broadcast_to(r, shape + r.shape[-2:]) for r in residuals_of_rounds)
    plain = Assembled(s, residuals, general, np.ones(shape, dtype=bool), 0)
    return _with_general(rounds, round_ports, round_closings, g, plain) if general.any() else plain


def _with_general(
    rounds: Sequence[NDArray],
    round_ports: Sequence[NDArray],
    round_closings: Sequence[NDArray],
    g: NDArray,
    plain: Assembled,
) -> Assembled:
    """Replace the points marked general by what the general solver finds there."""
    shape, n = plain.general.shape, plain.s.shape[-1]
    where = plain.general
    flat = [np.broadcast_to(r, shape + r.shape[-2:])[where] for r in rounds]
    closing = [np.broadcast_to(r, (*shape, n))[where] for r in round_closings]
    g = np.broadcast_to(g, (*shape, n))[where]
    placed = mean_of_rounds(
        [_to_orthogonal(r, g[:, p]) for r, p in zip(flat, round_ports, strict=True)], round_ports, n
    )[0]
    starts_in_order = [_from_orthogonal(placed, g), mean_of_rounds(flat, round_ports, n)[0]]
    solved, good, steps = solve_general(flat, round_ports, closing, starts_in_order)
    s, converged = plain.s.copy(), plain.converged.copy()
    s[where], converged[where] = solved, good
    residuals = [round_residual.copy() for round_residual in plain.residuals]
    for residual, reading, kept, closed in zip(residuals, flat, round_ports, closing, strict=True):
        residual[where] = reading - _linearized(solved, kept, closed)[0]
    return Assembled(s, tuple(residuals), where, converged, steps)
