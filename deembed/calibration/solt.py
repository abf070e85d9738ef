"""Short-open-load-thru calibration of any number of ports."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.calibration.error_terms import build_terms
from deembed.calibration.reading import Reading, element, laid_out, sorted_readings, unsolved
from deembed.calibration.sol import port_terms, signed_standards
from deembed.errors import JobError, PortError, SolveError
from deembed.findings import attach
from deembed.labels import relabel_ports
from deembed.numeric.error_terms import Terms
from deembed.numeric.solt import thru_terms

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["DRIVES", "solve_solt"]

DRIVES = ("every-port", "first-port-only")
Pair = tuple[int, int]


def solve_solt(
    readings: Sequence[Reading],
    kit: Kit,
    *,
    ports: Sequence[int] = (1, 2),
    drive: str = "every-port",
    isolation: bool = False,
) -> xr.Dataset:
    """Error terms from reflections at every port and a known thru between every two ports.

    Parameters
    ----------
    readings : sequence of Reading
        Three or more reflections at each port that drives, a thru (any known two-port of kind thru, line or
        table) for each pair, and with `isolation` a reading called ``isolation`` for each pair.
    kit : Kit
    ports : sequence of int
        Analyzer ports, two or more.
    drive : str
        ``every-port``, or ``first-port-only`` for an analyzer in which only ``ports[0]`` drives.
    isolation : bool
        Take leakage from the isolation readings; zero otherwise.

    Returns
    -------
    Dataset
        Error terms, in the kit's reference impedance; directions that are not driven are NaN.

    Raises
    ------
    SolveError
        A standard or thru missing, or no solution at some frequencies (named).
    KitError, GridError, PortError, JobError
        Unknown standard, different grids, a port that is not calibrated, an unknown `drive`.

    References
    ----------
    Rytting 2001, ARFTG short course (twelve-term model), per ordered pair of ports.
    """
    if drive not in DRIVES:
        raise JobError(f"drive is {drive!r}", where="calibration", do=f"Use one of {', '.join(DRIVES)}.")
    if len(set(ports)) < 2 or len(set(ports)) != len(ports):
        raise PortError(f"ports are {list(ports)}", where="calibration", do="Name two or more, each once.")
    one, two, apart = sorted_readings(readings, kit, ports)
    driven = list(ports) if drive == "every-port" else [ports[0]]
    ordered = [(r, d) for d in driven for r in ports if r != d]
    wanted = sorted({(min(p), max(p)) for p in ordered})
    _all_there(wanted, two, "thru")
    if isolation:
        _all_there(wanted, apart, "isolation")
    own, dims, coords, findings = port_terms(one, kit, driven)
    f = coords["frequency"]
    for pair in wanted:
        found = kit.validity_findings(two[pair].standard, f, where=two[pair].name)
        findings += found
    arrays = _two_port_arrays(ordered, two, apart if isolation else {}, kit, f)
    # Own terms and thrus may carry different leading dims: laid out together, they line up.
    labelled = [xr.DataArray(t[..., i], dims=dims, coords=coords) for t in own for i in range(len(ports))]
    plain, dims, coords = laid_out([*labelled, *arrays])
    n = len(ports)
    own = [np.stack(plain[k * n : (k + 1) * n], axis=-1) for k in range(3)]
    terms = _transmission(own, plain[3 * n :], ordered, list(ports))
    _solved(terms, ordered, ports, f)
    absent = "" if drive == "every-port" else "only the first port drives, so no relation is left over"
    data = build_terms(
        terms,
        ports=ports,
        coords=coords,
        dims=dims,
        z0=kit.reference_impedance,
        method="solt",
        drive=drive,
        redundancy_absent=absent,
    )
    return attach(data.assign_attrs(signed_standards=signed_standards(one, kit)), findings)


def _all_there(wanted: Sequence[Pair], have: dict[Pair, Reading], what: str) -> None:
    missing = [pair for pair in wanted if pair not in have]
    if missing:
        d, r = missing[0]
        others = f" (and of {', '.join(f'{a}-{b}' for a, b in missing[1:])})" if missing[1:] else ""
        raise SolveError(
            f"no {what} reading between ports {d} and {r}{others}",
            where="calibration",
            do=f"Read the {what} with ports [{d}, {r}].",
        )


def _two_port_arrays(
    ordered: Sequence[Pair], two: dict[Pair, Reading], apart: dict[Pair, Reading], kit: Kit, f: NDArray
) -> list[xr.DataArray]:
    """Per ordered pair: M_dd, M_rd, the thru's four S-parameters (driven port first), leakage."""
    arrays = []
    for r, d in ordered:
        reading = two[min(r, d), max(r, d)]
        thru = relabel_ports(kit.response(reading.standard, f), reading.ports)
        arrays += [element(reading.raw, d, d), element(reading.raw, r, d)]
        arrays += [element(thru, i, j) for i in (d, r) for j in (d, r)]
        if apart:
            arrays.append(element(apart[min(r, d), max(r, d)].raw, r, d))
    return arrays


def _transmission(
    own: list[NDArray], plain: list[NDArray], ordered: Sequence[Pair], ports: list[int]
) -> Terms:
    n = len(ports)
    load, tracking, leakage = (np.full((*own[0].shape, n), np.nan, dtype=complex) for _ in range(3))
    each = len(plain) // len(ordered)
    for k, (r, d) in enumerate(ordered):
        m_dd, m_rd, *thru = plain[k * each : k * each + 6]
        leak = plain[k * each + 6] if each == 7 else 0.0
        i, j = ports.index(r), ports.index(d)
        two_port = np.stack(thru, axis=-1).reshape(*thru[0].shape, 2, 2)
        terms = (own[0][..., j], own[1][..., j], own[2][..., j])
        load[..., i, j], tracking[..., i, j] = thru_terms(m_dd, m_rd, two_port, terms, leak)
        leakage[..., i, j] = leak
    return Terms(own[0], own[1], own[2], load, tracking, leakage)


def _solved(terms: Terms, ordered: Sequence[Pair], ports: Sequence[int], f: NDArray) -> None:
    for r, d in ordered:
        i, j = list(ports).index(r), list(ports).index(d)
        values = {"load": terms.load_match[..., i, j], "tracking": terms.transmission_tracking[..., i, j]}
        unsolved(
            f,
            values,
            where=f"thru {min(r, d)}-{max(r, d)}, port {d} driving",
            why="the thru passes nothing there, or its reading is not a number",
        )
