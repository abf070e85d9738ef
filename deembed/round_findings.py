"""What rounds and terminations say of themselves: missing, impossible, unsolved, disagreeing readings."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.banding import banded_findings, over_leading, worst_of
from deembed.findings import Finding, finding_id
from deembed.labels import ports_of
from deembed.numeric.threeport import Assembled

__all__ = [
    "disagreement_findings",
    "missing_findings",
    "repeat_findings",
    "termination_findings",
    "unsolved_findings",
]

# A reflection of 1 may be written with six digits.
_OVER_ONE = 1e-6

Closings = Sequence[Mapping[int, xr.DataArray]]


def _bad_points(array: xr.DataArray, ports: int) -> NDArray:
    """Where anything is not a number, over frequency; `ports` counts the port dims at the end."""
    values = array.transpose(..., "frequency", *array.dims[array.ndim - ports :]).values
    bad = ~np.isfinite(values)
    return over_leading(bad.any(axis=tuple(range(-ports, 0))) if ports else bad, keep=1)


def _over_frequencies(
    kind: str, where: str, severity: str, text: str, f: NDArray, number: int = 1
) -> Finding:
    return Finding(finding_id(kind, where, number), kind, where, severity, text, float(f[0]), float(f[-1]))


def missing_findings(
    rounds: Sequence[xr.DataArray], closings: Closings, names: Sequence[str]
) -> list[Finding]:
    """Readings and terminations that are not numbers, each named with its frequencies."""
    f = rounds[0].frequency.values
    bad = {name: _bad_points(r, 2) for r, name in zip(rounds, names, strict=True)}
    for given in closings:
        for port, g in given.items():
            if "frequency" in g.dims:
                bad[f"termination {port}"] = bad.get(f"termination {port}", False) | _bad_points(g, 0)
    found = []
    for where, mask in bad.items():
        if mask.any():
            text = (
                f"At {words.some_frequencies(f[mask])} {where} is missing or not a number; the part is left "
                "empty there wherever it depends on it."
            )
            found.append(_over_frequencies("missing", where, "warning", text, f[mask]))
    return found


def termination_findings(
    closings: Closings, rounds: Sequence[xr.DataArray], ports: Sequence[int]
) -> list[Finding]:
    """Terminations that reflect more than they receive, and those no round needed."""
    found = []
    f = rounds[0].frequency.values
    for port in (p for p in ports if any(p in given for given in closings)):
        where = f"termination {port}"
        used = [
            np.abs(given[port].transpose(..., *[d for d in given[port].dims if d == "frequency"]).values)
            for given, r in zip(closings, rounds, strict=True)
            if port in given and port not in ports_of(r)
        ]
        if not used:
            text = f"The termination given for part port {port} was not used: every round reads that port."
            found.append(_over_frequencies("unused", where, "note", text, f))
            continue
        spread = [np.broadcast_to(u, np.broadcast_shapes(u.shape, f.shape)) for u in used]
        size = np.fmax.reduce([over_leading(s, keep=1) for s in spread])
        found += banded_findings(
            f,
            size,
            size > 1 + _OVER_ONE,
            kind="termination",
            where=where,
            severity="warning",
            sentence="{start} " + where + " reflects up to {worst} of the wave it receives{at}; a "
            "passive termination reflects 1 at most. Check its file and its format.",
            say="{:.4g}".format,
        )
    return found


def unsolved_findings(
    result: Assembled, rounds: Sequence[xr.DataArray], closings: Closings, part: xr.DataArray
) -> list[Finding]:
    """Frequencies with good readings and no part, and those where the general solver was needed."""
    f = part.frequency.values
    bad = [_bad_points(r, 2) for r in rounds]
    bad += [_bad_points(g, 0) for given in closings for g in given.values() if "frequency" in g.dims]
    fine = ~np.any(bad, axis=0)
    empty = fine & _bad_points(part, 2)
    general = fine & ~empty & over_leading(result.general, keep=1)
    found = []
    if empty.any():
        text = (
            f"At {words.some_frequencies(f[empty])} no part fits these rounds and terminations: there is no "
            "solution, or the solver settled on none. The part is left empty there. Close free ports with a "
            "better match and read the rounds again."
        )
        found.append(_over_frequencies("assembly", "", "warning", text, f[empty], 1))
    if general.any():
        text = (
            f"At {words.some_frequencies(f[general])} a part port met different terminations in different "
            "rounds, or one that reflects everything; the part is the least-squares fit to all rounds there, "
            f"settled after {result.steps} steps at most."
        )
        found.append(_over_frequencies("assembly", "", "note", text, f[general], 2))
    return found


def disagreement_findings(disagreement: xr.DataArray, limit: float) -> list[Finding]:
    """One warning per part port, round and band in which a reflection is not what other rounds read.

    Where only two rounds read a port both are equally far from their mean: one warning names both.
    """
    found = []
    outer = {str(d): n for d, n in disagreement.sizes.items() if d not in ("round", "frequency", "port")}
    for port in disagreement.port.values:
        values = np.abs(disagreement.sel(port=port).transpose("round", ..., "frequency").values)
        sizes = {
            str(label): over_leading(v, keep=1)
            for label, v in zip(disagreement["round"].values, values, strict=True)
            if not np.isnan(v).all()
        }
        first, *others = sizes.values() or [np.array([])]
        if len(others) == 1 and np.allclose(first, others[0], rtol=1e-6, atol=1e-12, equal_nan=True):
            found += _disagreement(disagreement, first, limit, outer, list(sizes), port)
            continue
        for label, size in sizes.items():
            found += _disagreement(disagreement, size, limit, outer, [label], port)
    return found


def _disagreement(
    disagreement: xr.DataArray,
    size: NDArray,
    limit: float,
    outer: dict[str, int],
    labels: Sequence[str],
    port: int,
) -> list[Finding]:
    read = f"read in {'rounds' if len(labels) > 1 else 'round'} {words.listed(labels)}"
    return banded_findings(
        disagreement.frequency.values,
        size,
        size > limit,
        kind="disagreement",
        where=", ".join([*(f"round {label}" for label in labels), f"part port {port}"]),
        severity="warning",
        sentence=f"{{start}} the reflection of part port {port} {read} is off the mean of its readings "
        "by a wave amplitude of up to {worst}{at}"
        + worst_of(outer)
        + "; a round, its connections or a termination is not what the job says.",
    )


def repeat_findings(
    residuals: Sequence[NDArray], rounds: Sequence[xr.DataArray], names: Sequence[str], limit: float
) -> list[Finding]:
    """As `disagreement_findings`, for transmissions that rounds of three or more ports read again."""
    found = []
    for r, residual, name in zip(rounds, residuals, names, strict=True):
        ports = ports_of(r)
        for i, j in combinations(range(len(ports)), 2):
            size = over_leading(np.abs(np.stack([residual[..., i, j], residual[..., j, i]])), keep=1)
            found += banded_findings(
                r.frequency.values,
                size,
                size > limit,
                kind="disagreement",
                where=f"{name}, part port {ports[i]}, part port {ports[j]}",
                severity="warning",
                sentence=f"{{start}} the transmission between part ports {ports[i]} and {ports[j]} read in "
                f"{name} "
                "is off what all rounds together say by a wave amplitude of up to {worst}{at}.",
            )
    return found
