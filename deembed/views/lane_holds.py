"""What each segment of the lane map holds, as rows of label and value."""

from __future__ import annotations

from typing import Any

import numpy as np

from deembed import words
from deembed.shell import arm_of
from deembed.views.job_facts import JobFacts, Round
from deembed.views.readings import disagreement
from deembed.views.terms import redundancy_words

__all__ = ["analyzer_port", "arm", "cable_plane", "error_box", "part", "part_port"]

Rows = tuple[tuple[str, str], ...]


def _worst(values: np.ndarray, frequency: np.ndarray, *, lowest: bool = False) -> tuple[float, float] | None:
    values = np.asarray(values, dtype=float)
    if not np.any(np.isfinite(values)):
        return None
    i = int(np.nanargmin(values) if lowest else np.nanargmax(values))
    return float(values[i]), float(frequency[i])


def _level(values: np.ndarray, frequency: np.ndarray, *, lowest: bool = False) -> str:
    found = _worst(np.abs(values), frequency, lowest=lowest)
    return "no value" if found is None else f"{words.decibel(found[0])} at {words.frequency(found[1])}"


def _length(ps: float) -> str:
    if not np.isfinite(ps):
        return "could not be estimated from the phase"
    return f"{ps:.1f} ps" + (" (drawn as 0)" if ps < 0 else "")


def analyzer_port(outcome: Any, facts: JobFacts, one: Round, port: int) -> Rows:
    """Rows of an analyzer port in one round."""
    rows = [("Round", one.label), ("File", ", ".join(one.files))]
    raw = next((outcome.raw[f] for f in one.files if f in outcome.raw), None)
    if raw is not None:
        rows.append(("Grid", words.grid(raw.frequency.values)))
    rows.append(("Drive", facts.drive.replace("-", " ")))
    rows.append(("Switch terms", facts.switch_terms.get(port, "not recorded")))
    return tuple(rows)


def error_box(outcome: Any, facts: JobFacts, port: int, length: float) -> Rows:
    """Rows of one analyzer port's error box."""
    terms = outcome.terms
    if terms is None:
        return (("Method", "none: the readings were corrected before"),)
    f = terms.frequency.values
    rows = [("Method", f"{facts.method}, kit {facts.kit}"), ("One-way length", _length(length))]
    for name in ("directivity", "source_match", "reflection_tracking"):
        if port in terms.port_in.values:
            rows.append(
                (f"Highest {name.replace('_', ' ')}", _level(terms[name].sel(port_in=port).values, f))
            )
    rows += [
        (f"{r.standard} on {words.listed(r.ports)}", ", ".join(r.files))
        for r in facts.readings
        if port in r.ports
    ]
    absent = redundancy_words(terms)
    if absent:
        rows.append(("Redundancy", f"none: {absent}"))
        return tuple(rows)
    for pair in terms.pair.values:
        if str(port) in str(pair).split("-"):
            found = _worst(np.abs(terms["redundancy"].sel(pair=pair).values), f)
            told = "no value" if found is None else f"at most {found[0]:.3g} at {words.frequency(found[1])}"
            rows.append((f"Redundancy residual, ports {pair}", told))
    return tuple(rows)


def cable_plane(outcome: Any, facts: JobFacts, port: int) -> Rows:
    """Rows of the cable plane at one part port."""
    read = [r.label for r in facts.rounds if port in r.part_ports]
    rows = [("Read in", f"round{'s' if len(read) > 1 else ''} {words.listed(read)}" if read else "no round")]
    if outcome.disagreement is not None:
        picture = disagreement(outcome.disagreement)
        told = [t for t in picture.traces if t.name == f"part port {port}"]
        found = _worst(told[0].y, told[0].frequency) if told else None
        apart = "read once" if found is None else f"at most {found[0]:.3g} at {words.frequency(found[1])}"
        rows.append(("Difference between readings", apart))
    for r in facts.rounds:
        if port not in r.part_ports:
            rows.append(
                (f"Closed in round {r.label} with", r.terminations.get(port, "a perfect match (none given)"))
            )
    return tuple(rows)


def arm(outcome: Any, facts: JobFacts, port: int, length: float) -> Rows:
    """Rows of one fixture arm."""
    given = next((a for a in facts.arms if a.part_port == port), None)
    rows = []
    if given is not None:
        rows += [("File", given.file), ("Faces the analyzer", f"port {given.analyzer_side} of the file")]
    elif facts.coupled:
        rows.append(("File", f"{facts.coupled} (coupled fixture)"))
    if outcome.shell is None or port not in outcome.shell.port_out.values:
        return (*rows, ("Arm", "none given"))
    own = arm_of(outcome.shell, port)
    f = own.frequency.values
    rows.append(("One-way length", _length(length)))
    rows.append(("Lowest transmission", _level(own.sel(port_out=2, port_in=1).values, f, lowest=True)))
    for p, side in ((1, "analyzer"), (2, "part")):
        rows.append((f"Highest reflection, {side} side", _level(own.sel(port_out=p, port_in=p).values, f)))
    return tuple(rows)


def part_port(outcome: Any, port: int) -> Rows:
    """Rows of one port of the part."""
    s, f = outcome.part, outcome.part.frequency.values
    rows = [
        ("Highest reflection", _level(s.sel(port_out=port, port_in=port).values, f)),
        ("Lowest reflection", _level(s.sel(port_out=port, port_in=port).values, f, lowest=True)),
    ]
    power = outcome.metrics["power_balance"].sel(port_in=port).values
    for label, lowest in (("Most power back", False), ("Least power back", True)):
        found = _worst(power, f, lowest=lowest)
        told = "not driven" if found is None else f"{words.percent(found[0])} at {words.frequency(found[1])}"
        rows.append((label, told))
    return tuple(rows)


def part(outcome: Any) -> Rows:
    """Rows of the part as a whole."""
    f = outcome.part.frequency.values
    rows = [("Verdict", outcome.verdict), ("Grid", words.grid(f))]
    gain = _worst(outcome.metrics["largest_singular_value"].values, f)
    if gain is not None:
        rows.append(("Gain ceiling", f"{gain[0]:.4g} at {words.frequency(gain[1])} (1 is the passive limit)"))
    error = outcome.metrics["reciprocity_error"].transpose("frequency", "port_out", "port_in").values
    if np.any(np.isfinite(error)):
        worst = np.unravel_index(np.nanargmax(error), error.shape)
        rows.append(("Reciprocity error", f"at most {error[worst]:.3g} at {words.frequency(f[worst[0]])}"))
    return tuple(rows)
