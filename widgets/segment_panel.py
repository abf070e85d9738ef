"""What the chosen segment holds, in rows."""

from __future__ import annotations

from html import escape

import ipywidgets as w

from deembed.views.lane_map import Segment
from deembed.views.sentences import SHAPES

__all__ = ["SegmentPanel"]


class SegmentPanel(w.HTML):
    """Title, state and contents of one segment of the lane map."""

    def __init__(self) -> None:
        super().__init__()
        self.add_class("deembed-holding")

    def show(self, segment: Segment) -> None:
        """Show another segment."""
        shape = SHAPES.get(segment.state, "")
        rows = "".join(f"<tr><td>{escape(k)}</td><td>{escape(v)}</td></tr>" for k, v in segment.holds)
        state = f"<p>{shape} {escape(segment.state_words)}</p>"
        self.value = f'<h4>{escape(segment.title)}</h4>{state}<table class="deembed-holds">{rows}</table>'
