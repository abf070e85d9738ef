"""The kit file: what may stand in it, checked, with one clear error for what may not."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Annotated, Any, Literal

import tomlkit
from pydantic import BaseModel, ConfigDict, Field, ValidationError, model_validator
from tomlkit.exceptions import ParseError

from deembed import words
from deembed.errors import KitError

__all__ = ["KINDS", "KitTable", "parse_kit"]

Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]
NotNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]
Number = Annotated[float, Field(allow_inf_nan=False)]


class _Table(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, strict=False)


class _Standard(_Table):
    description: str = ""
    contact: Literal["pin", "socket"] | None = None
    valid_hz: tuple[NotNegative, NotNegative] | None = None

    @model_validator(mode="after")
    def _band(self) -> _Standard:
        if self.valid_hz is not None and self.valid_hz[0] >= self.valid_hz[1]:
            raise ValueError(f"valid_hz runs from {self.valid_hz[0]:g} to {self.valid_hz[1]:g} Hz")
        return self


class _Offset(_Standard):
    offset_delay_ps: NotNegative = 0.0
    offset_loss_gohm_per_s: NotNegative = 0.0
    offset_impedance_ohm: Positive | None = None


class Open(_Offset):
    """An open: capacitance polynomial behind an offset line."""

    kind: Literal["open"]
    capacitance: tuple[Number, ...] = ()


class Short(_Offset):
    """A short: inductance polynomial behind an offset line."""

    kind: Literal["short"]
    inductance: tuple[Number, ...] = ()


class Load(_Offset):
    """A load: resistance and series inductance behind an offset line."""

    kind: Literal["load"]
    resistance_ohm: NotNegative | None = None
    inductance_h: Number = 0.0


class Reflect(_Standard):
    """A reflect of which only the sign and the offset are guessed."""

    kind: Literal["reflect"]
    sign: Literal[1, -1] = -1
    offset_delay_ps: NotNegative = 0.0


class _Line(_Standard):
    effective_permittivity: Annotated[float, Field(ge=1, allow_inf_nan=False)] = 1.0
    loss_db_per_m_at_1ghz: NotNegative = 0.0
    impedance_ohm: Positive | None = None
    cutoff_hz: NotNegative = 0.0


class Thru(_Line):
    """A thru: flush, or of a stated delay or length."""

    kind: Literal["thru"]
    delay_ps: NotNegative | None = None
    length_m: NotNegative | None = None

    @model_validator(mode="after")
    def _one(self) -> Thru:
        if self.delay_ps is not None and self.length_m is not None:
            raise ValueError("delay_ps and length_m are both given; keep one")
        return self


class Line(_Line):
    """A line of a stated length."""

    kind: Literal["line"]
    length_m: Positive


class Table(_Standard):
    """A standard tabulated in a Touchstone file."""

    kind: Literal["table"]
    file: str


MODELS: dict[str, type[_Standard]] = {
    "open": Open,
    "short": Short,
    "load": Load,
    "thru": Thru,
    "line": Line,
    "reflect": Reflect,
    "table": Table,
}
KINDS = tuple(MODELS)


class KitTable(_Table):
    """The [kit] table: name, description, reference impedance."""

    name: str
    description: str = ""
    reference_impedance_ohm: Positive = 50.0


def parse_kit(text: str, *, where: str) -> tuple[KitTable, dict[str, _Standard]]:
    """Check the text of a kit file.

    Raises
    ------
    KitError
        Not TOML, an unknown key (nearest known one named), a value that cannot be.
    """
    try:
        data = tomlkit.parse(text).unwrap()
    except ParseError as error:
        raise KitError(f"not readable as TOML: {error}", where=where, do="Correct that line.") from None
    stray = [key for key in data if key not in ("kit", "standards")]
    if stray:
        raise _unknown(stray[0], ("kit", "standards"), where, text)
    if "kit" not in data or not isinstance(data.get("standards"), dict) or not data["standards"]:
        raise KitError(
            "needs a [kit] table with a name and at least one [standards.NAME] table",
            where=where,
            do="See docs/kit-files.md.",
        )
    table = _checked(KitTable, data["kit"], where=where, key="kit", text=text)
    standards = {}
    for name, entry in data["standards"].items():
        kind = entry.get("kind") if isinstance(entry, dict) else None
        if name == "isolation" or kind not in MODELS:
            near = words.nearest(str(kind), MODELS) if kind else None
            what = "the name isolation is reserved" if name == "isolation" else f"kind is {kind!r}"
            do = f"Did you mean {near!r}? " if near else ""
            raise KitError(what, where=f"{where}, standards.{name}", do=f"{do}Kinds are {', '.join(MODELS)}.")
        standards[name] = _checked(MODELS[kind], entry, where=where, key=f"standards.{name}", text=text)
    return table, standards  # type: ignore[return-value]


def _line_of(key: str, text: str) -> str:
    for number, line in enumerate(text.splitlines(), start=1):
        if line.split("=")[0].strip() == key or line.strip() == f"[{key}]":
            return f", line {number}"
    return ""


def _unknown(key: str, known: Any, where: str, text: str) -> KitError:
    near = words.nearest(key, known)
    do = f"Did you mean {near!r}?" if near else f"Known keys are {', '.join(known)}."
    return KitError(f"unknown key {key!r}", where=f"{where}{_line_of(key, text)}", do=do)


def _checked(model: type[_Table], entry: Mapping[str, Any], *, where: str, key: str, text: str) -> Any:
    try:
        return model.model_validate(entry)
    except ValidationError as error:
        first = error.errors()[0]
        name = str(first["loc"][0]) if first["loc"] else ""
        if first["type"] == "extra_forbidden":
            raise _unknown(name, list(model.model_fields), f"{where}, {key}", text) from None
        if first["type"] == "missing":
            raise KitError(f"{name} is missing", where=f"{where}, {key}", do="Add it.") from None
        said = first["msg"].removeprefix("Value error, ")
        what = f"{name} = {first['input']!r}: {said}" if name else said
        raise KitError(what, where=f"{where}, {key}{_line_of(name, text)}", do="Correct the value.") from None
