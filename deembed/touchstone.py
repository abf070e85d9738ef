"""Touchstone files in and out, and networks across the border to scikit-rf.

Files are checked line by line before scikit-rf puts the matrices together, because an error must name its line;
reference impedances and parameters other than S are handled here. Touchstone 1.1, 2.0 and 2.1 (IBIS Open Forum).
"""

from __future__ import annotations

import io
import re
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr

from deembed import words
from deembed.errors import FileError
from deembed.labels import check, ports_of, relabel_ports, sparams
from deembed.numeric import sparams as kernel
from deembed.numeric.linalg import inverse
from deembed.touchstone_text import Checked, check_text

if TYPE_CHECKING:
    import skrf

__all__ = ["from_skrf", "parse_touchstone", "read_touchstone", "to_skrf", "write_touchstone"]

_PER_LINE = 4


def read_touchstone(path: str | Path, *, ports: Sequence[int] | None = None) -> xr.DataArray:
    """Read a Touchstone file.

    Parameters
    ----------
    path : str or Path
    ports : sequence of int, optional
        Physical port numbers of the file's ports, in order; 1 to N when not given.

    Returns
    -------
    DataArray of shape (frequency, port_out, port_in)
        S-parameters in the file's reference impedances; attribute ``comments`` holds its comment lines.

    Raises
    ------
    FileError
        No such file, or contents that are not a valid Touchstone file, by line.
    """
    where = str(path)
    try:
        text = Path(path).read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        raise FileError("there is no such file", where=where, do="Check the path.") from None
    except UnicodeDecodeError:
        raise FileError("is not text", where=where, do="Give a Touchstone file.") from None
    except OSError as error:
        raise FileError(f"cannot be read ({error.strerror})", where=where) from None
    s = parse_touchstone(text, name=where)
    return s if ports is None else relabel_ports(s, ports)


def parse_touchstone(text: str, *, name: str) -> xr.DataArray:
    """Read the text of a Touchstone file.

    Parameters
    ----------
    text : str
    name : str
        File name; its ending (``.s2p``) gives the number of ports of version 1 files.

    Returns
    -------
    DataArray of shape (frequency, port_out, port_in)

    Raises
    ------
    FileError
        By file and line: wrong column count, not a number, falling or repeated frequency, unit missing, ...
    """
    checked = check_text(text, name=name)
    values = _in_s(_by_skrf(checked), checked)
    s = sparams(values, checked.frequency, z0=np.asarray(checked.z0, dtype=complex))
    s = s.assign_attrs(comments="\n".join(checked.comments))
    return relabel_ports(s, _own_ports(checked))


def _own_ports(checked: Checked) -> list[int]:
    """Physical port numbers where the comments state them, as `write_touchstone` does."""
    labels = list(range(1, checked.ports + 1))
    for comment in checked.comments:
        said = re.fullmatch(r"port (\d+) of this file is port (\d+)", comment)
        if said and int(said.group(1)) <= checked.ports:
            labels[int(said.group(1)) - 1] = int(said.group(2))
    return (
        labels if len(set(labels)) == len(labels) and min(labels) > 0 else list(range(1, checked.ports + 1))
    )


def _by_skrf(checked: Checked) -> np.ndarray:
    """The file's matrices as scikit-rf puts them together: number format, order and triangle."""
    from skrf.io.touchstone import Touchstone

    n = checked.ports
    lines = ["[Version] 2.0", f"# Hz S {checked.form} R 50", f"[Number of Ports] {n}"]
    lines += [f"[Two-Port Data Order] {checked.order}"] if n == 2 else []
    lines += [
        f"[Number of Frequencies] {checked.frequency.size}",
        f"[Matrix Format] {checked.matrix.capitalize()}",
    ]
    table = np.column_stack([np.arange(checked.frequency.size, dtype=float), checked.numbers])
    lines += ["[Network Data]", *(" ".join(map(repr, row)) for row in table.tolist()), "[End]", ""]
    stream = io.StringIO("\n".join(lines))
    stream.name = f"checked.s{n}p"
    return np.asarray(Touchstone(stream).s, dtype=complex)


def _in_s(values: np.ndarray, checked: Checked) -> np.ndarray:
    """S-parameters, whatever the file holds; version 1 files divide impedances by the reference."""
    z0 = np.asarray(checked.z0, dtype=complex)
    unit = np.asarray(checked.z0) if checked.normalized else np.ones(checked.ports)
    if checked.parameter == "S":
        return values
    if checked.parameter == "Z":
        return kernel.z_to_s(values * unit, z0)
    if checked.parameter == "Y":
        return kernel.y_to_s(values / unit, z0)
    hybrid = values.copy()
    if checked.parameter == "G":  # [i1; v2] = G [v1; i2], the inverse of H
        hybrid = hybrid * np.array([[1 / unit[0], 1.0], [1.0, unit[1]]])
        hybrid = inverse(hybrid)
    else:
        hybrid = hybrid * np.array([[unit[0], 1.0], [1.0, 1 / unit[1]]])
    h11, h12, h21, h22 = (hybrid[:, i, j] for i in (0, 1) for j in (0, 1))
    with np.errstate(divide="ignore", invalid="ignore"):
        chain = np.stack([(h12 * h21 - h11 * h22) / h21, -h11 / h21, -h22 / h21, -1 / h21], axis=-1)
    return kernel.abcd_to_s(chain.reshape(-1, 2, 2), z0)


def to_skrf(s: xr.DataArray) -> skrf.Network:
    """The same network as a scikit-rf object, numbers copied; pseudo-waves.

    Parameters
    ----------
    s : DataArray of shape (frequency, port_out, port_in)
        Without leading dims.

    Raises
    ------
    FileError
        Leading dims, which the other side does not have.
    """
    import skrf

    s = check(s)
    if s.ndim > 3:
        raise FileError(
            f"dims are {s.dims}", where="scikit-rf network", do="Select one entry of the leading dims."
        )
    z0 = np.broadcast_to(s.z0.transpose(..., "port_out").values, s.shape[:2])
    return skrf.Network(
        f=s.frequency.values.copy(),
        f_unit="Hz",
        s=s.values.copy(),
        z0=z0.copy(),
        s_def="pseudo",
        name=str(s.name or ""),
    )


def from_skrf(network: skrf.Network) -> xr.DataArray:
    """A scikit-rf network as a labelled array, numbers copied, brought to pseudo-waves.

    Parameters
    ----------
    network : skrf.Network

    Returns
    -------
    DataArray of shape (frequency, port_out, port_in)
    """
    z0 = np.array(network.z0, dtype=complex)
    values = np.array(network.s, dtype=complex)
    if getattr(network, "s_def", "pseudo") != "pseudo" and np.any(z0.imag != 0):
        from skrf.network import s2s

        values = s2s(values, z0, "pseudo", network.s_def)
    same = np.all(z0 == z0[:1])
    return sparams(values, np.array(network.f, dtype=float), z0=z0[0] if same else z0)


def write_touchstone(
    s: xr.DataArray, path: str | Path, *, version: str = "1.1", provenance: Sequence[str] = ()
) -> None:
    """Write a Touchstone file, real and imaginary parts with every digit.

    Parameters
    ----------
    s : DataArray of shape (frequency, port_out, port_in)
    path : str or Path
    version : str
        ``1.1`` (one real reference impedance) or ``2.0`` (one real impedance per port).
    provenance : sequence of str
        Comment lines, e.g. where the numbers come from.

    Raises
    ------
    FileError
        Leading dims, or reference impedances the version cannot hold.
    """
    Path(path).write_text(
        touchstone_text(s, version=version, provenance=provenance, name=str(path)), encoding="utf-8"
    )


def touchstone_text(
    s: xr.DataArray, *, version: str = "1.1", provenance: Sequence[str] = (), name: str = "Touchstone"
) -> str:
    """The text `write_touchstone` writes."""
    s = check(s)
    if s.ndim > 3:
        raise FileError(f"dims are {s.dims}", where=name, do="Write one entry of the leading dims at a time.")
    if version not in ("1.1", "2.0"):
        raise FileError(f"version {version!r} cannot be written", where=name, do="Use 1.1 or 2.0.")
    z0 = _file_impedances(s, version, name)
    n, f = s.sizes["port_out"], s.frequency.values
    lines = [f"! {line}" for text in provenance for line in str(text).splitlines()]
    lines += [f"! port {i} of this file is port {p}" for i, p in enumerate(ports_of(s), start=1) if i != p]
    if version == "2.0":
        lines = ["[Version] 2.0", *lines, f"# Hz S RI R {z0[0]!r}", f"[Number of Ports] {n}"]
        lines += ["[Two-Port Data Order] 21_12"] if n == 2 else []
        lines += [f"[Number of Frequencies] {f.size}", "[Reference] " + " ".join(repr(z) for z in z0)]
        lines += ["[Matrix Format] Full", "[Network Data]"]
    else:
        lines.append(f"# Hz S RI R {z0[0]!r}")
    lines += _data_lines(s.values, f)
    return "\n".join([*lines, *(["[End]"] if version == "2.0" else []), ""])


def _file_impedances(s: xr.DataArray, version: str, name: str) -> list[float]:
    z0 = s.z0.transpose(..., "port_out").values.reshape(-1, s.sizes["port_out"])
    if np.any(z0.imag != 0) or np.any(z0 != z0[:1]):
        raise FileError(
            "the reference impedance is complex or varies over frequency, which the format cannot hold",
            where=name,
            do="Renormalize to a real impedance first.",
        )
    if version == "1.1" and np.any(z0 != z0[0, 0]):
        shown = words.listed(f"{z:.6g}" for z in z0[0].real)
        raise FileError(
            f"the ports are in {shown} ohm, and version 1.1 holds one value for all",
            where=name,
            do="Write version 2.0, or renormalize first.",
        )
    return [float(z) for z in z0[0].real]


def _data_lines(values: np.ndarray, f: np.ndarray) -> list[str]:
    n = values.shape[-1]
    if n == 2:
        values = values.swapaxes(-1, -2)  # two-ports go column by column: 11, 21, 12, 22
    pairs = np.stack([values.real, values.imag], axis=-1)
    if n <= 2:
        table = pairs.reshape(f.size, -1)
        rows = np.column_stack([f, table]).tolist()
        return [" ".join(map(repr, row)) for row in rows]
    lines = []
    for hz, matrix in zip(f.tolist(), pairs.tolist(), strict=True):
        start = repr(hz)
        for row in matrix:
            for first in range(0, n, _PER_LINE):
                numbers = " ".join(f"{re!r} {im!r}" for re, im in row[first : first + _PER_LINE])
                lines.append(f"{start} {numbers}")
                start = ""
    return lines
