"""Labelled shells: what stands between analyzer and part, one arm per port or coupled, put on and taken off.

A shell is a Dataset with ``outer_outer``, ``outer_inner``, ``inner_outer`` and ``inner_inner`` on
``(..., frequency, port_out, port_in)``, labelled by part ports, and the coordinates ``z0_outer`` and
``z0_inner`` [ohm].
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import xarray as xr

from deembed import networks as sp
from deembed.errors import PortError
from deembed.numeric import shell as kernel

__all__ = ["arm_of", "embed", "shell_from_arms", "shell_from_network", "strip"]

_BLOCKS = ("outer_outer", "outer_inner", "inner_outer", "inner_inner")


def shell_from_network(
    network: xr.DataArray,
    *,
    analyzer_side_ports: Sequence[int],
    part_side_ports: Sequence[int],
    ports: Sequence[int] | None = None,
) -> xr.Dataset:
    """A shell from one 2N-port network (a coupled fixture).

    Parameters
    ----------
    network : DataArray of shape (..., frequency, 2N, 2N)
    analyzer_side_ports, part_side_ports : sequences of int
        Network ports toward the analyzer and toward the part, in the order of `ports`.
    ports : sequence of int, optional
        Part port numbers; 1 to N when not given.

    Returns
    -------
    Dataset
        The shell.

    Raises
    ------
    PortError
        A port map that does not use every network port once.
    """
    network = sp.check(network, what="fixture")
    outer, inner = list(analyzer_side_ports), list(part_side_ports)
    labels = list(range(1, len(outer) + 1)) if ports is None else list(ports)
    if sorted(outer + inner) != sorted(sp.ports_of(network)) or not len(outer) == len(inner) == len(labels):
        raise PortError(
            f"analyzer side {outer}, part side {inner} and part ports {labels} for a network with ports "
            f"{list(sp.ports_of(network))}",
            where="fixture port map",
            do="Name every network port once, as many on each side as there are part ports.",
        )
    z0 = network.z0
    bare = network.drop_vars("z0")
    sides = {"outer": outer, "inner": inner}
    blocks = {}
    for name in _BLOCKS:
        row, column = name.split("_")
        block = bare.sel(port_out=sides[row], port_in=sides[column])
        blocks[name] = block.assign_coords(port_out=labels, port_in=labels)
    shell = xr.Dataset(blocks)
    for side, own in sides.items():
        picked = z0.sel(port_out=own).drop_vars(["port_out", "z0"])
        shell = shell.assign_coords({f"z0_{side}": picked})
    return shell


def shell_from_arms(
    arms: Mapping[int, xr.DataArray],
    *,
    analyzer_side: Mapping[int, int] | int = 1,
    ports: Sequence[int] | None = None,
) -> xr.Dataset:
    """A shell of one two-port arm per part port, uncoupled.

    Parameters
    ----------
    arms : mapping part port -> DataArray of shape (..., frequency, 2, 2)
    analyzer_side : int or mapping part port -> int
        Which of the arm's own ports faces the analyzer.
    ports : sequence of int, optional
        Part ports of the shell; those without an arm pass straight through. The arms' own when not given.

    Returns
    -------
    Dataset
        The shell.

    Raises
    ------
    PortError
        An arm at a port that is not among `ports`, not a two-port, or an `analyzer_side` it does not have.
    GridError
        Arms on different grids.
    """
    labels = sorted(arms) if ports is None else list(ports)
    stray = [p for p in arms if p not in labels]
    if stray or not arms:
        raise PortError(
            f"arms at part ports {sorted(arms)}; the part has {labels}",
            where="fixture",
            do="Give one arm per part port.",
        )
    turned = {p: _analyzer_first(arm, p, analyzer_side) for p, arm in arms.items()}
    first = next(iter(turned.values()))
    sp.same_grid(*turned.values(), names=[f"arm {p}" for p in turned])
    columns = [turned[p] if p in turned else _through(first) for p in labels]
    columns = list(xr.broadcast(*(c.drop_vars("z0") for c in columns), exclude=["port_out", "port_in"]))
    z0s = [(turned[p] if p in turned else _through(first)).z0.drop_vars("z0") for p in labels]
    shell = xr.Dataset(
        {
            name: _diagonal([c.isel(port_out=i, port_in=j, drop=True) for c in columns], labels)
            for name, (i, j) in zip(_BLOCKS, ((0, 0), (0, 1), (1, 0), (1, 1)), strict=True)
        }
    )
    for side, position in (("outer", 0), ("inner", 1)):
        values = [z.isel(port_out=position, drop=True) for z in z0s]
        joined = xr.concat(xr.broadcast(*values), dim="port_out").transpose(..., "port_out")
        shell = shell.assign_coords({f"z0_{side}": (joined.dims, joined.values)})
    return shell


def _analyzer_first(arm: xr.DataArray, port: int, analyzer_side: Mapping[int, int] | int) -> xr.DataArray:
    arm = sp.check(arm, what=f"arm {port}")
    side = analyzer_side[port] if isinstance(analyzer_side, Mapping) else analyzer_side
    own = sp.ports_of(arm)
    if len(own) != 2 or side not in own:
        raise PortError(
            f"the network has ports {list(own)} and analyzer_side is {side}",
            where=f"arm {port}",
            do="An arm is a two-port, and analyzer_side names one of its ports.",
        )
    other = own[1] if side == own[0] else own[0]
    return sp.relabel_ports(sp.select_ports(arm, (side, other)), (1, 2))


def _through(like: xr.DataArray) -> xr.DataArray:
    f = like.frequency.values
    outer = like.z0.isel(port_out=0).values.ravel()[0]
    return sp.sparams(np.broadcast_to([[0.0, 1.0], [1.0, 0.0]], (f.size, 2, 2)), f, z0=outer)


def _diagonal(entries: list[xr.DataArray], labels: list[int]) -> xr.DataArray:
    stacked = xr.concat(entries, dim="port_out").transpose(..., "port_out")
    values = stacked.values[..., :, None] * np.eye(len(labels))
    coords = {"frequency": stacked.frequency, "port_out": labels, "port_in": labels}
    kept = {d: stacked.coords[d] for d in stacked.dims if d in stacked.coords and d != "port_out"}
    return xr.DataArray(values, dims=(*stacked.dims[:-1], "port_out", "port_in"), coords={**kept, **coords})


def arm_of(shell: xr.Dataset, port: int) -> xr.DataArray:
    """The arm at one part port as a two-port: port 1 toward the analyzer, port 2 toward the part.

    Parameters
    ----------
    shell : Dataset
    port : int
        Part port.

    Returns
    -------
    DataArray of shape (..., frequency, 2, 2)

    Raises
    ------
    PortError
        A port the shell does not have.
    """
    labels = [int(p) for p in shell.port_out.values]
    if port not in labels:
        raise PortError(f"no arm at part port {port}; the fixture has {labels}", where="fixture")
    picked = [shell[name].sel(port_out=port, port_in=port, drop=True) for name in _BLOCKS]
    leading = picked[0].dims
    values = np.stack([p.transpose(*leading).values for p in picked], axis=-1).reshape(*picked[0].shape, 2, 2)
    kept = {d: picked[0].coords[d] for d in leading if d in picked[0].coords}
    arm = xr.DataArray(
        values, dims=(*leading, "port_out", "port_in"), coords={**kept, "port_out": [1, 2], "port_in": [1, 2]}
    )
    index = labels.index(port)
    z0 = [shell[f"z0_{side}"].isel(port_out=index, drop=True) for side in ("outer", "inner")]
    z0 = [z.drop_vars([n for n in z.coords if n not in z.dims]) for z in z0]
    return sp.with_z0(arm, xr.concat(xr.broadcast(*z0), dim="port_out").transpose(..., "port_out"))


def _fits(shell: xr.Dataset, s: xr.DataArray, side: str, what: str) -> xr.DataArray:
    s = sp.check(s, what=what)
    labels = [int(p) for p in shell.port_out.values]
    if sorted(labels) != sorted(sp.ports_of(s)):
        raise PortError(f"{what} has ports {list(sp.ports_of(s))}; the fixture has {labels}", where="fixture")
    s = sp.select_ports(s, labels)
    sp.same_grid(s, shell, names=(what, "the fixture"))
    own = sp.with_z0(s, shell[f"z0_{side}"].drop_vars([f"z0_{side}"], errors="ignore"))
    sp.same_impedance(s, own, names=(what, f"the fixture's {'analyzer' if side == 'outer' else 'part'} side"))
    return s


def _labelled(result: xr.DataArray, shell: xr.Dataset, side: str) -> xr.DataArray:
    bare = result.drop_vars([n for n in ("z0_outer", "z0_inner") if n in result.coords])
    return sp.with_z0(bare, shell[f"z0_{side}"])


def embed(shell: xr.Dataset, s: xr.DataArray) -> xr.DataArray:
    """What the analyzer side sees of a part inside a shell.

    Parameters
    ----------
    shell : Dataset
    s : DataArray of shape (..., frequency, port_out, port_in)
        The part, in the shell's inner reference impedances.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        In the shell's outer reference impedances.

    Raises
    ------
    PortError, GridError, DeembedError
        Ports, grids or reference impedances that differ.
    """
    s = _fits(shell, s, "inner", "the part")
    blocks = [shell[name].drop_vars(["z0_outer", "z0_inner"]) for name in _BLOCKS]
    return _labelled(sp.apply_kernel(kernel.embed, *blocks, s), shell, "outer")


def strip(shell: xr.Dataset, m: xr.DataArray) -> xr.DataArray:
    """The part inside a shell, from what the analyzer side sees (the inverse of `embed`).

    Parameters
    ----------
    shell : Dataset
    m : DataArray of shape (..., frequency, port_out, port_in)
        Response at the analyzer side, in the shell's outer reference impedances.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        In the shell's inner reference impedances; NaN where nothing passes the shell.

    Raises
    ------
    PortError, GridError, DeembedError
        Ports, grids or reference impedances that differ.
    """
    m = _fits(shell, m, "outer", "the reading")
    blocks = [shell[name].drop_vars(["z0_outer", "z0_inner"]) for name in _BLOCKS]
    return _labelled(sp.apply_kernel(kernel.strip, *blocks, m), shell, "inner")
