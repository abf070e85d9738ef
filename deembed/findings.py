"""Findings: what an engineer should know, with band, size and significance, in words."""

from __future__ import annotations

import json
import re
from collections.abc import Iterable, Sequence
from dataclasses import asdict, dataclass, fields

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike

__all__ = [
    "SEVERITIES",
    "BlindSpot",
    "Finding",
    "Suspect",
    "attach",
    "bands_over",
    "finding_id",
    "findings_of",
    "sort_findings",
]

SEVERITIES = ("contradiction", "warning", "note")


def _plain(value: object) -> object:
    """JSON has no NaN or infinity: an unknown number is null."""
    return None if isinstance(value, float) and not np.isfinite(value) else value


@dataclass(frozen=True)
class Finding:
    """One thing worth knowing about readings, terms or part.

    Parameters
    ----------
    id : str
        Stable name, made by `finding_id`.
    kind : str
        What sort of finding, e.g. ``gain``, ``non-reciprocity``, ``redundancy``.
    where : str
        Places, joined by commas: ``port 2``, ``part port 3``, ``short 1``, ``thru 1-2``, ``round 1-3``,
        ``arm 3``, ``termination 2``, ``switch 1``; empty for the part as a whole.
    severity : str
        ``note``, ``warning`` or ``contradiction`` (of what the job expects).
    text : str
        One sentence an engineer would say.
    from_hz, to_hz : float, optional
        Band [Hz].
    worst : float, optional
        Size at the worst frequency, in the unit the text names.
    worst_hz : float, optional
        Worst frequency [Hz].
    significance : float, optional
        Standard uncertainties beyond what could be; None where not known.
    """

    id: str
    kind: str
    where: str
    severity: str
    text: str
    from_hz: float | None = None
    to_hz: float | None = None
    worst: float | None = None
    worst_hz: float | None = None
    significance: float | None = None

    def __post_init__(self) -> None:
        if self.severity not in SEVERITIES:
            raise ValueError(f"severity is {self.severity!r}; it must be one of {', '.join(SEVERITIES)}")

    def as_dict(self) -> dict:
        """Plain dict for JSON; unknown numbers are None."""
        return {key: _plain(value) for key, value in asdict(self).items()}

    @classmethod
    def from_dict(cls, entry: dict) -> Finding:
        """The finding a dict from `as_dict` describes."""
        known = {f.name for f in fields(cls)}
        return cls(**{key: value for key, value in entry.items() if key in known})


@dataclass(frozen=True)
class BlindSpot:
    """A mistake that would leave no trace in this job's evidence, and what would expose it."""

    cause: str
    where: str
    unseen_error_db: float | None
    reading: str
    text: str

    def as_dict(self) -> dict:
        """Plain dict for JSON; unknown numbers are None."""
        return {key: _plain(value) for key, value in asdict(self).items()}


@dataclass(frozen=True)
class Suspect:
    """A step that may have gone wrong; `score` is belief, 0 to 1."""

    cause: str
    where: str
    score: float | None
    text: str

    def as_dict(self) -> dict:
        """Plain dict for JSON; unknown numbers are None."""
        return {key: _plain(value) for key, value in asdict(self).items()}


def finding_id(kind: str, where: str = "", number: int = 1) -> str:
    """Stable id: kind, place and running number of the band, e.g. ``gain-part-1``."""
    place = re.sub(r"[^a-z0-9]+", "-", (where or "part").lower()).strip("-")
    return f"{kind}-{place}-{number}"


def bands_over(frequency: ArrayLike, mask: ArrayLike, *, gap: float = 0.02) -> list[tuple[int, int]]:
    """Bands in which a per-frequency flag holds, close neighbours merged.

    Parameters
    ----------
    frequency : array of shape (frequency,)
        Grid [Hz], increasing.
    mask : bool array of shape (frequency,)
        True where the thing was seen.
    gap : float
        Two bands closer than this share of the whole span are one band.

    Returns
    -------
    list of (int, int)
        First and last index of each band, both inside it.
    """
    frequency = np.asarray(frequency, dtype=float)
    hits = np.flatnonzero(np.asarray(mask, dtype=bool))
    if hits.size == 0:
        return []
    reach = gap * (frequency[-1] - frequency[0])
    apart = (np.diff(hits) > 1) & (np.diff(frequency[hits]) > reach)
    starts = np.concatenate([hits[:1], hits[1:][apart]])
    stops = np.concatenate([hits[:-1][apart], hits[-1:]])
    return [(int(a), int(b)) for a, b in zip(starts, stops, strict=True)]


def sort_findings(findings: Iterable[Finding]) -> tuple[Finding, ...]:
    """Contradictions first, then warnings, then notes; larger significance first within each."""
    return tuple(sorted(findings, key=lambda f: (SEVERITIES.index(f.severity), -(f.significance or 0.0))))


def attach(data: xr.Dataset, findings: Sequence[Finding]) -> xr.Dataset:
    """A copy of the dataset that also carries these findings (JSON in its attributes)."""
    kept = list(findings_of(data)) + list(findings)
    return data.assign_attrs(findings=json.dumps([f.as_dict() for f in kept]))


def findings_of(data: xr.Dataset) -> tuple[Finding, ...]:
    """The findings a dataset carries."""
    return tuple(Finding.from_dict(entry) for entry in json.loads(data.attrs.get("findings", "[]")))
