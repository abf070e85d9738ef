"""Where a key stands in a job file: key paths such as ``rounds[2].file`` and their lines."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable

from deembed.errors import DeembedError, JobError

__all__ = ["Place", "line_of", "parse_path", "path_words", "read_toml"]

Path = tuple[str | int, ...]
_HEADER = re.compile(r"^\s*(\[\[?)\s*([^\[\]]+?)\s*(\]\]?)\s*(#.*)?$")
_KEY = re.compile(
    r"""^\s*((?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*')(?:\s*\.\s*(?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*'))*)\s*="""
)
_STEP = re.compile(r"([^.\[\]]+)|\[(\d+)\]")


def path_words(path: Iterable[str | int]) -> str:
    """A key path as written in messages: ``("rounds", 2, "file")`` is ``rounds[2].file``."""
    out = ""
    for step in path:
        out += f"[{step}]" if isinstance(step, int) else f".{step}" if out else step
    return out


def parse_path(words: str) -> Path:
    """The path that `path_words` would write so.

    Raises
    ------
    JobError
        Words that are not a key path.
    """
    steps = [(m[1], m[2]) for m in _STEP.finditer(words)]
    path = tuple(int(i) if i else k for k, i in steps)
    if not path or path_words(path) != words or isinstance(path[0], int):
        raise JobError(f"{words!r} is not a key of a job", do="Write it like fixture.arms[0].analyzer_side.")
    return path


def read_toml(text: str, *, name: str) -> dict:
    """The plain tables of a TOML text.

    Raises
    ------
    JobError
        Text that is not TOML, with the line.
    """
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        found = re.search(r"\(at (?:line (\d+), column \d+|end of document)\)", str(error))
        line = found[1] if found and found[1] else str(text.count("\n") + 1)
        what = re.sub(r"\s*\(at .*\)$", "", str(error))
        raise JobError(
            f"this is not TOML ({what})",
            where=f"{name}, line {line}",
            do="Correct the line; text values stand in double quotes, lists in square brackets.",
        ) from error


def _split(dotted: str) -> list[str]:
    return [part.strip().strip("\"'") for part in re.findall(r"\"[^\"]*\"|'[^']*'|[^.]+", dotted)]


def _lines(text: str) -> dict[Path, int]:
    """Line of every table header and key that starts a line."""
    found: dict[Path, int] = {}
    counts: dict[Path, int] = {}
    table: Path = ()
    quoted: str | None = None
    for number, line in enumerate(text.splitlines(), start=1):
        if quoted is None and (header := _HEADER.match(line)) and len(header[1]) == len(header[3]):
            table = _current(counts, _split(header[2]), repeated=header[1] == "[[")
            found.setdefault(table, number)
        elif quoted is None and (key := _KEY.match(line)):
            found.setdefault((*table, *_split(key[1])), number)
        for mark in re.findall(r'"""|\'\'\'', line):
            quoted = mark if quoted is None else None if mark == quoted else quoted
    return found


def _current(counts: dict[Path, int], names: list[str], *, repeated: bool) -> Path:
    path: Path = ()
    for depth, name in enumerate(names):
        path = (*path, name)
        last = depth == len(names) - 1
        if last and repeated:
            counts[path] = counts.get(path, -1) + 1
        if path in counts:
            path = (*path, counts[path])
    return path


def line_of(text: str, path: Iterable[str | int]) -> int | None:
    """Line of a key, or of the nearest table or key around it; None for the file as a whole.

    Parameters
    ----------
    text : str
        The job file.
    path : iterable of str and int
        Keys and list positions, from the root.
    """
    lines = _lines(text)
    path = tuple(path)
    while path:
        for here in (path, (*path, 0)):  # a list of tables stands where its first table stands
            if here in lines:
                return lines[here]
        path = path[:-1]
    return None


class Place:
    """Makes errors that name file, line and key of one job text.

    Parameters
    ----------
    text : str
        The job file.
    name : str
        What to call it.
    """

    def __init__(self, text: str, name: str) -> None:
        self.text, self.name = text, name

    def words(self, path: Iterable[str | int]) -> str:
        """``job.toml, line 12, rounds[2].file``."""
        path = tuple(path)
        line = line_of(self.text, path)
        at = f", line {line}" if line else ""
        return f"{self.name}{at}, {path_words(path)}" if path else f"{self.name}{at}"

    def located(self, error: DeembedError) -> DeembedError:
        """The same error with file and line, where it speaks of a key of the job."""
        key, _, rest = error.where.partition(" ")
        try:
            line = line_of(self.text, parse_path(key))
        except JobError:
            return error
        if line is None or key.startswith(self.name):
            return error
        where = f"{self.name}, line {line}, {key}{f' {rest}' if rest else ''}"
        return type(error)(error.what, where=where, do=error.do)

    def error(self, path: Iterable[str | int], what: str, do: str = "") -> JobError:
        """The error to raise about a key."""
        return JobError(what, where=self.words(path), do=do)
