"""The one set of error terms every calibration returns, and what is done with it.

A Dataset: ``directivity``, ``source_match``, ``reflection_tracking`` on ``(..., frequency, port_in)``;
``load_match``, ``transmission_tracking``, ``isolation`` on ``(..., frequency, port_out, port_in)``, receive by drive,
NaN on the diagonal; the reference impedance ``z0`` [ohm] on ``port_out``; ``redundancy`` on ``(..., frequency, pair)``
or, where there is none, the reason in the attribute ``redundancy_absent``.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations
from types import MappingProxyType

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.errors import PortError
from deembed.labels import check, ports_of, same_grid, select_ports, with_z0
from deembed.numeric import error_terms as kernel
from deembed.numeric.linalg import inverse

__all__ = ["ONE_INDEX", "TWO_INDEX", "build_terms", "correct", "plain_terms", "predict_raw"]

ONE_INDEX = ("directivity", "source_match", "reflection_tracking")
TWO_INDEX = ("load_match", "transmission_tracking", "isolation")


def build_terms(
    terms: kernel.Terms,
    *,
    ports: Sequence[int],
    coords: Mapping[str, NDArray],
    dims: Sequence[str],
    z0: NDArray | float | xr.DataArray,
    method: str,
    drive: str = "every-port",
    redundancy_absent: str = "",
    extra: Mapping[str, NDArray] = MappingProxyType({}),
) -> xr.Dataset:
    """Label plain error terms.

    Parameters
    ----------
    terms : numeric Terms
        One-index arrays of shape (..., frequency, n), two-index ones (..., frequency, n, n).
    ports : sequence of int
        Analyzer ports, in the order of the arrays.
    coords : mapping
        Coordinates of `dims`.
    dims : sequence of str
        Dims before the ports, frequency last.
    z0 : as in `labels.with_z0`
        Reference impedances [ohm] of what is corrected with these terms.
    method : str
        Name of the calibration method, kept as an attribute.
    drive : str
        ``every-port`` or ``first-port-only``.
    redundancy_absent : str
        Why the redundancy residual means nothing here; computed where empty.
    extra : mapping name -> array of shape (..., frequency)
        What the method found besides.

    Returns
    -------
    Dataset
    """
    n = len(ports)
    one, two = (*dims, "port_in"), (*dims, "port_out", "port_in")
    own = np.arange(n)
    data: dict = {name: (one, getattr(terms, name)) for name in ONE_INDEX}
    data |= {name: (tuple(dims), values) for name, values in extra.items()}
    shape = (*terms.directivity.shape, n)
    for name in TWO_INDEX:
        values = np.broadcast_to(getattr(terms, name), shape)
        if not np.isnan(values[..., own, own]).all():
            values = values.copy()
            values[..., own, own] = np.nan
        data[name] = (two, values)
    attrs = {"method": method, "drive": drive}
    pairs = list(combinations(range(n), 2))
    if redundancy_absent or not pairs:
        attrs["redundancy_absent"] = redundancy_absent or "one port alone holds no redundant relation"
    else:
        residual = np.stack([kernel.redundancy(terms, d, r) for d, r in pairs], axis=-1)
        data["redundancy"] = ((*dims, "pair"), residual)
        coords = {**coords, "pair": np.array([f"{ports[d]}-{ports[r]}" for d, r in pairs])}
    labels = np.asarray(ports)
    coords = {**coords, "port_out": labels, "port_in": labels}
    if not isinstance(z0, xr.DataArray) and np.ndim(z0) == 0:
        return xr.Dataset(data, coords | {"z0": ("port_out", np.full(n, complex(z0)))}, attrs)  # type: ignore[arg-type]
    data_set = xr.Dataset(data, coords, attrs)
    return data_set.assign_coords(z0=with_z0(data_set.load_match, z0).coords["z0"].variable)


def plain_terms(
    terms: xr.Dataset, ports: Sequence[int], leading: Sequence[str] = ()
) -> tuple[kernel.Terms, tuple[str, ...]]:
    """The terms of some ports as plain arrays, leading dims in front in the order returned.

    Raises
    ------
    PortError
        A port without terms.
    """
    known = [int(p) for p in terms.variables["port_in"].values]
    stray = [p for p in ports if p not in known]
    if stray:
        raise PortError(
            f"port {stray[0]} is not calibrated; the error terms hold ports {known}", where="error terms"
        )
    index = [known.index(p) for p in ports]
    own = [
        str(d) for d in terms.variables["load_match"].dims if d not in ("frequency", "port_out", "port_in")
    ]
    lead = (*leading, *(d for d in own if d not in leading))
    everything = index == list(range(len(known)))

    def plain(name: str) -> NDArray:
        variable = terms.variables[name]
        if not everything:
            variable = variable.isel({d: index for d in ("port_out", "port_in") if d in variable.dims})
        return _fronted(variable, lead)

    return kernel.Terms(**{name: plain(name) for name in (*ONE_INDEX, *TWO_INDEX)}), lead


def _fronted(variable: xr.Variable, lead: Sequence[str]) -> NDArray:
    missing = [d for d in lead if d not in variable.dims]
    if missing:
        variable = variable.set_dims({**dict.fromkeys(missing, 1), **variable.sizes})
    rest = [d for d in variable.dims if d not in lead]
    return variable.transpose(*lead, *rest).values


def _like(
    values: NDArray, lead: Sequence[str], terms: xr.Dataset, s: xr.DataArray, ports: Sequence[int]
) -> xr.DataArray:
    """Label a result like the sweep it came from, in the terms' impedances; in one go, for it is on every path."""
    z0 = terms.variables["z0"]
    known = terms.variables["port_out"].values.tolist()
    if tuple(known) != tuple(ports):
        z0 = z0.isel(port_out=[known.index(p) for p in ports])
    coords: dict = {d: a.variables[d] for a in (s.coords, terms) for d in lead if d in a}
    coords |= {"frequency": s.coords["frequency"].variable, "z0": z0}
    coords |= {"port_out": np.asarray(ports), "port_in": np.asarray(ports)}
    return xr.DataArray(values, coords=coords, dims=(*lead, "frequency", "port_out", "port_in"))


def correct(terms: xr.Dataset, raw: xr.DataArray, *, turned: xr.DataArray | None = None) -> xr.DataArray:
    """S-parameters from raw readings.

    Parameters
    ----------
    terms : Dataset
        Error terms.
    raw : DataArray of shape (..., frequency, port_out, port_in)
        Raw readings, labelled by analyzer ports; columns of ports that do not drive are not read.
    turned : DataArray, optional
        Where the first port alone drives: the sweep of the part turned round, read on the same analyzer ports.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        Ports as in `raw` (the first sweep), in the terms' reference impedances; NaN where it has no solution.

    Raises
    ------
    PortError
        Ports without terms; a turned sweep missing, not wanted, or on other ports.
    GridError
        Terms and readings on different grids.

    References
    ----------
    Rytting 2001, ARFTG short course; see `numeric.error_terms.part_waves`.
    """
    raw = check(raw, what="raw reading")
    ports = ports_of(raw)
    same_grid(terms, raw, names=("the error terms", "the raw reading"))
    if terms.attrs.get("drive") == "first-port-only" and len(ports) > 1:
        return _correct_turned(terms, raw, turned)
    if turned is not None:
        raise PortError(
            "a turned sweep came, but every port drives", where="correction", do="Correct each sweep alone."
        )
    plain, lead = plain_terms(terms, ports, _leading(raw))
    return _like(kernel.correct(plain, _fronted(raw.variable, lead)), lead, terms, raw, ports)


def _leading(s: xr.DataArray) -> tuple[str, ...]:
    return tuple(map(str, s.dims[:-3]))


def _correct_turned(terms: xr.Dataset, raw: xr.DataArray, turned: xr.DataArray | None) -> xr.DataArray:
    """Columns of the waves from both sweeps; the turned one's ports change places."""
    ports = ports_of(raw)
    driven = [p for p in ports if np.isfinite(terms.directivity.sel(port_in=p).values).any()]
    if turned is None:
        raise PortError(
            f"only port {', '.join(map(str, driven))} drives, so one sweep does not determine the part",
            where="correction",
            do="Turn the part round, read it again and give that sweep as turned.",
        )
    turned = check(turned, what="turned reading")
    same_grid(raw, turned, names=("the first sweep", "the turned sweep"))
    if len(ports) != 2 or set(ports_of(turned)) != set(ports) or len(driven) != 1:
        raise PortError(
            f"the first sweep has ports {list(ports)}, the turned one {list(ports_of(turned))}, driven {driven}",
            where="correction",
            do="Two sweeps of a two-port on the same two analyzer ports are needed.",
        )
    turned = select_ports(turned, ports)
    drive = ports.index(driven[0])
    lead = (*_leading(raw), *(d for d in _leading(turned) if d not in raw.dims))
    plain, lead = plain_terms(terms, ports, lead)
    columns = [kernel.part_waves(plain, _fronted(sweep.variable, lead)) for sweep in (raw, turned)]
    a, b = (
        np.stack(np.broadcast_arrays(straight[..., drive], flipped[..., ::-1, drive]), axis=-1)
        for straight, flipped in zip(*columns, strict=True)
    )
    return _like(b @ inverse(a), lead, terms, raw, ports)


def predict_raw(terms: xr.Dataset, part: xr.DataArray) -> xr.DataArray:
    """What the analyzer would read of a part: the inverse of `correct`.

    Parameters
    ----------
    terms : Dataset
    part : DataArray of shape (..., frequency, port_out, port_in)
        S-parameters labelled by the analyzer ports they sit on, in the terms' reference impedances.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        Raw readings; NaN columns for ports that do not drive.

    Raises
    ------
    PortError, GridError
        Ports without terms, or another grid.
    """
    part = check(part, what="part")
    ports = ports_of(part)
    same_grid(terms, part, names=("the error terms", "the part"))
    plain, lead = plain_terms(terms, ports, _leading(part))
    return _like(kernel.predict(plain, _fronted(part.variable, lead)), lead, terms, part, ports)
