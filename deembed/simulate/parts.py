"""Three-port parts as circuits: passive and causal by construction, reciprocal where nature has them so."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import MappingProxyType

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from deembed.labels import sparams
from deembed.numeric.sparams import close_ports
from deembed.simulate.circuit import LIGHT_SPEED, Circuit, line_constant

__all__ = [
    "PARTS",
    "balun",
    "circulator",
    "closed_coupler",
    "isolating_splitter",
    "reactive_tee",
    "resistive_divider",
]


def _gamma(frequency: NDArray, loss_db_per_m: float) -> NDArray:
    return line_constant(frequency, permittivity=2.9, loss_db_per_m=loss_db_per_m)


def _quarter(centre_hz: float) -> float:
    return LIGHT_SPEED / (4 * centre_hz * np.sqrt(2.9))


def isolating_splitter(
    frequency: ArrayLike, *, centre_hz: float = 6.0e9, loss_db_per_m: float = 6.0, resistor_ohm: float = 100.0
) -> xr.DataArray:
    """Two-way splitter of quarter-wave lines with an isolation resistor between its outputs.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    centre_hz : float
        Where the lines are a quarter wave long [Hz].
    loss_db_per_m : float
        Line loss at 1 GHz [dB/m].
    resistor_ohm : float
        [ohm].

    Returns
    -------
    DataArray of shape (frequency, 3, 3)
        Port 1 common; reciprocal, passive.
    """
    f = np.asarray(frequency, dtype=float)
    g, quarter = _gamma(f, loss_db_per_m), _quarter(centre_hz)
    circuit = Circuit(f, 3).resistor(1, 2, resistor_ohm)
    circuit.line(0, 1, ohm=50 * np.sqrt(2), gamma=g, length=quarter)
    circuit.line(0, 2, ohm=50 * np.sqrt(2), gamma=g, length=quarter)
    # The pads of the resistor and of the joint are never quite the same.
    circuit.capacitor(1, None, 18e-15).capacitor(2, None, 24e-15).capacitor(0, None, 40e-15)
    return sparams(circuit.sparams([0, 1, 2]), f)


def reactive_tee(
    frequency: ArrayLike, *, length_m: float = 0.006, loss_db_per_m: float = 0.0
) -> xr.DataArray:
    """Three 50 ohm lines joined in one point; lossless where the lines are, reciprocal always.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    length_m : float
        Of each line [m].
    loss_db_per_m : float
        Line loss at 1 GHz [dB/m].

    Returns
    -------
    DataArray of shape (frequency, 3, 3)
    """
    f = np.asarray(frequency, dtype=float)
    through = np.exp(-_gamma(f, loss_db_per_m) * length_m)
    joint = np.full((3, 3), 2 / 3) - np.eye(3)
    return sparams(joint * (through**2)[:, None, None], f)


def resistive_divider(
    frequency: ArrayLike, *, ohm: float = 50.0 / 3, shunt_farad: float = 0.0
) -> xr.DataArray:
    """Star of three resistors, matched and 6.02 dB down on every path; a stray capacitance at the star if asked.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    ohm : float
        Each resistor [ohm].
    shunt_farad : float
        [F].

    Returns
    -------
    DataArray of shape (frequency, 3, 3)
    """
    f = np.asarray(frequency, dtype=float)
    circuit = Circuit(f, 4).capacitor(3, None, shunt_farad)
    for port in range(3):
        circuit.resistor(port, 3, ohm)
    return sparams(circuit.sparams([0, 1, 2]), f)


def circulator(
    frequency: ArrayLike,
    *,
    centre_hz: float = 6.0e9,
    slope: float = 0.6,
    quality: float = 60.0,
    gyration: float = 0.93,
) -> xr.DataArray:
    """A junction that passes waves 1 to 2 to 3 to 1; passive, not reciprocal.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    centre_hz : float
        Where its resonators are tuned [Hz].
    slope : float
        Susceptance of each resonator's capacitor at the centre, in units of 1/50 ohm: larger is narrower.
    quality : float
        Unloaded quality factor of the resonators; infinite is lossless.
    gyration : float
        1 circulates perfectly at the centre when lossless.

    Returns
    -------
    DataArray of shape (frequency, 3, 3)

    Notes
    -----
    Three gyrators in a ring of g = 1/50 ohm have the admittance eigenvalues 0 and +-j sqrt(3) g, hence the
    scattering eigenvalues 1 and exp(-+j 120 degrees) of a perfect circulator; a parallel resonator at each port
    makes it a circulator in a band only (lumped-element circulator, common textbook model).
    """
    f = np.asarray(frequency, dtype=float)
    circuit = Circuit(f, 3)
    resonator, w = slope / 50.0, 2 * np.pi * centre_hz
    for port in range(3):
        circuit.gyrator(port, (port + 1) % 3, -gyration / 50.0)
        circuit.capacitor(port, None, resonator / w).inductor(port, None, 1 / (resonator * w))
        circuit.admittance(port, None, resonator / quality)
    return sparams(circuit.sparams([0, 1, 2]), f)


def closed_coupler(
    frequency: ArrayLike, *, centre_hz: float = 6.0e9, loss_db_per_m: float = 6.0, closing: complex = 0.01
) -> xr.DataArray:
    """Branch-line quadrature coupler whose fourth port is closed with a load.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    centre_hz : float
        [Hz].
    loss_db_per_m : float
        Line loss at 1 GHz [dB/m].
    closing : complex
        Reflection of that load.

    Returns
    -------
    DataArray of shape (frequency, 3, 3)
        Port 1 in, 2 through, 3 coupled; reciprocal, passive.
    """
    f = np.asarray(frequency, dtype=float)
    g, quarter = _gamma(f, loss_db_per_m), _quarter(centre_hz)
    circuit = Circuit(f, 4)
    for a, b, ohm in ((0, 1, 50 / np.sqrt(2)), (3, 2, 50 / np.sqrt(2)), (0, 3, 50.0), (1, 2, 50.0)):
        circuit.line(a, b, ohm=ohm, gamma=g, length=quarter)
    return sparams(close_ports(circuit.sparams([0, 1, 2, 3]), [3], [closing]), f)


def balun(
    frequency: ArrayLike, *, centre_hz: float = 6.0e9, loss_db_per_m: float = 6.0, closing: complex = 0.01
) -> xr.DataArray:
    """Ring of six quarter waves whose sum port is closed: one port in, two out in opposite phase.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    centre_hz : float
        [Hz].
    loss_db_per_m : float
        Line loss at 1 GHz [dB/m].
    closing : complex
        Reflection that closes the sum port.

    Returns
    -------
    DataArray of shape (frequency, 3, 3)
        Port 1 in, 2 and 3 out; reciprocal, passive.
    """
    f = np.asarray(frequency, dtype=float)
    g, quarter = _gamma(f, loss_db_per_m), _quarter(centre_hz)
    circuit = Circuit(f, 4)
    for a, b, waves in ((0, 1, 1), (1, 2, 1), (2, 3, 1), (3, 0, 3)):
        circuit.line(a, b, ohm=50 * np.sqrt(2), gamma=g, length=waves * quarter)
    # Driving node 3 splits to 2 (one quarter) and 0 (three quarters): half a wave apart; node 1 is the sum port.
    return sparams(close_ports(circuit.sparams([3, 2, 0, 1]), [3], [closing]), f)


PARTS: Mapping[str, Callable[..., xr.DataArray]] = MappingProxyType(
    {
        "isolating-splitter": isolating_splitter,
        "reactive-tee": reactive_tee,
        "resistive-divider": resistive_divider,
        "circulator": circulator,
        "closed-coupler": closed_coupler,
        "balun": balun,
    }
)
"""Every part by name."""
