"""From job text to a checked job file, or one error that names file, line, key, value and what to do."""

from __future__ import annotations

import typing
from typing import Any

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from deembed import words
from deembed.job.crosscheck import crosscheck
from deembed.job.places import Place, line_of, read_toml
from deembed.job.schema import JobFile

__all__ = ["validate"]

_NEEDED = {
    "int_type": "a whole number",
    "float_type": "a number",
    "bool_type": "true or false",
    "string_type": "text in double quotes",
    "tuple_type": "a list in square brackets",
    "model_type": "a table",
    "model_attributes_type": "a table",
    "dict_type": "a table",
}
_MISSING: dict[tuple[str | int, ...], str] = {
    ("job",): "Add a [job] table with at least part_ports.",
    (
        "calibration",
    ): 'Add a [calibration] table; method = "none" says that the readings are already corrected.',
    ("rounds",): "Add one [[rounds]] table per sweep of the part.",
}


def validate(text: str, *, name: str = "job.toml") -> JobFile:
    """The job a text describes.

    Parameters
    ----------
    text : str
        Job file.
    name : str
        What to call it in messages.

    Returns
    -------
    JobFile

    Raises
    ------
    JobError
        The first thing, by line, that cannot be.
    """
    place = Place(text, name)
    data = _tuples(read_toml(text, name=name))
    try:
        spec = JobFile.model_validate(data)
    except ValidationError as problems:
        raise _said(_first(problems.errors(), text), place) from None
    crosscheck(spec, place)
    return spec


def _first(problems: list[ErrorDetails], text: str) -> ErrorDetails:
    """The problem to speak of: the innermost, a mistyped key before the one it leaves missing, then by line."""
    paths = [p["loc"] for p in problems]
    inner = [p for p in problems if not any(q[: len(p["loc"])] == p["loc"] != q for q in paths)]
    return min(inner, key=lambda p: (p["type"] == "missing", line_of(text, p["loc"]) or 10**9, len(p["loc"])))


def _tuples(value: Any) -> Any:
    if isinstance(value, dict):
        return {k: _tuples(v) for k, v in value.items()}
    if isinstance(value, list):
        return tuple(_tuples(v) for v in value)
    return value


def _keys_at(path: tuple[str | int, ...]) -> list[str]:
    """Known keys of the table at a path of the schema."""
    model: Any = JobFile
    for step in path:
        if isinstance(step, str) and isinstance(model, type) and issubclass(model, BaseModel):
            model = _model_in(model.model_fields[step].annotation)
    return list(model.model_fields) if isinstance(model, type) and issubclass(model, BaseModel) else []


def _model_in(annotation: Any) -> Any:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    inner = [_model_in(a) for a in typing.get_args(annotation)]
    return next((m for m in inner if m is not None), None)


def _said(problem: ErrorDetails, place: Place) -> Exception:
    path, kind, value = problem["loc"], problem["type"], problem.get("input")
    if kind == "extra_forbidden":
        known = _keys_at(path[:-1])
        close = words.nearest(str(path[-1]), known)
        hint = f"Did you mean {close}? " if close else ""
        where = "here" if len(path) > 1 else "in a job file"
        return place.error(path, f"unknown key {path[-1]!r}", f"{hint}Known {where}: {', '.join(known)}")
    if kind == "missing":
        return place.error(
            path, "this key is missing", _MISSING.get(path, "Add it") + ("" if path in _MISSING else ".")
        )
    return place.error(path, _what(problem, value))


def _what(problem: ErrorDetails, value: Any) -> str:
    kind, context = problem["type"], problem.get("ctx", {})
    shown = list(value) if isinstance(value, tuple) else value
    if kind == "value_error":
        return str(context["error"])
    if kind in _NEEDED:
        return f"{shown!r} came; needed {_NEEDED[kind]}"
    if kind == "literal_error":
        close = words.nearest(str(value), [str(e).strip("'") for e in context["expected"].split(" or ")])
        return f"{shown!r} came; needed {context['expected']}" + (f" (nearest: {close})" if close else "")
    if kind in ("too_short", "string_too_short"):
        return "it is empty; needed at least one entry"
    return f"{shown!r} came; {problem['msg'][0].lower()}{problem['msg'][1:]}"
