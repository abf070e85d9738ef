"""Results of stages, kept by key so that a change re-runs from the first stage it touches."""

from __future__ import annotations

from collections import Counter, OrderedDict
from typing import Any

import numpy as np
import xarray as xr

__all__ = ["Cache"]


class Cache:
    """A bounded store of stage results, the least recently used leaving first.

    Hand one to ``Job.run(cache=...)`` and again to the run of the changed job.

    Parameters
    ----------
    megabytes : float
        Most memory that results may take. A single result larger than this is not kept.

    Attributes
    ----------
    executed : Counter
        How often each stage was really computed.
    """

    def __init__(self, *, megabytes: float = 512.0) -> None:
        self.limit = int(megabytes * 2**20)
        self.executed: Counter[str] = Counter()
        self._kept: OrderedDict[str, tuple[Any, int]] = OrderedDict()

    def __len__(self) -> int:
        return len(self._kept)

    @property
    def bytes(self) -> int:
        """Memory that the kept results take [bytes]."""
        return sum(size for _, size in self._kept.values())

    def find(self, key: str) -> Any | None:
        """The result kept under a key, or None."""
        if key not in self._kept:
            return None
        self._kept.move_to_end(key)
        return self._kept[key][0]

    def keep(self, key: str, value: Any) -> None:
        """Keep a result, letting go of the oldest ones where room is short."""
        size = _size(value)
        if size > self.limit:
            return
        self._kept[key] = (value, size)
        while self.bytes > self.limit:
            self._kept.popitem(last=False)


def _size(value: Any) -> int:
    if isinstance(value, (np.ndarray, xr.DataArray, xr.Dataset)):
        return int(value.nbytes)
    if isinstance(value, dict):
        return sum(_size(v) for v in value.values())
    if isinstance(value, (tuple, list)):
        return sum(_size(v) for v in value)
    if hasattr(value, "__dataclass_fields__"):
        return sum(_size(getattr(value, name)) for name in value.__dataclass_fields__)
    return 64
