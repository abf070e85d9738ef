"""Plain one- and two-ports: lines, pads and terminations that are not perfect."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike

from deembed.labels import sparams
from deembed.simulate.circuit import Circuit, line_constant

__all__ = ["line", "pad", "termination"]


def line(
    frequency: ArrayLike,
    *,
    length_m: float,
    impedance_ohm: float = 50.0,
    permittivity: float = 2.9,
    loss_db_per_m: float = 6.0,
) -> xr.DataArray:
    """A TEM line, lossless if asked.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    length_m : float
        [m].
    impedance_ohm : float
        [ohm].
    permittivity : float
        Effective.
    loss_db_per_m : float
        At 1 GHz [dB/m], growing with the square root of frequency.

    Returns
    -------
    DataArray of shape (frequency, 2, 2)
        In 50 ohm; reciprocal, passive, symmetric.

    Notes
    -----
    Two steps of impedance and all echoes between them, summed (common transmission-line theory).
    """
    f = np.asarray(frequency, dtype=float)
    through = np.exp(-line_constant(f, permittivity=permittivity, loss_db_per_m=loss_db_per_m) * length_m)
    step = (impedance_ohm - 50.0) / (impedance_ohm + 50.0)
    echoes = 1 - (step * through) ** 2
    s = np.empty((f.size, 2, 2), dtype=complex)
    s[:, 0, 0] = s[:, 1, 1] = step * (1 - through**2) / echoes
    s[:, 0, 1] = s[:, 1, 0] = through * (1 - step**2) / echoes
    return sparams(s, f)


def pad(frequency: ArrayLike, *, loss_db: float, shunt_farad: float = 0.0) -> xr.DataArray:
    """Matched pi attenuator for 50 ohm, with stray capacitance at both ends if asked.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    loss_db : float
        [dB], above zero.
    shunt_farad : float
        At each end [F].

    Returns
    -------
    DataArray of shape (frequency, 2, 2)
        Reciprocal, passive, symmetric.

    Raises
    ------
    ValueError
        A loss of zero or below.
    """
    if loss_db <= 0:
        raise ValueError(f"a pad of {loss_db} dB has no resistors: ask for a loss above 0 dB")
    k = 10 ** (loss_db / 20)
    circuit = Circuit(frequency, 2).resistor(0, 1, 50.0 * (k**2 - 1) / (2 * k))
    for end in (0, 1):
        circuit.resistor(end, None, 50.0 * (k + 1) / (k - 1)).capacitor(end, None, shunt_farad)
    return sparams(circuit.sparams([0, 1]), circuit.frequency)


def termination(
    frequency: ArrayLike, *, resistance_ohm: float = 50.0, inductance_h: float = 0.0, delay_s: float = 0.0
) -> xr.DataArray:
    """A resistor with some inductance, behind a short lossless 50 ohm line.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    resistance_ohm : float
        [ohm].
    inductance_h : float
        In series with it [H].
    delay_s : float
        Of the line, one way [s].

    Returns
    -------
    DataArray of shape (frequency, 1, 1)
    """
    f = np.asarray(frequency, dtype=float)
    z = resistance_ohm + 2j * np.pi * f * inductance_h
    reflection = (z - 50.0) / (z + 50.0) * np.exp(-4j * np.pi * f * delay_s)
    return sparams(reflection[:, None, None], f)
