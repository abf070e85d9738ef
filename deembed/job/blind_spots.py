"""What no one could have seen in this job, and how far off the part would be.

Each arm is turned round and the part stripped and judged again. Where physics would raise nothing new, the
mistake is a blind spot. Where turning it takes a contradiction away, that is evidence against the job as
written, and a finding.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr

from deembed import words
from deembed.findings import BlindSpot, Finding, finding_id
from deembed.job.methods import ISOLATION, Mistake, method_named
from deembed.job.schema import JobFile, tolerance_of
from deembed.job.stripping import strip_to

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["find_blind_spots", "turn_arm"]

# Below this a mistake is smaller than what a connector repeats (common practice, no source).
LEAST_ERROR_DB = -60.0
# A contradiction seen before counts as new when it grows by more than this factor.
_GROWN = 1.5


def find_blind_spots(
    spec: JobFile,
    *,
    whole: xr.DataArray,
    shell: xr.Dataset | None,
    part: xr.DataArray,
    findings: Sequence[Finding],
    terms: xr.Dataset | None,
    kit: Kit | None,
) -> tuple[tuple[BlindSpot, ...], tuple[Finding, ...]]:
    """Mistakes that would leave no trace in this job, and arms that look the wrong way round.

    Parameters
    ----------
    spec : JobFile
    whole : DataArray of shape (..., frequency, port_out, port_in)
        At the cable planes.
    shell : Dataset or None
        The fixture.
    part : DataArray of shape (..., frequency, port_out, port_in)
        At its own planes.
    findings : sequence of Finding
        What physics says of the part as the job is written.
    terms : Dataset or None
        Error terms.
    kit : Kit or None

    Returns
    -------
    tuple of BlindSpot, tuple of Finding
    """
    spots, found = [], []
    for arm in spec.fixture.arms:
        assert shell is not None
        spot, finding = _arm(spec, arm.part_port, whole, shell, part, findings)
        spots += [spot] if spot else []
        found += [finding] if finding else []
    return (*spots, *_calibration(spec, terms, kit)), tuple(found)


def turn_arm(shell: xr.Dataset, port: int) -> xr.Dataset:
    """The shell with the arm of one part port the other way round.

    Parameters
    ----------
    shell : Dataset
        One arm per port, not coupled.
    port : int
        Part port.
    """
    here = (shell.port_out == port) & (shell.port_in == port)
    turned = shell.copy()
    for a, b in (("outer_outer", "inner_inner"), ("outer_inner", "inner_outer")):
        turned[a], turned[b] = shell[a].where(~here, shell[b]), shell[b].where(~here, shell[a])
    at = shell.port_out.values == port
    outer, inner = shell.z0_outer, shell.z0_inner
    # port_out is the last dim of both impedances.
    sides = xr.broadcast(shell.z0_outer.reset_coords(drop=True), shell.z0_inner.reset_coords(drop=True))
    outer, inner = (side.transpose(..., "port_out") for side in sides)
    return turned.assign_coords(
        z0_outer=(outer.dims, np.where(at, inner.values, outer.values)),
        z0_inner=(outer.dims, np.where(at, outer.values, inner.values)),
    )


def _arm(
    spec: JobFile,
    port: int,
    whole: xr.DataArray,
    shell: xr.Dataset,
    part: xr.DataArray,
    findings: Sequence[Finding],
) -> tuple[BlindSpot | None, Finding | None]:
    from deembed.physicality.assess import assess

    other = strip_to(turn_arm(shell, port), whole, spec.job.reference_impedance_ohm)
    error = np.abs(other.values - part.values).max(axis=(-2, -1))
    error = np.where(np.isfinite(error), error, 0.0).reshape(-1, error.shape[-1]).max(axis=0)
    worst = float(error.max())
    if worst == 0 or 20 * np.log10(worst) < LEAST_ERROR_DB:
        return None, None
    at = float(part.frequency.values[error.argmax()])
    _, turned_findings = assess(other, expect=spec.expect.claims(), tolerance=tolerance_of(spec.expect))
    before, after = _evidence(findings), _evidence(turned_findings)
    new = [key for key, size in after.items() if key not in before or size > _GROWN * before[key]]
    gone = [f for f in findings if f.severity == "contradiction" and (f.kind, f.where) not in after]
    if gone and not new:
        # Gone by a margin: a contradiction at the edge of the tolerance comes and goes with anything.
        _, strict = assess(other, expect=spec.expect.claims(), tolerance=_halved(tolerance_of(spec.expect)))
        gone = [f for f in gone if (f.kind, f.where) not in _evidence(strict)]
    if gone and not new:
        return None, _direction(port, gone)
    return (None, None) if new else (_reversed(spec, port, worst, at), None)


def _halved(tolerance: float | dict[str, float]) -> float | dict[str, float]:
    return {k: v / 2 for k, v in tolerance.items()} if isinstance(tolerance, dict) else tolerance / 2


def _evidence(findings: Sequence[Finding]) -> dict[tuple[str, str], float]:
    """Size of every contradiction and warning, by kind and place."""
    out: dict[tuple[str, str], float] = {}
    for f in findings:
        if f.severity != "note":
            size = abs(f.worst) if f.worst is not None else 0.0
            out[f.kind, f.where] = max(size, out.get((f.kind, f.where), 0.0))
    return out


def _direction(port: int, gone: Sequence[Finding]) -> Finding:
    worst = max(gone, key=lambda f: abs(f.worst or 0.0))
    where = f"arm {port}"
    others = "" if len(gone) == 1 else f", and {len(gone) - 1} more"
    text = (
        f"Arm {port} looks the wrong way round: turned, it would take away what contradicts the part as "
        f"written: "
        f"{worst.text[0].lower()}{worst.text[1:].rstrip('.')}{others}."
    )
    return Finding(
        finding_id("arm-direction", where),
        "arm-direction",
        where,
        "warning",
        text,
        worst.from_hz,
        worst.to_hz,
        worst.worst,
        worst.worst_hz,
    )


def _reversed(spec: JobFile, port: int, worst: float, at: float) -> BlindSpot:
    second = next((a.part_port for a in spec.fixture.arms if a.part_port != port), None)
    if second is None:
        reading = f"an open and a short at the part's plane of port {port}, read through arm {port}"
    else:
        reading = f"a line of known length joining arms {min(port, second)} and {max(port, second)} in the part's place"
    text = (
        f"Were arm {port} the wrong way round, nothing in this job would show it, and the part would be off "
        f"by a wave amplitude of up to {words.decibel(worst)} (worst at {words.frequency(at)})."
    )
    return BlindSpot("arm-reversed", f"arm {port}", float(20 * np.log10(worst)), reading, text)


def _calibration(spec: JobFile, terms: xr.Dataset | None, kit: Kit | None) -> tuple[BlindSpot, ...]:
    why = _absent(terms)
    if why is None:
        return ()
    mistakes = method_named(spec.calibration.method).mistakes
    return tuple(_unseen(spec, mistake, why, kit) for mistake in mistakes)


def _absent(terms: xr.Dataset | None) -> str | None:
    """Why the error terms cannot be held against themselves; None where they can."""
    if terms is None:
        return "the readings came already corrected"
    if "redundancy" in terms:
        return None
    return str(terms.attrs.get("redundancy_absent", "the method leaves none")).rstrip(".")


def _unseen(spec: JobFile, mistake: Mistake, why: str, kit: Kit | None) -> BlindSpot:
    text = (
        f"{mistake.words[0].upper()}{mistake.words[1:]} would show only if it made the part break a law of "
        f"physics: redundancy is absent because {why}."
    )
    return BlindSpot(mistake.cause, _places(spec, mistake, kit), None, mistake.reading, text)


def _places(spec: JobFile, mistake: Mistake, kit: Kit | None) -> str:
    """Readings a mistake is about: ports for reflections, the standard by name for what sits between ports."""
    if kit is None:
        return ""
    found: dict[str, None] = {}
    for reading in spec.calibration.readings:
        if reading.standard == ISOLATION or kit.kind(reading.standard) not in mistake.kinds:
            continue
        between = kit.kind(reading.standard) in ("thru", "line")
        names = [f"{reading.standard} {'-'.join(map(str, reading.ports))}"] if between else []
        found.update(dict.fromkeys(names or [f"port {p}" for p in sorted(reading.ports)]))
    return ", ".join(found)
