"""Inputs as the stages need them: labelled by analyzer port, on one grid, or an error that names the file."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
import xarray as xr

from deembed import words
from deembed.errors import FileError, GridError, PortError
from deembed.job.inputs import Inputs, is_shipped_kit
from deembed.job.schema import JobFile
from deembed.labels import ports_of, relabel_ports, select_ports

__all__ = ["check_grids", "kit_files", "on_ports", "one_port", "touchstone_files"]

Named = tuple[str, str]  # job key, name of the input


def reading_files(spec: JobFile) -> list[Named]:
    """Readings of standards."""
    return [(f"calibration.readings[{i}].file", r.file) for i, r in enumerate(spec.calibration.readings)]


def switch_files(spec: JobFile) -> list[Named]:
    """Recorded switch terms."""
    return [(f"analyzer.switch_terms.{port}", file) for port, file in spec.analyzer.switch_terms.items()]


def round_files(spec: JobFile) -> list[Named]:
    """Sweeps of the part."""
    return [(f"rounds[{i}].file", one.file) for i, one in enumerate(spec.rounds)]


def termination_files(spec: JobFile) -> list[Named]:
    """Reflections of what closed free ports."""
    whole = [(f"terminations.{port}", file) for port, file in spec.terminations.items()]
    own = [
        (f"rounds[{i}].terminations.{port}", file)
        for i, one in enumerate(spec.rounds)
        for port, file in one.terminations.items()
    ]
    return whole + own


def fixture_files(spec: JobFile) -> list[Named]:
    """Arms or the coupled fixture."""
    arms = [(f"fixture.arms[{i}].file", arm.file) for i, arm in enumerate(spec.fixture.arms)]
    coupled = spec.fixture.coupled
    return arms if coupled is None else [*arms, ("fixture.coupled.file", coupled.file)]


def check_files(spec: JobFile) -> list[Named]:
    """Readings of check standards and their known values."""
    return [
        (f"checks[{i}].{what}", getattr(one, what))
        for i, one in enumerate(spec.checks)
        for what in ("file", "reference")
    ]


def touchstone_files(spec: JobFile) -> list[Named]:
    """Every Touchstone file a job names, rounds first."""
    groups = (round_files, reading_files, switch_files, termination_files, fixture_files, check_files)
    return [named for group in groups for named in group(spec)]


def kit_files(spec: JobFile, inputs: Inputs) -> list[Named]:
    """The kit and the files its tables name."""
    kit = spec.calibration.kit
    if kit is None or spec.calibration.method == "none":
        return []
    tables = [(f"calibration.kit {kit}, {written}", name) for written, name in inputs.kit_tables(kit)]
    if is_shipped_kit(kit) and tables:
        raise FileError(
            f"the shipped kit {kit!r} names files", where="calibration.kit", do="Use a kit of your own."
        )
    return [("calibration.kit", kit), *tables]


def on_ports(s: xr.DataArray, ports: Sequence[int], *, name: str, key: str) -> xr.DataArray:
    """A file's array labelled by the analyzer ports it was read on, in rising order.

    A file with as many ports as listed holds them in rising order; a file with more is the analyzer's whole
    sweep, and its port numbers are the analyzer's own.

    Raises
    ------
    PortError
        The file has too few ports, or lacks one of them.
    """
    listed = sorted(ports)
    count = s.sizes["port_out"]
    if count == len(listed):
        return relabel_ports(s, listed)
    if count > len(listed) and listed[-1] <= count:
        return select_ports(s, listed)
    some = "port" if len(listed) == 1 else "ports"
    raise PortError(
        f"{name!r} has {count} {'port' if count == 1 else 'ports'}; needed analyzer {some} "
        f"{words.listed(listed)}",
        where=key,
        do=f"Give a file with {len(listed)} {some}, or correct the port list.",
    )


def one_port(s: xr.DataArray, *, name: str, key: str) -> xr.DataArray:
    """A one-port array, or an error.

    Raises
    ------
    PortError
        The file has more ports.
    """
    if ports_of(s) != (1,):
        raise PortError(
            f"{name!r} has {s.sizes['port_out']} ports; needed a reflection, so one port",
            where=key,
            do="Give an .s1p file.",
        )
    return s


def check_grids(spec: JobFile, inputs: Inputs) -> None:
    """Raise unless all readings are on grids that go together.

    Rounds must share one grid, and so must the readings of standards: raw readings are never interpolated.
    All must be the same unless ``job.interpolate`` is true.

    Raises
    ------
    GridError
        Names both files and both grids.
    """
    rounds, standards = round_files(spec), reading_files(spec)
    _same(rounds, inputs, "Raw readings are never interpolated: read all rounds on one grid.")
    _same(standards, inputs, "Raw readings are never interpolated: read all standards on one grid.")
    if not spec.job.interpolate:
        rest = [*rounds[:1], *touchstone_files(spec)[len(rounds) :]]
        _same(rest, inputs, "Read both on one grid, or allow interpolation with job.interpolate = true.")


def _same(named: list[Named], inputs: Inputs, do: str) -> None:
    for (first_key, first), (key, name) in _pairs(named):
        a = inputs.sparams(first, key=first_key).frequency.values
        b = inputs.sparams(name, key=key).frequency.values
        if not np.array_equal(a, b):
            raise GridError(
                f"{first} ({first_key}) has {words.grid(a)}; {name} ({key}) has {words.grid(b)}"
                f"{_detail(a, b)}",
                where="frequency grids differ",
                do=do,
            )


def _pairs(named: list[Named]) -> Iterator[tuple[Named, Named]]:
    return ((named[0], other) for other in named[1:])


def _detail(a: np.ndarray, b: np.ndarray) -> str:
    if a.size != b.size:
        return ""
    i = int(np.argmax(a != b))
    return f"; they first differ at point {i + 1}: {a[i]:.12g} Hz and {b[i]:.12g} Hz"
