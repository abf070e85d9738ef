"""Pictures of what the part may be: gain ceiling, reciprocity, power balance, three-way law."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr

from deembed import words
from deembed.views.model import Band, Limit, Picture, Trace, one_sweep, s_name
from deembed.views.network import peak

__all__ = ["gain_ceiling", "lossless_error", "power_balance", "reciprocity", "three_way"]


def _frequency(metrics: xr.Dataset) -> np.ndarray:
    one_sweep(metrics, what="the metrics")
    return np.asarray(metrics.frequency.values, dtype=float)


def gain_ceiling(metrics: xr.Dataset, *, bands: Sequence[Band] = (), name: str = "part.gain") -> Picture:
    """Largest singular value of S beside 1, the most a passive part can show.

    Parameters
    ----------
    metrics : Dataset
        With ``largest_singular_value`` over frequency (see `deembed.physicality`).
    bands : sequence of Band
    name : str

    Returns
    -------
    Picture
        Wave amplitude out over wave amplitude in.

    Raises
    ------
    DeembedError
        Metrics with leading dimensions.
    """
    f = _frequency(metrics)
    trace = Trace("largest gain", f, metrics["largest_singular_value"].values)
    top = peak([trace])
    told = "no values"
    if top is not None:
        above = words.percent(top[1] - 1) if top[1] > 1 else ""
        told = f"at most {top[1]:.4g} at {words.frequency(top[2])}"
        told += f", {above} above the passive limit of 1" if above else ", within the passive limit of 1"
    return Picture(
        name,
        "Gain ceiling: largest wave gain any drive could find",
        "Largest singular value",
        (trace,),
        "out/in",
        limits=(Limit(1.0, "passive limit"),),
        bands=tuple(bands),
        alt=f"Gain ceiling (largest singular value of S): {told}.",
        y_floor=None,
    )


def _pairs(error: xr.DataArray) -> list[tuple[str, int, int]]:
    ports = [int(p) for p in error.port_out.values]
    n = len(ports)
    return [
        (f"|{s_name(ports[i], ports[j])} − {s_name(ports[j], ports[i])}|", i, j)
        for j in range(n)
        for i in range(j + 1, n)
    ]


def reciprocity(
    metrics: xr.Dataset, *, bands: Sequence[Band] = (), name: str = "part.reciprocity"
) -> Picture:
    """Difference of the two directions, per port pair.

    Parameters
    ----------
    metrics : Dataset
        With ``reciprocity_error`` over (frequency, port_out, port_in).
    bands : sequence of Band
    name : str

    Returns
    -------
    Picture
        |S_rd - S_dr|, wave amplitude.

    Raises
    ------
    DeembedError
        Metrics with leading dimensions.
    """
    f = _frequency(metrics)
    error = metrics["reciprocity_error"].transpose("frequency", "port_out", "port_in")
    traces = tuple(Trace(label, f, error.values[:, i, j], k) for k, (label, i, j) in enumerate(_pairs(error)))
    top = peak(traces)
    told = "no values" if top is None else f"at most {top[1]:.3g} ({top[0]} at {words.frequency(top[2])})"
    return Picture(
        name,
        "Reciprocity error: difference between the two directions",
        "Difference (wave amplitude)",
        traces,
        "",
        bands=tuple(bands),
        alt=f"Difference between the two directions of each port pair: {told}.",
        y_floor=0.0,
    )


def power_balance(metrics: xr.Dataset, *, bands: Sequence[Band] = (), name: str = "part.power") -> Picture:
    """Share of the power driven into each port that comes out again, at all ports together.

    Parameters
    ----------
    metrics : Dataset
        With ``power_balance`` over (frequency, port_in).
    bands : sequence of Band
    name : str

    Returns
    -------
    Picture
        Power ratio.

    Raises
    ------
    DeembedError
        Metrics with leading dimensions.
    """
    f = _frequency(metrics)
    power = metrics["power_balance"].transpose("frequency", "port_in")
    traces = tuple(
        Trace(f"driven at {int(p)}", f, power.values[:, k], k) for k, p in enumerate(power.port_in.values)
    )
    top, low = peak(traces), peak(traces, lowest=True)
    told = "no values"
    if top is not None and low is not None:
        told = (
            f"highest {top[1]:.3g} ({top[0]}, {words.frequency(top[2])}), "
            f"lowest {low[1]:.3g} ({low[0]}, {words.frequency(low[2])})"
        )
    return Picture(
        name,
        "Power balance: share of the driven power that comes out again",
        "Power out / power in",
        traces,
        "of the power",
        limits=(Limit(1.0, "passive limit"),),
        bands=tuple(bands),
        alt=f"Share of the driven power that comes out again: {told}.",
        y_floor=0.0,
    )


def three_way(metrics: xr.Dataset, *, bands: Sequence[Band] = (), name: str = "part.three-way") -> Picture:
    """The three reflections added up beside the least a reciprocal three-port must reflect.

    Parameters
    ----------
    metrics : Dataset
        With ``reflection_sum`` and ``three_way_floor`` over frequency.
    bands : sequence of Band
    name : str

    Returns
    -------
    Picture
        Wave amplitude.

    Raises
    ------
    DeembedError
        Metrics with leading dimensions.

    References
    ----------
    R. C. Thompson, Linear Algebra Appl. 26 (1979).
    """
    f = _frequency(metrics)
    total, floor = metrics["reflection_sum"].values, metrics["three_way_floor"].values
    traces = (
        Trace("reflections added up", f, total, 0),
        Trace("least for a reciprocal part", f, floor, 1, 1),
    )
    slack = peak([Trace("slack", f, total - floor)], lowest=True)
    told = "no values"
    if slack is not None:
        told = f"smallest distance {slack[1]:+.3g} at {words.frequency(slack[2])}"
        told += ", below what a reciprocal part can show" if slack[1] < -1e-9 else ""
    return Picture(
        name,
        "Three-way law: |S11| + |S22| + |S33| against its floor",
        "Sum (wave amplitude)",
        traces,
        "",
        bands=tuple(bands),
        alt=f"Sum of the three reflection magnitudes beside its floor in a reciprocal part: {told}.",
        y_floor=0.0,
    )


def lossless_error(
    metrics: xr.Dataset, *, bands: Sequence[Band] = (), name: str = "part.lossless"
) -> Picture:
    """How far S is from lossless (spectral norm of S^H S minus one); see `power_balance` for arguments."""
    f = _frequency(metrics)
    trace = Trace("from lossless", f, metrics["lossless_error"].values)
    top = peak([trace])
    told = "no values" if top is None else f"at most {top[1]:.3g} at {words.frequency(top[2])}"
    return Picture(
        name,
        "Distance from lossless",
        "Norm of SᴴS − 1",
        (trace,),
        "",
        bands=tuple(bands),
        alt=f"Distance of the part from lossless: {told}.",
        y_floor=0.0,
    )
