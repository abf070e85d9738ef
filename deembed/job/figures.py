"""The figures of an outcome that people quote, with the frequency at which each is found."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from deembed.banding import over_leading

if TYPE_CHECKING:
    from deembed.job.outcome import Outcome

__all__ = ["figures"]


def figures(outcome: Outcome) -> list[dict]:
    """Name, value, unit and frequency [Hz] of the extremes a data sheet or a doubt would quote.

    Parameters
    ----------
    outcome : Outcome

    Returns
    -------
    list of dict
        Keys ``figure``, ``value``, ``unit``, ``at_hz``; over leading dims the largest. What has no value at any
        frequency is left out.
    """
    metrics, part = outcome.metrics, outcome.part
    f = part.frequency.values
    found = [
        _extreme("largest singular value", metrics.largest_singular_value.values, f, "wave amplitude"),
        _extreme("largest reciprocity error", metrics.reciprocity_error_max.values, f, "wave amplitude"),
    ]
    size = np.abs(over_leading(np.abs(part.values), keep=3))
    with np.errstate(divide="ignore"):
        decibels = 20 * np.log10(size)
    ports = [int(p) for p in part.port_out.values]
    for i, r in enumerate(ports):
        for j, d in enumerate(ports):
            for name, lowest in (("highest", False), ("lowest", True)):
                found.append(_extreme(f"{name} |S{r}{d}|", decibels[:, i, j], f, "dB", lowest=lowest))
    return [entry for entry in found if entry]


def _extreme(name: str, values: NDArray, f: NDArray, unit: str, *, lowest: bool = False) -> dict:
    values = over_leading(values, keep=1)
    good = np.isfinite(values)
    if not good.any():
        return {}
    k = int(
        np.argmin(np.where(good, values, np.inf)) if lowest else np.argmax(np.where(good, values, -np.inf))
    )
    return {"figure": name, "value": float(values[k]), "unit": unit, "at_hz": float(f[k])}
