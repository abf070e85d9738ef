"""What each stage of a job does; `stages` says in which order and on what it depends."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import SolveError
from deembed.findings import Finding, finding_id
from deembed.job import loading
from deembed.job.blind_spots import find_blind_spots
from deembed.job.inputs import Inputs
from deembed.job.places import Place
from deembed.job.regrid import bring_onto, same_points
from deembed.job.schema import JobFile, tolerance_of
from deembed.job.stripping import in_reference, strip_to
from deembed.labels import relabel_ports, select_ports

__all__ = [
    "assembled",
    "assessment",
    "blind_spots",
    "corrected",
    "grid",
    "load",
    "part",
    "shell",
    "sweeps",
    "terminations",
]

Got = Mapping[str, Any]
Findings = tuple[Finding, ...]


def load(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[dict[str, xr.DataArray], Findings]:
    """Every Touchstone input by name, once their grids are known to go together."""
    del place, got
    raw = {name: inputs.sparams(name, key=key) for key, name in loading.touchstone_files(spec)}
    loading.check_grids(spec, inputs)
    return raw, ()


def grid(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[NDArray, Findings]:
    """The part's own frequency grid [Hz]."""
    del place, got
    key, name = loading.round_files(spec)[0]
    return inputs.sparams(name, key=key).frequency.values, ()


def sweeps(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[Any, Findings]:
    """Sweeps of the part, labelled by analyzer port in rising order."""
    del place, got
    out = []
    for i, one in enumerate(spec.rounds):
        key = f"rounds[{i}].file"
        on = one.analyzer_ports or tuple(range(1, len(one.part_ports) + 1))
        out.append(loading.on_ports(inputs.sparams(one.file, key=key), on, name=one.file, key=key))
    return tuple(out), ()


def base_rounds(spec: JobFile) -> list[tuple[int, int | None]]:
    """Rounds by position, each with the sweep of the turned part where only the first port drives."""
    seats = [one.seats() for one in spec.rounds]
    if spec.analyzer.drive == "every-port":
        return [(i, None) for i in range(len(seats))]
    first = [(i, s) for i, s in enumerate(seats) if s[::-1] not in seats[:i] or len(s) == 1]
    return [(i, None if len(s) == 1 else seats.index(s[::-1])) for i, s in first]


def corrected(
    spec: JobFile, inputs: Inputs, place: Place, got: Got
) -> tuple[tuple[xr.DataArray, ...], Findings]:
    """Rounds corrected and labelled by part port."""
    del inputs, place
    solved, raw = got["terms on the grid"], got["sweeps"]
    out = []
    for i, turned in base_rounds(spec):
        round_ = spec.rounds[i]
        one = raw[i]
        if solved is not None:
            from deembed.calibration.error_terms import correct

            one = correct(solved, one, turned=None if turned is None else raw[turned])
        one = select_ports(relabel_ports(one, round_.seats()), round_.part_ports)
        out.append(one.rename("-".join(str(p) for p in round_.part_ports)))
    return tuple(out), ()


def terminations(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[Any, Findings]:
    """What closed the free ports of each round, on the part's grid."""
    del place
    notes: list[Finding] = []

    def read(files: Mapping[int, str], prefix: str) -> dict[int, xr.DataArray]:
        out = {}
        for port, file in files.items():
            key = f"{prefix}terminations.{port}"
            one = loading.one_port(inputs.sparams(file, key=key), name=file, key=key)
            if not same_points(one, got["grid"]):
                name, where = f"the termination of part port {port}", f"termination {port}"
                moved, note = bring_onto(one, got["grid"], name=name, where=where)
                one = moved  # type: ignore[assignment]
                notes.append(note)
            out[port] = one
        return out

    common = read(spec.terminations, "")
    per_round = []
    for i, _ in base_rounds(spec):
        round_ = spec.rounds[i]
        all_ = {**common, **read(round_.terminations, f"rounds[{i}].")}
        per_round.append({p: g for p, g in all_.items() if p not in round_.part_ports})
    return tuple(per_round), tuple(notes)


def assembled(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[Any, Findings]:
    """The part with its fixture at the cable planes, and how far readings of one port disagree."""
    del inputs, place
    from deembed.threeport import assemble

    rounds = got["corrected"]
    result = assemble(rounds, terminations=got["terminations"], part_ports=spec.job.part_ports)
    whole = in_reference(result.part, spec.job.reference_impedance_ohm)
    disagreement = result.disagreement.rename("disagreement")
    return (whole.rename(None), disagreement), tuple(result.findings)


def shell(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[xr.Dataset | None, Findings]:
    """The fixture as a shell on the part's grid; None where there is none."""
    del place
    notes: list[Finding] = []
    ports = tuple(range(1, spec.job.part_ports + 1))

    def here(file: str, key: str, name: str, where: str) -> xr.DataArray:
        one = inputs.sparams(file, key=key)
        if same_points(one, got["grid"]):
            return one
        moved, note = bring_onto(one, got["grid"], name=name, where=where)
        notes.append(note)
        return moved  # type: ignore[return-value]

    fixture = spec.fixture
    if fixture.coupled is not None:
        from deembed.fixture.coupled import coupled_shell

        network = here(fixture.coupled.file, "fixture.coupled.file", "the fixture", "")
        built, found = coupled_shell(
            network,
            analyzer_side_ports=fixture.coupled.analyzer_side_ports,
            part_side_ports=fixture.coupled.part_side_ports,
            ports=ports,
        )
        return built, (*found, *notes)
    if not fixture.arms:
        return None, ()
    from deembed.fixture.arms import arms_shell

    arms = {}
    for i, arm in enumerate(fixture.arms):
        where = f"arm {arm.part_port}"
        arms[arm.part_port] = here(arm.file, f"fixture.arms[{i}].file", where, where)
    sides = {arm.part_port: arm.analyzer_side for arm in fixture.arms}
    built, found = arms_shell(arms, analyzer_side=sides, ports=ports)
    return built, (*found, *notes)


def part(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[xr.DataArray, Findings]:
    """The part at its own planes."""
    del inputs, place
    whole, _ = got["assembled"]
    out = strip_to(got["shell"], whole, spec.job.reference_impedance_ohm).rename(None)
    bad = ~np.isfinite(out.values).all(axis=(-2, -1))
    bad = bad.reshape(-1, bad.shape[-1]).any(axis=0)
    f = out.frequency.values
    if not np.isfinite(out.values).any():
        raise SolveError(
            f"nothing could be computed at any of the {words.some_frequencies(f)}",
            where="the part",
            do="Look at the readings of the standards and at the arms: one passes or reflects nothing.",
        )
    if not bad.any():
        return out, ()
    text = (
        f"The part could not be computed at {words.some_frequencies(f[bad])}: a step before it has no "
        "solution there; those values are left empty."
    )
    low, high = float(f[bad][0]), float(f[bad][-1])
    return out, (Finding(finding_id("not-computed"), "not-computed", "", "warning", text, low, high),)


def assessment(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[Any, Findings]:
    """What physics has to say about the part."""
    del inputs, place
    from deembed.physicality.assess import assess

    metrics, found = assess(got["part"], expect=spec.expect.claims(), tolerance=tolerance_of(spec.expect))
    return (metrics, tuple(found)), tuple(found)


def blind_spots(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[Any, Findings]:
    """What no one could have seen in this job, and arms that evidence says are the wrong way round."""
    del inputs, place
    whole, _ = got["assembled"]
    _, judged = got["assessment"]
    return find_blind_spots(
        spec,
        whole=whole,
        shell=got["shell"],
        part=got["part"],
        findings=judged,
        terms=got["terms on the grid"],
        kit=got["kit"],
    )
