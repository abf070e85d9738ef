"""The lane map with a real button over every segment, for mouse and keyboard alike."""

from __future__ import annotations

import ipywidgets as w
import traitlets as t

from deembed.plots import lane_map_svg
from deembed.plots_lanes_layout import layout_of
from deembed.views.lane_map import LaneMap, Segment

__all__ = ["LanePanel"]

WIDTH = 960
# A plane is drawn thinner than a fingertip or a shaky mouse can hit.
LEAST = 16


class LanePanel(w.GridBox):
    """Shows a lane map; `selected` is the id of the chosen segment.

    Parameters
    ----------
    lane_map : LaneMap
    theme : str
        ``light`` or ``dark``.
    """

    selected = t.Unicode("part").tag(sync=False)

    def __init__(self, lane_map: LaneMap, *, theme: str = "light") -> None:
        self._map, self._theme = lane_map, theme
        place = layout_of(lane_map, width=WIDTH)
        self.picture = w.HTML(layout=_cell(0, 0, WIDTH, place.height))
        self.picture.add_class("deembed-map")
        self.buttons = {
            s.id: self._button(s, place.boxes[s.id]) for s in lane_map.segments if s.id in place.boxes
        }
        super().__init__(
            [self.picture, *self.buttons.values()],
            layout=w.Layout(
                grid_template_columns=f"{WIDTH}px",
                grid_template_rows=f"{place.height:.0f}px",
                justify_items="flex-start",
                align_items="flex-start",
                overflow="auto hidden",
                width="auto",
                max_width=f"{WIDTH + 8}px",
            ),
        )
        self._draw()
        self.observe(lambda _: self._draw(), "selected")

    def _button(self, segment: Segment, box: tuple[float, float, float, float]) -> w.Button:
        x, y, width, height = box
        wider = max(LEAST - width, 0)
        layout = _cell(x - wider / 2, y, width + wider, height)
        button = w.Button(tooltip=f"{segment.title}: {segment.state_words}", layout=layout)
        button.add_class("deembed-segment")
        button.on_click(lambda _, name=segment.id: self.set_trait("selected", name))
        return button

    def _draw(self) -> None:
        self.picture.value = lane_map_svg(self._map, selected=self.selected, width=WIDTH, theme=self._theme)


def _cell(x: float, y: float, width: float, height: float) -> w.Layout:
    """Everything shares one grid cell; margins put each thing where the drawing has it."""
    return w.Layout(
        grid_area="1 / 1 / 2 / 2",
        margin=f"{y:.1f}px 0 0 {x:.1f}px",
        width=f"{width:.1f}px",
        height=f"{height:.1f}px",
        min_width="0",
    )
