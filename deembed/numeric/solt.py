"""What a known thru adds to one-port terms: load match and transmission tracking."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from deembed.numeric.sol import seen_reflection

__all__ = ["thru_terms"]


def thru_terms(
    measured_drive: NDArray,
    measured_receive: NDArray,
    thru: NDArray,
    drive_terms: tuple[NDArray, NDArray, NDArray],
    isolation: NDArray | float,
) -> tuple[NDArray, NDArray]:
    """Load match of the receiving port and transmission tracking, from a known two-port between two ports.

    Parameters
    ----------
    measured_drive, measured_receive : complex arrays of shape (...)
        M_dd and M_rd, read with the thru connected and port d driven.
    thru : complex array of shape (..., 2, 2)
        Its S-parameters, driven port first.
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
    rest = seen_reflection(measured_drive, *drive_terms) - thru[..., 0, 0]
    with np.errstate(divide="ignore", invalid="ignore"):
        load = rest / (thru[..., 0, 1] * thru[..., 1, 0] + thru[..., 1, 1] * rest)
        into = 1.0 + source_match * (measured_drive - directivity) / reflection_tracking
        out = thru[..., 1, 0] * into / (1.0 - thru[..., 1, 1] * load)
        return load, (measured_receive - isolation) / out
