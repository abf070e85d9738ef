"""Every standard predicted through the solved model, beside what was read of it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import xarray as xr

from deembed import words
from deembed.banding import banded_findings, over_leading
from deembed.calibration.error_terms import predict_raw
from deembed.calibration.reading import Reading
from deembed.calibration.self_check import noise_of
from deembed.findings import Finding
from deembed.labels import ports_of, relabel_ports, select_ports

if TYPE_CHECKING:
    from deembed.standards import Kit

__all__ = ["RESIDUAL_LIMIT", "residual_findings", "standard_residuals"]

# Residual of a standard that connectors alone explain: -40 dB below full scale (common practice, no source).
RESIDUAL_LIMIT = 0.01
_NOISE_FACTOR = 6.0


def standard_residuals(terms: xr.Dataset, readings: Sequence[Reading], kit: Kit) -> dict[str, xr.DataArray]:
    """Reading minus prediction of every standard whose definition the kit knows in full.

    Parameters
    ----------
    terms : Dataset
        Error terms solved from these readings.
    readings : sequence of Reading
    kit : Kit

    Returns
    -------
    dict name -> DataArray of shape (..., frequency, port_out, port_in)
        Under names such as ``short 1`` or ``thru 1-2`` [raw wave ratio], only for columns that drive. Readings of
        ``isolation`` and reflects, whose true values nobody knows, are left out. Zero to rounding where nothing is
        read in excess.

    Raises
    ------
    PortError, GridError
        Terms that do not fit the readings.
    """
    found = {}
    for reading in readings:
        if reading.standard == "isolation" or kit.kind(reading.standard) == "reflect":
            continue
        response = kit.response(reading.standard, reading.raw.frequency.values, z0=terms.z0.values[0])
        if response.sizes["port_out"] == 1:
            for port in reading.ports:
                own = terms.sel(port_out=[port], port_in=[port])
                seen = select_ports(reading.raw, [port])
                found[f"{reading.standard} {port}"] = _difference(own, relabel_ports(response, [port]), seen)
        else:
            found[reading.name] = _difference(terms, relabel_ports(response, reading.ports), reading.raw)
    return found


def _difference(terms: xr.Dataset, standard: xr.DataArray, raw: xr.DataArray) -> xr.DataArray:
    predicted = select_ports(predict_raw(terms, standard), ports_of(raw))
    return raw.drop_vars("z0") - predicted.drop_vars("z0")


def residual_findings(terms: xr.Dataset, readings: Sequence[Reading], kit: Kit) -> list[Finding]:
    """A warning that names the standards which the solved model does not give back, the worst first.

    Parameters
    ----------
    terms, readings, kit
        As in `standard_residuals`.

    Returns
    -------
    list of Finding
        Kind ``standard-residual``, where ``short 1``; ``worst`` is the residual over full scale.
    """
    f = terms.frequency.values
    found: list[Finding] = []
    for name, residual in standard_residuals(terms, readings, kit).items():
        values = residual.transpose(..., "frequency", "port_out", "port_in").values
        size = over_leading(np.abs(np.where(np.isfinite(values), values, 0.0)).max(axis=(-2, -1)), keep=1)
        # The residual turns with the cable's phase: only its size is smooth enough to show noise.
        limit = max(RESIDUAL_LIMIT, _NOISE_FACTOR * noise_of(size))
        found += banded_findings(
            f,
            size,
            size > limit,
            kind="standard-residual",
            where=name,
            severity="warning",
            sentence=f"{{start}} the solved calibration gives {name} back only to {{worst}} of full scale{{at}}: the "
            "standards contradict each other, and where this one is worst it is the first to look at.",
            say=words.decibel,
        )
    return sorted(found, key=lambda finding: -(finding.worst or 0.0))
