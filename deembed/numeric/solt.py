"""What a known thru adds to one-port terms: load match and transmission tracking."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["thru_terms"]


def thru_terms(
    measured_drive: NDArray,
    measured_receive: NDArray,
    thru: tuple[NDArray, NDArray, NDArray, NDArray],
    drive_terms: tuple[NDArray, NDArray, NDArray],
    isolation: NDArray | float,
) -> tuple[NDArray, NDArray]:
    """Load match of the receiving port and transmission tracking, from a known two-port between two ports.

    Parameters
    ----------
    measured_drive, measured_receive : complex arrays of shape (...)
        M_dd and M_rd, read with the thru connected and port d driven.
    thru : four complex arrays of shape (...)
        Its T_dd, T_dr, T_rd and T_rr.
    drive_terms : three complex arrays of shape (...)
        Directivity, source match and reflection tracking of port d.
    isolation : complex array of shape (...) or 0
        Leakage from d to r.

    Returns
    -------
    load_match, transmission_tracking : complex arrays of shape (...)
        NaN where the thru passes nothing.

    References
    ----------
    Rytting 2001, ARFTG short course (twelve-term model), for a thru that need not be ideal: the reflection seen
    into it, T_dd + T_dr T_rd L / (1 - T_rr L), is solved for the load L.
    """
    directivity, source_match, reflection_tracking = drive_terms
    t_dd, t_dr, t_rd, t_rr = thru
    rest = measured_drive - directivity
    with np.errstate(divide="ignore", invalid="ignore"):
        # Into the thru: b / a = rest / below, with b and a at the driven port.
        below = reflection_tracking + source_match * rest
        beyond = rest - t_dd * below
        passed = t_dr * t_rd * below
        load = beyond / (passed + t_rr * beyond)
        # Out of it: T_rd a / (1 - T_rr L), with a = below / reflection_tracking.
        received = (measured_receive - isolation) * reflection_tracking
        return load, received * (1.0 - t_rr * load) / (t_rd * below)
