"""Single quantities over frequency and leading dims, lined up as plain arrays before a solve.

Solvers take many of them apart and together again: a labelled array for each would cost more than the solve.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping, Sequence
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.errors import GridError
from deembed.labels import ports_of

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["Sweep", "elements", "laid_out", "response"]


class Sweep(NamedTuple):
    """One quantity.

    Parameters
    ----------
    values : array of shape (..., frequency)
    leading : tuple of str
        Names of the dims before frequency.
    coords : mapping
        Coordinates of those dims, where they have any.
    """

    values: NDArray
    leading: tuple[Hashable, ...] = ()
    coords: Mapping[Hashable, Any] = {}


def _own_coords(s: xr.DataArray, leading: Sequence[Hashable]) -> dict[Hashable, NDArray]:
    return {d: s.coords[d].values for d in leading if d in s.coords}


def elements(s: xr.DataArray, ports: Sequence[int]) -> list[list[Sweep]]:
    """The S-parameters [out][in] between some ports of a checked S-parameter array."""
    known = ports_of(s)
    index = [known.index(p) for p in ports]
    leading = s.dims[:-3]
    coords = _own_coords(s, leading)
    values = s.values
    return [[Sweep(values[..., i, j], leading, coords) for j in index] for i in index]


def response(kit: Kit, standard: str, frequency: NDArray) -> list[list[Sweep]]:
    """The S-parameters [out][in] of a standard."""
    values, leading, coords = kit.plain(standard, frequency)
    n = values.shape[-1]
    return [[Sweep(values[..., i, j], leading, coords) for j in range(n)] for i in range(n)]


def laid_out(sweeps: Sequence[Sweep], frequency: NDArray) -> tuple[list[NDArray], tuple[str, ...], dict]:
    """Sweeps as plain arrays of one shape, leading dims matched by name.

    Returns
    -------
    list of arrays of shape (..., frequency)
    tuple of str
        Names of the dims, frequency last.
    dict
        Their coordinates.

    Raises
    ------
    GridError
        A leading dim that has another size or other labels in one of them.
    """
    coords: dict = {"frequency": frequency}
    if not any(s.leading for s in sweeps):
        return [s.values for s in sweeps], ("frequency",), coords
    sizes: dict[Hashable, int] = {}
    for sweep in sweeps:
        for dim, size in zip(sweep.leading, sweep.values.shape, strict=False):
            labels = sweep.coords.get(dim)
            if sizes.setdefault(dim, size) != size:
                raise GridError(
                    f"dim {dim} has {sizes[dim]} entries in one reading or definition and {size} in another",
                    where="leading dims differ",
                    do="Use the same entries everywhere.",
                )
            if labels is not None and not np.array_equal(coords.setdefault(dim, labels), labels):
                raise GridError(
                    f"dim {dim} is labelled otherwise in two readings or definitions",
                    where="leading dims differ",
                    do="Use the same labels everywhere.",
                )
    shape = (*sizes.values(), frequency.size)
    plain = [np.broadcast_to(_spread(s, tuple(sizes)), shape) for s in sweeps]
    return plain, (*map(str, sizes), "frequency"), coords


def _spread(sweep: Sweep, dims: tuple[Hashable, ...]) -> NDArray:
    """Leading dims in the order of `dims`, of size 1 where the sweep has none."""
    own = [d for d in dims if d in sweep.leading]
    axes = [sweep.leading.index(d) for d in own]
    values = sweep.values.transpose(*axes, len(axes))
    return values[tuple(slice(None) if d in own else None for d in dims)]
