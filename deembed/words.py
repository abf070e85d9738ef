"""Numbers as an engineer would say them: frequencies, bands, levels, and the nearest known word."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

import numpy as np
from numpy.typing import ArrayLike

__all__ = [
    "band",
    "decibel",
    "frequency",
    "grid",
    "listed",
    "nearest",
    "percent",
    "some_frequencies",
    "times",
]

_UNITS = ((1e9, "GHz"), (1e6, "MHz"), (1e3, "kHz"), (1.0, "Hz"))


def _scaled(hz: float) -> tuple[float, str]:
    for scale, unit in _UNITS:
        if abs(hz) >= scale:
            return hz / scale, unit
    return hz, "Hz"


def frequency(hz: float, *, digits: int = 4) -> str:
    """Frequency in words, e.g. ``4.06 GHz``.

    Parameters
    ----------
    hz : float
        Frequency [Hz].
    digits : int
        Significant digits.
    """
    value, unit = _scaled(float(hz))
    return f"{value:.{digits}g} {unit}" if abs(value) < 10**digits else f"{value:.0f} {unit}"


def band(from_hz: float, to_hz: float) -> str:
    """A band in words, e.g. ``2.6 to 4.4 GHz``; one frequency when both ends are equal."""
    if from_hz == to_hz:
        return frequency(from_hz)
    low, high = frequency(from_hz), frequency(to_hz)
    if low.split()[1] == high.split()[1]:
        low = low.split()[0]
    return f"{low} to {high}"


def grid(values: ArrayLike) -> str:
    """A frequency grid in words, e.g. ``4400 points, 1 MHz to 4.4 GHz``."""
    values = np.asarray(values, dtype=float)
    if values.size == 0:
        return "no points"
    if values.size == 1:
        return f"1 point, {frequency(values[0], digits=9)}"
    return f"{values.size} points, {frequency(values[0], digits=9)} to {frequency(values[-1], digits=9)}"


def some_frequencies(values: ArrayLike, *, most: int = 4) -> str:
    """Frequencies counted and named, e.g. ``3 frequencies (1 GHz, 1.2 GHz, 5 GHz)``."""
    values = np.atleast_1d(np.asarray(values, dtype=float))
    shown = ", ".join(frequency(v, digits=7) for v in values[:most])
    if values.size > most:
        shown += f" ... {frequency(values[-1], digits=7)}"
    return f"{values.size} {'frequency' if values.size == 1 else 'frequencies'} ({shown})"


def decibel(ratio: float) -> str:
    """A wave-amplitude ratio in decibels, e.g. ``-6.02 dB``."""
    ratio = abs(ratio)
    return "-inf dB" if ratio == 0 else f"{20 * np.log10(ratio):.2f} dB"


def percent(ratio: float) -> str:
    """A ratio in per cent with two significant digits, e.g. ``10 %``."""
    value = 100 * ratio
    if value != 0 and abs(value) < 1e-4:
        return f"{value:.1e} %"
    return f"{float(f'{value:.2g}'):g} %"


def times(factor: float) -> str:
    """A factor in words, e.g. ``12 times``."""
    return f"{factor:.3g} times"


def listed(words: Iterable[object], *, last: str = "and") -> str:
    """Words in a row, e.g. ``1, 2 and 3``."""
    texts = [str(w) for w in words]
    if len(texts) < 2:
        return "".join(texts)
    return f"{', '.join(texts[:-1])} {last} {texts[-1]}"


def nearest(word: str, known: Iterable[str]) -> str | None:
    """The known word closest to a mistyped one, or None when none is close."""
    found = difflib.get_close_matches(word, list(known), n=1, cutoff=0.5)
    return found[0] if found else None
