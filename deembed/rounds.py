"""Rounds and terminations checked and made ready for assembly."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import DeembedError, PortError, SolveError
from deembed.labels import CORE, check, ports_of, same_grid
from deembed.networks import renormalize

__all__ = [
    "Reflection",
    "check_cover",
    "closing_matrix",
    "common_z0",
    "in_port_waves",
    "label_of",
    "leading_dims",
    "part_ports_of",
    "plain_values",
    "terminations_by_round",
]

Reflection = complex | xr.DataArray


def label_of(s: xr.DataArray) -> str:
    """Part ports of a round in its own order, e.g. ``3-1``."""
    if not isinstance(s, xr.DataArray) or "port_out" not in s.coords:
        return "?"
    return "-".join(str(p) for p in s.port_out.values)


def part_ports_of(rounds: Sequence[xr.DataArray], part_ports: int | None) -> list[int]:
    """Labels of all part ports; PortError for a round that reads one the part does not have."""
    if not rounds:
        raise PortError("no rounds came", where="assembly", do="Measure round 1-2 first.")
    read = sorted({p for r in rounds for p in ports_of(r)})
    if part_ports is None:
        return read
    ports = list(range(1, part_ports + 1))
    for r in rounds:
        stray = [p for p in ports_of(r) if p not in ports]
        if stray:
            raise PortError(
                f"part port {stray[0]} does not exist; the part has {part_ports} ports",
                where=f"round {label_of(r)}",
                do="Correct the part ports of this round or the number of part ports.",
            )
    return ports


def check_cover(rounds: Sequence[xr.DataArray], ports: Sequence[int], names: Sequence[str]) -> None:
    """PortError or SolveError unless every pair of ports shares a round and no two read the same ports."""
    sets = [frozenset(ports_of(r)) for r in rounds]
    for (i, a), (j, b) in combinations(enumerate(sets), 2):
        if a == b:
            both = words.listed(sorted(a))
            raise SolveError(
                f"two rounds read part ports {both}: {names[i]} (number {i + 1}) and {names[j]} "
                f"(number {j + 1})",
                where="rounds",
                do="Keep one of them.",
            )
    read = set().union(*sets)
    for port in ports:
        if port not in read:
            other = next(p for p in ports if p != port)
            pair = "-".join(str(p) for p in sorted((other, port)))
            raise PortError(
                f"part port {port} was never read",
                where=f"part port {port}",
                do=f"Measure round {pair} next.",
            )
    missing = [pair for pair in combinations(ports, 2) if not any(set(pair) <= s for s in sets)]
    if missing:
        listed = words.listed(f"{a}-{b}" for a, b in missing)
        verb = "was" if len(missing) == 1 else "were"
        raise PortError(
            f"pair{'s' if len(missing) > 1 else ''} {listed} of part ports {verb} never read together",
            where="rounds",
            do=f"Measure round {missing[0][0]}-{missing[0][1]} next.",
        )


def common_z0(
    rounds: Sequence[xr.DataArray], ports: Sequence[int], names: Sequence[str]
) -> dict[int, xr.DataArray]:
    """Reference impedance of each part port [ohm], the same in all rounds that read it."""
    found: dict[int, tuple[str, xr.DataArray]] = {}
    for r, name in zip(rounds, names, strict=True):
        for port in ports_of(r):
            z0 = r.z0.sel(port_out=port, drop=True)
            z0 = z0.drop_vars([c for c in z0.coords if c not in z0.dims])
            if port not in found:
                found[port] = (name, z0)
            elif not np.allclose(found[port][1] - z0, 0, rtol=0, atol=1e-9):
                first = found[port]
                raise DeembedError(
                    f"{first[0]} has {_ohm(first[1])}, {name} has {_ohm(z0)}",
                    where=f"reference impedance of part port {port}",
                    do="Renormalize the rounds to one impedance per part port first.",
                )
    return {port: found[port][1] for port in ports}


def _ohm(z0: xr.DataArray) -> str:
    value = complex(z0.values.ravel()[0])
    return f"{value.real:.6g} ohm" if value.imag == 0 else f"{value:.6g} ohm"


def terminations_by_round(
    terminations: Mapping[int, Reflection] | Sequence[Mapping[int, Reflection]],
    rounds: Sequence[xr.DataArray],
    ports: Sequence[int],
) -> list[dict[int, Reflection]]:
    """Terminations of each round; PortError for ports the part does not have."""
    if isinstance(terminations, Mapping):
        per_round = [dict(terminations)] * len(rounds)
    elif not terminations:
        per_round = [{} for _ in rounds]
    else:
        per_round = [dict(t) for t in terminations]
    if len(per_round) != len(rounds):
        raise PortError(
            f"{len(per_round)} sets of terminations for {len(rounds)} rounds",
            where="terminations",
            do="Give one mapping for all rounds, or one per round.",
        )
    for port in (p for given in per_round for p in given):
        if port not in ports:
            raise PortError(
                f"the part has no port {port}; it has ports {words.listed(ports)}",
                where=f"termination {port}",
                do="Correct the port number of the termination.",
            )
    return per_round


def in_port_waves(
    given: Mapping[int, Reflection], like: xr.DataArray, z0: Mapping[int, xr.DataArray], ports: Sequence[int]
) -> dict[int, xr.DataArray]:
    """Each termination as a reflection over frequency (and leading dims), in the waves of its part port."""
    out = {}
    for port, value in given.items():
        name = f"termination {port}"
        if not isinstance(value, xr.DataArray):
            out[port] = xr.DataArray(complex(value))
            continue
        if "frequency" in value.dims:
            same_grid(like, value, names=("each round", name))
        if "port_out" in value.dims:
            value = check(value, what=name)
            if value.sizes["port_out"] != 1:
                raise PortError(f"{value.sizes['port_out']} ports came; needed one", where=name)
            value = renormalize(value, z0[port]).isel(port_out=0, port_in=0)
        out[port] = value.drop_vars(["z0", "port_out", "port_in"], errors="ignore")
    return out


def leading_dims(
    rounds: Sequence[xr.DataArray], closing: Sequence[Mapping[int, xr.DataArray]]
) -> dict[str, int]:
    """Names and sizes of the leading dims of all that goes in."""
    sizes: dict[str, int] = {}
    labels: dict[str, xr.DataArray] = {}
    for array in [*rounds, *(g for given in closing for g in given.values())]:
        for dim, size in array.sizes.items():
            if dim in CORE:
                continue
            if dim in array.coords:
                first = labels.setdefault(str(dim), array[dim])
                if first.size == size and not np.array_equal(first.values, array[dim].values):
                    raise DeembedError(f"labels along '{dim}' differ", where="rounds and terminations")
            if sizes.setdefault(str(dim), size) != size:
                raise DeembedError(
                    f"{sizes[str(dim)]} and {size} entries along '{dim}'",
                    where="rounds and terminations",
                    do="Use one size for each leading dim.",
                )
    return sizes


def plain_values(array: xr.DataArray, leading: Mapping[str, int]) -> NDArray:
    """Values with all leading dims in order, of size 1 where the array has none."""
    bare = array.drop_vars([c for c in array.coords if c not in array.dims])
    missing = [d for d in leading if d not in bare.dims]
    return (bare.expand_dims(missing) if missing else bare).transpose(*leading, ...).values


def closing_matrix(
    given: Mapping[int, xr.DataArray], ports: Sequence[int], like: xr.DataArray, leading: Mapping[str, int]
) -> NDArray:
    """Closing reflections of one round, shape (..., frequency, port)."""
    columns = []
    for port in ports:
        g = given.get(port, xr.DataArray(0j))
        g = g if "frequency" in g.dims else g.expand_dims(frequency=like.frequency.values)
        columns.append(plain_values(g.transpose(..., "frequency"), leading))
    return np.stack(np.broadcast_arrays(*columns), axis=-1)
