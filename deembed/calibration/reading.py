"""Readings of standards, and how they are laid beside what the kit says of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import PortError, SolveError
from deembed.labels import check, ports_of, same_grid

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["ONE_PORT_KINDS", "TWO_PORT_KINDS", "Reading", "kit_kind", "sorted_readings", "unsolved"]

ONE_PORT_KINDS = ("open", "short", "load", "reflect")
TWO_PORT_KINDS = ("thru", "line")


@dataclass(frozen=True)
class Reading:
    """One raw reading of a standard.

    Parameters
    ----------
    standard : str
        Its id in the kit, or ``isolation`` for a reading with nothing connected through.
    ports : tuple of int
        Analyzer ports the standard sat on. A one-port standard on several ports means one on each.
    raw : DataArray of shape (..., frequency, port_out, port_in)
        Raw wave ratios; carries exactly `ports` as labels.

    Raises
    ------
    PortError
        Labels that are not `ports`.
    """

    standard: str
    ports: tuple[int, ...]
    raw: xr.DataArray

    def __post_init__(self) -> None:
        object.__setattr__(self, "ports", tuple(int(p) for p in self.ports))
        object.__setattr__(self, "raw", check(self.raw, what=f"reading of {self.name}"))
        if sorted(ports_of(self.raw)) != sorted(self.ports):
            raise PortError(
                f"the reading has ports {list(ports_of(self.raw))} and is said to be on {list(self.ports)}",
                where=self.name,
                do="Select the ports the standard sat on.",
            )

    @property
    def name(self) -> str:
        """The place in words, e.g. ``short 1`` or ``thru 1-2``."""
        return f"{self.standard} {'-'.join(map(str, self.ports))}"


def sorted_readings(
    readings: Sequence[Reading], kit: Kit, ports: Sequence[int]
) -> tuple[dict[int, list[Reading]], dict[tuple[int, int], Reading], dict[tuple[int, int], Reading]]:
    """Readings by what they are: reflections per port, two-ports per pair, isolation per pair.

    Raises
    ------
    SolveError
        No readings, or two two-port readings for one pair.
    PortError
        A reading on a port that is not calibrated, or on the wrong number of ports.
    KitError
        A standard the kit does not have.
    GridError
        Readings on different grids.
    """
    if not readings:
        raise SolveError("no readings of standards", where="calibration", do="Read the standards first.")
    same_grid(*(r.raw for r in readings), names=[r.name for r in readings])
    one: dict[int, list[Reading]] = {p: [] for p in ports}
    two: dict[tuple[int, int], Reading] = {}
    apart: dict[tuple[int, int], Reading] = {}
    for reading in readings:
        stray = [p for p in reading.ports if p not in ports]
        if stray:
            raise PortError(
                f"port {stray[0]} is not among the calibrated ports {list(ports)}", where=reading.name
            )
        pairs = apart if reading.standard == "isolation" else two
        if reading.standard != "isolation" and _is_one_port(reading, kit):
            for p in reading.ports:
                one[p].append(reading)
            continue
        if len(reading.ports) != 2:
            raise PortError(
                f"read on {words.listed([f'port {p}' for p in reading.ports])}; it sits between two ports",
                where=reading.name,
            )
        pair = (min(reading.ports), max(reading.ports))
        if pair in pairs:
            raise SolveError(
                f"{pairs[pair].name} and {reading.name} are both given", where="calibration", do="Keep one."
            )
        pairs[pair] = reading
    return one, two, apart


def kit_kind(reading: Reading, kit: Kit) -> str:
    """Kind of the reading's standard; ``isolation`` for itself."""
    return "isolation" if reading.standard == "isolation" else kit.kind(reading.standard)


def _is_one_port(reading: Reading, kit: Kit) -> bool:
    kind = kit.kind(reading.standard)
    if kind == "table":
        return kit.tables[reading.standard].sizes["port_out"] == 1
    return kind in ONE_PORT_KINDS


def unsolved(frequency: NDArray, values: Mapping[str, NDArray], *, where: str, why: str) -> None:
    """Raise SolveError naming the frequencies at which any of these (..., frequency) arrays is not a number."""
    bad = np.zeros(frequency.size, dtype=bool)
    for array in values.values():
        bad |= ~np.isfinite(array).reshape(-1, frequency.size).all(axis=0)
    if bad.any():
        raise SolveError(
            f"no solution at {words.some_frequencies(frequency[bad])} of {frequency.size}: {why}",
            where=where,
            do="Check those readings, or leave these frequencies out.",
        )
