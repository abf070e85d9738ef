"""Short-open-load-thru calibration of any number of ports."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.calibration.error_terms import build_terms
from deembed.calibration.reading import Reading, sorted_readings, unsolved
from deembed.calibration.sol import port_terms, signed_standards, stacked_terms
from deembed.calibration.sweeps import Sweep, elements, laid_out, response
from deembed.calibration.thrus import chain_findings, check_connected, known_pairs
from deembed.errors import JobError, PortError, SolveError
from deembed.findings import attach
from deembed.numeric.error_terms import Terms
from deembed.numeric.solt import thru_terms
from deembed.numeric.thru_chain import complete_pairs, load_match_spread

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
        Three or more reflections at each port that drives, thrus (any known two-port of kind thru, line or
        table) that connect all ports, and with `isolation` a reading called ``isolation`` for each pair. A pair
        without a thru is followed through a third port, and a finding says so.
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
    ports = tuple(ports)
    if drive not in DRIVES:
        raise JobError(f"drive is {drive!r}", where="calibration", do=f"Use one of {', '.join(DRIVES)}.")
    if len(set(ports)) < 2 or len(set(ports)) != len(ports):
        raise PortError(f"ports are {list(ports)}", where="calibration", do="Name two or more, each once.")
    one, two, apart = sorted_readings(readings, kit, ports)
    driven = list(ports) if drive == "every-port" else [ports[0]]
    ordered = [(r, d) for d in driven for r in ports if r != d]
    wanted = sorted({(min(p), max(p)) for p in ordered})
    if isolation:
        _all_there(wanted, apart, "isolation")
    if drive == "every-port":
        check_connected(two, ports)
        ordered = [(r, d) for r, d in ordered if (min(r, d), max(r, d)) in two]
    wanted = sorted({(min(p), max(p)) for p in ordered})
    _all_there(wanted, two, "thru")
    own, dims, coords, findings = port_terms(one, kit, driven)
    f = coords["frequency"]
    for pair in wanted:
        findings += kit.validity_findings(two[pair].standard, f, where=two[pair].name)
    # Own terms and thrus may carry different leading dims: laid out together, they line up.
    sweeps = [Sweep(t, dims[:-1], coords) for d in driven for t in own[d]]
    sweeps += _two_port_sweeps(ordered, two, apart if isolation else {}, kit, f)
    rest = [(r, d) for d in driven for r in ports if r != d and (r, d) not in ordered]
    sweeps += [elements(apart[min(r, d), max(r, d)].raw, (d, r))[1][0] for r, d in rest if isolation]
    plain, dims, coords = laid_out(sweeps, f)
    leaks = dict(zip(rest, plain[len(plain) - len(rest) :] if isolation else [0.0] * len(rest), strict=True))
    plain = plain[: len(plain) - len(rest)] if isolation else plain
    own = {d: tuple(plain[3 * k : 3 * k + 3]) for k, d in enumerate(driven)}  # type: ignore[misc]
    terms = _transmission(own, plain[3 * len(driven) :], ordered, ports, f)
    known = known_pairs(ordered, ports)
    if drive == "every-port" and known.sum() < len(ports) * (len(ports) - 1):
        for (r, d), leak in leaks.items():
            terms.isolation[..., ports.index(r), ports.index(d)] = leak
        terms = complete_pairs(terms, known)
        findings += chain_findings(
            f, load_match_spread(terms, known), known, ports, next(iter(two.values())).standard
        )
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


def _two_port_sweeps(
    ordered: Sequence[Pair], two: dict[Pair, Reading], apart: dict[Pair, Reading], kit: Kit, f: NDArray
) -> list[Sweep]:
    """Per ordered pair: M_dd, M_rd, the thru's four S-parameters (driven port first), leakage."""
    used = {(min(p), max(p)) for p in ordered}
    models = {name: response(kit, name, f) for name in {two[pair].standard for pair in used}}
    sweeps = []
    for r, d in ordered:
        reading = two[min(r, d), max(r, d)]
        (own, _), (across, _) = elements(reading.raw, (d, r))
        model = models[reading.standard]
        i, j = reading.ports.index(d), reading.ports.index(r)
        sweeps += [own, across, model[i][i], model[i][j], model[j][i], model[j][j]]
        if apart:
            sweeps.append(elements(apart[min(r, d), max(r, d)].raw, (d, r))[1][0])
    return sweeps


def _transmission(
    own: Mapping[int, tuple[NDArray, NDArray, NDArray]],
    plain: list[NDArray],
    ordered: Sequence[Pair],
    ports: Sequence[int],
    f: NDArray,
) -> Terms:
    first, second, third = stacked_terms(own, ports)
    load, tracking, leakage = (np.full((*first.shape, len(ports)), np.nan, dtype=complex) for _ in range(3))
    each = len(plain) // len(ordered)
    for k, (r, d) in enumerate(ordered):
        m_dd, m_rd, t_dd, t_dr, t_rd, t_rr = plain[k * each : k * each + 6]
        leak = plain[k * each + 6] if each == 7 else 0.0
        found = thru_terms(m_dd, m_rd, (t_dd, t_dr, t_rd, t_rr), own[d], leak)
        unsolved(
            f,
            dict(zip(("load", "tracking"), found, strict=True)),
            where=f"thru {min(r, d)}-{max(r, d)}, port {d} driving",
            why="the thru passes nothing there, or its reading is not a number",
        )
        i, j = ports.index(r), ports.index(d)
        load[..., i, j], tracking[..., i, j] = found
        leakage[..., i, j] = leak
    return Terms(first, second, third, load, tracking, leakage)
