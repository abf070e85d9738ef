"""A change re-runs from the first stage it touches, and nothing before it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from deembed.job import Cache, load_job
from deembed.job.stages import STAGES

AFTER_ARMS = ["shell", "part", "assessment", "blind spots"]


@pytest.mark.parametrize(
    ("edits", "again"),
    [
        ({}, []),
        ({"job.title": "another"}, []),
        ({"expect.lossless": True}, ["assessment", "blind spots"]),
        ({"fixture.arms[1].analyzer_side": 2}, AFTER_ARMS),
        (
            {"terminations.3": "raw/termination_1.s1p"},
            ["load", "terminations", "assembled", "part", "assessment", "blind spots"],
        ),
        (
            {"calibration.readings[0].file": "raw/open_2.s1p"},
            [
                "load",
                "readings",
                "terms",
                "terms on the grid",
                "checks",
                "corrected",
                "assembled",
                "part",
                "assessment",
                "blind spots",
            ],
        ),
        (
            {"job.reference_impedance_ohm": 75.0},
            ["assembled", "part", "assessment", "blind spots"],
        ),
    ],
)
def test_stages_that_run_again(bench: Callable[..., Path], edits: dict, again: list[str]) -> None:
    job = load_job(bench(method="solt", terminations={1: 0.1, 3: 0.2}, points=5))
    cache = Cache()
    job.run(cache=cache)
    assert dict(cache.executed) == {stage.name: 1 for stage in STAGES}
    cache.executed.clear()
    changed = job.changed(edits)
    kept = changed.run(cache=cache)
    assert sorted(cache.executed.elements()) == sorted(again)
    fresh = changed.run()
    assert (
        kept.part.identical(fresh.part) and kept.findings == fresh.findings and kept.verdict == fresh.verdict
    )


def test_an_edited_reading_runs_what_comes_after_it(bench: Callable[..., Path]) -> None:
    job = load_job(bench(method="solt", points=5))
    cache = Cache()
    first = job.run(cache=cache)
    cache.executed.clear()
    name = "raw/part_31.s2p"
    edited = job.with_reading(name, first.raw[name].conj())
    assert np.abs(edited.run(cache=cache).part - first.part).max() > 0.01
    assert sorted(cache.executed) == sorted(
        ["load", "sweeps", "corrected", "assembled", "part", "assessment", "blind spots"]
    )


def test_needs_come_before_the_stage_that_needs_them() -> None:
    seen: set[str] = set()
    for stage in STAGES:
        assert set(stage.needs) <= seen
        seen.add(stage.name)


def test_the_cache_is_bounded_and_lets_the_oldest_go() -> None:
    cache = Cache(megabytes=1)
    half = np.zeros(60_000)
    cache.keep("a", half)
    cache.keep("b", half)
    assert cache.find("a") is half and len(cache) == 2
    cache.keep("c", half)
    assert cache.find("b") is None and cache.find("a") is half and cache.find("c") is half
    assert cache.bytes == 2 * half.nbytes <= cache.limit
    cache.keep("too large", np.zeros(200_000))
    assert cache.find("too large") is None and len(cache) == 2
