"""Check standards of a job: corrected like the part, held against their known values."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import xarray as xr

from deembed.findings import Finding
from deembed.job import loading
from deembed.job.inputs import Inputs
from deembed.job.places import Place
from deembed.job.schema import JobFile

__all__ = ["checks"]


def checks(
    spec: JobFile, inputs: Inputs, place: Place, got: Mapping[str, Any]
) -> tuple[tuple[xr.DataArray, ...], tuple[Finding, ...]]:
    """Normalized error of each check standard, and what it means."""
    del place
    if not spec.checks:
        return (), ()
    from deembed.calibration.check_standards import check_findings, normalized_error
    from deembed.calibration.error_terms import correct

    terms = got["terms on the grid"]
    errors, findings = [], []
    for i, one in enumerate(spec.checks):
        key = f"checks[{i}].file"
        raw = loading.on_ports(inputs.sparams(one.file, key=key), one.analyzer_ports, name=one.file, key=key)
        key = f"checks[{i}].reference"
        known = loading.on_ports(
            inputs.sparams(one.reference, key=key), one.analyzer_ports, name=one.reference, key=key
        )
        measured = raw if terms is None else correct(terms, raw)
        error = normalized_error(
            measured, known, uncertainty=one.uncertainty, reference_uncertainty=one.reference_uncertainty
        )
        errors.append(error)
        where = ", ".join(f"port {p}" for p in one.analyzer_ports)
        findings += check_findings(error, name=one.name or one.file, where=where)
    return tuple(errors), tuple(findings)
