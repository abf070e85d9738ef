"""Pictures of any S array: transmission, reflection, phase, group delay, reflection chart."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.views.lengths import group_delay
from deembed.views.model import Band, Picture, Trace, one_sweep, s_name

__all__ = [
    "chart",
    "decibels",
    "delay",
    "entries",
    "magnitude",
    "peak",
    "phase",
    "reflection",
    "transmission",
]


def decibels(values: NDArray) -> NDArray:
    """20 log10 of the magnitude [dB]; NaN for an exact zero, which no picture can show."""
    size = np.abs(values)
    return 20 * np.log10(np.where(size > 0, size, np.nan))


def entries(s: xr.DataArray, *, which: str) -> list[tuple[str, int, int, NDArray]]:
    """The curves of an S array, each with its place in palette and line styles.

    Parameters
    ----------
    s : DataArray of shape (frequency, port_out, port_in)
    which : str
        ``through`` (between different ports), ``reflection`` or ``all``.

    Returns
    -------
    list of (name, hue, dash, complex array of shape (frequency,))
        The two directions of a port pair share their hue, and the second is dashed.
    """
    one_sweep(s, what="the S array")
    s = s.transpose("frequency", "port_out", "port_in")
    ports = [int(p) for p in s.port_out.values]
    values = s.values
    out = []
    if which in ("reflection", "all"):
        out += [(s_name(p, p), i, 0, values[:, i, i]) for i, p in enumerate(ports)]
    if which in ("through", "all"):
        pairs = [(i, j) for j in range(len(ports)) for i in range(j + 1, len(ports))]
        first = len(ports) if which == "all" else 0
        for k, (i, j) in enumerate(pairs):
            out.append((s_name(ports[i], ports[j]), first + k, 0, values[:, i, j]))
            out.append((s_name(ports[j], ports[i]), first + k, 1, values[:, j, i]))
    return out


def peak(traces: Sequence[Trace], *, lowest: bool = False) -> tuple[str, float, float] | None:
    """Name, value and frequency [Hz] of the highest (or lowest) point of all curves; None without any."""
    best = None
    for t in traces:
        if t.empty:
            continue
        i = int(np.nanargmin(t.y) if lowest else np.nanargmax(t.y))
        found = (t.name, float(t.y[i]), float(t.frequency[i]))
        if best is None or (found[1] < best[1]) == lowest:
            best = found
    return best


def said(traces: Sequence[Trace], unit: str) -> str:
    """Highest and lowest point in words, for alternative text."""
    high, low = peak(traces), peak(traces, lowest=True)
    if high is None or low is None:
        return "no values"
    return (
        f"highest {high[1]:.4g} {unit} ({high[0]} at {words.frequency(high[2])}), "
        f"lowest {low[1]:.4g} {unit} ({low[0]} at {words.frequency(low[2])})"
    )


def _over(frequency: NDArray) -> str:
    return words.band(frequency[0], frequency[-1]) if frequency.size else "no frequencies"


def magnitude(s: xr.DataArray, *, which: str, name: str, title: str, bands: Sequence[Band] = ()) -> Picture:
    """Magnitudes in decibels over frequency.

    Parameters
    ----------
    s : DataArray of shape (frequency, port_out, port_in)
    which : str
        ``through``, ``reflection`` or ``all``.
    name, title : str
    bands : sequence of Band

    Returns
    -------
    Picture
        y in [dB].

    Raises
    ------
    DeembedError
        An array with leading dimensions.
    """
    f = np.asarray(s.frequency.values, dtype=float)
    traces = tuple(Trace(n, f, decibels(v), hue, dash) for n, hue, dash, v in entries(s, which=which))
    alt = f"{title}, magnitude over {_over(f)}: {said(traces, 'dB')}."
    return Picture(name, title, "Magnitude (dB)", traces, "dB", bands=tuple(bands), alt=alt)


def transmission(
    s: xr.DataArray,
    *,
    name: str = "part.transmission",
    title: str = "Transmission",
    bands: Sequence[Band] = (),
) -> Picture:
    """Magnitude between different ports [dB]; see `magnitude`."""
    return magnitude(s, which="through", name=name, title=title, bands=bands)


def reflection(
    s: xr.DataArray, *, name: str = "part.reflection", title: str = "Reflection", bands: Sequence[Band] = ()
) -> Picture:
    """Magnitude of the reflections [dB]; see `magnitude`."""
    return magnitude(s, which="reflection", name=name, title=title, bands=bands)


def phase(
    s: xr.DataArray,
    *,
    name: str = "part.phase",
    title: str = "",
    bands: Sequence[Band] = (),
) -> Picture:
    """Phase between different ports [degrees], -180 to 180, not unwrapped; see `magnitude`."""
    f = np.asarray(s.frequency.values, dtype=float)
    which = "through" if s.sizes["port_out"] > 1 else "reflection"
    title = title or f"Phase of {'transmission' if which == 'through' else 'reflection'}"
    traces = tuple(
        Trace(n, f, np.degrees(np.angle(v)) + 0 * np.abs(v), hue, dash, wraps=True)
        for n, hue, dash, v in entries(s, which=which)
    )
    middle = "; ".join(
        f"{t.name} {t.y[t.y.size // 2]:.0f} degrees" for t in traces if np.isfinite(t.y[t.y.size // 2])
    )
    where = words.frequency(f[f.size // 2]) if f.size else "no frequency"
    alt = f"{title} over {_over(f)}; at {where}: {middle or 'no value'}."
    return Picture(name, title, "Phase (degrees)", traces, "degrees", bands=tuple(bands), alt=alt)


def delay(
    s: xr.DataArray, *, name: str = "part.delay", title: str = "Group delay", bands: Sequence[Band] = ()
) -> Picture:
    """Group delay between different ports [ps], aperture about 1 % of the sweep; see `magnitude`."""
    f = np.asarray(s.frequency.values, dtype=float)
    half = max(1, round(f.size / 200))
    which = "through" if s.sizes["port_out"] > 1 else "reflection"
    traces = tuple(
        Trace(n, f, 1e12 * group_delay(v, f, aperture=half), hue, dash)
        for n, hue, dash, v in entries(s, which=which)
    )
    alt = f"{title} over {_over(f)}: {said(traces, 'ps')}."
    if f.size > 1:
        title += f" (aperture {words.frequency(f[min(2 * half, f.size - 1)] - f[0], digits=3)})"
    return Picture(name, title, "Group delay (ps)", traces, "ps", bands=tuple(bands), alt=alt)


def _impedance_words(s: xr.DataArray) -> str:
    if "z0" not in s.coords:
        return "reference impedance not stated"
    z0 = np.asarray(s.z0.values)
    z = complex(z0.ravel()[0])
    if not np.allclose(z0, z):
        return "reference impedances differ"
    return f"reference {z.real:.4g} ohm" if z.imag == 0 else f"reference {z:.4g} ohm"


def chart(s: xr.DataArray, *, name: str = "part.chart", title: str = "Reflection chart") -> Picture:
    """Reflections in the complex plane, on a grid of normalized impedance.

    Parameters
    ----------
    s : DataArray of shape (frequency, port_out, port_in)
    name, title : str

    Returns
    -------
    Picture
        Kind ``reflection``; x and y are real and imaginary part, no unit.

    Raises
    ------
    DeembedError
        An array with leading dimensions.
    """
    f = np.asarray(s.frequency.values, dtype=float)
    traces = tuple(
        Trace(n, v.real, v.imag, hue, dash, frequency=f) for n, hue, dash, v in entries(s, which="reflection")
    )
    sizes = [Trace(t.name, f, np.hypot(t.x, t.y)) for t in traces]
    largest = peak(sizes)
    told = (
        "no values"
        if largest is None
        else f"largest magnitude {largest[1]:.3g} ({largest[0]} at {words.frequency(largest[2])})"
    )
    title = f"{title}, {_impedance_words(s)}"
    return Picture(
        name,
        title,
        "Imaginary part",
        traces,
        "",
        kind="reflection",
        x_label="Real part",
        alt=f"{title}, over {_over(f)}: {told}.",
    )
