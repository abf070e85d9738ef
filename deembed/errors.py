"""Errors: every message says what is wrong, where, and what to do about it."""

from __future__ import annotations

__all__ = ["DeembedError", "FileError", "GridError", "JobError", "KitError", "PortError", "SolveError"]


class DeembedError(ValueError):
    """Anything the user can put right: ``where: what. What to do``.

    Parameters
    ----------
    what : str
        What came and what was needed, with the value.
    where : str, optional
        File, line, key, dimension, port or frequency the error speaks of.
    do : str, optional
        What to do about it.
    """

    def __init__(self, what: str, *, where: str = "", do: str = "") -> None:
        self.what, self.where, self.do = what, where, do
        text = f"{where}: {what}" if where else what
        if do:
            text = f"{text.rstrip('.')}. {do}"
        super().__init__(text)


class FileError(DeembedError):
    """A file is missing, unreadable or holds something it must not."""


class GridError(DeembedError):
    """Two frequency grids that must agree do not, or a grid is not usable."""


class PortError(DeembedError):
    """Port numbers that do not exist, repeat or do not match."""


class KitError(DeembedError):
    """A calibration kit or one of its standards is unknown or badly defined."""


class JobError(DeembedError):
    """A job file that cannot be run as written."""


class SolveError(DeembedError):
    """A calibration or assembly that has no solution at some frequencies."""
