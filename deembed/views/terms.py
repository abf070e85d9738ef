"""Pictures of error terms: what the analyzer and its cables add, per port, and whether the terms agree."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr

from deembed import words
from deembed.views.model import Band, Limit, Picture, Trace, one_sweep
from deembed.views.network import decibels, peak

__all__ = ["line_phase", "port_terms", "redundancy", "redundancy_words"]

_OWN = ("directivity", "source_match", "reflection_tracking")
_BETWEEN = ("load_match", "transmission_tracking", "isolation")


def port_terms(terms: xr.Dataset, *, port: int) -> Picture:
    """All terms of one analyzer port: its own while it drives, and those it receives with while others drive.

    Parameters
    ----------
    terms : Dataset
        Error terms of any calibration method.
    port : int
        Analyzer port.

    Returns
    -------
    Picture
        [dB]

    Raises
    ------
    DeembedError
        Terms with leading dimensions.
    """
    one_sweep(terms, what="the error terms")
    f = np.asarray(terms.frequency.values, dtype=float)
    traces = [
        Trace(name.replace("_", " "), f, decibels(terms[name].sel(port_in=port).values), k)
        for k, name in enumerate(_OWN)
        if name in terms
    ]
    others = [int(d) for d in terms.port_in.values if int(d) != port]
    for k, name in enumerate(_BETWEEN):
        for n, d in enumerate(others):
            if name in terms:
                value = terms[name].sel(port_out=port, port_in=d).values
                label = name.replace("_", " ") + (f" from {d}" if len(others) > 1 else "")
                traces.append(Trace(label, f, decibels(value), 3 + k, 1 + n))
    told = "; ".join(f"{t.name} at most {np.nanmax(t.y):.3g} dB" for t in traces if not t.empty)
    return Picture(
        f"terms.port-{port}",
        f"Error terms of analyzer port {port}",
        "Magnitude (dB)",
        tuple(t for t in traces if not t.name.startswith("isolation") or not t.empty),
        "dB",
        alt=f"Error terms of analyzer port {port}: {told or 'no values'}.",
    )


def redundancy(terms: xr.Dataset, *, bands: Sequence[Band] = ()) -> Picture:
    """Residual of the one relation more than the terms need, per port pair.

    Parameters
    ----------
    terms : Dataset
        With ``redundancy`` over (frequency, pair), or without, and then the picture says why.
    bands : sequence of Band

    Returns
    -------
    Picture
        Magnitude of the residual, no unit.

    Raises
    ------
    DeembedError
        Terms with leading dimensions.
    """
    traces: tuple[Trace, ...] = ()
    if "redundancy" in terms:
        one_sweep(terms, what="the error terms")
        f = np.asarray(terms.frequency.values, dtype=float)
        residual = terms["redundancy"].transpose("frequency", "pair")
        traces = tuple(
            Trace(f"ports {p}", f, np.abs(residual.values[:, k]), k)
            for k, p in enumerate(residual.pair.values)
        )
    top = peak(traces)
    told = (
        redundancy_words(terms)
        if top is None
        else (f"at most {top[1]:.3g} ({top[0]} at {words.frequency(top[2])})")
    )
    return Picture(
        "terms.redundancy",
        "Redundancy residual: how far the terms contradict one another",
        "Residual (relative)",
        traces,
        "",
        bands=tuple(bands),
        alt=f"Redundancy residual of the error terms: {told}.",
        y_floor=0.0,
    )


def redundancy_words(terms: xr.Dataset) -> str:
    """Why there is no redundancy residual, or an empty string where there is one."""
    if "redundancy" in terms:
        return ""
    return str(terms.attrs.get("redundancy_absent", "the terms carry no redundancy residual"))


def line_phase(terms: xr.Dataset) -> Picture:
    """Phase of line minus thru of a TRL calibration, with the band in which it is trusted.

    Parameters
    ----------
    terms : Dataset
        With ``line_phase`` over frequency.

    Returns
    -------
    Picture
        [degrees]

    Notes
    -----
    20 to 160 degrees is common practice.
    """
    f = np.asarray(terms.frequency.values, dtype=float)
    value = np.abs(np.asarray(terms["line_phase"].values, dtype=float))
    trace = Trace("line minus thru", f, value)
    told = "no values" if trace.empty else f"{np.nanmin(value):.0f} to {np.nanmax(value):.0f} degrees"
    return Picture(
        "terms.line-phase",
        "Phase of the line beyond the thru",
        "Phase (degrees)",
        (trace,),
        "degrees",
        limits=(Limit(20.0, "trusted from"), Limit(160.0, "trusted to")),
        alt=f"Phase of the line beyond the thru: {told}; 20 to 160 degrees is trusted (common practice).",
    )
