"""One-port calibration from known reflections (short, open, load and more)."""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.calibration.error_terms import build_terms
from deembed.calibration.reading import Reading, element, laid_out, sorted_readings, unsolved
from deembed.errors import SolveError
from deembed.findings import attach
from deembed.labels import select_ports
from deembed.numeric.error_terms import Terms
from deembed.numeric.sol import reflection_terms

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["port_terms", "signed_standards", "solve_sol"]


def solve_sol(readings: Sequence[Reading], kit: Kit, *, ports: Sequence[int] = (1,)) -> xr.Dataset:
    """Directivity, source match and reflection tracking of each port, from three or more known reflections.

    Parameters
    ----------
    readings : sequence of Reading
        One-port standards; readings of two-port standards are not used here and are an error.
    kit : Kit
    ports : sequence of int
        Analyzer ports, each calibrated alone.

    Returns
    -------
    Dataset
        Error terms; the two-index ones are NaN. Exact for three standards, least squares for more.

    Raises
    ------
    SolveError
        Fewer than three standards at a port, standards that do not differ, a two-port standard.
    KitError, GridError, PortError
        Unknown standard, different grids, a port that is not calibrated.

    References
    ----------
    Rytting 2001, ARFTG short course.
    """
    one, two, apart = sorted_readings(readings, kit, ports)
    for reading in (*two.values(), *apart.values()):
        raise SolveError(
            f"{reading.name} sits between two ports; method sol uses reflections only",
            where="calibration",
            do="Use method solt, or leave that reading out.",
        )
    terms, dims, coords, findings = port_terms(one, kit)
    nothing = np.full((*terms[0].shape, len(ports)), np.nan, dtype=complex)
    data = build_terms(
        Terms(terms[0], terms[1], terms[2], nothing, nothing, nothing),
        ports=ports,
        coords=coords,
        dims=dims,
        z0=kit.reference_impedance,
        method="sol",
        redundancy_absent="method sol finds no transmission terms",
    )
    return attach(data.assign_attrs(signed_standards=signed_standards(one, kit)), findings)


def signed_standards(one: dict[int, list[Reading]], kit: Kit) -> str:
    """JSON of the standards at each port whose exchange would invert a sign: opens, shorts and reflects."""
    kinds = ("open", "short", "reflect")
    names = {p: [r.standard for r in group if kit.kind(r.standard) in kinds] for p, group in one.items()}
    return json.dumps({str(p): list(dict.fromkeys(group)) for p, group in names.items()})


def port_terms(
    one: dict[int, list[Reading]], kit: Kit, driven: Sequence[int] | None = None
) -> tuple[list[NDArray], tuple[str, ...], dict, list]:
    """One-port terms of each port from its reflections.

    Returns
    -------
    list of three arrays of shape (..., frequency, port)
        NaN for ports that do not drive.
    dims, coords, findings
    """
    driven = list(one) if driven is None else driven
    for port in driven:
        _enough(port, one[port])
    f = one[driven[0]][0].raw.frequency.values
    arrays, findings, sizes = [], [], {}
    for port in driven:
        group = one[port]
        findings += [
            x for r in group for x in kit.validity_findings(r.standard, f, where=f"{r.standard} {port}")
        ]
        arrays += [element(r.raw, port, port) for r in group]
        arrays += [element(_own(r, port, kit, f), 1, 1) for r in group]
        sizes[port] = len(group)
    plain, dims, coords = laid_out(arrays)
    terms = []
    start = 0
    for port in one:
        if port not in driven:
            terms.append([np.full(plain[0].shape, np.nan, dtype=complex)] * 3)
            continue
        n = sizes[port]
        measured, known = (np.stack(plain[start + k * n : start + (k + 1) * n], axis=-1) for k in (0, 1))
        start += 2 * n
        solved = reflection_terms(measured, known)
        unsolved(
            f,
            dict(zip("abc", solved, strict=True)),
            where=f"port {port}",
            why="the readings or the definitions of "
            + ", ".join(r.standard for r in one[port])
            + " do not differ from each other there, or are not numbers",
        )
        terms.append(list(solved))
    return [np.stack([t[k] for t in terms], axis=-1) for k in range(3)], dims, coords, findings


def _enough(port: int, group: list[Reading]) -> None:
    names = sorted({r.standard for r in group})
    if len(names) < 3:
        have = f"only {', '.join(names)}" if names else "no reflection standard"
        raise SolveError(
            f"{have} read at port {port}; three different reflections are needed",
            where="calibration",
            do=f"Read {'another' if names else 'an open, a short and a load'} at port {port}.",
        )


def _own(reading: Reading, port: int, kit: Kit, f: NDArray) -> xr.DataArray:
    response = kit.response(reading.standard, f)
    return select_ports(response, [1]) if response.sizes["port_out"] > 1 else response
