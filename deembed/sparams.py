"""Labelled S-parameters: build, check, select, renormalize, convert, join.

An S-parameter array is an `xarray.DataArray`, complex128, dims ``(..., frequency, port_out, port_in)``: frequency in Hz,
physical port numbers from 1, time convention exp(+j w t), pseudo-waves (Marks & Williams 1992), reference impedances
in the coordinate ``z0`` [ohm] on ``port_out`` (also on ``frequency`` and leading dims where they vary).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from deembed import words
from deembed.errors import DeembedError, GridError, PortError
from deembed.numeric import sparams as kernel

__all__ = [
    "CORE",
    "admittance",
    "apply_kernel",
    "cascade",
    "chain",
    "check",
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

CORE = ("frequency", "port_out", "port_in")
_PORTS = ["port_out", "port_in"]


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
            f"frequency does not rise from point {i + 1} ({f[i]:.9g} Hz) to point {i + 2} ({f[i + 1]:.9g} Hz)",
            where=what,
            do="Sort the points and remove repeats.",
        )


def _check_ports(s: xr.DataArray, what: str) -> None:
    for dim in _PORTS:
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
    """Call a plain kernel on labelled matrices, leading dims matched by name; ``z0`` is left to the caller."""
    bare = [a.drop_vars("z0", errors="ignore") for a in arrays]
    out = xr.apply_ufunc(
        function,
        *bare,
        input_core_dims=[_PORTS] * len(bare),
        output_core_dims=[_PORTS],
        join="exact",
        keep_attrs=False,
    )
    return out.transpose(..., *CORE)


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
    """Wave-transfer matrix of a 2m-port, ``[b1; a1] = T [a2; b2]``, same shape as s; NaN where nothing passes."""
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
            f"the first ends in {left.values.ravel()[0]:.6g} ohm, the second starts in {right.values.ravel()[0]:.6g} ohm",
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
        input_core_dims=[_PORTS, ["closed"]],
        output_core_dims=[_PORTS],
        exclude_dims=set(_PORTS),
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
