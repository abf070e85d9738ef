"""The job: its file, its stages, its archive and the command line."""

from __future__ import annotations

from deembed.job.job import Job, load_job
from deembed.job.outcome import Outcome, open_outcome
from deembed.job.stages import Cache

__all__ = ["Cache", "Job", "Outcome", "load_job", "open_outcome"]
