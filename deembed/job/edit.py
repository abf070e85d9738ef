"""Edits of a job file's text that lose nothing the user typed."""

from __future__ import annotations

from collections.abc import Mapping, MutableMapping
from typing import Any

import tomlkit
from tomlkit.items import AoT

from deembed.errors import JobError
from deembed.job.places import parse_path, path_words

__all__ = ["edited_text"]


def edited_text(text: str, edits: Mapping[str, Any]) -> str:
    """A job file with some keys changed, comments and layout kept.

    Parameters
    ----------
    text : str
        Valid TOML.
    edits : mapping
        Dotted keys to values. A mapping merges into the table that is there, None takes the key out, and a
        position one past the end of a list appends to it.

    Raises
    ------
    JobError
        A path through something that is not a table or list, or past the end of a list.
    """
    document = tomlkit.parse(text)
    for key, value in edits.items():
        _set(document, parse_path(key), _as_toml(value))
    return tomlkit.dumps(document)


def _as_toml(value: Any) -> Any:
    if isinstance(value, Mapping):
        return {str(k): _as_toml(v) for k, v in value.items()}
    if isinstance(value, (tuple, list)):
        return [_as_toml(v) for v in value]
    return value


def _set(document: Any, path: tuple[str | int, ...], value: Any) -> None:
    at = document
    for depth, step in enumerate(path[:-1]):
        at = _step(at, step, path[: depth + 1], make=[] if isinstance(path[depth + 1], int) else {})
    last = path[-1]
    if isinstance(value, dict) and isinstance(last, str) and isinstance(at.get(last), Mapping):
        for key, inner in value.items():
            _set(at[last], (key,), inner)
        return
    _check(at, last, path)
    if value is None:
        if isinstance(last, int) or last in at:
            del at[last]
    elif isinstance(last, int) and last == len(at):
        at.append(_table(value) if isinstance(at, AoT) else value)
    elif isinstance(last, int) and isinstance(at, AoT):
        del at[last]  # older tomlkit cannot assign to an entry
        at.insert(last, _table(value))
    else:
        at[last] = _tables(value)


def _step(at: Any, step: str | int, path: tuple[str | int, ...], *, make: Any) -> Any:
    if isinstance(step, str) and isinstance(at, MutableMapping) and step not in at:
        at[step] = tomlkit.aot() if make == [] else tomlkit.table()
    _check(at, step, path)
    if isinstance(step, int) and step == len(at):
        at.append(tomlkit.table())
    return at[step]


def _check(at: Any, step: str | int, path: tuple[str | int, ...]) -> None:
    fits = isinstance(at, Mapping) if isinstance(step, str) else isinstance(at, list)
    if not fits:
        held = path_words(path[:-1])
        raise JobError(f"{held} holds {at!r}, which has no {path_words(path[-1:])}", where=path_words(path))
    if isinstance(step, int) and step > len(at):
        raise JobError(
            f"there are {len(at)} entries in {path_words(path[:-1])}, counted from 0",
            where=path_words(path),
            do=f"Use [0] to [{len(at) - 1}], or [{len(at)}] to add one.",
        )


def _table(value: Mapping) -> Any:
    table = tomlkit.table()
    for key, inner in value.items():
        table[key] = inner
    return table


def _tables(value: Any) -> Any:
    """A list of tables is written as [[...]], a mapping as a table of its own."""
    if isinstance(value, list) and value and all(isinstance(v, Mapping) for v in value):
        out = tomlkit.aot()
        for one in value:
            out.append(_table(one))
        return out
    return _table(value) if isinstance(value, Mapping) else value
