"""Labelled S-parameters: renormalize, convert, join; with the labels of `deembed.labels` in one namespace."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from deembed.errors import DeembedError, PortError
from deembed.labels import (
    CORE,
    PORT_DIMS,
    apply_kernel,
    check,
    check_frequency,
    ports_of,
    relabel_ports,
    same_grid,
    same_impedance,
    select_ports,
    sparams,
    with_z0,
    z0_of,
)
from deembed.numeric import sparams as kernel

__all__ = [
    "CORE",
    "admittance",
    "apply_kernel",
    "cascade",
    "chain",
    "check",
    "check_frequency",
    "close_ports",
    "from_admittance",
    "from_chain",
    "from_impedance",
    "from_transfer",
    "impedance",
    "ports_of",
    "relabel_ports",
    "renormalize",
    "same_grid",
    "same_impedance",
    "select_ports",
    "sparams",
    "transfer",
    "with_z0",
    "z0_of",
]


def _converted(function: Callable[..., NDArray], s: xr.DataArray) -> xr.DataArray:
    s = check(s)
    z0 = z0_of(s)
    shape = np.broadcast_shapes(s.shape[:-2], z0.shape[:-1])
    values = function(s.values, z0)
    return s.copy(data=np.broadcast_to(values, (*shape, *s.shape[-2:])))


def renormalize(s: xr.DataArray, z0: ArrayLike | xr.DataArray) -> xr.DataArray:
    """S-parameters in other reference impedances.

    Parameters
    ----------
    s : DataArray of shape (..., frequency, port_out, port_in)
    z0 : as in `with_z0`
        New reference impedances [ohm], complex allowed.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)

    Raises
    ------
    DeembedError
        As in `with_z0`.

    References
    ----------
    Marks & Williams 1992, J. Res. NIST 97 (pseudo-waves).
    """
    s = check(s)
    target = with_z0(s, z0)
    return target.copy(data=kernel.renormalize(s.values, z0_of(s), z0_of(target)))


def impedance(s: xr.DataArray) -> xr.DataArray:
    """Impedance matrix [ohm], same shape as s; NaN where it does not exist."""
    return _converted(kernel.s_to_z, s)


def from_impedance(z: xr.DataArray, *, z0: ArrayLike | xr.DataArray | None = None) -> xr.DataArray:
    """S-parameters of an impedance matrix [ohm], in z0 (its own ``z0`` coordinate when not given)."""
    return _converted(kernel.z_to_s, z if z0 is None else with_z0(z, z0))


def admittance(s: xr.DataArray) -> xr.DataArray:
    """Admittance matrix [S], same shape as s; NaN where it does not exist."""
    return _converted(kernel.s_to_y, s)


def from_admittance(y: xr.DataArray, *, z0: ArrayLike | xr.DataArray | None = None) -> xr.DataArray:
    """S-parameters of an admittance matrix [S], in z0 (its own ``z0`` coordinate when not given)."""
    return _converted(kernel.y_to_s, y if z0 is None else with_z0(y, z0))


def _two_port(s: xr.DataArray, what: str) -> xr.DataArray:
    s = check(s)
    if s.sizes["port_out"] != 2:
        raise PortError(f"{s.sizes['port_out']} ports came; needed two", where=what)
    return s


def chain(s: xr.DataArray) -> xr.DataArray:
    """Chain (ABCD) matrix of a two-port, B in ohm, C in S, same shape as s; NaN where nothing passes."""
    return _converted(kernel.s_to_abcd, _two_port(s, "chain matrix"))


def from_chain(abcd: xr.DataArray, *, z0: ArrayLike | xr.DataArray | None = None) -> xr.DataArray:
    """S-parameters of a chain (ABCD) matrix, in z0 (its own ``z0`` coordinate when not given)."""
    abcd = _two_port(abcd, "chain matrix")
    return _converted(kernel.abcd_to_s, abcd if z0 is None else with_z0(abcd, z0))


def _even(s: xr.DataArray, what: str) -> xr.DataArray:
    s = check(s)
    if s.sizes["port_out"] % 2:
        raise PortError(f"{s.sizes['port_out']} ports came; needed an even number", where=what)
    return s


def transfer(s: xr.DataArray) -> xr.DataArray:
    """Wave-transfer matrix of a 2m-port, ``[b1; a1] = T [a2; b2]``, same shape as s."""
    return _converted(lambda v, _: kernel.s_to_t(v), _even(s, "wave-transfer matrix"))


def from_transfer(t: xr.DataArray) -> xr.DataArray:
    """S-parameters of a wave-transfer matrix (see `transfer`)."""
    return _converted(lambda v, _: kernel.t_to_s(v), _even(t, "wave-transfer matrix"))


def cascade(first: xr.DataArray, second: xr.DataArray) -> xr.DataArray:
    """Two 2m-ports in a row, last m ports of the first on first m ports of the second.

    Parameters
    ----------
    first, second : DataArrays of shape (..., frequency, port_out, port_in)
        On one grid; equal reference impedances where they meet.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        Ports 1 to 2m; outer reference impedances kept.

    Raises
    ------
    GridError, PortError, DeembedError
        Different grids, port counts, or impedances at the joint.
    """
    first, second = _even(first, "first of a cascade"), _even(second, "second of a cascade")
    if first.sizes["port_out"] != second.sizes["port_out"]:
        raise PortError(
            f"{first.sizes['port_out']} and {second.sizes['port_out']} ports cannot be cascaded",
            where="cascade",
        )
    same_grid(first, second, names=("the first network", "the second network"))
    m = first.sizes["port_out"] // 2
    labels = list(range(1, 2 * m + 1))
    first, second = relabel_ports(first, labels), relabel_ports(second, labels)
    left, right = first.z0.isel(port_out=slice(m, None)), second.z0.isel(port_out=slice(None, m))
    if not np.allclose(
        *xr.broadcast(left.drop_vars("port_out"), right.drop_vars("port_out")), rtol=1e-12, atol=0
    ):
        raise DeembedError(
            f"the first ends in {left.values.ravel()[0]:.6g} ohm, "
            f"the second starts in {right.values.ravel()[0]:.6g} ohm",
            where="cascade",
            do="Renormalize one of them first.",
        )
    outer = xr.concat(
        xr.broadcast(
            first.z0.isel(port_out=slice(None, m)).drop_vars("z0"),
            second.z0.isel(port_out=slice(m, None)).drop_vars("z0"),
            exclude=["port_out"],
        ),
        dim="port_out",
    )
    return with_z0(apply_kernel(kernel.cascade, first, second), outer)


def close_ports(s: xr.DataArray, reflections: Mapping[int, complex | xr.DataArray]) -> xr.DataArray:
    """What is seen at the other ports when some are closed with known reflections.

    Parameters
    ----------
    s : DataArray of shape (..., frequency, port_out, port_in)
    reflections : mapping port -> complex, DataArray over frequency (and leading dims), or one-port S array
        In that port's reference impedance.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        The ports left open, under their own numbers.

    Raises
    ------
    PortError
        A port that is not there, or none left.
    GridError
        A reflection on another grid.
    """
    s = check(s)
    ports = ports_of(s)
    unknown = [p for p in reflections if p not in ports]
    if unknown or len(reflections) == len(ports):
        raise PortError(
            f"ports {list(reflections)} are to be closed; there are {list(ports)}",
            where="closing ports",
            do="Close ports that exist and leave at least one open.",
        )
    if not reflections:
        return s
    closed = [ports.index(p) for p in reflections]
    columns = [_reflection(s, p, g) for p, g in reflections.items()]
    g = xr.concat(
        [c.drop_vars([n for n in c.coords if n != "frequency"]) for c in xr.broadcast(*columns)], "closed"
    )
    out = xr.apply_ufunc(
        lambda v, r: kernel.close_ports(v, closed, r),
        s.drop_vars("z0"),
        g,
        input_core_dims=[PORT_DIMS, ["closed"]],
        output_core_dims=[PORT_DIMS],
        exclude_dims=set(PORT_DIMS),
        join="exact",
    ).transpose(..., *CORE)
    left = [p for p in ports if p not in reflections]
    out = out.assign_coords(port_out=left, port_in=left)
    return with_z0(out, s.z0.sel(port_out=left).drop_vars("z0"))


def _reflection(s: xr.DataArray, port: int, value: complex | xr.DataArray) -> xr.DataArray:
    if not isinstance(value, xr.DataArray):
        return xr.DataArray(np.asarray(value, dtype=complex))
    if "frequency" in value.dims:
        same_grid(s, value, names=("the network", f"the reflection at port {port}"))
    if "port_out" in value.dims:
        if value.sizes["port_out"] != 1:
            raise PortError(
                f"{value.sizes['port_out']} ports came; needed one", where=f"reflection at port {port}"
            )
        own = check(value, what=f"reflection at port {port}")
        value = renormalize(own, s.z0.sel(port_out=[port]).drop_vars("z0"))
        value = value.isel(port_out=0, port_in=0, drop=True)
    return value.drop_vars("z0", errors="ignore")
