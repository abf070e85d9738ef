"""Touchstone text, checked line by line before anything is made of it.

Touchstone 1.1, 2.0 and 2.1 (IBIS Open Forum). An option line without a frequency unit would mean GHz by the format's
default; here it is an error, because the default is far more often a mistake than a wish.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from decimal import Decimal, InvalidOperation

import numpy as np
from numpy.typing import NDArray

from deembed import words
from deembed.errors import FileError

__all__ = ["MOST_PORTS", "Checked", "check_text"]

MOST_PORTS = 12
_UNITS = {"HZ": 1, "KHZ": 10**3, "MHZ": 10**6, "GHZ": 10**9}
_PARAMETERS = ("S", "Y", "Z", "G", "H")
_FORMATS = ("RI", "MA", "DB")
_KEYWORDS = (
    "version", "number of ports", "two-port data order", "number of frequencies", "number of noise frequencies",
    "reference", "matrix format", "mixed-mode order", "begin information", "end information", "network data",
    "noise data", "end",
)  # fmt: skip


@dataclass
class Checked:
    """What a file says, ready to be turned into arrays.

    Parameters
    ----------
    ports : int
    parameter, form : str
        S, Y, Z, G or H; RI, MA or DB.
    z0 : list of float
        Reference impedance of each port [ohm].
    normalized : bool
        Whether Z, Y, G, H are divided by the reference (version 1 files).
    frequency : array of shape (frequency,)
        [Hz].
    numbers : array of shape (frequency, 2 m)
        Number pairs as in the file.
    order : str
        Order of a two-port's pairs: 21_12 or 12_21.
    matrix : str
        full, lower or upper.
    comments : list of str
    """

    ports: int
    parameter: str
    form: str
    z0: list[float]
    normalized: bool
    frequency: NDArray
    numbers: NDArray
    order: str
    matrix: str
    comments: list[str] = field(default_factory=list)


@dataclass
class _Head:
    version: str = ""
    ports: int = 0
    order: str = ""
    frequencies: int | None = None
    reference: list[float] | None = None
    matrix: str = "full"
    option: tuple[str, str, str, float] | None = None
    option_line: int = 0


@dataclass
class _Row:
    line: int
    tokens: list[str]


def check_text(text: str, *, name: str) -> Checked:
    """Check a Touchstone text.

    Parameters
    ----------
    text : str
    name : str
        File name, with ending.

    Returns
    -------
    Checked

    Raises
    ------
    FileError
        By file and line.
    """
    head = _Head()
    comments: list[str] = []
    rows: list[_Row] = []
    where = {"section": "head"}
    for number, line in enumerate(text.splitlines(), start=1):
        body, _, comment = line.partition("!")
        if comment.strip():
            comments.append(comment.strip())
        body = body.strip()
        if body:
            _take(body, number, head, rows, where, name)
    if not rows:
        raise FileError("holds no data", where=name, do="Check that the file is complete.")
    if head.option is None:
        raise FileError(
            "there is no option line (such as '# GHz S RI R 50'), so unit and format are not known",
            where=f"{name}, line {rows[0].line}",
            do="Add the line the readings were written with.",
        )
    ports = _ports(head, name)
    unit, parameter, form, resistance = head.option
    width = _width(head, ports)
    points = _points(rows, ports, width, head, name)
    frequency, numbers = _numbers(points, unit, width, name)
    if head.frequencies is not None and head.frequencies != frequency.size:
        raise FileError(
            f"[Number of Frequencies] is {head.frequencies}, and there are {frequency.size} points",
            where=name,
            do="The file is cut short or was edited; write it again.",
        )
    if parameter in "GH" and ports != 2:
        raise FileError(
            f"{parameter}-parameters of {ports} ports", where=name, do="They exist for two ports only."
        )
    z0 = head.reference if head.reference is not None else [resistance] * ports
    if len(z0) != ports:
        raise FileError(
            f"[Reference] has {len(z0)} values for {ports} ports", where=name, do="Give one per port."
        )
    order = head.order or "21_12"
    return Checked(
        ports, parameter, form, z0, not head.version, frequency, numbers, order, head.matrix, comments
    )


def _take(body: str, number: int, head: _Head, rows: list[_Row], where: dict, name: str) -> None:
    at = f"{name}, line {number}"
    if where["section"] in ("done", "information") and not body.startswith("["):
        return
    if body.startswith("["):
        _keyword(body, head, where, at)
    elif body.startswith("#"):
        option = _option(body, at)
        if head.option is not None and head.option != option:
            raise FileError(
                f"a second option line differs from that of line {head.option_line}", where=at, do="Keep one."
            )
        head.option, head.option_line = option, number
    elif where["section"] == "reference":
        values = [_value(t, at) for t in body.split()]
        head.reference = [*(head.reference or []), *values]
    else:
        rows.append(_Row(number, body.split()))


def _keyword(body: str, head: _Head, where: dict, at: str) -> None:
    match = re.match(r"\[([^\]]*)\]\s*(.*)", body)
    word = match.group(1).strip().lower() if match else ""
    rest = match.group(2).strip() if match else ""
    if where["section"] == "information":
        where["section"] = "head" if word == "end information" else "information"
        return
    if word not in _KEYWORDS:
        near = words.nearest(word, _KEYWORDS)
        do = f"Did you mean [{near}]?" if near else "Remove it."
        raise FileError(f"unknown keyword {body.split(']')[0]}]", where=at, do=do)
    where["section"] = {
        "network data": "data", "noise data": "done", "end": "done", "reference": "reference",
        "begin information": "information",
    }.get(word, "head")  # fmt: skip
    if word == "version":
        if rest not in ("2.0", "2.1"):
            raise FileError(
                f"version {rest!r}", where=at, do="Versions 1.1 (no keyword), 2.0 and 2.1 are read."
            )
        head.version = rest
    elif word == "number of ports":
        head.ports = _count(rest, at)
    elif word == "number of frequencies":
        head.frequencies = _count(rest, at)
    elif word == "two-port data order":
        if rest not in ("12_21", "21_12"):
            raise FileError(f"[Two-Port Data Order] is {rest!r}", where=at, do="It is 12_21 or 21_12.")
        head.order = rest
    elif word == "matrix format":
        if rest.lower() not in ("full", "lower", "upper"):
            raise FileError(f"[Matrix Format] is {rest!r}", where=at, do="It is Full, Lower or Upper.")
        head.matrix = rest.lower()
    elif word == "reference" and rest:
        head.reference = [_value(t, at) for t in rest.split()]
    elif word == "mixed-mode order":
        raise FileError("mixed-mode data cannot be read", where=at, do="Write single-ended S-parameters.")


def _count(text: str, at: str) -> int:
    if not text.isdigit() or int(text) < 1:
        raise FileError(f"{text!r} is not a count", where=at, do="Give a whole number from 1.")
    return int(text)


def _value(token: str, at: str) -> float:
    try:
        value = float(token)
    except ValueError:
        raise FileError(f"{token!r} is not a number", where=at, do="Correct that line.") from None
    if not np.isfinite(value):
        raise FileError(f"{token} stands where a number is needed", where=at, do="Read that point again.")
    return value


def _option(body: str, at: str) -> tuple[str, str, str, float]:
    tokens = body[1:].upper().split()
    unit, parameter, form, resistance = "", "S", "MA", 50.0
    i = 0
    while i < len(tokens):
        token = tokens[i]
        if token in _UNITS:
            unit = token
        elif token in _PARAMETERS:
            parameter = token
        elif token in _FORMATS:
            form = token
        elif token == "R" and i + 1 < len(tokens):
            resistance = _value(tokens[i + 1], at)
            i += 1
        else:
            raise FileError(
                f"{token!r} in the option line is not understood",
                where=at,
                do="Needed is such as '# GHz S RI R 50'.",
            )
        i += 1
    if not unit:
        raise FileError(
            f"the option line {body!r} names no frequency unit",
            where=at,
            do="Add Hz, kHz, MHz or GHz, as the readings were written.",
        )
    if resistance <= 0:
        raise FileError(f"reference resistance {resistance:g} ohm", where=at, do="It must be positive.")
    return unit, parameter, form, resistance


def _ports(head: _Head, name: str) -> int:
    suffix = re.search(r"\.s(\d+)p$", name, re.IGNORECASE)
    by_name = int(suffix.group(1)) if suffix else 0
    if head.version:
        if not head.ports:
            raise FileError("[Number of Ports] is missing", where=name, do="Add it.")
        if by_name and by_name != head.ports:
            raise FileError(
                f"the name says {by_name} ports, [Number of Ports] says {head.ports}",
                where=name,
                do="Correct one.",
            )
        if head.ports == 2 and not head.order:
            raise FileError("[Two-Port Data Order] is missing", where=name, do="Add 12_21 or 21_12.")
    elif not by_name:
        raise FileError(
            "the number of ports is not known",
            where=name,
            do="Let the name end in .s1p, .s2p, .s3p and so on.",
        )
    ports = head.ports or by_name
    if not 1 <= ports <= MOST_PORTS:
        raise FileError(f"{ports} ports", where=name, do=f"1 to {MOST_PORTS} can be read.")
    return ports


def _width(head: _Head, ports: int) -> int:
    pairs = ports * ports if head.matrix == "full" else ports * (ports + 1) // 2
    return 1 + 2 * pairs


def _points(rows: list[_Row], ports: int, width: int, head: _Head, name: str) -> list[_Row]:
    """One row of tokens per frequency; a version 1 two-port's noise block ends the data."""
    points: list[_Row] = []
    for row in rows:
        starts = len(row.tokens) % 2 == 1
        complete = not points or len(points[-1].tokens) == width
        if not head.version and ports == 2 and points and complete and _is_noise(row, points[-1]):
            break
        at = f"{name}, line {row.line}"
        if starts != complete or (complete and len(row.tokens) > width):
            _wrong_count(row, points, ports, width, complete, at)
        if complete:
            points.append(_Row(row.line, list(row.tokens)))
        else:
            points[-1].tokens += row.tokens
            if len(points[-1].tokens) > width:
                _wrong_count(row, points, ports, width, False, at)
        if ports <= 2 and len(points[-1].tokens) != width:
            _wrong_count(row, points, ports, width, True, at)
    if len(points[-1].tokens) != width:
        raise FileError(
            f"the last point has {len(points[-1].tokens)} numbers; a {ports}-port point has {width}",
            where=f"{name}, line {points[-1].line}",
            do="The file is cut short; write it again.",
        )
    return points


def _is_noise(row: _Row, last: _Row) -> bool:
    """Five numbers at a frequency that is not above the last: noise parameters follow the network data."""
    try:
        return len(row.tokens) == 5 and float(row.tokens[0]) <= float(last.tokens[0])
    except ValueError:
        return False


def _wrong_count(row: _Row, points: list[_Row], ports: int, width: int, complete: bool, at: str) -> None:
    if complete:
        text = f"{len(row.tokens)} columns; a line of a {ports}-port file has {width if ports <= 2 else 'at most 9'}"
    else:
        start = points[-1]
        text = (
            f"{len(row.tokens)} columns here, while the point that starts at line {start.line} has "
            f"{len(start.tokens)} numbers so far; a {ports}-port point has {width}"
        )
    raise FileError(text, where=at, do="Check the number of ports in the file name and that line.")


def _numbers(points: list[_Row], unit: str, width: int, name: str) -> tuple[NDArray, NDArray]:
    try:
        table = np.array([p.tokens for p in points], dtype=float)
        scale = _UNITS[unit]
        # Decimal scaling: the same frequency in GHz and in Hz must come out as the same number.
        frequency = np.array([float(Decimal(p.tokens[0]) * scale) for p in points])
    except (ValueError, InvalidOperation):
        table, frequency = None, None
    if table is None or not np.isfinite(table).all():
        for point in points:
            for token in point.tokens:
                _value(token, f"{name}, line {point.line}")
    assert table is not None and frequency is not None
    falls = np.flatnonzero(np.diff(frequency) <= 0)
    if falls.size:
        i = int(falls[0])
        word = "repeats" if frequency[i + 1] == frequency[i] else "falls"
        raise FileError(
            f"the frequency {word}: {words.frequency(frequency[i + 1], digits=9)} after "
            f"{words.frequency(frequency[i], digits=9)} of line {points[i].line}",
            where=f"{name}, line {points[i + 1].line}",
            do="Sort the points and remove repeats.",
        )
    if frequency[0] < 0:
        raise FileError(
            f"frequency {frequency[0]:g} Hz", where=f"{name}, line {points[0].line}", do="It must be 0 up."
        )
    return frequency, table[:, 1:]
