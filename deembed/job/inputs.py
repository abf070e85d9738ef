"""What a job loads: files of a folder, or the copies an archive holds. Each is read once and hashed."""

from __future__ import annotations

import hashlib
import posixpath
from collections.abc import Mapping
from dataclasses import dataclass, field
from importlib import resources
from pathlib import Path

import numpy as np
import xarray as xr

from deembed import words
from deembed.errors import DeembedError, FileError

__all__ = ["Input", "Inputs", "hash_of_array", "is_shipped_kit"]


@dataclass(frozen=True)
class Input:
    """One thing a job loaded.

    Parameters
    ----------
    name : str
        As the job file names it.
    sha256 : str
        Of the bytes of the file.
    text : str, optional
        Its text, where it came from a file.
    data : DataArray, optional
        Its S-parameters, where it came from an archive or was edited.
    edited : bool
        True where `data` is not what the file held.
    """

    name: str
    sha256: str
    text: str | None = None
    data: xr.DataArray | None = None
    edited: bool = False


@dataclass(frozen=True)
class Inputs:
    """All inputs of a job, read when first asked for and kept.

    Parameters
    ----------
    folder : Path, optional
        Where the job file lies; None for a job that came out of an archive.
    given : mapping name -> Input
        Inputs that are not read from the folder: an archive's copies, or edited ones.
    source : str
        What to call the place in messages.
    """

    folder: Path | None
    given: Mapping[str, Input] = field(default_factory=dict)
    source: str = "the job's folder"
    _read: dict[str, Input] = field(default_factory=dict, repr=False, compare=False)
    _parsed: dict[str, xr.DataArray] = field(default_factory=dict, repr=False, compare=False)

    def get(self, name: str, *, key: str) -> Input:
        """The input of this name; `key` is the job key that asks for it, for messages.

        Raises
        ------
        FileError
            It does not exist or cannot be read.
        """
        if name in self.given:
            return self.given[name]
        if name not in self._read:
            raw = self._bytes(name, key)
            try:
                text = raw.decode("utf-8")
            except UnicodeDecodeError:
                text = raw.decode("latin-1")  # comments in old files; numbers are ASCII in both
            self._read[name] = Input(name, hashlib.sha256(raw).hexdigest(), text=text)
        return self._read[name]

    def _bytes(self, name: str, key: str) -> bytes:
        if is_shipped_kit(name) and key == "calibration.kit":
            return _shipped_kit(name)
        if self.folder is None:
            held = sorted(self.given)
            close = words.nearest(name, held)
            raise FileError(
                f"{name!r} is not in {self.source}",
                where=key,
                do=f"{f'Nearest: {close}. ' if close else ''}It holds {words.listed(held)}.",
            )
        path = self.folder / name
        if not path.is_file():
            what = "is a folder" if path.is_dir() else "does not exist"
            raise FileError(f"{name!r} {what}", where=key, do=_look(path, name))
        try:
            return path.read_bytes()
        except OSError as error:
            raise FileError(f"{name!r} cannot be read ({error.strerror})", where=key) from error

    def sparams(self, name: str, *, key: str) -> xr.DataArray:
        """S-parameters of a Touchstone input, ports 1 to N.

        Raises
        ------
        FileError
            It does not exist, or is not a Touchstone file that can be used.
        """
        entry = self.get(name, key=key)
        if entry.data is not None:
            return entry.data
        if name not in self._parsed:
            from deembed.touchstone import parse_touchstone

            try:
                self._parsed[name] = parse_touchstone(entry.text or "", name=name)
            except DeembedError as error:
                raise type(error)(error.what, where=f"{error.where} ({key})", do=error.do) from error
        return self._parsed[name]

    def edited(self, name: str, data: xr.DataArray) -> Inputs:
        """Inputs in which one reading is another array; the rest is shared."""
        given = {**self.given, name: Input(name, hash_of_array(data), data=data, edited=True)}
        return Inputs(self.folder, given, self.source, self._read, self._parsed)

    def kit_tables(self, name: str) -> list[tuple[str, str]]:
        """Files that a kit's tabulated standards name: (as the kit writes it, as an input is named)."""
        import tomllib

        text = self.get(name, key="calibration.kit").text or ""
        try:
            standards = tomllib.loads(text).get("standards", {})
        except tomllib.TOMLDecodeError:
            return []  # the kit reader names the line
        files = [
            s["file"] for s in standards.values() if isinstance(s, dict) and isinstance(s.get("file"), str)
        ]
        base = "" if is_shipped_kit(name) else posixpath.dirname(name)
        return [(file, posixpath.join(base, file)) for file in files]


def _look(path: Path, name: str) -> str:
    try:
        near = words.nearest(path.name, [p.name for p in path.parent.iterdir()])
    except OSError:
        return "Its folder does not exist; paths are relative to the job file."
    hint = f" A file {near!r} lies there." if near else ""
    return f"Paths are relative to the job file; correct the name or put the file there.{hint}"


def is_shipped_kit(name: str) -> bool:
    """Whether a kit is named, rather than given as a path."""
    return not name.endswith(".toml") and "/" not in name and "\\" not in name


def _shipped_kit(name: str) -> bytes:
    root = resources.files("deembed.standards_defs")
    known = sorted(p.name.removesuffix(".toml") for p in root.iterdir() if p.name.endswith(".toml"))
    if name not in known:
        close = words.nearest(name, known)
        raise FileError(
            f"no kit is called {name!r}",
            where="calibration.kit",
            do=f"{f'Did you mean {close}? ' if close else ''}Shipped: {', '.join(known)}; "
            "or give the path of a kit file ending in .toml.",
        )
    return (root / f"{name}.toml").read_bytes()


def hash_of_array(data: xr.DataArray) -> str:
    """SHA-256 of values, grid, ports and reference impedances."""
    digest = hashlib.sha256()
    for part in (data, data.frequency, data.port_out, data.z0):
        values = np.ascontiguousarray(part.values)
        digest.update(f"{part.dims}{values.shape}{values.dtype}".encode())
        digest.update(values.tobytes())
    return digest.hexdigest()
