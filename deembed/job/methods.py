"""The calibration methods a job may name.

A new one is a solver file in `deembed.calibration` and a row here.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import xarray as xr

from deembed.job.places import Place
from deembed.job.schema import CalibrationTable, JobFile

if TYPE_CHECKING:
    from deembed.calibration.reading import Reading
    from deembed.standards import Kit

__all__ = ["ISOLATION", "METHODS", "Method", "Mistake", "Setup", "method_named"]


@dataclass(frozen=True)
class Setup:
    """What a solver may need beside readings and kit.

    Parameters
    ----------
    ports : tuple of int
        Analyzer ports to calibrate.
    drive : str
        ``every-port`` or ``first-port-only``.
    table : CalibrationTable
        The job's own ``[calibration]``.
    switch_terms : mapping port -> DataArray
        One-port arrays a_r / b_r on the readings' grid; empty where they were not recorded.
    """

    ports: tuple[int, ...]
    drive: str
    table: CalibrationTable
    switch_terms: Mapping[int, xr.DataArray]


@dataclass(frozen=True)
class Mistake:
    """A mistake that shows in the redundancy of the error terms, and nowhere else for certain."""

    cause: str
    words: str
    reading: str
    kinds: tuple[str, ...] = ()  # of the standards it is about


# A reading with nothing connected between its ports; it is no standard of the kit.
ISOLATION = "isolation"

Solver = Callable[[Sequence["Reading"], "Kit", Setup], xr.Dataset]
_EVERY = ("every-port",)
_BOTH = ("every-port", "first-port-only")

_EXCHANGED = Mistake(
    "standards-exchanged",
    "two standards read in each other's place",
    "a known part that was not used for calibration, such as another offset short, at each port",
    ("open", "short", "load", "table"),
)
_THRU = Mistake(
    "thru-length",
    "a thru longer or shorter than said",
    "a line of known length between the same ports, not used for calibration",
    ("thru",),
)
_LINE = Mistake(
    "line-length",
    "lines exchanged or of another length than said",
    "a second line of another known length between the same ports",
    ("line",),
)
_SIGN = Mistake(
    "reflect-sign",
    "a reflect of the other sign",
    "a short at each port, whose reflection is near -1 at low frequency",
    ("reflect",),
)
_ELSEWHERE = Mistake(
    "calibration",
    "a mistake in the calibration that corrected these readings",
    "the raw readings and their standards, or a known part read through the same correction",
)


def _solve_sol(readings: Sequence[Reading], kit: Kit, setup: Setup) -> xr.Dataset:
    from deembed.calibration.sol import solve_sol

    return solve_sol(readings, kit, ports=setup.ports)


def _solve_solt(readings: Sequence[Reading], kit: Kit, setup: Setup) -> xr.Dataset:
    from deembed.calibration.solt import solve_solt

    return solve_solt(readings, kit, ports=setup.ports, drive=setup.drive, isolation=setup.table.isolation)


def _solve_trl(readings: Sequence[Reading], kit: Kit, setup: Setup) -> xr.Dataset:
    from deembed.calibration.trl import solve_trl

    return solve_trl(readings, kit, ports=setup.ports, switch_terms=dict(setup.switch_terms) or None)


def _check_sol(spec: JobFile, place: Place) -> None:
    if spec.job.part_ports > 1:
        raise place.error(
            ("calibration", "method"),
            f"'sol' corrects reflections alone, and the part has {spec.job.part_ports} ports",
            "Use solt or trl, or set job.part_ports = 1.",
        )


def _check_pairs(spec: JobFile, place: Place) -> None:
    if spec.job.part_ports > 1 and spec.analyzer.ports < 2:
        raise place.error(
            ("analyzer", "ports"),
            f"one analyzer port cannot read a part with {spec.job.part_ports} ports",
            "Correct analyzer.ports or job.part_ports.",
        )


@dataclass(frozen=True)
class Method:
    """One way of finding error terms.

    Parameters
    ----------
    solve : callable or None
        ``(readings, kit, setup) -> error terms``; None where readings are already corrected.
    kit : bool
        Whether it needs a kit and readings of its standards.
    drives : tuple of str
        Values of ``analyzer.drive`` it can be used with.
    check : callable, optional
        Checks across the job file that this method alone needs.
    mistakes : tuple of Mistake
        What no one can see for certain where redundancy is absent.
    uses_switch_terms, uses_isolation : bool
        Whether recorded switch terms, and leakage between ports, go into the terms.
    """

    solve: Solver | None
    kit: bool
    drives: tuple[str, ...]
    check: Callable[[JobFile, Place], None] | None = None
    mistakes: tuple[Mistake, ...] = ()
    uses_switch_terms: bool = False
    known_standards: bool = False
    uses_isolation: bool = False


METHODS: Mapping[str, Method] = {
    "none": Method(None, kit=False, drives=_EVERY, mistakes=(_ELSEWHERE,)),
    "sol": Method(
        _solve_sol, kit=True, drives=_BOTH, check=_check_sol, mistakes=(_EXCHANGED,), known_standards=True
    ),
    "solt": Method(
        _solve_solt,
        kit=True,
        drives=_BOTH,
        check=_check_pairs,
        mistakes=(_EXCHANGED, _THRU),
        known_standards=True,
        uses_isolation=True,
    ),
    "trl": Method(
        _solve_trl,
        kit=True,
        drives=_EVERY,
        check=_check_pairs,
        mistakes=(_LINE, _SIGN),
        uses_switch_terms=True,
    ),
}


def method_named(name: str) -> Method:
    """The method a checked job names."""
    return METHODS[name]
