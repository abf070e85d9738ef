"""What a job comes to, and how it is written: all files or none."""

from __future__ import annotations

import json
import os
import shutil
import tempfile
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import xarray as xr

from deembed.errors import FileError
from deembed.findings import BlindSpot, Finding, Suspect
from deembed.job.figures import figures

if TYPE_CHECKING:
    from deembed.job.job import Job

__all__ = ["Outcome", "findings_json", "open_outcome"]


@dataclass(frozen=True, eq=False)
class Outcome:
    """Everything a run of a job found.

    Parameters
    ----------
    job : Job
    part : DataArray of shape (..., frequency, port_out, port_in)
        At its own planes, in the job's reference impedance.
    metrics : Dataset
        Physical figures per frequency.
    findings : tuple of Finding
        Contradictions first.
    blind_spots : tuple of BlindSpot
        What could not have been seen.
    verdict : str
        One sentence.
    raw : mapping name -> DataArray
        Every Touchstone input as read.
    terms : Dataset or None
        Error terms on the part's grid; None where readings came corrected.
    rounds : tuple of DataArray
        Corrected, labelled by part ports, named such as ``1-2``.
    assembled : DataArray of shape (..., frequency, port_out, port_in)
        At the cable planes.
    disagreement : DataArray of shape (..., round, frequency, port) or None
        Reading minus mean of each reflection.
    shell : Dataset or None
        The fixture.
    suspects : tuple of Suspect
    """

    job: Job
    part: xr.DataArray
    metrics: xr.Dataset
    findings: tuple[Finding, ...]
    blind_spots: tuple[BlindSpot, ...]
    verdict: str
    raw: Mapping[str, xr.DataArray]
    terms: xr.Dataset | None
    rounds: tuple[xr.DataArray, ...]
    assembled: xr.DataArray
    disagreement: xr.DataArray | None
    shell: xr.Dataset | None
    suspects: tuple[Suspect, ...] = ()

    @property
    def contradicts(self) -> bool:
        """Whether a finding contradicts what the job expects."""
        return any(f.severity == "contradiction" for f in self.findings)

    def write(self, directory: str | Path) -> tuple[Path, ...]:
        """Write part, archive, findings and report: all of them or none.

        They are made in a folder beside and moved in when all are complete. Where a move fails, what was
        there before is put back.

        Parameters
        ----------
        directory : str or Path
            Made when it does not exist; other files in it are left alone.

        Returns
        -------
        tuple of Path
            The files written.

        Raises
        ------
        FileError
            The folder cannot be written.
        """
        target = Path(directory)
        real = target.resolve()  # a link may lead to another file system
        if target.exists() and not target.is_dir():
            raise FileError(
                "this is a file, not a folder", where=str(target), do="Name another folder for the output."
            )
        try:
            real.parent.mkdir(parents=True, exist_ok=True)
            beside = Path(tempfile.mkdtemp(prefix=f".{real.name}-", dir=real.parent))
        except OSError as error:
            raise FileError(f"it cannot be written ({error.strerror})", where=str(target)) from error
        try:
            new = beside / "new"
            new.mkdir()
            self._make(new)
            return tuple(target / path.name for path in _move_in(new, real, beside / "old"))
        except OSError as error:
            raise FileError(f"it cannot be written ({error.strerror or error})", where=str(target)) from error
        finally:
            shutil.rmtree(beside, ignore_errors=True)

    def _make(self, folder: Path) -> None:
        from deembed.job.archive import write_archive
        from deembed.report import report_html
        from deembed.touchstone import write_touchstone

        write_touchstone(
            writable(self.part),
            folder / f"part.s{self.part.sizes['port_out']}p",
            provenance=self.provenance(),
        )
        (folder / "findings.json").write_text(findings_json(self), encoding="utf-8")
        (folder / "report.html").write_text(report_html(self), encoding="utf-8")
        write_archive(self, folder / "outcome.nc")

    def provenance(self) -> tuple[str, ...]:
        """Lines that say where the numbers come from; no path of this machine."""
        import deembed

        job = self.job.spec.job
        lines = [
            f"deembed {deembed.__version__}",
            f"job: {job.title or self.job.name}",
            f"verdict: {self.verdict}",
        ]
        for key in ("operator", "instrument", "kit_serial", "kit_due", "temperature_c", "note"):
            if getattr(job, key):
                lines.append(f"{key}: {getattr(job, key)}")
        for key, name in self.job.input_names():
            lines.append(f"input: {name} ({key}) sha256 {self.job.inputs.get(name, key=key).sha256}")
        missing = int(self.part.sizes["frequency"] - writable(self.part).sizes["frequency"])
        if missing:
            some = (
                "1 frequency without a value is"
                if missing == 1
                else f"{missing} frequencies without a value are"
            )
            lines.append(f"{some} left out; see findings.json")
        return tuple(" ".join(line.split()) for line in lines)


def writable(part: xr.DataArray) -> xr.DataArray:
    """The part without frequencies that have no value: a Touchstone file cannot say so."""
    import numpy as np

    good = np.isfinite(part.values).all(axis=(-2, -1))
    return (
        part
        if good.all()
        else part.isel(frequency=np.flatnonzero(good.reshape(-1, good.shape[-1]).all(axis=0)))
    )


def findings_json(outcome: Outcome) -> str:
    """Verdict, findings, suspects, blind spots and the figures people quote, as JSON."""
    content = {
        "version": 1,
        "verdict": outcome.verdict,
        "findings": [f.as_dict() for f in outcome.findings],
        "suspects": [s.as_dict() for s in outcome.suspects],
        "blind_spots": [b.as_dict() for b in outcome.blind_spots],
        "figures": figures(outcome),
    }
    return json.dumps(content, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def _move_in(new: Path, target: Path, old: Path) -> tuple[Path, ...]:
    """Move complete files into place; on failure put back what was there."""
    names = sorted(p.name for p in new.iterdir())
    new.chmod(0o755)
    if not target.exists():
        os.replace(new, target)
        return tuple(target / name for name in names)
    old.mkdir()
    moved: list[str] = []
    try:
        for name in names:
            if (target / name).exists():
                os.replace(target / name, old / name)
            moved.append(name)
            os.replace(new / name, target / name)
    except OSError:
        for name in moved:
            (target / name).unlink(missing_ok=True)
            if (old / name).exists():
                os.replace(old / name, target / name)
        raise
    return tuple(target / name for name in names)


def open_outcome(path: str | Path) -> Outcome:
    """An outcome as it was written, without running the job again.

    Parameters
    ----------
    path : str or Path
        ``outcome.nc``.

    Raises
    ------
    FileError
        No such file, or not an outcome.
    """
    from deembed.job.archive import read_archive

    return read_archive(Path(path))
