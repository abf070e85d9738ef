"""Thru-reflect-line calibration of two ports."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.banding import banded_findings
from deembed.calibration.error_terms import build_terms
from deembed.calibration.reading import Reading, kit_kind, unsolved
from deembed.calibration.sweeps import Sweep, elements, laid_out, response
from deembed.errors import PortError, SolveError
from deembed.findings import Finding, attach
from deembed.labels import check, ports_of, same_grid
from deembed.numeric import trl as kernel
from deembed.numeric.error_terms import from_boxes

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["LINE_PHASE_DEG", "solve_trl"]

# Line-minus-thru phase in which a single line serves (common practice, no source).
LINE_PHASE_DEG = (20.0, 160.0)


def solve_trl(
    readings: Sequence[Reading],
    kit: Kit,
    *,
    ports: Sequence[int] = (1, 2),
    switch_terms: Mapping[int, xr.DataArray] | None = None,
) -> xr.Dataset:
    """Error terms of two ports from a thru, a line and an unknown reflect that is the same at both.

    Parameters
    ----------
    readings : sequence of Reading
        One each of kind thru, line and reflect (a short or open serves as reflect). The reflect is read on both
        ports, in one reading or two.
    kit : Kit
        The thru's and the line's lengths tell the two roots apart; of the reflect only the sign counts.
    ports : sequence of two int
        Analyzer ports.
    switch_terms : mapping port -> one-port DataArray, optional
        a_r / b_r at port r while the other port drives; taken as zero where not given.

    Returns
    -------
    Dataset
        Error terms in the line's own impedance, planes in the middle of the thru. Also
        ``propagation_constant`` [1/m] on (..., frequency), or ``line_constant`` (that constant times the
        difference of length, no unit) where the kit gives a delay but no lengths; ``line_phase`` [degree] of
        line minus thru; ``reflect``, the reflection found.

    Raises
    ------
    SolveError
        A standard missing, or no solution at some frequencies (named).
    PortError, KitError, GridError
        Other than two ports, unknown standard, different grids.

    References
    ----------
    Engen & Hoer 1979, IEEE Trans. MTT 27(12); Marks 1997, 50th ARFTG (switch terms).
    """
    ports = tuple(ports)
    if len(set(ports)) != 2:
        raise PortError(f"ports are {list(ports)}", where="calibration", do="TRL calibrates two ports.")
    thru, line, reflects = _standards(readings, kit, ports)
    same_grid(*(r.raw for r in readings), names=[r.name for r in readings])
    f = thru.raw.frequency.values
    switched = _switch_sweeps(switch_terms, ports, thru)
    sweeps = [s for r in (thru, line) for row in elements(r.raw, ports) for s in row]
    sweeps += _reflect_sweeps(reflects, ports) + switched
    # In the standards' own impedance: a mismatch to the kit's reference is not the line's.
    sweeps += [Sweep(*kit.plain_transmission(r.standard, f)) for r in (line, thru)]
    sweeps.append(response(kit, reflects[0].standard, f)[0][0])
    plain, dims, coords = laid_out(sweeps, f)
    raw = [np.stack(plain[k : k + 4], axis=-1).reshape(*plain[0].shape, 2, 2) for k in (0, 4, 8)]
    switch = np.stack(plain[12:14], axis=-1)
    free = [kernel.remove_switch_terms(m, switch) for m in raw] if switch_terms else raw
    guess = plain[14] / plain[15]
    boxes = kernel.solve(*free, line_guess=guess, reflect_guess=plain[16])
    _solved(boxes, thru, line, reflects, f)
    extra, attrs = _line_results(boxes, guess, kit, thru, line)
    data = build_terms(
        from_boxes(boxes.e00, boxes.e11, boxes.e10e01, boxes.forward, switch),
        ports=ports,
        coords=coords,
        dims=dims,
        z0=kit.reference_impedance,
        method="trl",
        redundancy_absent="the terms come from one box per port, for which the relation is an identity",
        extra=extra,
    )
    signed = json.dumps({str(p): [reflects[0].standard] for p in ports})
    attrs |= {"signed_standards": signed, "switch_terms": "given" if switch_terms else "taken as zero"}
    data = data.assign_attrs(attrs)
    findings = _validity(kit, thru, line, f) + line_phase_findings(data, f"{line.standard} {_pair(ports)}")
    return attach(data, findings)


def _pair(ports: Sequence[int]) -> str:
    return "-".join(map(str, ports))


def _standards(
    readings: Sequence[Reading], kit: Kit, ports: tuple[int, ...]
) -> tuple[Reading, Reading, list[Reading]]:
    found: dict[str, list[Reading]] = {"thru": [], "line": [], "reflect": []}
    for reading in readings:
        stray = [p for p in reading.ports if p not in ports]
        if stray:
            raise PortError(
                f"port {stray[0]} is not among the calibrated ports {list(ports)}", where=reading.name
            )
        kind = kit_kind(reading, kit)
        kind = "reflect" if kind in ("open", "short") else kind
        if kind not in found:
            raise SolveError(
                f"{reading.name} is of kind {kind}; TRL uses a thru, a line and a reflect",
                where="calibration",
                do="Leave it out.",
            )
        found[kind].append(reading)
    for kind in ("thru", "line"):
        if len(found[kind]) != 1 or len(found[kind][0].ports) != 2:
            names = ", ".join(r.name for r in found[kind]) or "none"
            raise SolveError(
                f"readings of kind {kind} between ports {_pair(ports)}: {names}",
                where="calibration",
                do=f"TRL with a single line uses exactly one {kind}, read between ports {list(ports)}.",
            )
    read_on = sorted(p for r in found["reflect"] for p in r.ports)
    if read_on != sorted(ports) or len({r.standard for r in found["reflect"]}) != 1:
        raise SolveError(
            f"the reflect was read on ports {read_on}",
            where="calibration",
            do=f"Read one and the same reflect on each of ports {list(ports)}, once.",
        )
    return found["thru"][0], found["line"][0], found["reflect"]


def _reflect_sweeps(reflects: list[Reading], ports: tuple[int, ...]) -> list[Sweep]:
    """The four readings with the reflect on both ports; leakage is zero where each port was read alone."""
    if len(reflects) == 1:
        return [s for row in elements(reflects[0].raw, ports) for s in row]
    by_port = {r.ports[0]: elements(r.raw, r.ports)[0][0] for r in reflects}
    first, second = (by_port[p] for p in ports)
    return [first, _zero(first.values), _zero(first.values), second]


def _zero(like: NDArray) -> Sweep:
    return Sweep(np.zeros(like.shape[-1], dtype=complex))


def _switch_sweeps(
    switch_terms: Mapping[int, xr.DataArray] | None, ports: tuple[int, ...], thru: Reading
) -> list[Sweep]:
    if not switch_terms:
        return [_zero(thru.raw.frequency)] * 2
    if sorted(switch_terms) != sorted(ports):
        raise PortError(
            f"switch terms are given at ports {sorted(switch_terms)}; needed at {list(ports)}",
            where="switch terms",
            do="Give one per port: a_r / b_r at port r while the other drives.",
        )
    sweeps = []
    for port in ports:
        term = check(switch_terms[port], what=f"switch {port}")
        same_grid(thru.raw, term, names=("the thru", f"switch {port}"))
        if len(ports_of(term)) != 1:
            raise PortError(f"{len(ports_of(term))} ports came; needed one", where=f"switch {port}")
        sweeps.append(elements(term, ports_of(term))[0][0])
    return sweeps


def _solved(boxes: kernel.Boxes, thru: Reading, line: Reading, reflects: list[Reading], f: NDArray) -> None:
    unsolved(
        f,
        {"line": boxes.line},
        where=f"{line.name} beside {thru.name}",
        why="line and thru do not differ there (the same length, or half a wavelength apart), "
        "or a reading is not a number or passes nothing",
    )
    values = {"reflect": boxes.reflect, "box": boxes.e10e01.sum(axis=-1), "through": boxes.forward[..., 1, 0]}
    name = ", ".join(r.name for r in reflects)
    unsolved(f, values, where=name, why="the reflect reflects nothing there, or its reading is not a number")


def _line_results(
    boxes: kernel.Boxes, guess: NDArray, kit: Kit, thru: Reading, line: Reading
) -> tuple[dict[str, NDArray], dict[str, str]]:
    expected = -np.unwrap(np.angle(guess), axis=-1)
    phase = -np.angle(boxes.line)
    phase = phase + 2 * np.pi * np.round((expected - phase) / (2 * np.pi))
    constant = -np.log(np.abs(boxes.line)) + 1j * phase
    results = {"line_phase": np.degrees(phase), "reflect": boxes.reflect}
    lengths = kit.length(line.standard), kit.length(thru.standard)
    attrs = {"reference_plane": "middle of the thru", "reference_impedance": "the line's own"}
    if None in lengths:
        return results | {"line_constant": constant}, attrs
    difference = float(lengths[0] - lengths[1])  # type: ignore[operator]
    return results | {"propagation_constant": constant / difference}, attrs


def _validity(kit: Kit, thru: Reading, line: Reading, f: NDArray) -> list[Finding]:
    return [x for r in (thru, line) for x in kit.validity_findings(r.standard, f, where=r.name)]


def line_phase_findings(terms: xr.Dataset, where: str) -> list[Finding]:
    """Warnings where line and thru differ too little from a multiple of 180 degrees to tell them apart."""
    low, high = LINE_PHASE_DEG
    phase = np.abs(terms.line_phase.transpose(..., "frequency").values.reshape(-1, terms.sizes["frequency"]))
    # Distance to the nearest multiple of 180 degrees, the least over leading dims.
    margin = np.abs((phase + 90.0) % 180.0 - 90.0).min(axis=0)
    return banded_findings(
        terms.frequency.values,
        90.0 - margin,
        margin < min(low, 180.0 - high),
        kind="line-phase",
        where=where,
        severity="warning",
        sentence=f"{{start}} line and thru differ in phase by less than {low:.0f} or more than {high:.0f} degrees: "
        "they come within {worst} of a multiple of 180 degrees{at}, where errors of the readings are amplified; "
        "use another line there.",
        say=lambda value: f"{90.0 - value:.3g} degrees",
    )
