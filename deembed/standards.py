"""Calibration kits: what their standards are, and how each responds over frequency."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from importlib import resources
from pathlib import Path
from types import MappingProxyType
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from deembed import standard_models as models
from deembed import words
from deembed.errors import FileError, KitError
from deembed.findings import Finding, bands_over, finding_id
from deembed.kit_schema import parse_kit
from deembed.labels import ports_of, relabel_ports, sparams
from deembed.networks import renormalize

__all__ = ["Kit", "kit_from_text", "load_kit", "shipped_kits"]


@dataclass(frozen=True)
class Kit:
    """A set of calibration standards.

    Parameters
    ----------
    name, description : str
    reference_impedance : float
        [ohm], of everything `response` returns unless another is asked for.
    standards : mapping id -> mapping of parameters
        As in the kit file, defaults filled in; each has a ``kind``.
    tables : mapping id -> DataArray
        Tabulated responses.
    text : str
        Source of the kit file.
    """

    name: str
    description: str
    reference_impedance: float
    standards: Mapping[str, Mapping[str, Any]]
    tables: Mapping[str, xr.DataArray] = field(default_factory=dict)
    text: str = ""

    def kind(self, standard: str) -> str:
        """Kind of a standard: open, short, load, thru, line, reflect or table.

        Raises
        ------
        KitError
            A standard the kit does not have.
        """
        return self._parameters(standard)["kind"]

    def _parameters(self, standard: str) -> Mapping[str, Any]:
        if standard not in self.standards:
            near = words.nearest(standard, self.standards)
            hint = f"Did you mean {near!r}? " if near else ""
            raise KitError(
                f"no standard {standard!r}",
                where=f"kit {self.name}",
                do=f"{hint}It has {', '.join(self.standards)}.",
            )
        return self.standards[standard]

    def response(
        self, standard: str, frequency: ArrayLike, *, z0: complex | ArrayLike | None = None
    ) -> xr.DataArray:
        """S-parameters of a standard.

        Parameters
        ----------
        standard : str
            Its id.
        frequency : array of shape (frequency,)
            [Hz].
        z0 : complex, optional
            Reference impedance [ohm]; the kit's when not given.

        Returns
        -------
        DataArray of shape (..., frequency, port_out, port_in)
            One port labelled 1, or two labelled 1 and 2; leading dims as the parameters have them.

        Raises
        ------
        KitError
            A standard the kit does not have.
        GridError
            A tabulated standard on another grid.
        """
        f = np.atleast_1d(np.asarray(frequency, dtype=float))
        if self.kind(standard) == "table":
            s = models.from_table(self.tables[standard], f, self.name, standard)
            return renormalize(s, self.reference_impedance if z0 is None else z0)
        values, leading, coords = self.plain(standard, f)
        s = sparams(values, f, z0=self.reference_impedance, leading=leading).assign_coords(coords)
        return s if z0 is None else renormalize(s, z0)

    def plain(self, standard: str, frequency: NDArray) -> tuple[NDArray, tuple[str, ...], dict]:
        """As `response` in the kit's impedance: the values, the names of their leading dims, coordinates of those."""
        given = self._parameters(standard)
        if given["kind"] != "table":
            return models.modelled(given, frequency, self.reference_impedance)
        s = self.response(standard, frequency)
        leading = tuple(map(str, s.dims[:-3]))
        return s.values, leading, {d: s.coords[d].values for d in leading if d in s.coords}

    def transmission(self, standard: str, frequency: ArrayLike) -> xr.DataArray:
        """Transmission of a thru or line in its own impedance, over frequency and leading dims.

        Raises
        ------
        KitError
            A standard that is neither thru, line nor a tabulated two-port.
        """
        f = np.atleast_1d(np.asarray(frequency, dtype=float))
        values, leading, coords = self.plain_transmission(standard, f)
        return xr.DataArray(values, dims=(*leading, "frequency"), coords={**coords, "frequency": f})

    def plain_transmission(self, standard: str, frequency: NDArray) -> tuple[NDArray, tuple[str, ...], dict]:
        """As `transmission`: the values, the names of their leading dims, coordinates of those."""
        given = self._parameters(standard)
        if given["kind"] == "table" and self.tables[standard].sizes["port_out"] == 2:
            s = models.from_table(self.tables[standard], frequency, self.name, standard)
            leading = tuple(map(str, s.dims[:-3]))
            return s.values[..., 1, 0], leading, {d: s.coords[d].values for d in leading if d in s.coords}
        if given["kind"] not in ("thru", "line"):
            raise KitError(f"{standard} passes nothing on", where=f"kit {self.name}")
        plain, leading, coords = models.plain_parameters(given)
        values = models.transmission(plain, frequency)
        shape = (*values.shape[: len(leading)], frequency.size)
        return np.broadcast_to(values, shape), leading, coords

    def length(self, standard: str) -> float | None:
        """Length [m] of a thru or line; None where the kit gives a delay, or the standard is neither."""
        given = self._parameters(standard)
        if given["kind"] == "thru" and given["delay_ps"] is None and given["length_m"] is None:
            return 0.0
        if given["kind"] == "thru" and given["delay_ps"] == 0:
            return 0.0
        return given.get("length_m")

    def validity_findings(self, standard: str, frequency: ArrayLike, *, where: str) -> list[Finding]:
        """A warning for the part of a grid [Hz] outside the standard's stated band; none where it states none."""
        band = self._parameters(standard)["valid_hz"]
        if band is None:
            return []
        f = np.atleast_1d(np.asarray(frequency, dtype=float))
        found = []
        for number, (i, j) in enumerate(bands_over(f, (f < band[0]) | (f > band[1])), start=1):
            beyond = float(max(band[0] - f[i], f[j] - band[1]))
            text = (
                f"The definition of {where} is used at {words.band(f[i], f[j])}, outside the "
                f"{words.band(*band)} that kit {self.name} states for it."
            )
            kind = "outside-validity"
            worst_hz = float(f[j] if f[j] > band[1] else f[i])
            found.append(
                Finding(
                    finding_id(kind, where, number), kind, where, "warning", text,
                    float(f[i]), float(f[j]), beyond, worst_hz,
                )
            )  # fmt: skip
        return found

    def changed(self, standard: str, **parameters: Any) -> Kit:
        """A copy with some parameters of one standard replaced; a parameter may be a DataArray over leading dims.

        Raises
        ------
        KitError
            A standard or parameter that does not exist (nearest named).
        """
        given = self._parameters(standard)
        for name in parameters:
            if name not in given or name in ("kind", "file"):
                near = words.nearest(name, given)
                hint = f"Did you mean {near!r}?" if near else f"It has {', '.join(given)}."
                raise KitError(
                    f"no parameter {name!r}", where=f"kit {self.name}, standards.{standard}", do=hint
                )
        new = MappingProxyType({**given, **parameters})
        return replace(self, standards=MappingProxyType({**self.standards, standard: new}))


def kit_from_text(text: str, *, where: str, read_table: Callable[[str], xr.DataArray] | None = None) -> Kit:
    """A kit from the text of a kit file.

    Parameters
    ----------
    text : str
        TOML, see docs/kit-files.md.
    where : str
        What to call the file in messages.
    read_table : callable path -> DataArray, optional
        Reads the file of a tabulated standard, by the path written in the kit file.

    Returns
    -------
    Kit

    Raises
    ------
    KitError
        What the file must not hold, by key and line; a tabulated standard that cannot be read here.
    """
    head, described = parse_kit(text, where=where)
    tables = {}
    for name, model in described.items():
        path = getattr(model, "file", None)
        if path is None:
            continue
        if read_table is None:
            raise KitError(f"file {path!r} cannot be read from here", where=f"{where}, standards.{name}")
        table = read_table(path)
        if len(ports_of(table)) > 2:
            raise KitError(
                f"{path!r} has {len(ports_of(table))} ports",
                where=f"{where}, standards.{name}",
                do="Give one or two.",
            )
        tables[name] = relabel_ports(table, range(1, len(ports_of(table)) + 1))
    standards = {name: MappingProxyType(dict(model)) for name, model in described.items()}
    return Kit(
        head.name,
        head.description,
        head.reference_impedance_ohm,
        MappingProxyType(standards),
        MappingProxyType(tables),
        text,
    )


def shipped_kits() -> list[str]:
    """Names of the kits that come with the package."""
    folder = resources.files("deembed.standards_defs")
    return sorted(p.name.removesuffix(".toml") for p in folder.iterdir() if p.name.endswith(".toml"))


def load_kit(name_or_path: str | Path) -> Kit:
    """A kit by the name of a shipped one, or from a file.

    Parameters
    ----------
    name_or_path : str or Path
        A name from `shipped_kits`, or the path of a TOML file.

    Returns
    -------
    Kit

    Raises
    ------
    KitError
        No kit of that name (nearest named), or a file that must not be so.
    FileError
        No such file.
    """
    name = str(name_or_path)
    if not name.endswith(".toml"):
        if name not in shipped_kits():
            near = words.nearest(name, shipped_kits())
            hint = f"Did you mean {near!r}? " if near else ""
            raise KitError(
                f"no kit is called {name!r}",
                where="kit",
                do=f"{hint}Shipped are {', '.join(shipped_kits())}; a file of your own ends in .toml.",
            )
        text = (resources.files("deembed.standards_defs") / f"{name}.toml").read_text(encoding="utf-8")
        return kit_from_text(text, where=f"{name}.toml")
    path = Path(name)
    try:
        text = path.read_text(encoding="utf-8")
    except FileNotFoundError:
        raise FileError("there is no such file", where=name, do="Check the path of the kit.") from None
    except (OSError, UnicodeDecodeError) as error:
        raise FileError(f"cannot be read: {error}", where=name) from None

    def read_table(file: str) -> xr.DataArray:
        from deembed.touchstone import read_touchstone

        return read_touchstone(path.parent / file)

    return kit_from_text(text, where=name, read_table=read_table)
