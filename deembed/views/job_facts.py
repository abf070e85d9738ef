"""What a job says, as plain rows the pictures and sentences need."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

__all__ = ["Arm", "JobFacts", "Round", "StandardReading", "facts_of"]


@dataclass(frozen=True)
class Round:
    """One round: which part port sat on which analyzer port, and what closed the others."""

    label: str
    files: tuple[str, ...]
    analyzer_ports: tuple[int, ...]
    part_ports: tuple[int, ...]
    terminations: Mapping[int, str]


@dataclass(frozen=True)
class StandardReading:
    """One reading of a standard."""

    standard: str
    ports: tuple[int, ...]
    files: tuple[str, ...]


@dataclass(frozen=True)
class Arm:
    """One fixture arm: its file and which of its ports faces the analyzer."""

    part_port: int
    file: str
    analyzer_side: int


@dataclass(frozen=True)
class JobFacts:
    """The parts of a job that are shown."""

    title: str
    part_ports: int
    method: str
    kit: str
    drive: str
    reference_impedance_ohm: float
    rounds: tuple[Round, ...]
    readings: tuple[StandardReading, ...]
    arms: tuple[Arm, ...]
    coupled: str
    switch_terms: Mapping[int, str]
    free_text: tuple[tuple[str, str], ...]
    expect: Mapping[str, Any]


_FREE = ("operator", "instrument", "kit_serial", "kit_due", "temperature_c", "note")


def _get(thing: Any, *keys: str, default: Any = None) -> Any:
    for key in keys:
        thing = thing.get(key) if isinstance(thing, Mapping) else getattr(thing, key, None)
        if thing is None:
            return default
    return thing


def _files(value: Any) -> tuple[str, ...]:
    if value is None:
        return ()
    return (
        (str(value),) if isinstance(value, str) or not hasattr(value, "__iter__") else tuple(map(str, value))
    )


def _closed(table: Any) -> dict[int, str]:
    return {int(port): str(value) for port, value in dict(table or {}).items()}


def facts_of(job: Any) -> JobFacts:
    """The facts of a job.

    Parameters
    ----------
    job : Job
        See `deembed.job`; its fields are those of ``job.toml``.

    Returns
    -------
    JobFacts
    """
    job = getattr(job, "spec", job)
    shared = _closed(_get(job, "terminations"))
    rounds = tuple(
        Round(
            "-".join(str(p) for p in _get(r, "part_ports")),
            _files(_get(r, "file")),
            tuple(int(p) for p in _get(r, "analyzer_ports") or range(1, len(_get(r, "part_ports")) + 1)),
            tuple(int(p) for p in _get(r, "part_ports")),
            {**shared, **_closed(_get(r, "terminations"))},
        )
        for r in _get(job, "rounds", default=())
    )
    readings = tuple(
        StandardReading(
            str(_get(r, "standard")), tuple(_get(r, "ports", default=())), _files(_get(r, "file"))
        )
        for r in _get(job, "calibration", "readings", default=())
    )
    arms = tuple(
        Arm(int(_get(a, "part_port")), str(_get(a, "file")), int(_get(a, "analyzer_side", default=1)))
        for a in _get(job, "fixture", "arms", default=()) or ()
    )
    expect = _get(job, "expect")
    judged = {
        k: _get(expect, k) for k in ("passive", "reciprocal", "lossless") if _get(expect, k) is not None
    }
    return JobFacts(
        title=str(_get(job, "job", "title", default="")),
        part_ports=int(_get(job, "job", "part_ports", default=0)),
        method=str(_get(job, "calibration", "method", default="none")),
        kit=str(_get(job, "calibration", "kit", default="") or ""),
        drive=str(_get(job, "analyzer", "drive", default="every-port")),
        reference_impedance_ohm=float(_get(job, "job", "reference_impedance_ohm", default=50.0)),
        rounds=rounds,
        readings=readings,
        arms=arms,
        coupled=str(_get(job, "fixture", "coupled", "file", default="")),
        switch_terms=_closed(_get(job, "analyzer", "switch_terms")),
        free_text=tuple((k, str(_get(job, "job", k))) for k in _FREE if _get(job, "job", k)),
        expect=judged,
    )
