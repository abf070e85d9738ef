"""What these readings could not have shown, and the cautions at the bench."""

from __future__ import annotations

from typing import Any

import ipywidgets as w

from deembed.views.sentences import CAUTIONS, blind_lines, unwitnessed
from deembed.widgets.style import para, safe

__all__ = ["UnseenPanel"]


class UnseenPanel(w.HTML):
    """Blind spots of an outcome, each with the reading that would lift it; cautions behind a disclosure.

    Parameters
    ----------
    outcome : Outcome
    """

    def __init__(self, outcome: Any) -> None:
        spots = [f"{text} To see it: {reading}." for text, _, _, reading in blind_lines(outcome)]
        cautions = "".join(f"<p><b>{safe(c.about)}.</b> {safe(c.text)}</p>" for c in CAUTIONS)
        super().__init__(
            f"<h4>What these readings could not have shown</h4>{para(*spots, *unwitnessed(outcome))}"
            f"<details><summary>Cautions at the bench</summary>{cautions}</details>"
        )
        self.add_class("deembed-unseen")
