"""What a job file may hold: one frozen model per table.

Lists become tuples and tables with free keys read-only maps, so a job cannot change under anyone's feet.
Checks that need more than one key are in `crosscheck`.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterator, Mapping
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field

__all__ = [
    "AnalyzerTable",
    "ArmTable",
    "CalibrationTable",
    "CoupledTable",
    "ExpectTable",
    "FixtureTable",
    "FrozenMap",
    "JobFile",
    "JobTable",
    "ReadingTable",
    "RoundTable",
    "calibrated_ports",
    "plain",
    "tolerance_of",
]

MOST_PORTS = 12


class FrozenMap(Mapping):
    """A read-only, hashable mapping, in the order it was given."""

    def __init__(self, items: Mapping | None = None) -> None:
        self._items = dict(items or {})

    def __getitem__(self, key: Any) -> Any:
        return self._items[key]

    def __iter__(self) -> Iterator:
        return iter(self._items)

    def __len__(self) -> int:
        return len(self._items)

    def __hash__(self) -> int:
        return hash(frozenset(self._items.items()))

    def __repr__(self) -> str:
        return f"FrozenMap({self._items!r})"


def _port_files(value: object) -> FrozenMap:
    """A table port -> file; the keys of a TOML table are text."""
    if not isinstance(value, Mapping):
        raise ValueError('must be a table such as { 3 = "raw/file_3.s1p" }')
    out: dict[int, str] = {}
    for key, file in value.items():
        if not str(key).isdigit() or int(key) < 1:
            raise ValueError(f"has the key {key!r}; its keys are port numbers from 1")
        if not isinstance(file, str) or not file:
            raise ValueError(f"has {file!r} for port {key}; needed the name of a file")
        out[int(key)] = file
    return FrozenMap(out)


def _free_text(value: object) -> object:
    if isinstance(value, (int, float, datetime.date, datetime.time)) and not isinstance(value, bool):
        return str(value)
    return value


def _tolerance(value: object) -> object:
    names = ("gain", "reciprocity", "lossless", "match", "three_way")
    entries = value if isinstance(value, Mapping) else {"tolerance": value}
    for name, number in entries.items():
        if isinstance(value, Mapping) and name not in names:
            raise ValueError(f"has the key {name!r}; its keys are {', '.join(names)}")
        if isinstance(number, bool) or not isinstance(number, (int, float)) or not 0 < number < 1:
            raise ValueError(f"is {number!r}; needed a wave amplitude above 0 and below 1, such as 0.01")
    return FrozenMap({k: float(v) for k, v in value.items()}) if isinstance(value, Mapping) else float(value)  # type: ignore[arg-type]


PortFiles = Annotated[Any, BeforeValidator(_port_files)]
Text = Annotated[str, BeforeValidator(_free_text)]
File = Annotated[str, Field(min_length=1)]
Port = Annotated[int, Field(ge=1, le=99)]
Ports = Annotated[tuple[Port, ...], Field(min_length=1)]


class _Table(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid", strict=True, allow_inf_nan=False)


class JobTable(_Table):
    """``[job]``: what the part is and the words that go with it."""

    title: Text = ""
    part_ports: Annotated[int, Field(ge=1, le=MOST_PORTS)]
    reference_impedance_ohm: Annotated[float, Field(gt=0)] = 50.0
    interpolate: bool = False
    operator: Text = ""
    instrument: Text = ""
    kit_serial: Text = ""
    kit_due: Text = ""
    temperature_c: Text = ""
    note: Text = ""


class AnalyzerTable(_Table):
    """``[analyzer]``: how many ports it has and which of them drive."""

    ports: Annotated[int, Field(ge=1, le=MOST_PORTS)] = 2
    drive: Literal["every-port", "first-port-only"] = "every-port"
    switch_terms: PortFiles = FrozenMap()


class ReadingTable(_Table):
    """One ``[[calibration.readings]]``: a standard, where it sat, what was read."""

    standard: Annotated[str, Field(min_length=1)]
    ports: Ports
    file: File


class CalibrationTable(_Table):
    """``[calibration]``: method, kit and readings of its standards."""

    method: str
    kit: File | None = None
    isolation: bool = False
    readings: tuple[ReadingTable, ...] = ()


class RoundTable(_Table):
    """One ``[[rounds]]``: a sweep of the part, and which part port sat on which analyzer port."""

    file: File
    analyzer_ports: Ports | None = None
    part_ports: Ports
    terminations: PortFiles = FrozenMap()

    def seats(self) -> tuple[int, ...]:
        """Part ports in rising order of the analyzer ports they sat on."""
        on = self.analyzer_ports or tuple(range(1, len(self.part_ports) + 1))
        return tuple(part for _, part in sorted(zip(on, self.part_ports, strict=True)))


class CheckTable(_Table):
    """One ``[[checks]]``: a known part read after the calibration and not used in it."""

    name: Text = ""
    file: File
    reference: File
    analyzer_ports: Ports
    uncertainty: Annotated[float, Field(ge=0, le=1)]
    reference_uncertainty: Annotated[float, Field(ge=0, le=1)] = 0.0


class ArmTable(_Table):
    """One ``[[fixture.arms]]``: what stands between the cable plane and a part port."""

    part_port: Port
    file: File
    analyzer_side: Literal[1, 2]


class CoupledTable(_Table):
    """``[fixture.coupled]``: one file for all arms and what couples them."""

    file: File
    analyzer_side_ports: Ports
    part_side_ports: Ports


class FixtureTable(_Table):
    """``[fixture]``: arms, or one coupled network, or neither."""

    arms: tuple[ArmTable, ...] = ()
    coupled: CoupledTable | None = None


class ExpectTable(_Table):
    """``[expect]``: what the part is held to be; an absent key is not judged."""

    passive: bool | None = None
    reciprocal: bool | None = None
    lossless: bool | None = None
    tolerance: Annotated[Any, BeforeValidator(_tolerance)] = 0.01

    def claims(self) -> dict[str, bool]:
        """The properties that are judged."""
        held = {k: getattr(self, k) for k in ("passive", "reciprocal", "lossless")}
        return {k: v for k, v in held.items() if v is not None}


class JobFile(_Table):
    """A whole job file."""

    job: JobTable
    analyzer: AnalyzerTable = AnalyzerTable()
    calibration: CalibrationTable
    rounds: Annotated[tuple[RoundTable, ...], Field(min_length=1)]
    terminations: PortFiles = FrozenMap()
    checks: tuple[CheckTable, ...] = ()
    fixture: FixtureTable = FixtureTable()
    expect: ExpectTable = ExpectTable()


def tolerance_of(expect: ExpectTable) -> float | dict[str, float]:
    """Tolerance [wave amplitude]: one number, or one per property."""
    return dict(expect.tolerance) if isinstance(expect.tolerance, Mapping) else expect.tolerance


def calibrated_ports(spec: JobFile) -> tuple[int, ...]:
    """Analyzer ports that standards or rounds use."""
    on = [reading.ports for reading in spec.calibration.readings]
    on += [one.analyzer_ports or () for one in spec.rounds]
    return tuple(sorted({port for ports in on for port in ports}))


def plain(value: Any) -> Any:
    """Models, maps and tuples as plain dicts and lists, for hashing and JSON."""
    if isinstance(value, BaseModel):
        return {name: plain(getattr(value, name)) for name in type(value).model_fields}
    if isinstance(value, Mapping):
        return {str(k): plain(v) for k, v in value.items()}
    if isinstance(value, (tuple, list)):
        return [plain(v) for v in value]
    return value
