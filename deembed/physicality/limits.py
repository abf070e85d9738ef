"""Figures per frequency: how much gain, loss, reflection and non-reciprocity S-parameters show."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import xarray as xr

from deembed import words
from deembed.errors import JobError
from deembed.labels import check, ports_of, z0_of
from deembed.networks import renormalize
from deembed.numeric import physicality as kernel

__all__ = ["DEFAULT_TOLERANCE", "TOLERANCES", "limits", "real_impedance", "tolerances"]

# Wave amplitude (common practice, no source).
DEFAULT_TOLERANCE = 0.01
TOLERANCES = ("gain", "reciprocity", "lossless", "match", "three_way")


def tolerances(tolerance: float | Mapping[str, float] | None) -> dict[str, float]:
    """All tolerances by name.

    Parameters
    ----------
    tolerance : float, mapping or None
        One wave amplitude for all, or some by name (`TOLERANCES`); 0.01 where not given.

    Raises
    ------
    JobError
        Unknown name (the nearest known one is named), or a value that is not in 0 to 1.
    """
    if tolerance is None:
        tolerance = {}
    given = tolerance if isinstance(tolerance, Mapping) else dict.fromkeys(TOLERANCES, tolerance)
    for name, value in given.items():
        if name not in TOLERANCES:
            near = words.nearest(name, TOLERANCES)
            raise JobError(
                f"unknown tolerance '{name}'",
                where="tolerance",
                do=f"Did you mean '{near}'?" if near else f"Known are {words.listed(TOLERANCES)}.",
            )
        if not 0 <= value <= 1:
            raise JobError(
                f"tolerance '{name}' is {value:g}", where="tolerance", do="Give a wave amplitude from 0 to 1."
            )
    return dict.fromkeys(TOLERANCES, DEFAULT_TOLERANCE) | {name: float(v) for name, v in given.items()}


def real_impedance(s: xr.DataArray) -> tuple[xr.DataArray, bool]:
    """The same part in real reference impedances, and whether it had to be renormalized.

    Passivity, reciprocity and losslessness show in S only where z0 is real; a complex z0 is replaced, port
    by port and frequency by frequency, by its real part (Marks & Williams 1992).
    """
    s = check(s)
    if np.all(z0_of(s).imag == 0):
        return s, False
    return renormalize(s, s.z0.real.drop_vars("z0", errors="ignore")), True


def limits(s: xr.DataArray, *, tolerance: float | Mapping[str, float] | None = None) -> xr.Dataset:
    """Figures of physicality per frequency.

    Parameters
    ----------
    s : DataArray of shape (..., frequency, port_out, port_in)
    tolerance : float or mapping, optional
        For ``holds``; see `tolerances`.

    Returns
    -------
    Dataset
        ``singular_values`` (..., frequency, rank), ``largest_singular_value`` and ``smallest_singular_value``
        (..., frequency) [wave amplitude]; ``power_balance`` (..., frequency, port_in), ``lossless_error``
        (spectral norm of ``S^H S - 1``) and ``dissipation`` [share of power]; ``reciprocity_error`` (...,
        frequency, port_out, port_in), ``reciprocity_error_max``, ``reflection_sum`` [wave amplitude];
        ``holds`` (..., frequency, property) for matched, reciprocal, lossless. Three-ports also:
        ``three_way_floor``, ``three_way_slack`` (reflection_sum minus floor, negative only where S is not
        symmetric) and ``dissipation_floor``; else the attribute ``three_way_absent`` says why not. All in
        real reference impedances. NaN (False in ``holds``) where S is not a number.
    """
    allowed = tolerances(tolerance)
    s, changed = real_impedance(s)
    lead = s.dims[:-2]
    values = kernel.singular_values(s.values)
    error = kernel.reciprocity_error(s.values)
    data = {
        "singular_values": ((*lead, "rank"), values),
        "largest_singular_value": (lead, values[..., 0]),
        "smallest_singular_value": (lead, values[..., -1]),
        "power_balance": ((*lead, "port_in"), kernel.power_balance(s.values)),
        "reciprocity_error": (s.dims, error),
        "reciprocity_error_max": (lead, error.max(axis=(-2, -1))),
        "lossless_error": (lead, kernel.lossless_error(values)),
        "dissipation": (lead, kernel.dissipation(values)),
        "reflection_sum": (lead, kernel.reflection_sum(s.values)),
    }
    attrs = {
        "reference_impedance": "real part of a complex z0, port by port" if changed else "as given (real)",
        **{f"tolerance_{name}": value for name, value in allowed.items()},
    }
    if len(ports_of(s)) == 3:
        reflections, floor = data["reflection_sum"][1], kernel.three_way_floor(values)
        data["three_way_floor"] = (lead, floor)
        data["three_way_slack"] = (lead, reflections - floor)
        data["dissipation_floor"] = (lead, kernel.dissipation_floor(reflections))
    else:
        attrs["three_way_absent"] = f"the three-way law is for three-ports; this part has {len(ports_of(s))}"
    coords = {str(d): s[d] for d in s.dims if d in s.coords} | {"rank": np.arange(1, values.shape[-1] + 1)}
    metrics = xr.Dataset(data, coords=coords, attrs=attrs).drop_vars("z0", errors="ignore")
    return metrics.assign(holds=_holds(s, metrics, allowed))


def _holds(s: xr.DataArray, metrics: xr.Dataset, allowed: Mapping[str, float]) -> xr.DataArray:
    """Which properties the data show within the tolerances; a wave amplitude e beside 1 is 2 e of power."""
    match = np.abs(np.diagonal(s.values, axis1=-2, axis2=-1)).max(axis=-1)
    flags = [
        match <= allowed["match"],
        metrics.reciprocity_error_max.values <= allowed["reciprocity"],
        metrics.lossless_error.values <= 2 * allowed["lossless"],
    ]
    return xr.DataArray(
        np.stack(flags, axis=-1),
        dims=(*s.dims[:-2], "property"),
        coords={"property": ["matched", "reciprocal", "lossless"]},
    )
