"""What a calibration says of itself, the moment it is solved."""

from __future__ import annotations

import json

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.banding import banded_findings
from deembed.findings import Finding, finding_id

__all__ = ["REDUNDANCY_FLOOR", "check_terms", "equivalent_delay", "noise_of"]

# Redundancy residual below which hardware alone explains it: eight connections that repeat to -50 dB at 10 GHz
# leave up to 3.3 % in 160 simulated calibrations to 8.5 GHz (the limit itself: common practice, no source).
REDUNDANCY_FLOOR = 0.04
# Noise of a residual counts as explained up to this many of its own standard deviations.
_NOISE_FACTOR = 6.0
# A sweep that starts below this share of its end can be extrapolated to zero frequency.
_REACHES_LOW = 0.1
# There and back through four metres of cable and the analyzer itself [s] (common practice, no source).
_LONGEST_ROUND_TRIP = 40e-9


def check_terms(terms: xr.Dataset) -> list[Finding]:
    """Findings on error terms: the redundant relation, signs of reflections, sizes that cannot be.

    Parameters
    ----------
    terms : Dataset
        Error terms of any method. Along leading dims the first entry is checked.

    Returns
    -------
    list of Finding
        Kinds ``redundancy`` (where ``thru 1-2``), ``tracking-sign`` (``open 2, short 2``), ``terms-size``
        (``port 2``).
    """
    extra = {d: 0 for d in terms.directivity.dims if d not in ("frequency", "port_in")}
    one = terms.isel(extra)
    inverted = _inverted_ports(one)
    return [*_tracking_sign(one, inverted), *_redundancy(one, inverted), *_sizes(one)]


def equivalent_delay(frequency: NDArray, ratio: NDArray) -> tuple[float, float]:
    """Thru delay error that would explain a redundancy ratio, and the share of it left unexplained.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        [Hz].
    ratio : complex array of shape (frequency,)
        Residual plus 1.

    Returns
    -------
    delay : float
        How much longer than said the thru would be [s].
    left : float
        Root mean square of what remains, over that of the residual itself.

    Notes
    -----
    A thru longer by tau than said leaves exp(-j w tau) in both transmission trackings, so the ratio is
    exp(-2 j w tau).
    """
    phase = np.unwrap(np.angle(ratio))
    # The mean turn is free: unwrapping starts at the first point, which need not be the right turn.
    phase = phase - 2 * np.pi * np.round((phase[0] - _through_origin(frequency, phase)) / (2 * np.pi))
    slope = float(frequency @ phase / (frequency @ frequency))
    model = np.exp(1j * slope * frequency)
    whole = np.sqrt(np.mean(np.abs(ratio - 1) ** 2))
    left = np.sqrt(np.mean(np.abs(ratio - model) ** 2)) / whole if whole else 0.0
    return -slope / (4 * np.pi), float(left)


def _through_origin(frequency: NDArray, phase: NDArray) -> float:
    """Phase at the first point of the straight line through zero with the sweep's own slope."""
    if frequency.size < 2:
        return 0.0
    return float(np.polyfit(frequency, phase, 1)[0] * frequency[0])


def noise_of(values: NDArray) -> float:
    """Standard deviation of a smooth trace's noise, from second differences of neighbours.

    Parameters
    ----------
    values : complex array of shape (frequency,)

    Returns
    -------
    float
        0 for fewer than five points.
    """
    if values.size < 5:
        return 0.0
    second = np.diff(values, 2)
    return float(np.median(np.abs(second)) / np.sqrt(6.0) / 0.8326)


def _redundancy(terms: xr.Dataset, inverted: list[int]) -> list[Finding]:
    if "redundancy" not in terms:
        return []
    f = terms.frequency.values
    found = []
    for pair in terms.pair.values:
        residual = terms.redundancy.sel(pair=pair).values
        good = np.isfinite(residual)
        if not good.any():
            continue
        size = np.where(good, np.abs(residual), 0.0)
        limit = max(REDUNDANCY_FLOOR, _NOISE_FACTOR * noise_of(residual[good]))
        # One point beyond six noises is chance; a fault of a standard is not a point.
        over = size > limit
        if over.mean() < 0.01:
            continue
        found += banded_findings(
            f,
            size,
            over,
            kind="redundancy",
            where=f"thru {pair}",
            severity="warning",
            sentence=f"{{start}} the error terms of ports {pair.replace('-', ' and ')} contradict each other by "
            f"up to {{worst}}{{at}}: {_reason(f[good], residual[good], pair, inverted)}.",
            say=words.percent,
        )
    return found


def _reason(f: NDArray, residual: NDArray, pair: str, inverted: list[int]) -> str:
    ratio = 1.0 + residual
    if np.median(np.abs(ratio + 1.0)) < 0.5:
        at = [p for p in map(int, pair.split("-")) if p in inverted]
        place = f"port {at[0]}" if len(at) == 1 else f"one of ports {pair.replace('-', ' and ')}"
        return f"the sign of the reflections is inverted at {place}, as when open and short are exchanged"
    delay, left = equivalent_delay(f, ratio)
    text = "a standard at one of them, or the thru, is not what it is said to be"
    if left < 0.3:
        sense = "longer" if delay > 0 else "shorter"
        text += f"; if the thru is to blame, it is {abs(delay) * 1e12:.3g} ps {sense} than said"
    return text


def _phase_at_zero(f: NDArray, tracking: NDArray) -> float | None:
    """Phase [degree] of a tracking term extrapolated to zero frequency; None where the sweep cannot tell.

    Points that lie far apart leave the delay open by whole turns per step: a phase is only stated when every
    delay that cables can have leads to the same one.
    """
    good = np.isfinite(tracking)
    f, tracking = f[good], tracking[good]
    if f.size < 8 or f[0] > _REACHES_LOW * f[-1]:
        return None
    low = f <= f[0] + 0.25 * (f[-1] - f[0])
    if low.sum() < 4:
        return None
    f, step = f[low], float(np.diff(f[low]).max())
    slope, at_zero = np.polyfit(f, np.unwrap(np.angle(tracking[low])), 1)
    turns = np.arange(-20, 21)
    delays = -slope / (2 * np.pi) + turns / step
    possible = (delays > -0.1e-9) & (delays < _LONGEST_ROUND_TRIP)
    if not possible.any():
        return None
    phases = np.exp(1j * (at_zero + 2 * np.pi * turns[possible] * f[0] / step))
    if np.abs(phases - phases[0]).max() > 0.5:
        return None
    return float(np.degrees(np.angle(phases.mean())))


def _inverted_ports(terms: xr.Dataset) -> list[int]:
    f = terms.frequency.values
    found = []
    for port in terms.port_in.values:
        at_zero = _phase_at_zero(f, terms.reflection_tracking.sel(port_in=port).values)
        if at_zero is not None and abs(at_zero) > 120.0:
            found.append(int(port))
    return found


def _tracking_sign(terms: xr.Dataset, inverted: list[int]) -> list[Finding]:
    """Cables and couplers pass low frequencies upright: a tracking that starts inverted is a swap of standards."""
    f = terms.frequency.values
    names = json.loads(terms.attrs.get("signed_standards", "{}"))
    found = []
    for port in inverted:
        own = names.get(str(port), [])
        where = ", ".join(f"{name} {port}" for name in own) or f"port {port}"
        at_zero = _phase_at_zero(f, terms.reflection_tracking.sel(port_in=port).values)
        text = (
            f"At port {port} the reflection tracking, followed down to zero frequency, is inverted "
            f"({at_zero:.0f} degrees, near 0 is usual): {_swap(own)}, or its sign is wrong in the kit."
        )
        kind = "tracking-sign"
        found.append(
            Finding(
                finding_id(kind, where),
                kind,
                where,
                "warning",
                text,
                float(f[0]),
                float(f[-1]),
                at_zero,
                float(f[0]),
            )
        )
    return found


def _swap(names: list[str]) -> str:
    if len(names) < 2:
        return "the reflect is of the other sign"
    return f"the readings of {words.listed(names)} there look exchanged"


def _sizes(terms: xr.Dataset) -> list[Finding]:
    """A source or load match above 1 is no termination: a standard is wrong where it happens."""
    f = terms.frequency.values
    found = []
    for port in terms.port_in.values:
        matches = [np.abs(terms.source_match.sel(port_in=port).values)]
        matches += [np.abs(m) for m in terms.load_match.sel(port_out=port).values.T]
        with np.errstate(invalid="ignore"):
            size = np.nanmax([np.where(np.isfinite(m), m, 0.0) for m in matches], axis=0)
        found += banded_findings(
            f,
            size,
            size > 1.0,
            kind="terms-size",
            where=f"port {port}",
            severity="warning",
            sentence=f"{{start}} port {port} would send back up to {{worst}} times the wave it receives{{at}}, "
            "which no analyzer port does: a standard there is not what it is said to be.",
        )
    return found
