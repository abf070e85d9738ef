"""Responses of calibration standards: terminations behind offset lines, and lines.

Every parameter may be an array that broadcasts against the frequency axis, which is last.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Numbers = NDArray | float

__all__ = [
    "LIGHT_SPEED",
    "capacitor_reflection",
    "impedance_reflection",
    "line_constant",
    "matched_transmission",
    "mismatched_line",
    "offset_constants",
    "offset_reflection",
    "polynomial",
]

LIGHT_SPEED = 299_792_458.0
"""Speed of light in vacuum [m/s] (exact, SI)."""


def _decayed(exponent: NDArray) -> NDArray:
    """exp(-exponent), its two parts apart: three times faster than the complex exponential."""
    size, turn = np.exp(-exponent.real), np.ascontiguousarray(exponent.imag)
    out = np.empty(np.shape(exponent), dtype=complex)
    out.real, out.imag = size * np.cos(turn), -size * np.sin(turn)
    return out


def polynomial(frequency: NDArray, coefficients: Sequence[Numbers]) -> NDArray:
    """``c0 + c1 f + c2 f^2 + ...``, shape (..., frequency)."""
    total = np.zeros_like(frequency)
    for order in reversed(range(len(coefficients))):
        total = total * frequency + coefficients[order]
    return total


def offset_constants(
    frequency: NDArray, *, delay: Numbers, loss: Numbers, impedance: Numbers
) -> tuple[NDArray, NDArray]:
    """Propagation and impedance of an offset line with skin-effect loss.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    delay : array
        One way [s].
    loss : array
        [ohm/s] at 1 GHz, growing with the square root of frequency.
    impedance : array
        Of the lossless line [ohm].

    Returns
    -------
    gamma_l, zc : complex arrays of shape (..., frequency)
        Propagation constant times length, and characteristic impedance [ohm]. At f = 0 no line at all.

    Notes
    -----
    With a = loss delay sqrt(f / 1 GHz) / (2 Z): gamma l = j w delay + (1 + j) a and
    Zc = Z + (1 - j) (loss / 2 w) sqrt(f / 1 GHz); the first order of a line whose series resistance and inner
    inductance follow the skin effect (any textbook on coaxial lines).
    """
    delay, loss, impedance = np.asarray(delay), np.asarray(loss), np.asarray(impedance)
    w = 2 * np.pi * frequency
    root = np.sqrt(frequency / 1e9)
    a = loss * delay * root / (2 * impedance)
    safe = np.where(w > 0, w, 1.0)
    gamma_l = 1j * w * delay + (1 + 1j) * a
    zc = impedance + np.where(w > 0, (1 - 1j) * loss / (2 * safe) * root, 0.0)
    return gamma_l, zc


def capacitor_reflection(frequency: NDArray, capacitance: Numbers, zc: Numbers) -> NDArray:
    """Reflection of a capacitance [F] in zc [ohm]: 1 for none at all, shape (..., frequency)."""
    y = 2j * np.pi * frequency * capacitance * zc
    return (1 - y) / (1 + y)


def impedance_reflection(z: NDArray, zc: Numbers) -> NDArray:
    """Reflection of an impedance z [ohm] in zc [ohm], shape (..., frequency)."""
    return (z - zc) / (z + zc)


def offset_reflection(termination: NDArray, gamma_l: NDArray, zc: NDArray, z0: Numbers) -> NDArray:
    """Reflection, in z0 [ohm], of a termination (its reflection in zc) behind an offset line.

    Parameters
    ----------
    termination, gamma_l, zc : complex arrays of shape (..., frequency)
    z0 : complex array

    Returns
    -------
    complex array of shape (..., frequency)
    """
    seen = termination * _decayed(2 * gamma_l)
    z0 = np.asarray(z0)
    return ((zc - z0) + seen * (zc + z0)) / ((zc + z0) + seen * (zc - z0))


def line_constant(
    frequency: NDArray, *, permittivity: Numbers, loss_db_per_m: Numbers, cutoff: Numbers
) -> NDArray:
    """Propagation constant [1/m], shape (..., frequency).

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    permittivity : array
        Effective relative permittivity.
    loss_db_per_m : array
        At 1 GHz, growing with the square root of frequency.
    cutoff : array
        Cut-off [Hz] of a waveguide mode; 0 for TEM lines.

    Notes
    -----
    (2 pi sqrt(eps) / c) sqrt(fc^2 - f^2): evanescent below cut-off, j beta above (Pozar, Microwave Engineering,
    rectangular waveguide; from memory, checked against the closed form in the tests).
    """
    below = np.asarray(cutoff, dtype=complex) ** 2 - frequency**2
    per_metre = 2 * np.pi * np.sqrt(np.asarray(permittivity)) / LIGHT_SPEED
    decibels_per_neper = 20 / np.log(10)
    loss = np.asarray(loss_db_per_m) * np.sqrt(frequency / 1e9) / decibels_per_neper
    return per_metre * np.sqrt(below) + loss


def matched_transmission(gamma: NDArray, length: Numbers) -> NDArray:
    """Transmission of a matched line, shape (..., frequency)."""
    return _decayed(np.asarray(gamma * length, dtype=complex))


def mismatched_line(transmission: NDArray, impedance: Numbers, z0: Numbers) -> NDArray:
    """A line of some impedance [ohm] seen in z0 [ohm].

    Parameters
    ----------
    transmission : complex array of shape (..., frequency)
        In the line's own impedance.
    impedance, z0 : arrays

    Returns
    -------
    complex array of shape (..., frequency, 2, 2)
    """
    g = impedance_reflection(np.asarray(impedance), np.asarray(z0))
    if not g.any():
        matched = np.zeros((*np.broadcast_shapes(g.shape, transmission.shape), 2, 2), dtype=complex)
        matched[..., 0, 1] = matched[..., 1, 0] = transmission
        return matched
    e2 = transmission**2
    below = 1 - g**2 * e2
    s11, s21 = g * (1 - e2) / below, transmission * (1 - g**2) / below
    s11, s21 = np.broadcast_arrays(s11, s21)
    return np.stack([s11, s21, s21, s11], axis=-1).reshape(*s11.shape, 2, 2)
