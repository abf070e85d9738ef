"""S-parameter algebra on plain arrays ``(..., n, n)``.

Waves are pseudo-waves (Marks & Williams 1992): at a port with reference impedance z, voltage v and current i
into the network, ``a = k (v + z i)`` and ``b = k (v - z i)`` with ``k = sqrt(Re z) / (2 |z|)``; for real z
these are power waves.
Reference impedances are arrays of shape ``(..., n)`` that broadcast against the matrices' leading dims.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from deembed.numeric.linalg import diagonal_matrix, inverse

__all__ = [
    "abcd_to_s",
    "cascade",
    "close_ports",
    "renormalize",
    "s_to_abcd",
    "s_to_t",
    "s_to_y",
    "s_to_z",
    "t_to_s",
    "y_to_s",
    "z_to_s",
]


def _wave_scale(z: NDArray) -> NDArray:
    return np.sqrt(z.real) / (2.0 * np.abs(z))


def _eye(s: NDArray) -> NDArray:
    return np.eye(s.shape[-1])


def renormalize(s: NDArray, z_from: ArrayLike, z_to: ArrayLike) -> NDArray:
    """S-parameters in other reference impedances, without passing through Z (an ideal open stays exact).

    Parameters
    ----------
    s : complex array of shape (..., n, n)
    z_from, z_to : complex arrays of shape (..., n)
        Reference impedances [ohm], real part positive.

    Returns
    -------
    complex array of shape (..., n, n)
        NaN where the other waves cannot be defined (singular).

    References
    ----------
    Marks & Williams 1992, J. Res. NIST 97: definition of pseudo-waves. With v and i written in the old waves,
    a' = (P + Q S) a and b' = (Q + P S) a, hence S' = (Q + P S)(P + Q S)^-1.
    """
    z_from, z_to = np.asarray(z_from, dtype=complex), np.asarray(z_to, dtype=complex)
    scale = _wave_scale(z_to) / (2.0 * _wave_scale(z_from))
    same, other = scale * (1.0 + z_to / z_from), scale * (1.0 - z_to / z_from)
    p, q = diagonal_matrix(same), diagonal_matrix(other)
    return (q + same[..., :, None] * s) @ inverse(p + other[..., :, None] * s)


def s_to_z(s: NDArray, z0: ArrayLike) -> NDArray:
    """Impedance matrix [ohm], shape (..., n, n); NaN where it does not exist (an open).

    ``Z = K^-1 (1 + S)(1 - S)^-1 K Z0`` with ``K = diag(k)``, from the definition of the waves.
    """
    z0 = np.asarray(z0, dtype=complex)
    k = _wave_scale(z0)
    return (1 / k)[..., :, None] * ((_eye(s) + s) @ inverse(_eye(s) - s)) * (k * z0)[..., None, :]


def z_to_s(z: NDArray, z0: ArrayLike) -> NDArray:
    """S-parameters of an impedance matrix [ohm]: ``S = K (Z - Z0)(Z + Z0)^-1 K^-1``, shape (..., n, n)."""
    z0 = np.asarray(z0, dtype=complex)
    k, reference = _wave_scale(z0), diagonal_matrix(z0)
    return k[..., :, None] * ((z - reference) @ inverse(z + reference)) * (1 / k)[..., None, :]


def s_to_y(s: NDArray, z0: ArrayLike) -> NDArray:
    """Admittance matrix [S], shape (..., n, n); NaN where it does not exist (a short).

    ``Y = Z0^-1 K^-1 (1 - S)(1 + S)^-1 K``, from the definition of the waves.
    """
    z0 = np.asarray(z0, dtype=complex)
    k = _wave_scale(z0)
    return (1 / (k * z0))[..., :, None] * ((_eye(s) - s) @ inverse(_eye(s) + s)) * k[..., None, :]


def y_to_s(y: NDArray, z0: ArrayLike) -> NDArray:
    """S-parameters of an admittance matrix [S]: ``S = K (1 - Z0 Y)(1 + Z0 Y)^-1 K^-1``, shape (..., n, n)."""
    z0 = np.asarray(z0, dtype=complex)
    k = _wave_scale(z0)
    normalized = z0[..., :, None] * y
    return k[..., :, None] * ((_eye(y) - normalized) @ inverse(_eye(y) + normalized)) * (1 / k)[..., None, :]


def s_to_abcd(s: NDArray, z0: ArrayLike) -> NDArray:
    """Chain matrix of two-ports, ``[v1; i1] = [[A, B], [C, D]] [v2; -i2]``; NaN where S21 = 0.

    Parameters
    ----------
    s : complex array of shape (..., 2, 2)
    z0 : complex array of shape (..., 2)
        Reference impedances [ohm].

    Returns
    -------
    complex array of shape (..., 2, 2)
        A and D plain, B in ohm, C in S.
    """
    z0 = np.asarray(z0, dtype=complex)
    k = _wave_scale(z0)
    t = s_to_t(s)
    # [v; i] = W [b; a] at port 1, and [b1; a1] = T [a2; b2]; at port 2 the current counts outward.
    w1 = _waves_to_circuit(k[..., 0], z0[..., 0])
    w2 = _waves_to_circuit(k[..., 1], z0[..., 1])
    swapped = w2[..., :, ::-1] * np.array([[1.0], [-1.0]])
    return w1 @ t @ inverse(swapped)


def abcd_to_s(abcd: NDArray, z0: ArrayLike) -> NDArray:
    """S-parameters of a chain matrix (see `s_to_abcd`), shape (..., 2, 2)."""
    z0 = np.asarray(z0, dtype=complex)
    k = _wave_scale(z0)
    w1 = _waves_to_circuit(k[..., 0], z0[..., 0])
    w2 = _waves_to_circuit(k[..., 1], z0[..., 1])
    swapped = w2[..., :, ::-1] * np.array([[1.0], [-1.0]])
    return t_to_s(inverse(w1) @ abcd @ swapped)


def _waves_to_circuit(k: NDArray, z: NDArray) -> NDArray:
    """Matrix W with ``[v; i] = W [b; a]``: v = (a + b) / 2k, i = (a - b) / (2 k z)."""
    k, z = np.broadcast_arrays(k, z)
    w = np.empty((*z.shape, 2, 2), dtype=complex)
    w[..., 0, 0] = w[..., 0, 1] = 1 / (2 * k)
    w[..., 1, 0], w[..., 1, 1] = -1 / (2 * k * z), 1 / (2 * k * z)
    return w


def _halves(s: NDArray) -> tuple[NDArray, NDArray, NDArray, NDArray]:
    n = s.shape[-1] // 2
    return s[..., :n, :n], s[..., :n, n:], s[..., n:, :n], s[..., n:, n:]


def _joined(a: NDArray, b: NDArray, c: NDArray, d: NDArray) -> NDArray:
    return np.concatenate([np.concatenate([a, b], axis=-1), np.concatenate([c, d], axis=-1)], axis=-2)


def s_to_t(s: NDArray) -> NDArray:
    """Wave-transfer matrix of 2m-ports: ``[b1; a1] = T [a2; b2]``, first m ports against last m.

    Parameters
    ----------
    s : complex array of shape (..., 2m, 2m)

    Returns
    -------
    complex array of shape (..., 2m, 2m)
        Cascading multiplies them in order. NaN where S21 is singular.
    """
    s11, s12, s21, s22 = _halves(s)
    back = inverse(s21)
    return _joined(s12 - s11 @ back @ s22, s11 @ back, -back @ s22, back)


def t_to_s(t: NDArray) -> NDArray:
    """S-parameters of a wave-transfer matrix (see `s_to_t`), shape (..., 2m, 2m)."""
    t11, t12, t21, t22 = _halves(t)
    forward = inverse(t22)
    return _joined(t12 @ forward, t11 - t12 @ forward @ t21, forward, -forward @ t21)


def cascade(first: NDArray, second: NDArray) -> NDArray:
    """Two 2m-ports in a row, last m ports of the first on first m ports of the second, shape (..., 2m, 2m).

    Works where a transmission is zero, which wave-transfer matrices do not.
    """
    a11, a12, a21, a22 = _halves(first)
    b11, b12, b21, b22 = _halves(second)
    eye = np.eye(a11.shape[-1])
    rightward = inverse(eye - a22 @ b11) @ a21
    leftward = inverse(eye - b11 @ a22) @ b12
    return _joined(a11 + a12 @ b11 @ rightward, a12 @ leftward, b21 @ rightward, b22 + b21 @ a22 @ leftward)


def close_ports(s: NDArray, closed: ArrayLike, reflections: ArrayLike) -> NDArray:
    """The network seen at the remaining ports when some are closed with known reflections.

    Parameters
    ----------
    s : complex array of shape (..., n, n)
    closed : int array of shape (m,)
        Positions (from 0) of the closed ports.
    reflections : complex array of shape (..., m)
        Reflection of what closes each, in that port's reference impedance.

    Returns
    -------
    complex array of shape (..., n - m, n - m)
        ``S_oo + S_oc G (1 - S_cc G)^-1 S_co``; NaN where closing resonates without loss.
    """
    closed = np.atleast_1d(np.asarray(closed, dtype=int))
    kept = np.setdiff1d(np.arange(s.shape[-1]), closed)
    g = np.asarray(reflections, dtype=complex)[..., None, :]
    s_oc = s[..., kept[:, None], closed] * g
    s_cc = s[..., closed[:, None], closed] * g
    inner = inverse(np.eye(closed.size) - s_cc) @ s[..., closed[:, None], kept]
    return s[..., kept[:, None], kept] + s_oc @ inner
