"""An N-port part from rounds that each read some of its ports: three ports from two."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed.findings import Finding, sort_findings
from deembed.labels import check, ports_of, same_grid, select_ports, sparams
from deembed.numeric import threeport as kernel
from deembed.round_findings import (
    disagreement_findings,
    missing_findings,
    repeat_findings,
    termination_findings,
    unsolved_findings,
)
from deembed.rounds import (
    Reflection,
    check_cover,
    closing_matrix,
    common_z0,
    in_port_waves,
    label_of,
    leading_dims,
    part_ports_of,
    plain_values,
    terminations_by_round,
)

__all__ = ["DISAGREEMENT_LIMIT", "Assembly", "assemble"]

# Wave amplitude between a reading and the mean from which it is worth a warning (common practice, no source).
DISAGREEMENT_LIMIT = 0.01


@dataclass(frozen=True)
class Assembly:
    """A part put together from rounds.

    Parameters
    ----------
    part : DataArray of shape (..., frequency, port_out, port_in)
        Labelled by part ports, in the rounds' reference impedances; NaN where it could not be found.
    disagreement : DataArray of shape (..., round, frequency, port)
        Reading minus mean of each reflection [wave amplitude], complex, in waves for which the closing
        reflections are a match (plain S where they are a perfect match). With two readings of a port each is
        half their difference. At frequencies where the general solver was used: reading minus what the whole
        predicts for that round, in plain S. NaN where a round does not read a port, and for a port that only
        one round reads: nothing there could disagree.
    findings : tuple of Finding
    """

    part: xr.DataArray
    disagreement: xr.DataArray
    findings: tuple[Finding, ...]


def assemble(
    rounds: Sequence[xr.DataArray],
    *,
    terminations: Mapping[int, Reflection] | Sequence[Mapping[int, Reflection]] = (),
    part_ports: int | None = None,
    disagreement_limit: float = DISAGREEMENT_LIMIT,
) -> Assembly:
    """Put a part together from corrected rounds.

    Exact where each part port always met the same reflection when left free: readings go into waves in which
    that reflection is a match and which make them plain elements of the whole (Tippet & Speciale 1982);
    what was read more than once is their mean. Where terminations differ between rounds, or are an ideal
    open or short, the part that fits all readings best is found by Gauss-Newton.

    Parameters
    ----------
    rounds : sequence of DataArrays of shape (..., frequency, port_out, port_in)
        Labelled by part ports, any number of ports each; every pair of part ports must share a round.
    terminations : mapping part port -> reflection, or a sequence with one such mapping per round
        What closed a part port that a round left free: a complex number, a DataArray over frequency (in the
        port's reference impedance) or a one-port S array (renormalized to it). Absent: a perfect match.
    part_ports : int, optional
        Number of part ports, labelled from 1; the ports the rounds read when not given.
    disagreement_limit : float
        Disagreement [wave amplitude] beyond which a warning names round, port and band.

    Returns
    -------
    Assembly

    Raises
    ------
    PortError
        No rounds, a part port or pair never read, a port or termination the part does not have.
    SolveError
        Two rounds that read the same ports.
    GridError
        Rounds or terminations on different grids.
    DeembedError
        Rounds that give one port different reference impedances; leading dims of different size.

    References
    ----------
    Tippet & Speciale 1982, IEEE Trans. MTT 30(5).

    Examples
    --------
    >>> import numpy as np
    >>> from deembed.labels import select_ports, sparams
    >>> splitter = np.array([[0, 1, 1], [1, 0, 0], [1, 0, 0]]) * -0.5j
    >>> part = sparams(splitter[None], [1e9])
    >>> rounds = [select_ports(part, pair) for pair in ([1, 2], [2, 3], [3, 1])]
    >>> bool((assemble(rounds).part == part).all())
    True
    """
    rounds = [check(r, what=f"round {label_of(r)}") for r in rounds]
    ports = part_ports_of(rounds, part_ports)
    labels = [label_of(r) for r in rounds]
    names = [f"round {label}" for label in labels]
    check_cover(rounds, ports, names)
    same_grid(*rounds, names=names)
    rounds = [select_ports(r, sorted(ports_of(r))) for r in rounds]
    z0 = common_z0(rounds, ports, names)
    per_round = terminations_by_round(terminations, rounds, ports)
    closing = [in_port_waves(given, rounds[0], z0, ports) for given in per_round]
    leading = leading_dims(rounds, closing)
    result = kernel.assemble(
        [plain_values(r, leading) for r in rounds],
        [np.array([ports.index(p) for p in ports_of(r)]) for r in rounds],
        [closing_matrix(given, ports, rounds[0], leading) for given in closing],
        len(ports),
    )
    part = _part(rounds, result.s, ports, z0, leading)
    disagreement = _disagreement(result.residuals, rounds, labels, part)
    findings = [
        *missing_findings(rounds, closing, names),
        *termination_findings(closing, rounds, ports),
        *unsolved_findings(result, rounds, closing, part),
        *disagreement_findings(disagreement, disagreement_limit),
        *repeat_findings(result.residuals, rounds, names, disagreement_limit),
    ]
    return Assembly(part, disagreement, sort_findings(findings))


def _part(
    rounds: Sequence[xr.DataArray],
    values: NDArray,
    ports: Sequence[int],
    z0: Mapping[int, xr.DataArray],
    leading: Mapping[str, int],
) -> xr.DataArray:
    joined = xr.concat(xr.broadcast(*(z0[p] for p in ports)), dim="port_out").transpose(..., "port_out")
    shape = (*leading.values(), *values.shape[-3:])
    part = sparams(
        np.broadcast_to(values, shape).copy(), rounds[0].frequency.values, ports=ports, leading=tuple(leading)
    )
    part = part.assign_coords({d: r[d] for r in rounds for d in leading if d in r.coords})
    return part.assign_coords(z0=(joined.dims, joined.values))


def _disagreement(
    residuals: Sequence[NDArray], rounds: Sequence[xr.DataArray], labels: Sequence[str], part: xr.DataArray
) -> xr.DataArray:
    """Diagonals of the residuals, per round, frequency and part port."""
    ports = ports_of(part)
    readers = {p: sum(p in ports_of(r) for r in rounds) for p in ports}
    values = np.full((len(rounds), *part.shape[:-1]), np.nan, dtype=complex)
    for k, (r, residual) in enumerate(zip(rounds, residuals, strict=True)):
        for i, port in enumerate(ports_of(r)):
            if readers[port] > 1:
                values[k, ..., ports.index(port)] = residual[..., i, i]
    leading = part.dims[:-3]
    coords = {d: part[d] for d in (*leading, "frequency") if d in part.coords}
    return xr.DataArray(
        values,
        dims=("round", *leading, "frequency", "port"),
        coords={**coords, "round": list(labels), "port": list(ports)},
        name="disagreement",
    ).transpose(*leading, "round", "frequency", "port")
