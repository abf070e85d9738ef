"""Pictures on the way to the part: raw readings, corrected rounds, both readings of a reflection, arms."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr

from deembed import words
from deembed.shell import arm_of
from deembed.views.model import Band, Picture, Trace, one_sweep, s_name
from deembed.views.network import decibels, delay, magnitude, peak, said

__all__ = ["arm", "arm_delay", "coupling", "disagreement", "raw", "reflection_readings", "round_picture"]


def raw(reading: xr.DataArray, *, path: str) -> Picture:
    """Magnitude of a raw reading as the analyzer wrote it [dB].

    Parameters
    ----------
    reading : DataArray of shape (frequency, port_out, port_in)
    path : str
        The file, as the job names it.

    Returns
    -------
    Picture

    Raises
    ------
    DeembedError
        An array with leading dimensions.
    """
    return magnitude(reading, which="all", name=f"raw.{path}", title=f"Raw reading {path}")


def round_picture(corrected: xr.DataArray, *, label: str) -> Picture:
    """Magnitude of one corrected round at the cable planes [dB], labelled by part ports; see `raw`."""
    title = f"Round {label}, corrected, at the cable planes"
    return magnitude(corrected, which="all", name=f"round.{label}", title=title)


def reflection_readings(rounds: Sequence[xr.DataArray], *, port: int, labels: Sequence[str]) -> Picture:
    """Every reading of one part port's reflection at the cable plane [dB].

    Parameters
    ----------
    rounds : sequence of DataArrays of shape (frequency, port_out, port_in)
        Labelled by part ports.
    port : int
        Part port.
    labels : sequence of str
        Name of each round.

    Returns
    -------
    Picture
    """
    traces: list[Trace] = []
    for k, (one, label) in enumerate(zip(rounds, labels, strict=True)):
        if port in one.port_out.values:
            values = one.sel(port_out=port, port_in=port).values
            traces.append(
                Trace(f"in round {label}", one.frequency.values, decibels(values), k, len(traces) % 2)
            )
    title = f"Readings of {s_name(port, port)} at the cable plane"
    alt = f"{title}, magnitude: {said(traces, 'dB')}."
    return Picture(f"cable-plane.{port}", title, "Magnitude (dB)", tuple(traces), "dB", alt=alt)


def disagreement(spread: xr.DataArray, *, bands: Sequence[Band] = ()) -> Picture:
    """Largest difference between the readings of each part port's reflection.

    Parameters
    ----------
    spread : DataArray of shape (round, frequency, port)
        Complex, reading minus mean, as `deembed.threeport` gives it; NaN where a round does not read a port.
    bands : sequence of Band

    Returns
    -------
    Picture
        Wave amplitude; ports read once are among the missing.

    Raises
    ------
    DeembedError
        An array with other leading dimensions.
    """
    one_sweep(spread, what="the disagreement")
    values = spread.transpose("round", "frequency", "port").values
    apart = np.abs(values[:, None] - values[None, :])
    found = np.isfinite(apart).sum(axis=(0, 1)) > 1  # a lone reading only differs from itself, by nothing
    widest = np.where(found, np.max(np.where(np.isfinite(apart), apart, 0.0), axis=(0, 1)), np.nan)
    f = spread.frequency.values
    traces = tuple(Trace(f"part port {int(p)}", f, widest[:, k], k) for k, p in enumerate(spread.port.values))
    top = peak(traces)
    told = (
        "no port was read twice"
        if top is None
        else (f"at most {top[1]:.3g} ({top[0]} at {words.frequency(top[2])})")
    )
    return Picture(
        "rounds.disagreement",
        "Difference between the two readings of each reflection",
        "Difference (wave amplitude)",
        traces,
        "",
        bands=tuple(bands),
        alt=f"Difference between the two readings of each reflection: {told}.",
        y_floor=0.0,
    )


def arm(shell: xr.Dataset, *, port: int) -> Picture:
    """Transmission and reflections of one fixture arm [dB]; port 1 of the arm faces the analyzer.

    Parameters
    ----------
    shell : Dataset
        See `deembed.shell`.
    port : int
        Part port.

    Returns
    -------
    Picture

    Raises
    ------
    PortError
        A port the fixture does not have.
    """
    picture = magnitude(
        arm_of(shell, port),
        which="all",
        name=f"arm.{port}",
        title=f"Arm {port} (its port 1 faces the analyzer, port 2 the part)",
    )
    return picture


def arm_delay(shell: xr.Dataset, *, port: int) -> Picture:
    """Group delay of one fixture arm [ps]; see `arm`."""
    return delay(arm_of(shell, port), name=f"arm.{port}.delay", title=f"Group delay of arm {port}")


def coupling(shell: xr.Dataset) -> Picture:
    """What leaks between the arms of a coupled fixture [dB].

    Parameters
    ----------
    shell : Dataset
        See `deembed.shell`.

    Returns
    -------
    Picture
        |inner_outer| between different ports.
    """
    block = shell["inner_outer"]
    one_sweep(block, what="the fixture")
    return magnitude(
        block, which="through", name="fixture.coupling", title="Leakage between the fixture's arms"
    )
