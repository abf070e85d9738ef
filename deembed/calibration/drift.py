"""Two calibrations of one set-up compared: what has moved between them, in words."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.errors import PortError
from deembed.findings import Finding, finding_id
from deembed.labels import same_grid

__all__ = ["DRIFT_LIMITS", "drift", "drift_findings"]

# Changes from which a calibration is worth making again (common practice, no source).
DRIFT_LIMITS = {"amplitude_db": 0.1, "phase_deg": 1.0, "directivity_db": -50.0}


def drift(before: xr.Dataset, after: xr.Dataset) -> xr.Dataset:
    """What changed from one calibration to another.

    Parameters
    ----------
    before, after : Dataset
        Error terms of the same ports on the same grid.

    Returns
    -------
    Dataset
        ``tracking_db`` and ``tracking_deg``, change of reflection tracking [dB, degree] on
        (..., frequency, port_in); ``tracking_delay_s``, the delay that explains its phase best [s] on
        (..., port_in), there and back; ``directivity``, magnitude of its change [wave amplitude].

    Raises
    ------
    GridError, PortError
        Other frequencies or ports.
    """
    same_grid(before, after, names=("the first calibration", "the second"))
    ports = [[int(p) for p in terms.port_in.values] for terms in (before, after)]
    if ports[0] != ports[1]:
        raise PortError(f"the first calibration has ports {ports[0]}, the second {ports[1]}", where="drift")
    ratio = after.reflection_tracking / before.reflection_tracking
    with np.errstate(divide="ignore"):
        out = xr.Dataset({"tracking_db": 20 * np.log10(np.abs(ratio))})
    turned = xr.apply_ufunc(np.angle, ratio)
    f = before.frequency
    # The phase of a ratio of two calibrations stays well within half a turn: a line through zero frequency.
    weight = (f**2).where(np.isfinite(turned)).sum("frequency")
    slope = (turned * f).sum("frequency") / weight.where(weight > 0)
    out["tracking_deg"] = np.degrees(turned)
    out["tracking_delay_s"] = -slope / (2 * np.pi)
    out["directivity"] = np.abs(after.directivity - before.directivity)
    return out


def drift_findings(change: xr.Dataset) -> list[Finding]:
    """One finding per port: a warning beyond `DRIFT_LIMITS`, else a note, with the sizes in words.

    Parameters
    ----------
    change : Dataset
        From `drift`; along leading dims the largest counts.

    Returns
    -------
    list of Finding
        Kind ``drift``, where ``port 2``; ``worst`` is the change of tracking amplitude [dB].
    """
    f = change.frequency.values
    found = []
    for port in change.port_in.values:
        one = change.sel(port_in=port)
        db, deg, direct = (_largest(one[k], f) for k in ("tracking_db", "tracking_deg", "directivity"))
        if db is None or deg is None or direct is None:
            continue
        level = 20 * np.log10(direct[0]) if direct[0] > 0 else -np.inf
        over = (
            db[0] > DRIFT_LIMITS["amplitude_db"]
            or deg[0] > DRIFT_LIMITS["phase_deg"]
            or level > DRIFT_LIMITS["directivity_db"]
        )
        delay = float(np.abs(one.tracking_delay_s).max()) * 1e12
        text = (
            f"Between the two calibrations tracking at port {port} moved by up to {db[0]:.2g} dB "
            f"(at {words.frequency(db[1])}) and {deg[0]:.2g} degrees (at {words.frequency(deg[1])}), as {delay:.2g} ps "
            f"there and back would, and directivity by {words.decibel(direct[0])}"
            + (": calibrate again before the part is read." if over else ".")
        )
        where = f"port {port}"
        severity = "warning" if over else "note"
        ends = (float(f[0]), float(f[-1]))
        found.append(Finding(finding_id("drift", where), "drift", where, severity, text, *ends, db[0], db[1]))
    return found


def _largest(values: xr.DataArray, f: NDArray) -> tuple[float, float] | None:
    size = np.abs(values.transpose(..., "frequency").values).reshape(-1, f.size)
    size = np.where(np.isfinite(size), size, -1.0).max(axis=0)
    k = int(size.argmax())
    return None if size[k] < 0 else (float(size[k]), float(f[k]))
