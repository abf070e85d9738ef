"""Findings over bands: one per band in which something was seen, with its worst point and one sentence."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from deembed import words
from deembed.findings import Finding, bands_over, finding_id

__all__ = ["at_band", "banded_findings", "over_leading", "worst_of"]

# More bands than this for one thing in one place help nobody: neighbours further apart are then merged.
_MOST_BANDS = 2
# A merged band is said to be patchy when fewer of its points than this count.
_PATCHY = 0.9
_GAPS = (0.02, 0.05, 0.1, 0.2, 1.0)


def at_band(from_hz: float, to_hz: float) -> str:
    """Start of a sentence: ``Between 2.6 and 4.4 GHz`` or ``At 2 GHz``."""
    if from_hz == to_hz:
        return f"At {words.frequency(from_hz)}"
    return f"Between {words.band(from_hz, to_hz).replace(' to ', ' and ')}"


def over_leading(values: NDArray, *, keep: int) -> NDArray:
    """Any (bool) or largest over all axes before the last `keep`; NaN only where there is nothing else."""
    axes = tuple(range(values.ndim - keep))
    if values.dtype == bool:
        return np.asarray(values.any(axis=axes))
    largest = np.where(np.isnan(values), -np.inf, values).max(axis=axes)
    return np.where(np.isneginf(largest), np.nan, largest)


def worst_of(sizes: dict[str, int]) -> str:
    """How a sentence says that it speaks of the worst of many, e.g. `` (worst of 200 along draw)``."""
    if not sizes:
        return ""
    return f" (worst of {words.listed(f'{n} along {dim}' for dim, n in sizes.items())})"


def _worst_at(hz: float, over: NDArray) -> str:
    """Where the worst is, and how much of a merged band counts at all."""
    if over.size == 1:
        return ""
    patchy = f", seen at {words.percent(over.mean())} of the points" if over.mean() < _PATCHY else ""
    return f" (worst at {words.frequency(hz)}{patchy})"


def banded_findings(
    frequency: NDArray,
    size: NDArray,
    over: NDArray,
    *,
    kind: str,
    where: str,
    severity: str,
    sentence: str,
    say: Callable[[float], str] = "{:.2g}".format,
) -> list[Finding]:
    """One finding per band.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    size : array of shape (frequency,)
        How large the thing is; the largest inside a band is its worst.
    over : bool array of shape (frequency,)
        Where it counts.
    kind, where, severity : str
        As in `Finding`.
    sentence : str
        With ``{start}`` (the band), ``{worst}`` (the worst size, as `say` words it) and ``{at}`` (where:
        `` (worst at 3.9 GHz)``, or nothing when the band is one frequency).
    say : callable float -> str

    Returns
    -------
    list of Finding
        Bands merged until two at most are left.
    """
    merged = (bands_over(frequency, over, gap=gap) for gap in _GAPS)
    bands = next(b for b in merged if len(b) <= _MOST_BANDS)
    found = []
    for number, (i, j) in enumerate(bands, start=1):
        counted = np.where(over[i : j + 1], size[i : j + 1], -np.inf)
        worst = i + int(np.argmax(counted))
        f0, f1, at = (float(frequency[k]) for k in (i, j, worst))
        text = sentence.format(
            start=at_band(f0, f1),
            worst=say(float(size[worst])),
            at=_worst_at(at, over[i : j + 1]),
        )
        place = finding_id(kind, where, number)
        found.append(Finding(place, kind, where, severity, text, f0, f1, float(size[worst]), at))
    return found
