"""Pictures and sentences as plain data, made once for plots, report and widgets."""

from deembed.views.inventory import Inventory, pictures
from deembed.views.lane_map import Lane, LaneMap, Plane, Segment, lane_map
from deembed.views.model import Band, Limit, Picture, Reading, Trace, room_around

__all__ = [
    "Band",
    "Inventory",
    "Lane",
    "LaneMap",
    "Limit",
    "Picture",
    "Plane",
    "Reading",
    "Segment",
    "Trace",
    "lane_map",
    "pictures",
    "room_around",
]
