"""The signal path as lanes to scale: one lane per part port, from analyzer port to the part they meet at."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from deembed.findings import Finding
from deembed.views import lane_holds as holds
from deembed.views.job_facts import JobFacts, facts_of
from deembed.views.lane_lengths import arm_length, box_lengths
from deembed.views.places import place_ports, places, state_of

__all__ = ["KINDS", "Lane", "LaneMap", "Plane", "Segment", "lane_map"]

KINDS = ("analyzer-port", "error-box", "cable-plane", "arm", "part-port", "part")


@dataclass(frozen=True)
class Segment:
    """One stretch of the signal path that can be chosen.

    Parameters
    ----------
    id : str
        Stable, e.g. ``lane-1/round-1-2/error-box``.
    kind : str
        One of `KINDS`.
    where : str
        Words as in findings, e.g. ``arm 3``.
    title : str
    from_ps, to_ps : float
        Electrical distance from the part's plane [ps], negative toward the analyzer; equal for planes.
    state, state_words : str
        One of `deembed.views.places.STATES`, and what that means here.
    holds : tuple of (label, value)
    picture_name : str
        Key in the inventory of pictures; empty where there is nothing to draw.
    findings : tuple of str
        Ids of the findings that name it.
    round_label : str
        The round it belongs to; empty for what all rounds share.
    """

    id: str
    kind: str
    where: str
    title: str
    from_ps: float
    to_ps: float
    state: str
    state_words: str
    holds: tuple[tuple[str, str], ...] = ()
    picture_name: str = ""
    findings: tuple[str, ...] = ()
    round_label: str = ""


@dataclass(frozen=True)
class Lane:
    """The path of one part port; each round that reads it has its own analyzer port and error box."""

    part_port: int
    segments: tuple[Segment, ...]

    def of(self, kind: str) -> tuple[Segment, ...]:
        """Segments of one kind, in order of rounds."""
        return tuple(s for s in self.segments if s.kind == kind)


@dataclass(frozen=True)
class Plane:
    """A reference plane: a rule across one lane, or (lane None) across all."""

    words: str
    at_ps: float
    lane: int | None = None


@dataclass(frozen=True)
class LaneMap:
    """All lanes, the part they meet at, their planes, and the findings that name no segment."""

    lanes: tuple[Lane, ...]
    part: Segment
    planes: tuple[Plane, ...]
    total_ps: float
    elsewhere: tuple[Finding, ...]
    alt: str

    @property
    def segments(self) -> tuple[Segment, ...]:
        """Every segment in the order a keyboard walks them; the part comes last."""
        return (*(s for lane in self.lanes for s in lane.segments), self.part)

    def segment(self, segment_id: str) -> Segment:
        """The segment with an id.

        Raises
        ------
        KeyError
            No such segment; the message lists those there are.
        """
        for s in self.segments:
            if s.id == segment_id:
                return s
        raise KeyError(f"no segment {segment_id!r}; there are {', '.join(s.id for s in self.segments)}")


def lane_map(outcome: Any) -> LaneMap:
    """The lane map of an outcome.

    Parameters
    ----------
    outcome : Outcome
        See `deembed.job`.

    Returns
    -------
    LaneMap
        Every finding is at a segment or in `elsewhere`.
    """
    facts = facts_of(outcome.job)
    findings = tuple(outcome.findings)
    boxes = box_lengths(outcome.terms)
    ports = [int(p) for p in outcome.part.port_out.values]
    lanes = tuple(_lane(p, outcome, facts, findings, boxes) for p in ports)
    part = _part(outcome, findings)
    used = {i for lane in lanes for s in lane.segments for i in s.findings} | set(part.findings)
    planes = [Plane("part plane", 0.0)]
    for lane in lanes:
        cable = lane.of("cable-plane")[0]
        planes.append(Plane("cable plane", cable.from_ps, lane.part_port))
        planes += [Plane("analyzer port", s.from_ps, lane.part_port) for s in lane.of("analyzer-port")]
    return LaneMap(
        lanes,
        part,
        tuple(planes),
        max([-p.at_ps for p in planes] + [0.0]),
        tuple(f for f in findings if f.id not in used),
        _alt(lanes, part),
    )


def _alt(lanes: Sequence[Lane], part: Segment) -> str:
    told = []
    count = "1 lane" if len(lanes) == 1 else f"{len(lanes)} lanes"
    for lane in lanes:
        arm = lane.of("arm")[0]
        noted = [f"{s.title}: {s.state_words}" for s in lane.segments if s.state not in ("plain", "absent")]
        length = "no arm" if arm.state == "absent" else f"arm of {arm.to_ps - arm.from_ps:.0f} ps"
        told.append(f"part port {lane.part_port}, {length}{', ' + '; '.join(noted) if noted else ''}")
    return f"Lane map, {count} meeting at the part ({part.state_words}). {'. '.join(told)}."


def _naming(
    findings: Iterable[Finding], answers: Iterable[tuple[str, tuple[int, ...]]], *, lane: int
) -> list[Finding]:
    """Findings that name one of these places; one that also names part ports counts in their lanes only."""
    answers, found = set(map(_unordered, answers)), []
    for f in findings:
        named = [_unordered(place_ports(p)) for p in places(f.where)]
        lanes = [ports for what, ports in named if what == "part port"]
        if any(n in answers for n in named) and (not lanes or any(lane in ports for ports in lanes)):
            found.append(f)
    return found


def _unordered(place: tuple[str, tuple[int, ...]]) -> tuple[str, tuple[int, ...]]:
    """Round 3-1 and round 1-3 are one place."""
    return place[0], tuple(sorted(place[1]))


def _lane(
    port: int, outcome: Any, facts: JobFacts, findings: Sequence[Finding], boxes: dict[int, float]
) -> Lane:
    length, arm_absent = arm_length(outcome.shell, port)
    start = -max(length, 0.0) if np.isfinite(length) else 0.0
    mine = [r for r in facts.rounds if port in r.part_ports]
    segments: list[Segment] = []

    def add(kind: str, where: str, title: str, span: tuple[float, float], answers, **more: Any) -> None:
        absent = more.pop("absent", "")
        state = state_of(_naming(findings, answers, lane=port), absent=absent)
        label = more.get("round_label", "")
        key = f"lane-{port}/" + (f"round-{label}/" if label else "") + kind
        segments.append(
            Segment(key, kind, where, title, *span, state.name, state.words, findings=state.findings, **more)
        )

    for r in mine:
        analyzer = r.analyzer_ports[r.part_ports.index(port)]
        box = boxes.get(analyzer, float("nan"))
        far = start - (max(box, 0.0) if np.isfinite(box) else 0.0)
        standards = {
            n
            for f in findings
            for n in map(place_ports, places(f.where))
            if n[0] == "standard" and analyzer in n[1]
        }
        add(
            "analyzer-port",
            f"port {analyzer}",
            f"Analyzer port {analyzer} in round {r.label}",
            (far, far),
            {("port", (analyzer,)), ("switch", (analyzer,))},
            holds=holds.analyzer_port(outcome, facts, r, analyzer),
            picture_name=f"raw.{r.files[0]}" if r.files else "",
            round_label=r.label,
        )
        add(
            "error-box",
            f"port {analyzer}",
            f"Error box of analyzer port {analyzer} in round {r.label}",
            (far, start),
            {("port", (analyzer,)), *standards},
            holds=holds.error_box(outcome, facts, analyzer, box),
            picture_name=f"terms.port-{analyzer}" if outcome.terms is not None else "",
            round_label=r.label,
            absent="" if outcome.terms is not None else "already corrected by the instrument",
        )
    labels = {("round", r.part_ports) for r in mine}
    add(
        "cable-plane",
        f"part port {port}",
        f"Cable plane at part port {port}",
        (start, start),
        labels | {("termination", (port,))},
        holds=holds.cable_plane(outcome, facts, port),
        picture_name=f"cable-plane.{port}" if mine else "",
    )
    add(
        "arm",
        f"arm {port}",
        f"Arm {port}",
        (start, 0.0),
        {("arm", (port,))},
        absent=arm_absent,
        holds=holds.arm(outcome, facts, port, length),
        picture_name="" if arm_absent else f"arm.{port}",
    )
    add(
        "part-port",
        f"part port {port}",
        f"Part port {port}",
        (0.0, 0.0),
        {("part port", (port,))},
        holds=holds.part_port(outcome, port),
        picture_name="part.reflection",
    )
    return Lane(port, tuple(segments))


def _part(outcome: Any, findings: Sequence[Finding]) -> Segment:
    own = [
        f
        for f in findings
        if not places(f.where) or any(place_ports(p)[0] == "part" for p in places(f.where))
    ]
    state = state_of(own)
    return Segment(
        "part",
        "part",
        "",
        "The part",
        0.0,
        0.0,
        state.name,
        state.words,
        holds.part(outcome),
        "part.gain",
        state.findings,
    )
