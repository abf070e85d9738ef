"""The three-way law: no three-port is matched, reciprocal and lossless at once."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.banding import at_band, banded_findings, over_leading, worst_of
from deembed.findings import Finding, bands_over, finding_id

__all__ = ["three_way_findings"]


def three_way_findings(
    metrics: xr.Dataset, *, expect: Mapping[str, bool], tolerance: Mapping[str, float]
) -> list[Finding]:
    """Findings of the three-way law for a three-port; none for other parts.

    Parameters
    ----------
    metrics : Dataset
        From `limits`.
    expect : mapping of passive, reciprocal, lossless to bool
    tolerance : mapping
        From `tolerances`.

    Returns
    -------
    list of Finding
        Kind ``three-way`` where data break Thompson's inequality or claim all three properties; notes of kind
        ``holds`` (which properties the part shows, where) and ``dissipation-floor``.

    References
    ----------
    Thompson 1979, Linear Algebra Appl. 26.
    """
    if "three_way_slack" not in metrics:
        return []
    return [
        *_broken(metrics, expect, tolerance["three_way"]),
        *_all_three(metrics, expect),
        *_which_hold(metrics),
        *_least_loss(metrics),
    ]


def _spread(metrics: xr.Dataset) -> str:
    lead = metrics.largest_singular_value
    return worst_of({str(d): n for d, n in lead.sizes.items() if d != "frequency"})


def _broken(metrics: xr.Dataset, expect: Mapping[str, bool], allowed: float) -> list[Finding]:
    if not expect.get("reciprocal", False):
        return []
    short = over_leading(-metrics.three_way_slack.transpose(..., "frequency").values, keep=1)
    return banded_findings(
        metrics.frequency.values,
        short,
        short > allowed,
        kind="three-way",
        where="",
        severity="contradiction",
        sentence="{start} the three reflections add up to {worst} less{at} than any reciprocal three-port "
        "with so little loss must show" + _spread(metrics) + "; these are not readings of a reciprocal part.",
    )


def _all_three(metrics: xr.Dataset, expect: Mapping[str, bool]) -> list[Finding]:
    claims = metrics.holds.all("property").transpose(..., "frequency").values
    contradicts = expect.get("reciprocal", False) or expect.get("lossless", False)
    short = over_leading(-metrics.three_way_slack.transpose(..., "frequency").values, keep=1)
    return banded_findings(
        metrics.frequency.values,
        short,
        over_leading(claims, keep=1),
        kind="three-way",
        where=", ".join(f"part port {p}" for p in metrics.port_in.values),
        severity="contradiction" if contradicts else "warning",
        sentence="{start} the part looks matched, reciprocal and lossless at once within the tolerances; no "
        "three-port can be. The reflections are up to {worst} too small for that{at}"
        + _spread(metrics)
        + ": a reading is wrong, or the tolerances are too wide to tell.",
    )


def _which_hold(metrics: xr.Dataset) -> list[Finding]:
    f = metrics.frequency.values
    judged = over_leading(np.isfinite(metrics.three_way_slack.transpose(..., "frequency").values), keep=1)
    if not judged.any():
        return []
    phrases = []
    for name in ("matched", "reciprocal", "lossless"):
        flags = metrics.holds.sel(property=name).transpose(..., "frequency").values
        always = flags.all(axis=tuple(range(flags.ndim - 1)))
        phrases.append(f"{name} {_where_true(f, always, judged)}")
    text = (
        f"Within the tolerances the part is {words.listed(phrases)}; a three-port can be any two of matched, "
        f"reciprocal and lossless, never all three{_spread(metrics)}."
    )
    return [
        Finding(finding_id("holds"), "holds", "", "note", text, float(f[judged][0]), float(f[judged][-1]))
    ]


def _where_true(f: NDArray, mask: NDArray, judged: NDArray) -> str:
    mask = mask & judged
    if not mask.any():
        return "nowhere"
    if mask[judged].all():
        return "everywhere"
    bands = bands_over(f, mask)
    share = f"at {words.percent(mask.sum() / judged.sum())} of the frequencies"
    if len(bands) > 3:
        return share
    named = [at_band(float(f[i]), float(f[j])) for i, j in bands]
    return f"{words.listed(n[0].lower() + n[1:] for n in named)} ({share})"


def _least_loss(metrics: xr.Dataset) -> list[Finding]:
    """The dissipation floor where it is highest, among the points at which the part shows as reciprocal."""
    f = metrics.frequency.values
    reciprocal = metrics.holds.sel(property="reciprocal").transpose(..., "frequency").values
    floor = metrics.dissipation_floor.transpose(..., "frequency").values
    floor = over_leading(np.where(reciprocal, floor, np.nan), keep=1)
    band = np.flatnonzero(floor > 0)
    if not band.size:
        return []
    k = int(np.nanargmax(floor))
    lost = metrics.dissipation.transpose(..., "frequency").values[..., k]
    least = float(np.nanmin(lost))
    shown = f"lose {words.percent(least)}" if least >= 0 else f"gain {words.percent(-least)}"
    reflections = float(np.nanmin(metrics.reflection_sum.transpose(..., "frequency").values[..., k]))
    text = (
        f"At {words.frequency(f[k])} the three reflections add up to {reflections:.2g}: a passive, "
        f"reciprocal part so matched must lose at least {words.percent(floor[k])} of the power inside, "
        f"averaged over its ports; these readings {shown}{_spread(metrics)}."
    )
    f0, f1, at = float(f[band[0]]), float(f[band[-1]]), float(f[k])
    kind = "dissipation-floor"
    return [Finding(finding_id(kind), kind, "", "note", text, f0, f1, float(floor[k]), at)]
