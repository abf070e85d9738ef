"""Edge-launch arms: a connector's launch, then a lossy line on the board."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike

from deembed.labels import sparams
from deembed.simulate.circuit import Circuit, line_constant

__all__ = ["edge_launch_arm"]


def edge_launch_arm(
    frequency: ArrayLike,
    *,
    length_m: float,
    impedance_ohm: float = 50.0,
    launch_farad: float = 0.15e-12,
    launch_henry: float = 0.3e-9,
    permittivity: float = 2.9,
    loss_db_per_m: float = 6.0,
) -> xr.DataArray:
    """One arm from connector to part.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz], above zero.
    length_m : float
        Of the board line [m].
    impedance_ohm : float
        Of the board line [ohm].
    launch_farad, launch_henry : float
        Shunt capacitance [F] and series inductance [H] of the launch, at the connector.
    permittivity : float
        Effective.
    loss_db_per_m : float
        At 1 GHz [dB/m], growing with the square root of frequency.

    Returns
    -------
    DataArray of shape (frequency, 2, 2)
        Port 1 toward the analyzer, port 2 toward the part.
    """
    f = np.asarray(frequency, dtype=float)
    gamma = line_constant(f, permittivity=permittivity, loss_db_per_m=loss_db_per_m)
    circuit = Circuit(f, 3).capacitor(0, None, launch_farad).inductor(0, 1, launch_henry)
    circuit.line(1, 2, ohm=impedance_ohm, gamma=gamma, length=length_m)
    return sparams(circuit.sparams([0, 2]), f)
