"""Electrical lengths of arms and error boxes for the lane map."""

from __future__ import annotations

import numpy as np
import xarray as xr

from deembed.shell import arm_of
from deembed.views.lengths import delay_over

__all__ = ["arm_length", "box_lengths"]


def arm_length(shell: xr.Dataset | None, port: int) -> tuple[float, str]:
    """One-way delay of an arm [ps], and, where there is none, why.

    Parameters
    ----------
    shell : Dataset or None
    port : int
        Part port.

    Returns
    -------
    (float, str)
        0 and a reason without an arm; NaN where the arm passes nothing.
    """
    if shell is None or port not in shell.port_out.values:
        return 0.0, "no arm here: the cable plane is the part's plane"
    own = arm_of(shell, port)
    through = own.sel(port_out=2, port_in=1).values
    back = own.sel(port_out=1, port_in=1).values
    if np.all(through == 1) and np.all(back == 0):
        return 0.0, "no arm here: the cable plane is the part's plane"
    return 1e12 * delay_over(through, own.frequency.values), ""


def box_lengths(terms: xr.Dataset | None) -> dict[int, float]:
    """One-way delay of every analyzer port's error box [ps].

    Parameters
    ----------
    terms : Dataset or None
        Error terms of any method.

    Returns
    -------
    dict of int to float
        Half the two-way delay of the reflection tracking; for a port that never drives, the transmission
        tracking from one that does, less that one's own length. NaN where neither has values.
    """
    if terms is None:
        return {}
    f = terms.frequency.values
    ports = [int(p) for p in terms.port_in.values]
    out = {p: 0.5e12 * delay_over(terms["reflection_tracking"].sel(port_in=p).values, f) for p in ports}
    if "transmission_tracking" not in terms:
        return out
    receivers = [int(p) for p in terms.port_out.values]
    known = {p: d for p, d in out.items() if np.isfinite(d)}
    for r in receivers:
        if r not in known:
            through = [
                1e12 * delay_over(terms["transmission_tracking"].sel(port_out=r, port_in=d).values, f)
                - known[d]
                for d in known
                if d != r
            ]
            out[r] = next((t for t in through if np.isfinite(t)), float("nan"))
    return out
