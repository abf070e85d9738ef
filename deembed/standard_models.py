"""From the parameters of a standard, numbers or draws, to its response on a grid."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import GridError
from deembed.numeric import standards as kernel

__all__ = ["from_table", "modelled", "plain_parameters", "transmission"]

_OWN = ("kind", "description", "contact", "valid_hz", "file")


def from_table(table: xr.DataArray, f: NDArray, kit: str, standard: str) -> xr.DataArray:
    """A tabulated response at the frequencies of a grid.

    Parameters
    ----------
    table : DataArray of shape (frequency, port_out, port_in)
    f : array of shape (frequency,)
        [Hz], each of them in the table.
    kit, standard : str
        Names for the message.

    Raises
    ------
    GridError
        A frequency the table does not hold: nothing is interpolated.
    """
    own = table.frequency.values
    if own.size == f.size and np.allclose(own, f, rtol=1e-12, atol=0):
        return table.assign_coords(frequency=f)
    index = np.searchsorted(own, f)
    index = np.clip(index, 0, own.size - 1)
    index = np.where(np.abs(own[np.maximum(index - 1, 0)] - f) < np.abs(own[index] - f), index - 1, index)
    if not np.allclose(own[index], f, rtol=1e-12, atol=0):
        raise GridError(
            f"the table has {words.grid(own)}; the readings have {words.grid(f)}, and not all of these are in it",
            where=f"kit {kit}, standards.{standard}",
            do="Tabulate the standard on the grid of the readings.",
        )
    return table.isel(frequency=index).assign_coords(frequency=f)


def plain_parameters(given: Mapping[str, Any]) -> tuple[dict[str, Any], tuple[str, ...], dict]:
    """Parameters as arrays with one trailing axis for frequency, leading dims lined up by name."""
    arrays = [v for v in _values(given) if isinstance(v, xr.DataArray)]
    leading = tuple(dict.fromkeys(str(d) for a in arrays for d in a.dims))
    coords = {d: a.coords[d].values for a in arrays for d in a.dims if d in a.coords}

    def plain(value: Any) -> Any:
        if isinstance(value, xr.DataArray):
            return (
                value.expand_dims([d for d in leading if d not in value.dims])
                .transpose(*leading)
                .values[..., None]
            )
        if isinstance(value, tuple | list):
            return [plain(v) for v in value]
        return value

    return {name: plain(v) for name, v in given.items() if name not in _OWN}, leading, coords


def _values(given: Mapping[str, Any]) -> list:
    flat: list = []
    for value in given.values():
        flat += list(value) if isinstance(value, tuple | list) else [value]
    return flat


def modelled(given: Mapping[str, Any], f: NDArray, reference: float) -> tuple[NDArray, tuple[str, ...], dict]:
    """S-parameters of a modelled standard in the kit's impedance.

    Parameters
    ----------
    given : mapping
        Parameters with their kind; a parameter may be a DataArray over leading dims.
    f : array of shape (frequency,)
        [Hz].
    reference : float
        [ohm].

    Returns
    -------
    array of shape (..., frequency, n, n), names of its leading dims, their coordinates
    """
    p, leading, coords = plain_parameters(given)
    kind = given["kind"]
    if kind in ("thru", "line"):
        impedance = reference if p["impedance_ohm"] is None else p["impedance_ohm"]
        values = kernel.mismatched_line(transmission(p, f), impedance, reference)
    else:
        values = _reflection(kind, p, f, reference)[..., None, None]
    n = values.shape[-1]
    shape = np.broadcast_shapes(values.shape, (*([1] * len(leading)), f.size, n, n))
    return np.broadcast_to(values, shape), leading, coords


def transmission(p: Mapping[str, Any], f: NDArray) -> NDArray:
    """Transmission of a thru or line in its own impedance, shape (..., frequency), from `plain_parameters`."""
    delay, length = p.get("delay_ps"), p["length_m"]
    if delay is None and length is None:
        length = 0.0
    if not np.any(delay if length is None else length):
        return np.ones(f.shape, dtype=complex)
    if length is None:
        return kernel.matched_transmission(2j * np.pi * f, np.asarray(delay) * 1e-12)
    gamma = kernel.line_constant(
        f,
        permittivity=p["effective_permittivity"],
        loss_db_per_m=p["loss_db_per_m_at_1ghz"],
        cutoff=p["cutoff_hz"],
    )
    return kernel.matched_transmission(gamma, length)


def _reflection(kind: str, p: Mapping[str, Any], f: NDArray, reference: float) -> NDArray:
    w = 2 * np.pi * f
    if kind == "reflect":
        return p["sign"] * kernel.matched_transmission(2j * w, np.asarray(p["offset_delay_ps"]) * 1e-12)
    bare = _no_offset(p, reference)
    gamma_l, zc = (np.zeros(1), np.asarray(reference)) if bare else _offset(p, f, reference)
    if kind == "open":
        end = kernel.capacitor_reflection(f, kernel.polynomial(f, p["capacitance"]), zc)
    elif kind == "short":
        end = kernel.impedance_reflection(1j * w * kernel.polynomial(f, p["inductance"]), zc)
    else:
        resistance = reference if p["resistance_ohm"] is None else p["resistance_ohm"]
        end = kernel.impedance_reflection(resistance + 1j * w * p["inductance_h"], zc)
    return end if bare else kernel.offset_reflection(end, gamma_l, zc, reference)


def _no_offset(p: Mapping[str, Any], reference: float) -> bool:
    """Whether a termination sits right at the plane, in the reference impedance."""
    lossless = all(np.ndim(p[k]) == 0 and p[k] == 0 for k in ("offset_delay_ps", "offset_loss_gohm_per_s"))
    impedance = p["offset_impedance_ohm"]
    return lossless and (impedance is None or (np.ndim(impedance) == 0 and impedance == reference))


def _offset(p: Mapping[str, Any], f: NDArray, reference: float) -> tuple[NDArray, Any]:
    return kernel.offset_constants(
        f,
        delay=np.asarray(p["offset_delay_ps"]) * 1e-12,
        loss=np.asarray(p["offset_loss_gohm_per_s"]) * 1e9,
        impedance=reference if p["offset_impedance_ohm"] is None else p["offset_impedance_ohm"],
    )
