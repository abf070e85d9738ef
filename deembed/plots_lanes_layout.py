"""Where the lane map puts its segments: lanes to scale, error boxes cut short where they dwarf the arms."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable
from dataclasses import dataclass

from deembed.views.lane_map import Lane, LaneMap
from deembed.views.sentences import SHAPES as SEVERITY_SHAPES

__all__ = [
    "CAPTION",
    "LEFT",
    "ROW",
    "SHAPES",
    "TAB",
    "TOP",
    "Layout",
    "caption",
    "layout_of",
    "segment_boxes",
]

ROW, TALL, CAPTION, GAP, TOP = 34, 24, 22, 22, 44
LEFT, TAB = 112, 78  # words of the lane, then the analyzer port's tab
_BREAK_RATIO = 3.5  # error boxes longer than this many arms are cut short
SHAPES = {"plain": "", "absent": "", **SEVERITY_SHAPES}


@dataclass(frozen=True)
class Layout:
    """Where everything goes [px].

    Parameters
    ----------
    width, height : float
    part_x : float
        The part's plane.
    px_per_ps : float
        Scale right of the break.
    broken_at : float
        Everything left of this is not to scale; 0 when all of it is.
    boxes : dict of id to (x, y, width, height)
        Rectangle of every segment, for pointing at it.
    rows : dict of part port to (top, middle, bottom)
    """

    width: float
    height: float
    part_x: float
    px_per_ps: float
    broken_at: float
    boxes: dict[str, tuple[float, float, float, float]]
    rows: dict[int, tuple[float, float, float]]

    @property
    def rows_end(self) -> float:
        """Below the last lane and its words."""
        return self.boxes["part"][1] + self.boxes["part"][3] + CAPTION


def _scale(lane_map: LaneMap, room: float) -> tuple[float, bool]:
    """Pixels per picosecond, and whether error boxes must be drawn short."""
    arms = [s.to_ps - s.from_ps for lane in lane_map.lanes for s in lane.of("arm")]
    longest = max(arms, default=0.0)
    if longest > 0 and lane_map.total_ps > (1 + _BREAK_RATIO) * longest:
        return 0.5 * room / longest, True
    return (room / lane_map.total_ps if lane_map.total_ps > 0 else 0.0), False


def layout_of(lane_map: LaneMap, *, width: float = 960) -> Layout:
    """Place every segment of a lane map.

    Parameters
    ----------
    lane_map : LaneMap
    width : float
        [px]

    Returns
    -------
    Layout
    """
    part_x = width - 190
    first = LEFT + TAB
    scale, broken = _scale(lane_map, part_x - first)
    if scale == 0:  # nothing has a length: every plane falls on the part's
        part_x = first + 150.0
    boxes: dict[str, tuple[float, float, float, float]] = {}
    rows: dict[int, tuple[float, float, float]] = {}
    y = float(TOP)
    for lane in lane_map.lanes:
        branches = max(len(lane.of("analyzer-port")), 1)
        top, bottom = y, y + branches * ROW
        rows[lane.part_port] = (top, (top + bottom) / 2, bottom)
        boxes.update(_lane_boxes(lane, rows[lane.part_port], part_x, scale, first if broken else None))
        y = bottom + CAPTION * max(len(caption(lane, part_x + 60)), 1) + GAP
    bottom = y - GAP
    boxes["part"] = (part_x + 70, TOP, 104, bottom - CAPTION - TOP)
    arm_start = min(
        [part_x + scale * s.from_ps for lane in lane_map.lanes for s in lane.of("arm")] or [part_x]
    )
    return Layout(
        width, bottom + (78 if broken else 58), part_x, scale, arm_start - 24 if broken else 0.0, boxes, rows
    )


def _lane_boxes(lane, row, part_x: float, scale: float, short_from: float | None) -> dict:
    top, middle, bottom = row
    out = {}
    for kind in ("analyzer-port", "error-box"):
        for k, s in enumerate(lane.of(kind)):
            y = top + k * ROW + (ROW - TALL) / 2
            end = part_x + scale * s.to_ps
            drawn_whole = short_from is None and s.state != "absent"
            start = part_x + scale * s.from_ps if drawn_whole else float(LEFT + TAB)
            out[s.id] = (start, y, end - start, TALL)
            if kind == "analyzer-port":
                out[s.id] = (float(LEFT), y, float(TAB), TALL)
    for s in lane.of("cable-plane"):
        out[s.id] = (part_x + scale * s.from_ps - 5, top - 2, 10, bottom - top + 4)
    for s in lane.of("arm"):
        x = part_x + scale * s.from_ps
        out[s.id] = (x, middle - TALL / 2, part_x - x, TALL)
    for s in lane.of("part-port"):
        out[s.id] = (part_x + 8, middle - 15, 30, 30)
    return out


def segment_boxes(lane_map: LaneMap, *, width: float = 960) -> dict[str, tuple[float, float, float, float]]:
    """Rectangle (x, y, width, height) [px] of every segment id, as drawn at this width."""
    return layout_of(lane_map, width=width).boxes


def caption(lane: Lane, room: float) -> list[str]:
    """What is noted along a lane, with shapes, in words, like with like, in lines that fit."""
    noted: dict[tuple[str, str], dict[str, None]] = {}
    for s in lane.segments:
        if s.state not in ("plain", "absent"):
            name = "cable plane" if s.kind == "cable-plane" else s.where
            noted.setdefault((SHAPES[s.state], s.state_words), {})[name] = None
    told = []
    for (shape, said), names in noted.items():
        one = f"{shape} {next(iter(names))}: {said}"
        told.append(_unbroken(one) if len(names) == 1 else _unbroken(f"{shape} {said} each: ") + _row(names))
    lines = textwrap.wrap("; ".join(told), max(int((room - LEFT) / 7.6), 24))
    return [line.replace("\N{NO-BREAK SPACE}", " ") for line in lines]


def _row(names: Iterable[str]) -> str:
    return ", ".join(map(_unbroken, names))


def _unbroken(text: str) -> str:
    """Lines break between names, never inside one."""
    return text.replace(" ", "\N{NO-BREAK SPACE}")
