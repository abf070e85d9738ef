"""Lanes and their segments as plain data."""

from __future__ import annotations

from dataclasses import dataclass

from deembed.findings import Finding

__all__ = ["KINDS", "Lane", "LaneMap", "Plane", "Segment"]

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
