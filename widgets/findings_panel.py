"""Findings as sentences, each with a button that takes the pictures to its band."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from html import escape

import ipywidgets as w

from deembed import words
from deembed.findings import Finding
from deembed.views.sentences import finding_line, tally

__all__ = ["FindingsPanel"]


class FindingsPanel(w.VBox):
    """Lists findings, most serious first.

    Parameters
    ----------
    findings : sequence of Finding
    on_show : callable
        Called with the finding whose band is asked for.
    """

    def __init__(self, findings: Sequence[Finding], *, on_show: Callable[[Finding], None]) -> None:
        self.buttons: dict[str, w.Button] = {}
        self._on_show = on_show
        rows: list[w.Widget] = [w.HTML(f"<h4>Findings: {escape(tally(findings))}</h4>")]
        rows += [self._row(f) for f in findings]
        super().__init__(rows)
        self.add_class("deembed-findings")

    def _row(self, finding: Finding) -> w.HBox:
        line = finding_line(finding)
        text = w.HTML(
            f"<p><b>{line.shape} {escape(line.severity)}</b>, {escape(line.place)}: {escape(line.text)}</p>",
            layout=w.Layout(width="100%"),
        )
        if finding.from_hz is None or finding.to_hz is None:
            return w.HBox([text])
        band = words.band(finding.from_hz, finding.to_hz)
        button = w.Button(
            description=f"show {band}",
            tooltip=f"show {band} in the pictures: {line.severity}, {line.place}",
            layout=w.Layout(width="17em", height="auto", min_width="17em"),
        )
        button.add_class("deembed-show")
        button.on_click(lambda _: self._show(finding))
        self.buttons[finding.id] = button
        return w.HBox([button, text], layout=w.Layout(align_items="flex-start", margin="2px 0"))

    def _show(self, finding: Finding) -> None:
        for key, button in self.buttons.items():
            (button.add_class if key == finding.id else button.remove_class)("deembed-shown")
        self._on_show(finding)
