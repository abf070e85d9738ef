"""One-port calibration from known reflections (short, open, load and more)."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.calibration.error_terms import build_terms
from deembed.calibration.reading import Reading, sorted_readings, unsolved
from deembed.calibration.sweeps import Sweep, elements, laid_out, response
from deembed.errors import PortError, SolveError
from deembed.findings import Finding, attach
from deembed.numeric.error_terms import Terms
from deembed.numeric.sol import reflection_terms

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["port_terms", "signed_standards", "solve_sol", "stacked_terms"]


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
    ports = tuple(ports)
    if not ports or len(set(ports)) != len(ports):
        raise PortError(f"ports are {list(ports)}", where="calibration", do="Name one or more, each once.")
    one, two, apart = sorted_readings(readings, kit, ports)
    for reading in (*two.values(), *apart.values()):
        raise SolveError(
            f"{reading.name} sits between two ports; method sol uses reflections only",
            where="calibration",
            do="Use method solt, or leave that reading out.",
        )
    found, dims, coords, findings = port_terms(one, kit, ports)
    own = stacked_terms(found, ports)
    nothing = np.full((*own[0].shape, len(ports)), np.nan, dtype=complex)
    data = build_terms(
        Terms(*own, nothing, nothing, nothing),
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
    one: dict[int, list[Reading]], kit: Kit, driven: Sequence[int]
) -> tuple[dict[int, tuple[NDArray, NDArray, NDArray]], tuple[str, ...], dict, list[Finding]]:
    """One-port terms of each port that drives from its reflections.

    Returns
    -------
    mapping port -> directivity, source match, reflection tracking of shape (..., frequency)
    dims, coords, findings
    """
    for port in driven:
        _enough(port, one[port])
    f = one[driven[0]][0].raw.frequency.values
    models = {name: response(kit, name, f)[0][0] for port in driven for name in _names(one[port])}
    sweeps: list[Sweep] = []
    findings: list[Finding] = []
    for port in driven:
        for r in one[port]:
            sweeps += [elements(r.raw, [port])[0][0], models[r.standard]]
            findings += kit.validity_findings(r.standard, f, where=f"{r.standard} {port}")
    plain, dims, coords = laid_out(sweeps, f)
    terms, start = {}, 0
    for port in driven:
        stop = start + 2 * len(one[port])
        terms[port] = reflection_terms(plain[start:stop:2], plain[start + 1 : stop : 2])
        start = stop
        unsolved(
            f,
            dict(zip("abc", terms[port], strict=True)),
            where=f"port {port}",
            why="the readings or the definitions of "
            + ", ".join(r.standard for r in one[port])
            + " do not differ from each other there, or are not numbers",
        )
    return terms, dims, coords, findings


def stacked_terms(
    terms: Mapping[int, Sequence[NDArray]], ports: Sequence[int]
) -> tuple[NDArray, NDArray, NDArray]:
    """The three one-port terms with ports last; NaN for ports that do not drive."""
    shape = np.shape(next(iter(terms.values()))[0])
    first, second, third = (np.full((*shape, len(ports)), np.nan, dtype=complex) for _ in range(3))
    for position, port in enumerate(ports):
        if port in terms:
            first[..., position], second[..., position], third[..., position] = terms[port]
    return first, second, third


def _names(group: list[Reading]) -> list[str]:
    return list(dict.fromkeys(r.standard for r in group))


def _enough(port: int, group: list[Reading]) -> None:
    names = sorted({r.standard for r in group})
    if len(names) < 3:
        have = f"only {', '.join(names)}" if names else "no reflection standard"
        raise SolveError(
            f"{have} read at port {port}; three different reflections are needed",
            where="calibration",
            do=f"Read {'another' if names else 'an open, a short and a load'} at port {port}.",
        )
