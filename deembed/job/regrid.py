"""Error terms and other inputs brought onto the part's grid, only when the job says so, and always said."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import GridError
from deembed.findings import Finding, finding_id
from deembed.numeric.regrid import onto_grid

__all__ = ["bring_onto", "same_points"]


def same_points(a: xr.DataArray | xr.Dataset, frequency: NDArray) -> bool:
    """Whether an array is on exactly this grid."""
    return bool(np.array_equal(a.frequency.values, frequency))


def bring_onto(
    data: xr.DataArray | xr.Dataset, frequency: NDArray, *, name: str, where: str = ""
) -> tuple[xr.DataArray | xr.Dataset, Finding]:
    """Data on another frequency grid, and a note that says so and how good it is.

    Parameters
    ----------
    data : DataArray or Dataset with a frequency dim
        Everything complex or real that varies over frequency is brought over; delay is removed first.
    frequency : array of shape (frequency,)
        Grid to bring it onto [Hz].
    name : str
        What it is, e.g. ``the error terms``.
    where : str
        Place for the finding.

    Returns
    -------
    DataArray or Dataset, Finding

    Raises
    ------
    GridError
        The grid reaches beyond the data: nothing is extrapolated.
    """
    own = data.frequency.values
    if frequency[0] < own[0] or frequency[-1] > own[-1]:
        raise GridError(
            f"{name}: only {words.grid(own)} came; the part was read over {words.grid(frequency)}",
            where="nothing is extrapolated",
            do="Read it over the whole band of the part, or read the part over less.",
        )
    worst, worst_hz = _left_out(data, own)
    if isinstance(data, xr.Dataset):
        moved: xr.DataArray | xr.Dataset = _dataset(data, own, frequency)
    else:
        moved = _array(data, own, frequency)
    error = "" if worst is None else f"; leaving out every second point, it comes back within {worst:.2g}"
    subject = name[0].upper() + name[1:]
    text = (
        f"{subject} went from {words.grid(own)} onto the part's grid of {words.grid(frequency)} by "
        f"interpolation, as job.interpolate allows{error}."
    )
    return moved, Finding(
        finding_id("interpolated", where or name),
        "interpolated",
        where,
        "note",
        text,
        from_hz=float(frequency[0]),
        to_hz=float(frequency[-1]),
        worst=worst,
        worst_hz=worst_hz,
    )


def _array(data: xr.DataArray, own: NDArray, target: NDArray) -> xr.DataArray:
    order = [d for d in data.dims if d != "frequency"] + ["frequency"]
    values = data.transpose(*order).values
    moved = onto_grid(values.astype(complex), own, target)
    if not np.iscomplexobj(values):
        moved = moved.real
    coords = {}
    for key, coord in data.coords.items():
        if key == "frequency":
            continue
        coords[key] = (
            _array(coord.reset_coords(drop=True), own, target) if "frequency" in coord.dims else coord
        )
    coords = {k: (c.dims, c.values) for k, c in coords.items()}
    out = xr.DataArray(
        moved, dims=order, coords={**coords, "frequency": target}, attrs=data.attrs, name=data.name
    )
    return out.transpose(*data.dims)


def _dataset(data: xr.Dataset, own: NDArray, target: NDArray) -> xr.Dataset:
    moved = {}
    for key, variable in data.data_vars.items():
        if "frequency" not in variable.dims:
            moved[key] = variable
        elif variable.dtype.kind in "cf":
            moved[key] = _array(variable, own, target)
        # Flags and counts per frequency mean nothing on another grid.
    return xr.Dataset(moved, attrs=data.attrs)


def _left_out(data: xr.DataArray | xr.Dataset, own: NDArray) -> tuple[float | None, float | None]:
    """Worst error at the points left out when only every second one is used."""
    if own.size < 9:
        return None, None
    arrays = data.data_vars.values() if isinstance(data, xr.Dataset) else [data]
    kept, left = own[::2], own[1:-1:2]
    worst, where = 0.0, float(own[0])
    for array in arrays:
        if "frequency" not in array.dims or array.dtype.kind != "c":
            continue
        values = array.transpose(..., "frequency").values
        error = np.abs(onto_grid(values[..., ::2], kept, left) - values[..., 1:-1:2])
        error = np.where(np.isfinite(error), error, 0.0).reshape(-1, error.shape[-1]).max(axis=0)
        if error.max() > worst:
            worst, where = float(error.max()), float(left[error.argmax()])
    return worst, where
