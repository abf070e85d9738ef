"""The lane map with a real button over every segment, for mouse and keyboard alike."""

from __future__ import annotations

from typing import Any

import ipywidgets as w
import traitlets as t

from deembed.plots import lane_map_svg
from deembed.plots_lanes_layout import layout_of
from deembed.views.lane_map import LaneMap, Segment
from deembed.widgets.turns import in_turn

__all__ = ["LanePanel"]

WIDTH = 960
# Below this the words of the map could not be read: it scrolls instead.
NARROW = 760
# A plane is drawn thinner than a fingertip or a shaky mouse can hit.
LEAST = 16
_ONE = "1 / 1 / 2 / 2"


class LanePanel(w.GridBox):
    """Shows a lane map; `selected` is the id of the chosen segment.

    Parameters
    ----------
    lane_map : LaneMap
    turns : Turns
        Shared with the panels that follow `selected`.
    theme : str
        ``light`` or ``dark``.
    """

    selected = t.Unicode("part").tag(sync=False)

    def __init__(self, lane_map: LaneMap, *, turns: Any, theme: str = "light") -> None:
        self._map, self._turns, self._theme = lane_map, turns, theme
        place = layout_of(lane_map, width=WIDTH)
        self.picture = w.HTML(layout=w.Layout(grid_area=_ONE, width="100%", margin="0"))
        self.picture.add_class("deembed-map")
        self.buttons = {
            s.id: self._button(s, place.boxes[s.id], place.height)
            for s in lane_map.segments
            if s.id in place.boxes
        }
        super().__init__(
            [self.picture, *self.buttons.values()],
            layout=w.Layout(
                grid_template_columns=f"minmax({NARROW}px, {WIDTH}px)",
                justify_items="flex-start",
                align_items="flex-start",
                overflow="auto hidden",
                width="100%",
            ),
        )
        self._draw(None, self.selected)
        self.observe(lambda change: self._draw(change["old"], change["new"]), "selected")

    def _button(self, segment: Segment, box: tuple[float, float, float, float], tall: float) -> w.Button:
        x, y, width, height = box
        wider = max(LEAST - width, 0)
        layout = _over(x - wider / 2, y, width + wider, height, tall=tall)
        button = w.Button(layout=layout)
        _say(button, segment, chosen=False)
        button.add_class("deembed-segment")
        if 0 < width < LEAST:  # above its neighbours; what has no length at all, such as a missing arm, below
            button.add_class("deembed-thin")
        button.on_click(in_turn(self._turns, lambda _: self.set_trait("selected", segment.id)))
        return button

    def _draw(self, old: str | None, new: str) -> None:
        for name in filter(None, (old, new)):
            _say(self.buttons[name], self._map.segment(name), chosen=name == new)
        self.picture.value = lane_map_svg(self._map, selected=new, width=WIDTH, theme=self._theme)


def _say(button: w.Button, segment: Segment, *, chosen: bool) -> None:
    """What the segment is, how it stands, whether it is the chosen one; as text (hidden) and on hovering.

    Not every assistive tool takes a title alone for the name of a button.
    """
    button.description = f"{segment.title}: {segment.state_words}{', chosen' if chosen else ''}"
    button.tooltip = button.description


def _over(x: float, y: float, width: float, height: float, *, tall: float) -> w.Layout:
    """Everything shares one grid cell; shares of it put each button where the drawing has its segment.

    Margins, also the upper one, are shares of the cell's width.
    """
    return w.Layout(
        grid_area=_ONE,
        margin=f"{100 * y / WIDTH:.3f}% 0 0 {100 * x / WIDTH:.3f}%",
        width=f"{100 * width / WIDTH:.3f}%",
        height=f"{100 * height / tall:.3f}%",
        min_width="0",
    )
