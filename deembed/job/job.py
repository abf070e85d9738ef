"""A job: immutable data that runs from raw readings to a judged part."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import xarray as xr

from deembed.errors import DeembedError, FileError
from deembed.findings import Finding, finding_id, sort_findings
from deembed.job.edit import edited_text
from deembed.job.inputs import Inputs
from deembed.job.loading import kit_files, touchstone_files
from deembed.job.places import Place
from deembed.job.schema import JobFile
from deembed.job.stages import Cache, Progress, walk
from deembed.job.validate import validate

if TYPE_CHECKING:
    from deembed.job.outcome import Outcome

__all__ = ["Job", "load_job"]


@dataclass(frozen=True)
class Job:
    """One job as its file describes it.

    Parameters
    ----------
    text : str
        The job file, comments and all.
    spec : JobFile
        What the text says, checked.
    inputs : Inputs
        What it loads, and from where.
    name : str
        What to call the job file in messages.
    """

    text: str
    spec: JobFile
    inputs: Inputs
    name: str = "job.toml"

    def changed(self, edits: Mapping[str, Any] | None = None, /, **more: Any) -> Job:
        """The job with some keys changed, checked again; this one stays as it is.

        Parameters
        ----------
        edits : mapping, optional
            Dotted keys to values, such as ``{"fixture.arms[0].analyzer_side": 2}``; None takes a key out.
        **more
            Tables to merge in, such as ``expect={"passive": False}``; dotted keys through ``**{...}``.

        Returns
        -------
        Job

        Raises
        ------
        JobError
            A key that does not exist, or a job that cannot be run as changed.
        """
        text = edited_text(self.text, {**(edits or {}), **more})
        return replace(self, text=text, spec=validate(text, name=self.name))

    def with_reading(self, name: str, data: xr.DataArray) -> Job:
        """The job with one Touchstone input replaced by another array (a what-if, draws, a suspect).

        Parameters
        ----------
        name : str
            Input as the job file names it.
        data : DataArray of shape (..., frequency, port_out, port_in)

        Raises
        ------
        FileError
            The job names no such input.
        """
        known = [file for _, file in touchstone_files(self.spec)]
        if name not in known:
            raise FileError(f"the job loads no {name!r}", do=f"It loads {', '.join(known)}.")
        return replace(self, inputs=self.inputs.edited(name, data))

    def to_toml(self) -> str:
        """The job file, with the comments it came with."""
        return self.text

    def input_names(self) -> list[tuple[str, str]]:
        """(job key, name) of everything the job loads, kit and its tables included."""
        return [*touchstone_files(self.spec), *kit_files(self.spec, self.inputs)]

    def run(self, progress: Progress | None = None, *, cache: Cache | None = None) -> Outcome:
        """From raw readings to the part, judged.

        Parameters
        ----------
        progress : callable, optional
            ``progress(fraction, words)`` with fraction from 0 to 1.
        cache : Cache, optional
            Results of earlier runs; only stages that a change touches are run again.

        Returns
        -------
        Outcome

        Raises
        ------
        DeembedError
            One clear error where the job cannot be run.
        """
        from deembed.job.outcome import Outcome
        from deembed.physicality.verdict import verdict

        place = Place(self.text, self.name)
        kept = Cache() if cache is None else cache
        try:
            done = walk(self.spec, self.inputs, place, cache=kept, progress=progress)
        except DeembedError as error:
            raise place.located(error) from error
        findings = sort_findings(_each_once(f for step in done.values() for f in step.findings))
        spots = done["blind spots"].value
        claims = self.spec.expect.claims()
        assembled, disagreement = done["assembled"].value
        if progress is not None:
            progress(1.0, "done")
        return Outcome(
            job=self,
            part=done["part"].value,
            metrics=done["assessment"].value[0],
            findings=findings,
            blind_spots=spots,
            verdict=verdict(findings, expect=claims, blind_spots=spots),
            raw=MappingProxyType(done["load"].value),
            terms=done["terms on the grid"].value,
            rounds=done["corrected"].value,
            assembled=assembled,
            disagreement=disagreement,
            shell=done["shell"].value,
        )


def _each_once(findings: Iterable[Finding]) -> list[Finding]:
    """Findings without repeats; of two that share an id the second gets a number of its own."""
    kept: dict[str, Finding] = {}
    for finding in findings:
        number = 1
        while finding.id in kept and finding != kept[finding.id]:
            number += 1
            finding = replace(finding, id=finding_id(finding.kind, finding.where, number))
        kept[finding.id] = finding
    return list(kept.values())


def load_job(path: str | Path) -> Job:
    """A job from its file, or from the archive of an outcome (readings included).

    Parameters
    ----------
    path : str or Path
        ``job.toml`` or ``outcome.nc``.

    Returns
    -------
    Job

    Raises
    ------
    FileError
        No such file, or not one that holds a job.
    JobError
        A job that cannot be run as written.
    """
    path = Path(path)
    if path.is_dir():
        raise FileError("this is a folder", where=str(path), do="Give the job file in it, usually job.toml.")
    if not path.is_file():
        raise FileError(
            "no such job file", where=str(path), do="Give the path of a job.toml or an outcome.nc."
        )
    if path.suffix == ".nc":
        from deembed.job.archive import job_from_archive

        return job_from_archive(path)
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise FileError(f"it cannot be read as text ({error})", where=str(path)) from error
    return Job(text, validate(text, name=path.name), Inputs(path.parent), path.name)
