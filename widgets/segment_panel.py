"""What the chosen segment holds, in rows."""

from __future__ import annotations

import ipywidgets as w

from deembed.views.lane_map import Segment
from deembed.views.sentences import SHAPES
from deembed.widgets.style import MARK, safe

__all__ = ["SegmentPanel"]

# The verdict stands above the map already.
_SAID_ABOVE = ("Verdict",)


class SegmentPanel(w.HTML):
    """Title, state and contents of one segment of the lane map."""

    def __init__(self) -> None:
        super().__init__(layout=w.Layout(width="100%"))
        self.add_class("deembed-holding")

    def show(self, segment: Segment) -> None:
        """Show another segment."""
        shape = SHAPES.get(segment.state, "")
        rows = "".join(
            f"<div><dt>{safe(k)}</dt><dd>{safe(v)}</dd></div>"
            for k, v in segment.holds
            if k not in _SAID_ABOVE
        )
        marked = f" (marked {MARK} in the findings)" if segment.findings else ""
        self.value = (
            f"<h4>{safe(segment.title)}</h4><p>{shape} {safe(segment.state_words)}{marked}</p>"
            f'<dl class="deembed-holds">{rows}</dl>'
        )
