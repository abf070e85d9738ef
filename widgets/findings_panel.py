"""Findings as sentences, each with a link that takes the pictures to its band."""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from typing import Any

import ipywidgets as w

from deembed import words
from deembed.findings import Finding
from deembed.views.sentences import finding_line, tally
from deembed.widgets.style import MARK, safe
from deembed.widgets.turns import in_turn

__all__ = ["FindingsPanel"]


class FindingsPanel(w.VBox):
    """Lists findings, most serious first, beside the picture they take to their band.

    Parameters
    ----------
    findings : sequence of Finding
    on_show : callable
        Called with the finding whose band is asked for.
    turns : Turns
        Shared with the panels that `on_show` changes.
    """

    def __init__(
        self, findings: Sequence[Finding], *, on_show: Callable[[Finding], None], turns: Any
    ) -> None:
        self.buttons: dict[str, w.Button] = {}
        self.rows: dict[str, w.VBox] = {}
        self._on_show, self._turns = on_show, turns
        self._findings = {f.id: f for f in findings}
        heading = w.HTML(f"<h4>Findings: {safe(tally(findings))}</h4>")
        for finding in findings:
            self.rows[finding.id] = self._row(finding)
        # A box that scrolls by itself: whichever finding is chosen, its picture stays in sight.
        self.list = w.VBox(
            list(self.rows.values()), layout=w.Layout(overflow="hidden auto", max_height="430px")
        )
        super().__init__([heading, self.list], layout=w.Layout(flex="1 1 300px", min_width="280px"))
        self.add_class("deembed-findings")

    def _row(self, finding: Finding) -> w.VBox:
        parts: list[w.Widget] = [w.HTML(layout=w.Layout(width="100%"))]
        if finding.from_hz is not None and finding.to_hz is not None:
            line = finding_line(finding)
            button = w.Button(
                tooltip=f"show {_band(finding)} in the pictures: {line.severity}, {line.place}",
                layout=w.Layout(width="auto", height="auto", align_self="flex-start"),
            )
            button.add_class("deembed-show")
            button.on_click(in_turn(self._turns, lambda _: self._show(finding)))
            self.buttons[finding.id] = button
            parts.append(button)
        # Without this the rows would shrink, not scroll.
        row = w.VBox(parts, layout=w.Layout(margin="0 0 8px 0", flex="0 0 auto"))
        row.add_class("deembed-finding")
        self._say(row, finding, here=False)
        self._name_button(finding, shown=False)
        return row

    def _say(self, row: w.VBox, finding: Finding, *, here: bool) -> None:
        line = finding_line(finding)
        marked = f"{MARK} " if here else ""
        row.children[
            0
        ].value = (
            f"<p>{marked}<b>{line.shape} {safe(line.severity)}</b>, {safe(line.place)}: {safe(line.text)}</p>"
        )
        (row.add_class if here else row.remove_class)("deembed-here")

    def _name_button(self, finding: Finding, *, shown: bool) -> None:
        button = self.buttons.get(finding.id)
        if button is not None:
            button.description = f"{'Shown: ' if shown else 'Show '}{_band(finding)}"
            (button.add_class if shown else button.remove_class)("deembed-shown")

    def mark(self, ids: Collection[str]) -> None:
        """Mark the findings that name the chosen segment."""
        for key, row in self.rows.items():
            self._say(row, self._findings[key], here=key in ids)

    def shown(self, finding_id: str | None) -> None:
        """Mark the finding whose band is on show; None for the whole sweep."""
        for key in self.buttons:
            self._name_button(self._findings[key], shown=key == finding_id)

    def _show(self, finding: Finding) -> None:
        self._on_show(finding)
        self.shown(finding.id)


def _band(finding: Finding) -> str:
    return words.band(finding.from_hz or 0.0, finding.to_hz or 0.0)
