"""The words that say where a finding is, and which segment of the signal path they mean."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass

from deembed.findings import SEVERITIES, Finding

__all__ = ["STATES", "State", "place_ports", "places", "state_of"]

_PLACE = re.compile(r"^(?P<what>.+?) (?P<ports>\d+(?:-\d+)*)$")
_NOT_STANDARDS = ("port", "part port", "round", "arm", "termination", "switch")

STATES = ("plain", "note", "warning", "contradiction", "absent")
"""What a segment can be; each is drawn in its own shape."""


@dataclass(frozen=True)
class State:
    """State of a segment: one of `STATES`, and in words."""

    name: str
    words: str
    findings: tuple[str, ...] = ()


def places(where: str) -> tuple[str, ...]:
    """The single places in a finding's `where`, e.g. ``("part port 2", "round 1-2")``."""
    return tuple(p.strip() for p in where.split(",") if p.strip())


def place_ports(place: str) -> tuple[str, tuple[int, ...]]:
    """What a place names, and which ports: ``thru 1-2`` is ``("standard", (1, 2))``."""
    found = _PLACE.match(place)
    if not found:
        return "part", ()
    ports = tuple(int(p) for p in found["ports"].split("-"))
    return (found["what"] if found["what"] in _NOT_STANDARDS else "standard"), ports


def state_of(findings: Iterable[Finding], *, absent: str = "") -> State:
    """State of a segment from the findings that name it.

    Parameters
    ----------
    findings : iterable of Finding
    absent : str
        Why the segment holds nothing, where it does not.

    Returns
    -------
    State
        The worst severity, counted in words.
    """
    findings = list(findings)
    ids = tuple(f.id for f in findings)
    counts = {s: sum(f.severity == s for f in findings) for s in SEVERITIES}
    said = ", ".join(f"{n} {s}{'s' if n > 1 else ''}" for s, n in counts.items() if n)
    worst = next((s for s in SEVERITIES if counts[s]), "")
    if absent:
        return State(worst or "absent", f"{absent}{'; ' + said if said else ''}", ids)
    return State(worst or "plain", said or "nothing noted", ids)
