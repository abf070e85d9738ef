"""Which pictures belong to a segment of the lane map, and which one shows a finding best."""

from __future__ import annotations

from deembed.findings import Finding
from deembed.views.inventory import Inventory
from deembed.views.lane_map import LaneMap, Segment

__all__ = ["offered", "seen_in"]

_SEEN_IN = {
    "gain": "part.gain",
    "power-balance": "part.power",
    "non-reciprocity": "part.reciprocity",
    "lossless": "part.lossless",
    "three-way": "part.three-way",
    "dissipation-floor": "part.three-way",
    "holds": "part.three-way",
    "redundancy": "terms.redundancy",
    "line-phase": "terms.line-phase",
    "disagreement": "rounds.disagreement",
}


def offered(inventory: Inventory, segment: Segment) -> tuple[str, ...]:
    """Names of the pictures to choose from at a segment.

    Parameters
    ----------
    inventory : Inventory
    segment : Segment

    Returns
    -------
    tuple of str
        The segment's own pictures, its main one first, then those of the part, which every segment leads to.
    """
    number = segment.where.rsplit(" ", 1)[-1]
    files = [f"raw.{file}" for _, value in segment.holds for file in value.split(", ")]
    near = {
        "arm": (f"arm.{number}.delay", "fixture.coupling"),
        "error-box": ("terms.redundancy", "terms.line-phase", *files),
        "analyzer-port": files,
        "cable-plane": (
            "rounds.disagreement",
            *(n for n in inventory.group("round") if number in n.removeprefix("round.").split("-")),
            *files,
        ),
        "part-port": ("part.chart",),
    }.get(segment.kind, ())
    names = (segment.picture_name, *near, *inventory.group("part"))
    return tuple(dict.fromkeys(n for n in names if n in inventory))


def seen_in(inventory: Inventory, lane_map: LaneMap, finding: Finding) -> str:
    """Name of the picture in which a finding is seen best.

    Parameters
    ----------
    inventory : Inventory
    lane_map : LaneMap
    finding : Finding

    Returns
    -------
    str
        By its kind, else that of the first segment it names; empty where neither has a picture.
    """
    name = _SEEN_IN.get(finding.kind, "")
    if name in inventory:
        return name
    at = (s.picture_name for s in lane_map.segments if finding.id in s.findings)
    return next((n for n in at if n in inventory), "")
