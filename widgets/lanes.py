"""The lane map and what belongs to it."""

from __future__ import annotations

from html import escape
from typing import Any

import ipywidgets as w

from deembed.findings import Finding
from deembed.views.inventory import pictures
from deembed.views.lane_map import lane_map
from deembed.views.model import room_around
from deembed.views.offered import offered, seen_in
from deembed.views.sentences import plain_text
from deembed.widgets.findings_panel import FindingsPanel
from deembed.widgets.lane_panel import LanePanel
from deembed.widgets.picture_panel import PicturePanel
from deembed.widgets.run_panel import RunPanel
from deembed.widgets.segment_panel import SegmentPanel
from deembed.widgets.style import css, para, safe
from deembed.widgets.turns import Turns, in_turn
from deembed.widgets.unseen_panel import UnseenPanel

__all__ = ["Lanes"]


class Lanes(w.VBox):
    """The lane map of a job, its verdict, findings and pictures.

    Parameters
    ----------
    source : Outcome, Job, str or Path
        An outcome is shown at once; a job, a job file or an archived outcome is run first, in the background.
    theme : str
        ``light`` or ``dark``.

    Raises
    ------
    DeembedError
        An unknown theme. What is wrong with a job is shown in place, not raised.
    """

    def __init__(self, source: Any, *, theme: str = "light") -> None:
        self.outcome: Any = None
        self._theme, self._turns = theme, Turns()
        self.verdict = w.HTML()
        self.verdict.add_class("deembed-verdict")
        self.running = RunPanel(on_done=in_turn(self._turns, self._show), on_failed=self._failed)
        self.body = w.VBox()
        self.status = w.HTML()
        self.status.add_class("deembed-status")
        super().__init__([w.HTML(css(theme)), self.verdict, self.running, self.body, self.status])
        self.add_class("deembed-lanes")
        self._tell("running")
        if hasattr(source, "verdict"):
            self._show(source)
        else:
            self.running.start(source)

    def wait(self, timeout: float | None = None) -> Lanes:
        """Block until the job is done (or `timeout` seconds have passed)."""
        self.running.wait(timeout)
        return self

    @property
    def text(self) -> str:
        """Verdict, findings and blind spots as plain text."""
        if self.outcome is not None:
            return plain_text(self.outcome)
        return self.running.error or "The job is still running; show `text` again when it is done."

    def __repr__(self) -> str:
        if self.outcome is None:
            return f"Lanes({self.running.error or 'running'})"
        return f"Lanes({self.outcome.verdict})"

    def _repr_mimebundle_(self, **kwargs: Any) -> dict[str, Any]:
        """Where no widget can be shown (a saved page, a terminal), the words stand in its place, uncut."""
        return {**super()._repr_mimebundle_(**kwargs), "text/plain": self.text}

    def _failed(self, said: str) -> None:
        self.verdict.value = said
        self._tell("failed")

    def _show(self, outcome: Any) -> None:
        self.outcome = outcome
        self.verdict.value = para(outcome.verdict)
        self._map, self._inventory = lane_map(outcome), pictures(outcome)
        chosen = self._map.part
        self.lanes = LanePanel(self._map, turns=self._turns, theme=self._theme)
        self.holding = SegmentPanel()
        self.pictures = PicturePanel(
            self._inventory,
            offered=offered(self._inventory, chosen),
            turns=self._turns,
            theme=self._theme,
        )
        self.findings = FindingsPanel(outcome.findings, on_show=self._to_finding, turns=self._turns)
        self.holding.show(chosen)
        self.findings.mark(chosen.findings)
        self.lanes.observe(self._chosen, "selected")
        self.pictures.observe(lambda _: self._tell("ready"), "drawn")
        self.pictures.observe(self._to_band, "band")
        beside = w.HBox(
            [self.pictures, self.findings], layout=w.Layout(flex_flow="row wrap", margin="6px 0 0 0")
        )
        self.body.children = [self.lanes, self.holding, beside, UnseenPanel(outcome)]
        self._tell("ready")

    def _chosen(self, change: dict) -> None:
        segment = self._map.segment(change["new"])
        self.holding.show(segment)
        self.findings.mark(segment.findings)
        main = segment.picture_name if segment.picture_name in self._inventory else ""
        self.pictures.offer(offered(self._inventory, segment), show=main)
        self._tell("ready")

    def _to_band(self, change: dict) -> None:
        if change["new"] is None:
            self.findings.shown(None)

    def _to_finding(self, finding: Finding) -> None:
        f = self.outcome.part.frequency.values
        low, high = float(f[0]), float(f[-1])
        start, end = finding.from_hz, finding.to_hz
        band = room_around(low if start is None else start, high if end is None else end, span=(low, high))
        with self.pictures.hold_trait_notifications():
            self.pictures.name = seen_in(self._inventory, self._map, finding) or self.pictures.name
            self.pictures.band = None if band == (low, high) else band
        self._tell("ready")

    def _tell(self, state: str) -> None:
        """The contract for tests and assistive tools: one span, rewritten after each redraw."""
        band, name, segment, said = None, "", "", f"The job: {state}."
        if state == "ready":
            band, name, segment = self.pictures.band, self.pictures.name, self.lanes.selected
            title = self._map.segment(segment).title
            said = f"Chosen: {title}. {self.pictures.said}"
        spoken = "whole" if band is None else f"{band[0]:.0f}-{band[1]:.0f}"
        self.status.value = (
            f'<span data-state="{state}" data-segment="{escape(segment)}" data-picture="{escape(name)}" '
            f'data-band="{spoken}" role="status" aria-live="polite">{safe(said)}</span>'
        )
