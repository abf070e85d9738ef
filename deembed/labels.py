"""The labels of S-parameter arrays: build, check, select, and the comparisons every module needs.

An S-parameter array is an `xarray.DataArray`, complex128, dims ``(..., frequency, port_out, port_in)``:
frequency in Hz, physical port numbers from 1, time convention exp(+j w t), pseudo-waves (Marks & Williams
1992), reference impedances in the coordinate ``z0`` [ohm] on ``port_out`` (also on ``frequency`` and leading
dims where they vary).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from deembed import words
from deembed.errors import DeembedError, GridError, PortError

__all__ = [
    "CORE",
    "PORT_DIMS",
    "apply_kernel",
    "check",
    "check_frequency",
    "ports_of",
    "relabel_ports",
    "same_grid",
    "same_impedance",
    "select_ports",
    "sparams",
    "with_z0",
    "z0_of",
]

CORE = ("frequency", "port_out", "port_in")
PORT_DIMS = ["port_out", "port_in"]


def sparams(
    values: ArrayLike,
    frequency: ArrayLike,
    *,
    ports: Sequence[int] | None = None,
    z0: ArrayLike | xr.DataArray = 50.0,
    leading: Sequence[str] | None = None,
) -> xr.DataArray:
    """Build a labelled S-parameter array.

    Parameters
    ----------
    values : array of shape (..., frequency, port_out, port_in)
        S-parameters, linear wave ratios.
    frequency : array of shape (frequency,)
        [Hz], strictly increasing, not negative.
    ports : sequence of int, optional
        Physical port numbers, from 1; 1 to N when not given.
    z0 : scalar, array of shape (port,) or (frequency, port), or DataArray
        Reference impedances [ohm], real part positive.
    leading : sequence of str, optional
        Names of the dims before frequency; one such dim is called ``draw`` when not given.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)

    Raises
    ------
    GridError, PortError, DeembedError
        Shape, grid, ports or impedances that cannot be.
    """
    s = np.asarray(values, dtype=complex)
    f = np.atleast_1d(np.asarray(frequency, dtype=float))
    if s.ndim < 3 or s.shape[-1] != s.shape[-2] or s.shape[-3] != f.size or s.shape[-1] == 0:
        raise DeembedError(
            f"values have shape {s.shape} for {f.size} frequencies; needed (..., {f.size}, ports, ports)",
            where="S-parameters",
            do="Put frequency third from last and the two port dims last.",
        )
    extra = s.ndim - 3
    if leading is None:
        leading = ("draw",) if extra == 1 else tuple(f"extra_{i + 1}" for i in range(extra))
    if len(leading) != extra:
        raise DeembedError(
            f"{extra} leading dims but {len(leading)} names {tuple(leading)}", where="S-parameters"
        )
    labels = np.arange(1, s.shape[-1] + 1) if ports is None else np.asarray(ports)
    if labels.shape != (s.shape[-1],):
        raise PortError(
            f"{s.shape[-1]} ports but labels {labels.tolist()}",
            where="S-parameters",
            do="Name each port once.",
        )
    data = xr.DataArray(
        s,
        dims=(*leading, *CORE),
        coords={"frequency": f, "port_out": labels, "port_in": labels},
    )
    return check(with_z0(data, z0))


def with_z0(s: xr.DataArray, z0: ArrayLike | xr.DataArray) -> xr.DataArray:
    """The same numbers said to be in these reference impedances (nothing is converted; see `renormalize`).

    Parameters
    ----------
    s : DataArray of shape (..., frequency, port_out, port_in)
    z0 : scalar, array of shape (port,) or (frequency, port), or DataArray with dims among those of s
        Reference impedances [ohm].

    Raises
    ------
    DeembedError
        Shape that fits neither form, or an impedance whose real part is not positive.
    """
    if isinstance(z0, xr.DataArray):
        dims: tuple = tuple("port_out" if d in ("port", "port_in") else d for d in z0.dims)
        values = np.asarray(z0.values, dtype=complex)
        if "port_out" not in dims:
            dims, values = (*dims, "port_out"), np.repeat(values[..., None], s.sizes["port_out"], axis=-1)
    else:
        values = np.asarray(z0, dtype=complex)
        if values.ndim == 0:
            values = np.full(s.sizes["port_out"], values)
        dims = ("port_out",) if values.ndim == 1 else ("frequency", "port_out")
    if values.ndim != len(dims) or any(n != s.sizes.get(d) for n, d in zip(values.shape, dims, strict=True)):
        raise DeembedError(
            f"z0 has shape {values.shape}; needed one value, one per port ({s.sizes['port_out']}) "
            f"or one per frequency and port ({s.sizes['frequency']}, {s.sizes['port_out']})",
            where="reference impedance z0",
        )
    if not (np.isfinite(values).all() and (values.real > 0).all()):
        bad = values[~(np.isfinite(values) & (values.real > 0))].ravel()[0]
        raise DeembedError(
            f"{bad:.6g} ohm; the real part must be positive and finite",
            where="reference impedance z0",
            do="Pseudo-waves are not defined otherwise.",
        )
    return s.assign_coords(z0=(dims, values))


def check(s: xr.DataArray, *, what: str = "S-parameters") -> xr.DataArray:
    """The array in canonical form, or one clear error.

    Parameters
    ----------
    s : DataArray with dims frequency, port_out, port_in and any leading ones
    what : str
        Name of the thing in the message.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        Complex128, both port dims in the same order, ``z0`` present.

    Raises
    ------
    DeembedError, GridError, PortError
    """
    if not isinstance(s, xr.DataArray):
        raise DeembedError(
            f"a {type(s).__name__} came; needed a labelled array",
            where=what,
            do="Build it with deembed.sparams().",
        )
    missing = [d for d in CORE if d not in s.dims or d not in s.coords]
    if missing:
        raise DeembedError(
            f"dims are {tuple(s.dims)}; {words.listed(missing)} missing or without labels",
            where=what,
            do="Needed (..., frequency, port_out, port_in) with coordinates.",
        )
    check_frequency(s.frequency.values, what=what)
    _check_ports(s, what)
    if s.dims[-3:] != CORE:
        s = s.transpose(..., *CORE)
    if s.dtype != np.complex128:
        s = s.astype(np.complex128)
    if not np.array_equal(s.port_out.values, s.port_in.values):
        s = s.sel(port_in=s.port_out.values)
    if "z0" not in s.coords:
        raise DeembedError(
            "no reference impedance", where=what, do="Give it with deembed.sparams(..., z0=50.0)."
        )
    return s


def check_frequency(frequency: ArrayLike, *, what: str) -> None:
    """Raise GridError unless the grid [Hz] is finite, not negative and strictly increasing."""
    f = np.asarray(frequency, dtype=float)
    if f.size == 0:
        raise GridError("no frequency points", where=what)
    if not np.isfinite(f).all() or f[0] < 0:
        raise GridError(
            f"frequency {f[~np.isfinite(f) | (f < 0)][0]:.9g} Hz", where=what, do="Needed: 0 Hz or more."
        )
    steps = np.flatnonzero(np.diff(f) <= 0)
    if steps.size:
        i = steps[0]
        raise GridError(
            f"frequency does not rise from point {i + 1} ({f[i]:.9g} Hz) "
            f"to point {i + 2} ({f[i + 1]:.9g} Hz)",
            where=what,
            do="Sort the points and remove repeats.",
        )


def _check_ports(s: xr.DataArray, what: str) -> None:
    for dim in PORT_DIMS:
        labels = s[dim].values
        if labels.dtype.kind not in "iu" or (labels < 1).any() or len(set(labels.tolist())) != labels.size:
            raise PortError(
                f"{dim} labels are {labels.tolist()}",
                where=what,
                do="Ports are whole numbers from 1, each once.",
            )
    if set(s.port_out.values.tolist()) != set(s.port_in.values.tolist()):
        raise PortError(
            f"port_out is {s.port_out.values.tolist()} but port_in is {s.port_in.values.tolist()}", where=what
        )


def ports_of(s: xr.DataArray) -> tuple[int, ...]:
    """Physical port numbers in order."""
    return tuple(int(p) for p in s.port_out.values)


def z0_of(s: xr.DataArray) -> NDArray:
    """Reference impedances [ohm], shape (..., frequency or 1, port), ready to broadcast in the kernels."""
    z0 = s.coords["z0"]
    leading = [d for d in s.dims if d not in CORE]
    if set(z0.dims) == {"port_out"}:
        return z0.values[None, :]
    missing = [d for d in leading if d not in z0.dims]
    z0 = z0.expand_dims(missing) if missing else z0
    if "frequency" not in z0.dims:
        z0 = z0.expand_dims("frequency")
    return z0.transpose(*leading, "frequency", "port_out").values


def same_grid(*arrays: xr.DataArray | xr.Dataset, names: Sequence[str]) -> None:
    """Raise GridError, naming both grids, unless all arrays have the same frequencies.

    Parameters
    ----------
    *arrays : DataArray or Dataset with a frequency coordinate
    names : sequence of str
        What to call each in the message.
    """
    first = arrays[0].frequency.values
    for other, name in zip(arrays[1:], names[1:], strict=True):
        f = other.frequency.values
        if f is first or np.array_equal(f, first):
            continue
        detail = ""
        if f.size == first.size:
            i = int(np.argmax(f != first))
            detail = f"; they first differ at point {i + 1}: {first[i]:.12g} Hz and {f[i]:.12g} Hz"
        raise GridError(
            f"{names[0]} has {words.grid(first)}; {name} has {words.grid(f)}{detail}",
            where="frequency grids differ",
            do="Read both on one grid.",
        )


def same_impedance(a: xr.DataArray, b: xr.DataArray, *, names: tuple[str, str]) -> None:
    """Raise DeembedError unless both are in the same reference impedances, port by port in order."""
    za, zb = z0_of(a), z0_of(b)
    if za.shape[-1] != zb.shape[-1] or not np.allclose(za, zb, rtol=1e-12, atol=0):
        raise DeembedError(
            f"{names[0]} is in {_ohms(za)}, {names[1]} in {_ohms(zb)}",
            where="reference impedances differ",
            do="Renormalize one of them first.",
        )


def _ohms(z0: NDArray) -> str:
    first = z0.reshape(-1, z0.shape[-1])[0]
    return words.listed(f"{v.real:.6g}" if v.imag == 0 else f"{v:.6g}" for v in first) + " ohm"


def select_ports(s: xr.DataArray, ports: Sequence[int]) -> xr.DataArray:
    """The chosen ports in the chosen order (the others stay closed by their reference impedance).

    Raises
    ------
    PortError
        A port that is not there, or named twice.
    """
    s = check(s)
    unknown = [p for p in ports if p not in ports_of(s)]
    if unknown or len(set(ports)) != len(ports) or not len(ports):
        raise PortError(
            f"ports {list(ports)} asked for; there are {list(ports_of(s))}",
            where="selection of ports",
            do="Name ports that exist, each once.",
        )
    return s.sel(port_out=list(ports), port_in=list(ports))


def relabel_ports(s: xr.DataArray, ports: Sequence[int] | Mapping[int, int]) -> xr.DataArray:
    """The same data under other port numbers: a sequence in order, or a mapping old -> new.

    Raises
    ------
    PortError
        Another count than there are ports, or a number twice.
    """
    s = check(s)
    old = ports_of(s)
    new = [ports.get(p, p) for p in old] if isinstance(ports, Mapping) else list(ports)
    if len(new) != len(old) or len(set(new)) != len(new):
        raise PortError(f"labels {new} for the {len(old)} ports {list(old)}", where="new port numbers")
    return check(s.assign_coords(port_out=new, port_in=new))


def apply_kernel(function: Callable[..., NDArray], *arrays: xr.DataArray) -> xr.DataArray:
    """Call a plain kernel on labelled matrices, leading dims matched by name; ``z0`` is the caller's."""
    bare = [a.drop_vars("z0", errors="ignore") for a in arrays]
    out = xr.apply_ufunc(
        function,
        *bare,
        input_core_dims=[PORT_DIMS] * len(bare),
        output_core_dims=[PORT_DIMS],
        join="exact",
        keep_attrs=False,
    )
    return out.transpose(..., *CORE)
