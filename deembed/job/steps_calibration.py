"""The calibration stages of a job: kit, readings of standards, error terms."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.findings import Finding, finding_id, findings_of
from deembed.job import loading
from deembed.job.inputs import Inputs, is_shipped_kit
from deembed.job.methods import ISOLATION, Setup, method_named
from deembed.job.places import Place
from deembed.job.regrid import bring_onto, same_points
from deembed.job.schema import JobFile, calibrated_ports
from deembed.labels import select_ports

__all__ = ["kit", "readings", "terms", "terms_on_grid"]

Got = Mapping[str, Any]
Findings = tuple[Finding, ...]


def kit(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[Any, Findings]:
    """The calibration kit, or None where the method needs none."""
    del place, got
    name = spec.calibration.kit
    if name is None or not method_named(spec.calibration.method).kit:
        return None, ()
    from deembed.standards import kit_from_text

    tables = dict(inputs.kit_tables(name))

    def read_table(file: str) -> xr.DataArray:
        return inputs.sparams(tables[file], key=f"calibration.kit {name}, {file}")

    text = inputs.get(name, key="calibration.kit").text or ""
    where = f"{name}.toml" if is_shipped_kit(name) else name
    return kit_from_text(text, where=where, read_table=read_table), ()


def readings(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[Any, Findings]:
    """Readings of standards, labelled by analyzer port."""
    del place, got
    if not spec.calibration.readings:
        return (), ()
    from deembed.calibration.reading import Reading

    out = []
    for i, one in enumerate(spec.calibration.readings):
        key = f"calibration.readings[{i}].file"
        raw = loading.on_ports(inputs.sparams(one.file, key=key), one.ports, name=one.file, key=key)
        out.append(Reading(one.standard, one.ports, select_ports(raw, one.ports)))
    return tuple(out), ()


def terms(spec: JobFile, inputs: Inputs, place: Place, got: Got) -> tuple[xr.Dataset | None, Findings]:
    """Error terms on the grid of the readings of standards, and what they say of themselves."""
    method = method_named(spec.calibration.method)
    if method.solve is None:
        return None, _unused_switch_terms(spec)
    from deembed.calibration.residuals import residual_findings
    from deembed.calibration.self_check import check_terms

    own_kit, own_readings = got["kit"], got["readings"]
    _known_standards(spec, own_kit, place)
    switch, notes = _switch_terms(spec, inputs, own_readings[0].raw.frequency.values)
    setup = Setup(
        calibrated_ports(spec),
        spec.analyzer.drive,
        spec.calibration,
        switch if method.uses_switch_terms else {},
    )
    solved = method.solve(own_readings, own_kit, setup)
    found = [*findings_of(solved), *check_terms(solved), *notes]
    if method.known_standards:
        found += residual_findings(solved, own_readings, own_kit)
    if not method.uses_switch_terms:
        from deembed.calibration.witness import switch_term_findings

        found += [*_unused_switch_terms(spec), *switch_term_findings(solved, switch)]
    return solved, tuple(found)


def _known_standards(spec: JobFile, kit: Any, place: Place) -> None:
    for i, reading in enumerate(spec.calibration.readings):
        if reading.standard not in kit.standards and reading.standard != ISOLATION:
            close = words.nearest(reading.standard, kit.standards)
            raise place.error(
                ("calibration", "readings", i, "standard"),
                f"standard {reading.standard!r} is not in the kit {kit.name!r}",
                f"{f'Did you mean {close}? ' if close else ''}The kit has {', '.join(kit.standards)}.",
            )


def _switch_terms(
    spec: JobFile, inputs: Inputs, frequency: NDArray
) -> tuple[dict[int, xr.DataArray], list[Finding]]:
    """Recorded switch terms on the grid of the readings that they go with."""
    out: dict[int, xr.DataArray] = {}
    notes: list[Finding] = []
    for port, file in spec.analyzer.switch_terms.items():
        key = f"analyzer.switch_terms.{port}"
        one = loading.one_port(inputs.sparams(file, key=key), name=file, key=key)
        if not same_points(one, frequency):
            moved, note = bring_onto(
                one, frequency, name=f"the switch term of port {port}", where=f"switch {port}"
            )
            one, notes = moved, [*notes, note]  # type: ignore[assignment]
        out[port] = one
    return out, notes


def _unused_switch_terms(spec: JobFile) -> tuple[Finding, ...]:
    ports = tuple(spec.analyzer.switch_terms)
    if not ports:
        return ()
    where = ", ".join(f"switch {p}" for p in ports)
    some = "port" if len(ports) == 1 else "ports"
    text = (
        f"The recorded switch terms of analyzer {some} {words.listed(ports)} were not "
        f"applied: method {spec.calibration.method} does not use them, but compares them with what its terms imply."
    )
    return (Finding(finding_id("switch-terms-unused", where), "switch-terms-unused", where, "note", text),)


def terms_on_grid(
    spec: JobFile, inputs: Inputs, place: Place, got: Got
) -> tuple[xr.Dataset | None, Findings]:
    """Error terms on the part's grid."""
    del spec, inputs, place
    solved, frequency = got["terms"], got["grid"]
    if solved is None or same_points(solved, frequency):
        return solved, ()
    moved, note = bring_onto(solved, frequency, name="the error terms")
    return moved, (note,)  # type: ignore[return-value]
