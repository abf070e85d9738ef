"""The lane map and what belongs to it, for a job that runs while you look on."""

from __future__ import annotations

import threading
import traceback
from html import escape
from pathlib import Path
from typing import Any

import ipywidgets as w

from deembed.errors import DeembedError
from deembed.findings import Finding
from deembed.views.inventory import pictures
from deembed.views.lane_map import lane_map
from deembed.views.model import room_around
from deembed.views.sentences import CAUTIONS, blind_lines, unwitnessed
from deembed.widgets.findings_panel import FindingsPanel
from deembed.widgets.lane_panel import LanePanel
from deembed.widgets.picture_panel import PicturePanel
from deembed.widgets.segment_panel import SegmentPanel
from deembed.widgets.style import css, para

__all__ = ["Lanes"]

# The picture in which a finding of this kind is seen best.
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
        self.error = ""
        self._theme = theme
        self.verdict = w.HTML()
        self.verdict.add_class("deembed-verdict")
        self.progress = w.FloatProgress(min=0.0, max=1.0, description="", layout=w.Layout(width="24em"))
        self.doing = w.HTML(para("Starting"))
        self.body = w.VBox()
        self.status = w.HTML()
        self.status.add_class("deembed-status")
        self._running = w.HBox([self.progress, self.doing])
        super().__init__([w.HTML(css(theme)), self.verdict, self._running, self.body, self.status])
        self.add_class("deembed-lanes")
        self._thread: threading.Thread | None = None
        self._tell("running")
        if hasattr(source, "verdict"):
            self._show(source)
        else:
            self._thread = threading.Thread(target=self._run, args=(source,), daemon=True)
            self._thread.start()

    def wait(self, timeout: float | None = None) -> Lanes:
        """Block until the job is done (or `timeout` seconds have passed)."""
        if self._thread is not None:
            self._thread.join(timeout)
        return self

    def __repr__(self) -> str:
        if self.outcome is None:
            return f"Lanes({self.error or 'running'})"
        return f"Lanes({self.outcome.verdict})"

    def _run(self, source: Any) -> None:
        try:
            job = source
            if isinstance(source, str | Path):
                from deembed.job import load_job

                job = load_job(source)
            self._show(job.run(progress=self._step))
        except DeembedError as error:
            self._fail(str(error), "")
        except Exception as error:
            # A thread's exception would vanish: say it where the user looks, details on request.
            self._fail(f"This job stopped unexpectedly: {error}", traceback.format_exc())

    def _step(self, fraction: float, doing: str) -> None:
        self.progress.value = fraction
        self.doing.value = para(doing)

    def _fail(self, message: str, details: str) -> None:
        self.error = message
        more = f"<details><summary>Details</summary><pre>{escape(details)}</pre></details>" if details else ""
        self.verdict.value = para(f"◆ The job could not be run. {message}") + more
        self._running.layout.display = "none"
        self._tell("failed")

    def _show(self, outcome: Any) -> None:
        self.outcome = outcome
        self.verdict.value = para(outcome.verdict)
        self._running.layout.display = "none"
        self._map = lane_map(outcome)
        inventory = pictures(outcome)
        self.lanes = LanePanel(self._map, theme=self._theme)
        self.holding = SegmentPanel()
        self.pictures = PicturePanel(inventory, offered=inventory.group("part"), theme=self._theme)
        self.findings = FindingsPanel(outcome.findings, on_show=self._to_finding)
        self._inventory = inventory
        self.holding.show(self._map.segment(self.lanes.selected))
        beside = w.HBox(
            [self.pictures, self.holding], layout=w.Layout(flex_flow="row wrap", align_items="flex-start")
        )
        self.body.children = [
            self.lanes,
            beside,
            self.findings,
            w.HTML(_unseen(outcome)),
            w.HTML(_cautions()),
        ]
        self.lanes.observe(self._chosen, "selected")
        self.pictures.observe(lambda _: self._tell("ready"), "drawn")
        self._tell("ready")

    def _chosen(self, change: dict) -> None:
        segment = self._map.segment(change["new"])
        self.holding.show(segment)
        if segment.picture_name in self._inventory and segment.picture_name != self.pictures.name:
            self.pictures.name = segment.picture_name
        self._tell("ready")

    def _to_finding(self, finding: Finding) -> None:
        f = self.outcome.part.frequency.values
        low, high = float(f[0]), float(f[-1])
        start, end = finding.from_hz, finding.to_hz
        band = room_around(low if start is None else start, high if end is None else end, span=(low, high))
        name = _SEEN_IN.get(finding.kind, self.pictures.name)
        with self.pictures.hold_trait_notifications():
            self.pictures.name = name if name in self._inventory else self.pictures.name
            self.pictures.band = band
        self._tell("ready")

    def _tell(self, state: str) -> None:
        """The contract for tests and assistive tools: one span, rewritten after each redraw."""
        band, name, segment = None, "", ""
        if state == "ready":
            band, name, segment = self.pictures.band, self.pictures.name, self.lanes.selected
        spoken = "whole" if band is None else f"{band[0]:.0f}-{band[1]:.0f}"
        self.status.value = (
            f'<span data-state="{state}" data-segment="{escape(segment)}" data-picture="{escape(name)}" '
            f'data-band="{spoken}" aria-live="polite"></span>'
        )


def _unseen(outcome: Any) -> str:
    lines = blind_lines(outcome)
    rows = "".join(f"<p>{escape(text)} To see it: {escape(reading)}.</p>" for text, _, _, reading in lines)
    return f"<h4>What these readings could not have shown</h4>{rows}{para(*unwitnessed(outcome))}"


def _cautions() -> str:
    rows = "".join(f"<p><b>{escape(c.about)}.</b> {escape(c.text)}</p>" for c in CAUTIONS)
    return f"<details><summary>Cautions at the bench</summary>{rows}</details>"
