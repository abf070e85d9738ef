"""Judge a part against what is expected of it, in findings an engineer would say."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import combinations

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.banding import banded_findings, over_leading, worst_of
from deembed.errors import JobError
from deembed.findings import Finding, finding_id, sort_findings
from deembed.labels import CORE, check
from deembed.physicality.limits import limits, tolerances
from deembed.physicality.three_way import three_way_findings

__all__ = ["EXPECTATIONS", "assess"]

EXPECTATIONS = ("passive", "reciprocal", "lossless")


def assess(
    s: xr.DataArray,
    *,
    expect: Mapping[str, bool] | None = None,
    tolerance: float | Mapping[str, float] | None = None,
) -> tuple[xr.Dataset, list[Finding]]:
    """Figures of physicality and what they mean for a part from which something is expected.

    Judged in real reference impedances: a complex z0 is first replaced by its real part (said in a note).
    Along leading dims figures keep every entry; findings speak of the worst.

    Parameters
    ----------
    s : DataArray of shape (..., frequency, port_out, port_in)
    expect : mapping, optional
        ``passive``, ``reciprocal``, ``lossless``: true or false. What is true and not so in the data is a
        contradiction; what is false and so everywhere in the data is a note; an absent key is not judged.
    tolerance : float or mapping, optional
        Wave amplitude allowed for ``gain``, ``reciprocity``, ``lossless``, ``match``, ``three_way``; one
        value for all, or some by name; 0.01 where not given (common practice, no source).

    Returns
    -------
    metrics : Dataset
        See `limits`.
    findings : list of Finding
        Contradictions first. Kinds ``gain``, ``power-balance``, ``non-reciprocity``, ``lossless``,
        ``three-way``, ``missing`` (``not-judged`` where nothing is left), ``reference-impedance``, and the
        notes ``holds`` and ``dissipation-floor``.

    Raises
    ------
    JobError
        Unknown expectation or tolerance.

    Examples
    --------
    >>> import numpy as np
    >>> from deembed import sparams
    >>> amplifier = sparams(np.array([[[0, 0], [1.1, 0]]] * 3), [1e9, 2e9, 3e9])
    >>> metrics, findings = assess(amplifier, expect={"passive": True})
    >>> print(findings[0].text)
    Between 1 and 3 GHz the part would give out up to 10 % more wave amplitude than it receives (worst at \
1 GHz); a passive part cannot.
    """
    s = check(s, what="part")
    expect = _expectations(expect)
    allowed = tolerances(tolerance)
    metrics = limits(s, tolerance=allowed)
    spread = worst_of({str(d): n for d, n in s.sizes.items() if d not in CORE})
    findings = [*_missing(s), *_reference(metrics, s)]
    if expect.get("passive"):
        findings += _gain(metrics, allowed["gain"], spread) + _power(metrics, allowed["gain"], spread)
    if expect.get("reciprocal"):
        findings += _non_reciprocity(metrics, allowed["reciprocity"], spread)
    if expect.get("lossless"):
        findings += _not_lossless(metrics, allowed["lossless"], spread)
    findings += _unexpected(metrics, expect, allowed)
    findings += three_way_findings(metrics, expect=expect, tolerance=allowed)
    return metrics, list(sort_findings(findings))


def _expectations(expect: Mapping[str, bool] | None) -> dict[str, bool]:
    expect = dict(expect or {})
    for name, value in expect.items():
        if name not in EXPECTATIONS:
            near = words.nearest(name, EXPECTATIONS)
            raise JobError(
                f"unknown expectation '{name}'",
                where="expect",
                do=f"Did you mean '{near}'?" if near else f"Known are {words.listed(EXPECTATIONS)}.",
            )
        if not isinstance(value, bool | np.bool_):
            raise JobError(
                f"'{name}' is {value!r}", where="expect", do="Give true or false, or leave it out."
            )
    return expect


def _worst(metrics: xr.Dataset, name: str) -> NDArray:
    return over_leading(metrics[name].transpose(..., "frequency").values, keep=1)


def _missing(s: xr.DataArray) -> list[Finding]:
    """Points that are not numbers are named, never dropped unseen."""
    f = s.frequency.values
    bad = ~np.isfinite(s.values)
    points = over_leading(bad.any(axis=(-2, -1)), keep=1)
    if not points.any():
        return []
    columns = over_leading(bad.any(axis=-2), keep=2).any(axis=0)
    where = "" if columns.all() else ", ".join(f"part port {p}" for p in s.port_in.values[columns])
    drive = "" if columns.all() else f" for waves into {where}"
    kind = "not-judged" if points.all() else "missing"
    all_points = "No frequency could be judged: at" if points.all() else "At"
    text = (
        f"{all_points} {words.some_frequencies(f[points])} the part is not a number{drive}; these points "
        "are left out of every judgement."
    )
    f0, f1 = float(f[points][0]), float(f[points][-1])
    return [Finding(finding_id(kind, where), kind, where, "warning", text, f0, f1)]


def _reference(metrics: xr.Dataset, s: xr.DataArray) -> list[Finding]:
    if metrics.attrs["reference_impedance"].startswith("as given"):
        return []
    largest = float(np.abs(s.z0.values.imag).max())
    text = (
        f"The reference impedances are complex (imaginary part up to {largest:.3g} ohm); the part was "
        f"judged in their "
        "real parts, port by port, since gain and reciprocity show only there."
    )
    return [Finding(finding_id("reference-impedance"), "reference-impedance", "", "note", text)]


def _gain(metrics: xr.Dataset, allowed: float, spread: str) -> list[Finding]:
    excess = _worst(metrics, "largest_singular_value") - 1.0
    return banded_findings(
        metrics.frequency.values,
        excess,
        excess > allowed,
        kind="gain",
        where="",
        severity="contradiction",
        sentence="{start} the part would give out up to {worst} more wave amplitude than it receives{at}"
        + spread
        + "; a passive part cannot.",
        say=words.percent,
    )


def _power(metrics: xr.Dataset, allowed: float, spread: str) -> list[Finding]:
    """Names the driven port that alone gives out too much; the gain of a combination of ports need not."""
    found = []
    for port in metrics.port_in.values:
        power = metrics.power_balance.sel(port_in=port).transpose(..., "frequency").values
        excess = over_leading(power, keep=1) - 1.0
        found += banded_findings(
            metrics.frequency.values,
            excess,
            excess > (1 + allowed) ** 2 - 1,
            kind="power-balance",
            where=f"part port {port}",
            severity="contradiction",
            sentence=f"{{start}} waves into part port {port} alone would come out with up to {{worst}} more "
            "power than went in{at}" + spread + "; a passive part cannot do that.",
            say=words.percent,
        )
    return found


def _non_reciprocity(metrics: xr.Dataset, allowed: float, spread: str) -> list[Finding]:
    found = []
    for a, b in combinations(metrics.port_out.values, 2):
        error = metrics.reciprocity_error.sel(port_out=a, port_in=b).transpose(..., "frequency").values
        size = over_leading(error, keep=1)
        found += banded_findings(
            metrics.frequency.values,
            size,
            size > allowed,
            kind="non-reciprocity",
            where=f"part port {a}, part port {b}",
            severity="contradiction",
            sentence=f"{{start}} transmission from part port {a} to {b} and back differs by a wave "
            "amplitude of up to {worst}{at}" + spread + "; a reciprocal part transmits alike both ways.",
        )
    return found


def _not_lossless(metrics: xr.Dataset, allowed: float, spread: str) -> list[Finding]:
    error = _worst(metrics, "lossless_error")
    return banded_findings(
        metrics.frequency.values,
        error,
        error > 2 * allowed,
        kind="lossless",
        where="",
        severity="contradiction",
        sentence="{start} the power that comes out differs from what went in by up to {worst}{at}"
        + spread
        + ", for the worst choice of drives; a lossless part gives all of it back.",
        say=words.percent,
    )


def _unexpected(
    metrics: xr.Dataset, expect: Mapping[str, bool], allowed: Mapping[str, float]
) -> list[Finding]:
    """What the job says the part is not, and the data say it is, over the whole sweep."""
    gain = _worst(metrics, "largest_singular_value") - 1.0
    shown = {
        "passive": (gain <= allowed["gain"], "it never gives out more than it receives"),
        "reciprocal": (
            _worst(metrics, "reciprocity_error_max") <= allowed["reciprocity"],
            "it transmits alike both ways everywhere",
        ),
        "lossless": (
            _worst(metrics, "lossless_error") <= 2 * allowed["lossless"],
            "it gives back all power everywhere",
        ),
    }
    judged = np.isfinite(gain)
    f = metrics.frequency.values
    found = []
    for name, (mask, words_for_it) in shown.items():
        if expect.get(name) is False and metrics.sizes["port_in"] > 1 and judged.any() and mask[judged].all():
            text = f"The part is expected not to be {name}, but within the tolerance {words_for_it}."
            kind = f"unexpectedly-{name}"
            found.append(Finding(finding_id(kind), kind, "", "note", text, float(f[0]), float(f[-1])))
    return found
