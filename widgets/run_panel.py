"""A job that runs while you look on: how far it is, or why it could not be done, in words."""

from __future__ import annotations

import threading
import traceback
from collections.abc import Callable
from html import escape
from pathlib import Path
from typing import Any

import ipywidgets as w

from deembed.errors import DeembedError
from deembed.widgets.style import para

__all__ = ["RunPanel"]


class RunPanel(w.HBox):
    """Runs a job in the background; gone when there is nothing to wait for.

    Parameters
    ----------
    on_done : callable
        Called with the outcome, in the background.
    on_failed : callable
        Called with what went wrong, as HTML, when there is none.
    """

    def __init__(self, *, on_done: Callable[[Any], None], on_failed: Callable[[str], None]) -> None:
        self.error = ""
        self._on_done, self._on_failed = on_done, on_failed
        self._thread: threading.Thread | None = None
        self.progress = w.FloatProgress(min=0.0, max=1.0, layout=w.Layout(width="24em"))
        self.doing = w.HTML(para("Starting"))
        super().__init__([self.progress, self.doing], layout=w.Layout(display="none"))
        self.add_class("deembed-run")

    def start(self, source: Any) -> None:
        """Run a job, a job file or an archived outcome."""
        self.layout.display = ""
        self._thread = threading.Thread(target=self._run, args=(source,), daemon=True)
        self._thread.start()

    def wait(self, timeout: float | None = None) -> None:
        """Block until the job is done, or for so many seconds."""
        if self._thread is not None:
            self._thread.join(timeout)

    def _run(self, source: Any) -> None:
        try:
            self._on_done(_job(source).run(progress=self._step))
            self.layout.display = "none"
        except DeembedError as error:
            self._fail(str(error), "")
        except Exception as error:
            # A thread's exception would vanish: say it where the user looks, details on request.
            self._fail(f"It stopped unexpectedly: {error}", traceback.format_exc())

    def _step(self, fraction: float, doing: str) -> None:
        self.progress.value = fraction
        self.doing.value = para(doing)

    def _fail(self, message: str, details: str) -> None:
        self.error = message
        more = f"<details><summary>Details</summary><pre>{escape(details)}</pre></details>" if details else ""
        self.layout.display = "none"
        self._on_failed(para(f"◆ The job could not be run. {message}") + more)


def _job(source: Any) -> Any:
    if isinstance(source, str | Path):
        from deembed.job import load_job

        return load_job(source)
    if not hasattr(source, "run"):
        raise DeembedError(
            f"{type(source).__name__} is neither a job nor an outcome",
            where="Lanes",
            do="Give the path of a job.toml or an outcome.nc, or what load_job or run returned.",
        )
    return source
