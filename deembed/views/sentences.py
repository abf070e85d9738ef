"""Sentences and rows for report and widgets: findings, blind spots, what went in, cautions."""

from __future__ import annotations

import platform
import re
from collections.abc import Iterable
from dataclasses import dataclass
from importlib import metadata
from typing import Any

from deembed import words
from deembed.findings import Finding
from deembed.views.job_facts import JobFacts, StandardReading, facts_of
from deembed.views.terms import redundancy_words

__all__ = [
    "CAUTIONS",
    "SHAPES",
    "Caution",
    "FindingLine",
    "InputLine",
    "blind_lines",
    "facts_rows",
    "finding_line",
    "finding_lines",
    "input_lines",
    "plain_text",
    "tally",
    "unwitnessed",
    "version_rows",
]

SHAPES = {"contradiction": "◆", "warning": "◈", "note": "◇"}
"""One shape per severity, beside its word."""


@dataclass(frozen=True)
class FindingLine:
    """A finding as a row of words."""

    id: str
    severity: str
    shape: str
    place: str
    band: str
    significance: str
    text: str


@dataclass(frozen=True)
class InputLine:
    """One file a job loaded: what for, its name, its hash."""

    used_for: str
    name: str
    sha256: str


@dataclass(frozen=True)
class Caution:
    """One caution: about what, and what it is."""

    about: str
    text: str


_TYPED = {
    "operator": "Operator",
    "instrument": "Instrument",
    "kit_serial": "Kit serial number",
    "kit_due": "Kit due",
    "temperature_c": "Temperature (°C)",
    "note": "Note",
}

CAUTIONS = (
    Caution(
        "What this is not",
        "This report is not a calibration certificate. It states no traceability and no uncertainty but "
        "what it says itself; for either, follow accredited practice.",
    ),
    Caution(
        "RF power",
        "Check levels before connecting: analyzer inputs and parts have limits, and open ports radiate. "
        "Switch the power off before touching a connection.",
    ),
    Caution(
        "Static",
        "Discharge yourself, cables and fixture before touching centre conductors; wear the wrist strap.",
    ),
    Caution(
        "Connectors",
        "Inspect and clean them, turn the nut and never the body, and use the torque wrench made for them.",
    ),
    Caution(
        "Lifting",
        "Support test heads and heavy fixtures or ask for help, and take the weight off the cables.",
    ),
    Caution(
        "Local rules",
        "The rules of your laboratory and the instrument's own manual come before this page.",
    ),
)
"""Usual cautions at the bench; common practice, no source."""


def finding_line(finding: Finding) -> FindingLine:
    """One finding as words.

    Parameters
    ----------
    finding : Finding

    Returns
    -------
    FindingLine
        Place "the part" where the finding names none; band "whole sweep" where it names none.
    """
    band = "whole sweep"
    if finding.from_hz is not None and finding.to_hz is not None:
        band = words.band(finding.from_hz, finding.to_hz)
        if finding.worst_hz is not None and finding.from_hz != finding.to_hz:
            band += f", worst at {words.frequency(finding.worst_hz)}"
    size = "not known"
    if finding.significance is not None:
        size = f"{finding.significance:.3g} standard uncertainties"
    return FindingLine(
        finding.id,
        finding.severity,
        SHAPES[finding.severity],
        finding.where or "the part",
        band,
        size,
        finding.text,
    )


def finding_lines(findings: Iterable[Finding]) -> tuple[FindingLine, ...]:
    """Every finding as words, in the order given."""
    return tuple(finding_line(f) for f in findings)


def tally(findings: Iterable[Finding]) -> str:
    """Findings counted by severity, e.g. ``1 contradiction, 2 warnings and 4 notes``."""
    found = [f.severity for f in findings]
    told = [f"{found.count(s)} {s}{'' if found.count(s) == 1 else 's'}" for s in SHAPES if found.count(s)]
    return words.listed(told) or "no findings"


def blind_lines(outcome: Any) -> tuple[tuple[str, str, str, str], ...]:
    """Blind spots as (text, place, size of the unseen error, the reading that would show it)."""
    return tuple(
        (
            b.text,
            b.where or "the part",
            "not known" if b.unseen_error_db is None else f"{b.unseen_error_db:.2g} dB",
            b.reading,
        )
        for b in outcome.blind_spots
    )


def unwitnessed(outcome: Any) -> tuple[str, ...]:
    """Sentences on evidence this job does not have, so that silence is not taken for proof.

    Parameters
    ----------
    outcome : Outcome
        See `deembed.job`.

    Returns
    -------
    tuple of str
    """
    facts = facts_of(outcome.job)
    out = []
    if any(b.cause == "calibration" for b in outcome.blind_spots):
        pass  # said there, and better
    elif outcome.terms is None:
        out.append("The readings came already corrected: nothing here can show a fault of that correction.")
    elif redundancy_words(outcome.terms):
        out.append(f"The error terms have no relation to spare ({redundancy_words(outcome.terms)}).")
    if len(facts.rounds) < 2:
        out.append(
            "The part was read in one round: no reflection was read twice, so no reading checks another."
        )
    if outcome.shell is None:
        out.append("No fixture was taken off: the part's plane is the cable plane.")
    else:
        out.append(
            "The fixture's own file is taken at its word; only its loss, passivity and fit are looked at."
        )
    missing = [k for k in ("passive", "reciprocal", "lossless") if k not in facts.expect]
    if missing:
        out.append(f"Not judged, because [expect] does not say: {words.listed(missing)}.")
    return tuple(out)


def plain_text(outcome: Any) -> str:
    """Verdict, findings and blind spots as plain text, for places that show neither pictures nor pages.

    Parameters
    ----------
    outcome : Outcome
        See `deembed.job`.

    Returns
    -------
    str
    """
    lines = [outcome.verdict, f"Findings: {tally(outcome.findings)}"]
    lines += [f"{f.shape} {f.severity}, {f.place}: {f.text}" for f in finding_lines(outcome.findings)]
    lines.append("What these readings could not have shown:")
    lines += [f"{text} To see it: {reading}." for text, _, _, reading in blind_lines(outcome)]
    return "\n".join([*lines, *unwitnessed(outcome)])


def facts_rows(outcome: Any) -> tuple[tuple[str, str], ...]:
    """What the job says, as (label, value); free text is handed on as it was typed.

    Parameters
    ----------
    outcome : Outcome

    Returns
    -------
    tuple of (str, str)
    """
    facts = facts_of(outcome.job)
    n = outcome.part.sizes["port_out"]
    count = "1 port" if n == 1 else f"{n} ports"
    expected = [f"{k}: {'yes' if v else 'no'}" for k, v in facts.expect.items()]
    rows = [
        ("Part", f"{facts.title or 'without a title'} ({count})"),
        ("Grid", words.grid(outcome.part.frequency.values)),
        ("Reference impedance", f"{facts.reference_impedance_ohm:g} ohm"),
        (
            "Calibration method",
            facts.method if facts.method != "none" else "none (readings already corrected)",
        ),
        ("Kit", facts.kit or "none"),
        ("Drive", facts.drive.replace("-", " ")),
        ("Rounds (part ports)", words.listed(r.label for r in facts.rounds)),
        ("Fixture", _fixture_words(facts)),
        ("Expected", ", ".join(expected) or "nothing"),
    ]
    rows += [(_TYPED[k], v) for k, v in facts.free_text]
    return tuple(rows)


def _fixture_words(facts: JobFacts) -> str:
    if facts.coupled:
        return f"coupled, {facts.coupled}"
    arms = [f"arm {a.part_port}: {a.file}, its port {a.analyzer_side} faces the analyzer" for a in facts.arms]
    return "; ".join(arms) or "none"


def input_lines(outcome: Any) -> tuple[InputLine, ...]:
    """Every file the job loaded: what for, its name, its SHA-256."""
    job, facts = outcome.job, facts_of(outcome.job)
    return tuple(
        InputLine(_used_for(key, facts), name, job.inputs.get(name, key=key).sha256)
        for key, name in job.input_names()
    )


_KEYS = (
    (r"rounds\[(\d+)\]\.file$", lambda facts, k: f"round {facts.rounds[k].label}"),
    (r"fixture\.arms\[(\d+)\]\.file$", lambda facts, k: f"arm {facts.arms[k].part_port}"),
    (r"calibration\.readings\[(\d+)\]\.file$", lambda facts, k: _reading_words(facts.readings[k])),
    (r"terminations\.(\d+)$", lambda facts, k: f"termination of part port {k}"),
    (r"analyzer\.switch_terms\.(\d+)$", lambda facts, k: f"switch terms of port {k}"),
    (r"calibration\.(kit)$", lambda facts, k: "kit"),
    (r"checks\[(\d+)\]\.file$", lambda facts, k: f"check standard {k + 1}"),
    (r"checks\[(\d+)\]\.reference$", lambda facts, k: f"known values of check standard {k + 1}"),
    (r"fixture\.(coupled)\.file$", lambda facts, k: "coupled fixture"),
)


def _used_for(key: str, facts: JobFacts) -> str:
    """A job key in words, e.g. ``open on port 1``; a key without words of its own as it is."""
    for pattern, said in _KEYS:
        found = re.match(pattern, key)
        if found:
            return said(facts, int(found[1]) if found[1].isdigit() else 0)
    return key


def _reading_words(one: StandardReading) -> str:
    return f"{one.standard} on port{'s' if len(one.ports) > 1 else ''} {words.listed(one.ports)}"


def version_rows() -> tuple[tuple[str, str], ...]:
    """Versions of what computed this, as (name, version)."""
    names = ("deembed", "numpy", "scipy", "xarray", "scikit-rf", "matplotlib")
    return (("Python", platform.python_version()), *((n, metadata.version(n)) for n in names))
