"""The stages of a job as a declared graph, and the walk along it.

Each stage is a pure function of its part of the job, its inputs and the stages it needs. Its key is the hash
of exactly those, so one cache serves live edits, draws and suspects alike: a change re-runs from the first
stage it touches, and nothing before it.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from deembed.findings import Finding
from deembed.job import loading, steps, steps_calibration, steps_checks
from deembed.job.cache import Cache
from deembed.job.inputs import Inputs
from deembed.job.places import Place
from deembed.job.schema import JobFile, calibrated_ports, plain

__all__ = ["STAGES", "Cache", "Progress", "Stage", "Step", "walk"]

Progress = Callable[[float, str], None]
Named = list[tuple[str, str]]


@dataclass(frozen=True)
class Step:
    """What a stage came to: its value and what is worth knowing about it."""

    value: Any
    findings: tuple[Finding, ...] = ()


@dataclass(frozen=True)
class Stage:
    """One stage of a job.

    Parameters
    ----------
    name : str
    words : str
        What it does, for a progress bar.
    run : callable
        ``(spec, inputs, place, got) -> (value, findings)``; `got` maps needed stage names to values.
    needs : tuple of str
        Stages whose results it uses.
    part : callable
        The job's keys it depends on.
    files : callable, optional
        ``(spec, inputs) -> [(job key, input name)]`` it depends on.
    content : callable, optional
        ``value -> bytes``: later stages then depend on the value itself, not on where it came from.
    """

    name: str
    words: str
    run: Callable[[JobFile, Inputs, Place, Mapping[str, Any]], Any]
    needs: tuple[str, ...]
    part: Callable[[JobFile], Any]
    files: Callable[[JobFile, Inputs], Named] | None = None
    content: Callable[[Any], bytes] | None = None


def _calibration(spec: JobFile) -> Any:
    c, a = spec.calibration, spec.analyzer
    return [c.method, c.isolation, calibrated_ports(spec), a.drive, a.switch_terms]


STAGES: tuple[Stage, ...] = (
    Stage(
        "load",
        "reading the files",
        steps.load,
        (),
        lambda spec: [spec.job.interpolate, loading.touchstone_files(spec)],
        lambda spec, _: loading.touchstone_files(spec),
    ),
    Stage(
        "grid",
        "finding the part's grid",
        steps.grid,
        (),
        lambda _: None,
        lambda spec, _: loading.round_files(spec)[:1],
        content=lambda value: value.tobytes(),
    ),
    Stage(
        "kit",
        "reading the kit",
        steps_calibration.kit,
        (),
        lambda spec: [spec.calibration.kit, spec.calibration.method],
        loading.kit_files,
    ),
    Stage(
        "readings",
        "sorting the readings of standards",
        steps_calibration.readings,
        (),
        lambda spec: spec.calibration.readings,
        lambda spec, _: loading.reading_files(spec),
    ),
    Stage(
        "terms",
        "solving the error terms",
        steps_calibration.terms,
        ("kit", "readings"),
        _calibration,
        lambda spec, _: loading.switch_files(spec),
    ),
    Stage(
        "terms on the grid",
        "bringing the error terms onto the part's grid",
        steps_calibration.terms_on_grid,
        ("terms", "grid"),
        lambda _: None,
    ),
    Stage(
        "checks",
        "judging the check standards",
        steps_checks.checks,
        ("terms on the grid",),
        lambda spec: [spec.checks, spec.analyzer.drive],
        lambda spec, _: loading.check_files(spec),
    ),
    Stage(
        "sweeps",
        "sorting the sweeps of the part",
        steps.sweeps,
        (),
        lambda spec: [[one.file, one.analyzer_ports, one.part_ports] for one in spec.rounds],
        lambda spec, _: loading.round_files(spec),
    ),
    Stage(
        "corrected",
        "correcting the rounds",
        steps.corrected,
        ("terms on the grid", "sweeps"),
        lambda spec: [[[one.analyzer_ports, one.part_ports] for one in spec.rounds], spec.analyzer.drive],
    ),
    Stage(
        "terminations",
        "reading the terminations",
        steps.terminations,
        ("grid",),
        lambda spec: [spec.terminations, [[one.seats(), one.terminations] for one in spec.rounds]],
        lambda spec, _: loading.termination_files(spec),
    ),
    Stage(
        "assembled",
        "putting the rounds together",
        steps.assembled,
        ("corrected", "terminations"),
        lambda spec: [spec.job.part_ports, spec.job.reference_impedance_ohm, spec.analyzer.drive],
    ),
    Stage(
        "shell",
        "reading the fixture",
        steps.shell,
        ("grid",),
        lambda spec: [spec.fixture, spec.job.part_ports],
        lambda spec, _: loading.fixture_files(spec),
    ),
    Stage(
        "part",
        "stripping the fixture",
        steps.part,
        ("assembled", "shell"),
        lambda spec: spec.job.reference_impedance_ohm,
    ),
    Stage(
        "assessment",
        "judging the part",
        steps.assessment,
        ("part",),
        lambda spec: spec.expect,
    ),
    Stage(
        "blind spots",
        "looking for what could not have been seen",
        steps.blind_spots,
        ("assembled", "shell", "part", "assessment", "terms on the grid", "kit"),
        lambda spec: [
            spec.expect,
            spec.fixture.arms,
            spec.job.reference_impedance_ohm,
            spec.calibration.method,
            [[reading.standard, reading.ports] for reading in spec.calibration.readings],
        ],
    ),
)


def walk(
    spec: JobFile, inputs: Inputs, place: Place, *, cache: Cache, progress: Progress | None = None
) -> dict[str, Step]:
    """Run every stage that the cache does not already hold.

    Parameters
    ----------
    spec : JobFile
    inputs : Inputs
    place : Place
        Makes errors that name file, line and key.
    cache : Cache
    progress : callable, optional
        ``progress(fraction, words)``.

    Returns
    -------
    dict of stage name to Step

    Raises
    ------
    DeembedError
        Anything that keeps the job from being run.
    """
    keys: dict[str, str] = {}
    done: dict[str, Step] = {}
    for count, stage in enumerate(STAGES):
        if progress is not None:
            progress(count / len(STAGES), stage.words)
        key = _key(stage, spec, inputs, keys)
        step = cache.find(key)
        if step is None:
            step = _run(stage, spec, inputs, place, done)
            cache.executed[stage.name] += 1
            cache.keep(key, step)
        done[stage.name] = step
        keys[stage.name] = (
            key if stage.content is None else hashlib.sha256(stage.content(step.value)).hexdigest()
        )
    return done


def _key(stage: Stage, spec: JobFile, inputs: Inputs, keys: Mapping[str, str]) -> str:
    files = [] if stage.files is None else stage.files(spec, inputs)
    parts = {
        "stage": stage.name,
        "job": plain(stage.part(spec)),
        "inputs": [[key, name, inputs.get(name, key=key).sha256] for key, name in files],
        "needs": [keys[name] for name in stage.needs],
    }
    return hashlib.sha256(json.dumps(parts, sort_keys=True).encode()).hexdigest()


def _run(stage: Stage, spec: JobFile, inputs: Inputs, place: Place, done: Mapping[str, Step]) -> Step:
    got = {name: done[name].value for name in stage.needs}
    return Step(*stage.run(spec, inputs, place, got))
