"""The signal path as lanes to scale: one lane per part port, from analyzer port to the part they meet at."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from deembed.findings import Finding
from deembed.views import lane_holds as holds
from deembed.views.job_facts import JobFacts, Round, facts_of
from deembed.views.lane_lengths import arm_length, box_lengths
from deembed.views.lane_model import KINDS, Lane, LaneMap, Plane, Segment
from deembed.views.places import place_ports, places, state_of

__all__ = ["KINDS", "Lane", "LaneMap", "Plane", "Segment", "lane_map"]

Place = tuple[str, tuple[int, ...]]  # what a place names, and which ports
Rows = tuple[tuple[str, str], ...]


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


def _naming(findings: Iterable[Finding], answers: Iterable[Place], *, lane: int) -> list[Finding]:
    """Findings that name one of these places; one that also names part ports counts in their lanes only."""
    answers, found = set(map(_unordered, answers)), []
    for f in findings:
        named = [_unordered(place_ports(p)) for p in places(f.where)]
        lanes = [ports for what, ports in named if what == "part port"]
        if any(n in answers for n in named) and (not lanes or any(lane in ports for ports in lanes)):
            found.append(f)
    return found


def _unordered(place: Place) -> Place:
    """Round 3-1 and round 1-3 are one place."""
    return place[0], tuple(sorted(place[1]))


@dataclass(frozen=True)
class _Lane:
    """What the segments of one lane are made from."""

    port: int
    outcome: Any
    facts: JobFacts
    findings: Sequence[Finding]

    def segment(
        self,
        kind: str,
        where: str,
        title: str,
        span: tuple[float, float],
        answers: Iterable[Place],
        *,
        absent: str = "",
        round_label: str = "",
        holds: Rows = (),
        picture_name: str = "",
    ) -> Segment:
        """A segment in the state its findings give it; `answers` are the places it stands for."""
        state = state_of(_naming(self.findings, answers, lane=self.port), absent=absent)
        branch = f"round-{round_label}/" if round_label else ""
        return Segment(
            id=f"lane-{self.port}/{branch}{kind}",
            kind=kind,
            where=where,
            title=title,
            from_ps=span[0],
            to_ps=span[1],
            state=state.name,
            state_words=state.words,
            holds=holds,
            picture_name=picture_name,
            findings=state.findings,
            round_label=round_label,
        )

    def branch(self, one: Round, start: float, boxes: dict[int, float]) -> list[Segment]:
        """Analyzer port and error box of one round, up to the cable plane at `start` [ps]."""
        outcome, facts = self.outcome, self.facts
        port = one.analyzer_ports[one.part_ports.index(self.port)]
        length = boxes.get(port, float("nan"))
        far = start - _drawn(length)
        named = {place_ports(p) for f in self.findings for p in places(f.where)}
        standards = {n for n in named if n[0] == "standard" and port in n[1]}
        corrected = outcome.terms is None
        socket = self.segment(
            "analyzer-port",
            f"port {port}",
            f"Analyzer port {port} in round {one.label}",
            (far, far),
            {("port", (port,)), ("switch", (port,))},
            round_label=one.label,
            holds=holds.analyzer_port(outcome, facts, one, port),
            picture_name=f"raw.{one.files[0]}" if one.files else "",
        )
        box = self.segment(
            "error-box",
            f"port {port}",
            f"Error box of analyzer port {port} in round {one.label}",
            (far, start),
            {("port", (port,)), *standards},
            round_label=one.label,
            holds=holds.error_box(outcome, facts, port, length),
            picture_name="" if corrected else f"terms.port-{port}",
            absent="already corrected by the instrument" if corrected else "",
        )
        return [socket, box]

    def shared(self, rounds: Sequence[Round], length: float, absent: str) -> list[Segment]:
        """Cable plane, arm and part port, which every round shares."""
        outcome, facts, port = self.outcome, self.facts, self.port
        start = -_drawn(length)
        cable = self.segment(
            "cable-plane",
            f"part port {port}",
            f"Cable plane at part port {port}",
            (start, start),
            {("termination", (port,)), *(("round", r.part_ports) for r in rounds)},
            holds=holds.cable_plane(outcome, facts, port),
            picture_name=f"cable-plane.{port}" if rounds else "",
        )
        arm = self.segment(
            "arm",
            f"arm {port}",
            f"Arm {port}",
            (start, 0.0),
            {("arm", (port,))},
            absent=absent,
            holds=holds.arm(outcome, facts, port, length),
            picture_name="" if absent else f"arm.{port}",
        )
        end = self.segment(
            "part-port",
            f"part port {port}",
            f"Part port {port}",
            (0.0, 0.0),
            {("part port", (port,))},
            holds=holds.part_port(outcome, port),
            picture_name="part.reflection",
        )
        return [cable, arm, end]


def _drawn(length: float) -> float:
    """Length a segment is drawn with [ps]: nothing where it is not known or below zero."""
    return length if np.isfinite(length) and length > 0 else 0.0


def _lane(
    port: int, outcome: Any, facts: JobFacts, findings: Sequence[Finding], boxes: dict[int, float]
) -> Lane:
    made = _Lane(port, outcome, facts, findings)
    length, absent = arm_length(outcome.shell, port)
    rounds = [r for r in facts.rounds if port in r.part_ports]
    branches = [s for r in rounds for s in made.branch(r, -_drawn(length), boxes)]
    return Lane(port, (*branches, *made.shared(rounds, length, absent)))


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
        "part.transmission" if outcome.part.sizes["port_out"] > 1 else "part.reflection",
        state.findings,
    )
