"""Recorded switch terms as a witness: what the error terms imply must be what the analyzer recorded."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from deembed import words
from deembed.banding import banded_findings, over_leading
from deembed.calibration.error_terms import plain_terms
from deembed.calibration.self_check import noise_of
from deembed.errors import PortError
from deembed.findings import Finding
from deembed.labels import check, ports_of, same_grid
from deembed.numeric import error_terms as kernel

__all__ = ["SWITCH_LIMIT", "implied_switch_terms", "switch_term_findings"]

# Difference of a recorded from an implied switch term that hardware alone explains (common practice, no source).
SWITCH_LIMIT = 0.02
_NOISE_FACTOR = 6.0


def implied_switch_terms(terms: xr.Dataset) -> xr.DataArray:
    """Switch term a_r / b_r at each port while each other port drives, as the error terms imply it.

    Parameters
    ----------
    terms : Dataset
        Error terms.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        Port r along port_out, drive along port_in; NaN on the diagonal and where terms are NaN.

    References
    ----------
    Marks 1997, 50th ARFTG, solved for the switch term: G_r = D_r / (reflection_tracking_r + directivity_r D_r),
    D_r = load_match_rd - source_match_r.
    """
    ports = [int(p) for p in terms.port_in.values]
    plain, lead = plain_terms(terms, ports)
    out = np.full(plain.load_match.shape, np.nan, dtype=complex)
    for r in range(len(ports)):
        for d in range(len(ports)):
            if r != d:
                out[..., r, d] = kernel.implied_switch_terms(plain, r, d)
    like = terms.load_match.transpose(*lead, "frequency", "port_out", "port_in")
    return like.copy(data=out).rename("implied_switch_terms")


def switch_term_findings(terms: xr.Dataset, recorded: Mapping[int, xr.DataArray]) -> list[Finding]:
    """Recorded switch terms beside the implied ones, per port.

    Parameters
    ----------
    terms : Dataset
        Drive-dependent error terms (SOLT). For boxes with switch terms the comparison is an identity and says nothing.
    recorded : mapping port -> one-port DataArray
        a_r / b_r at port r while another port drives.

    Returns
    -------
    list of Finding
        Kind ``switch-terms``, where ``switch 2``: a warning with band and size where they differ, which says so when
        the readings look already freed of their switch terms.

    Raises
    ------
    PortError, GridError
        A port without terms, or another grid.
    """
    implied = implied_switch_terms(terms)
    f = terms.frequency.values
    found = []
    for port, term in recorded.items():
        if port not in ports_of(implied):
            raise PortError(f"port {port} is not calibrated", where=f"switch {port}")
        one = check(term, what=f"switch {port}")
        same_grid(terms, one, names=("the error terms", f"switch {port}"))
        given = one.isel(port_out=0, port_in=0, drop=True).drop_vars("z0", errors="ignore")
        for drive in (p for p in ports_of(implied) if p != port):
            own = implied.sel(port_out=port, port_in=drive, drop=True)
            difference = (own - given).transpose(..., "frequency").values
            found += _one(f, difference, own, given, port)
    return found


def _one(f: NDArray, difference: NDArray, own: xr.DataArray, given: xr.DataArray, port: int) -> list[Finding]:
    size = over_leading(np.abs(difference), keep=1)
    good = np.isfinite(size)
    if not good.any():
        return []
    trace = difference.reshape(-1, f.size)[0][good]
    over = np.where(good, size, 0.0) > max(SWITCH_LIMIT, _NOISE_FACTOR * noise_of(trace))
    if over.mean() < 0.01:
        return []
    typical = [float(np.nanmedian(np.abs(x))) for x in (own, given)]
    gone = typical[0] < 0.25 * typical[1]
    reason = (
        f"the error terms imply almost none ({words.decibel(typical[0])}, recorded {words.decibel(typical[1])}): the "
        "readings look already freed of their switch terms"
        if gone
        else "the recording belongs to another port or set-up, or a standard is not what it is said to be"
    )
    return banded_findings(
        f,
        np.where(good, size, 0.0),
        over,
        kind="switch-terms",
        where=f"switch {port}",
        severity="warning",
        sentence=f"{{start}} the switch term recorded at port {port} differs from what the error terms imply by up to "
        f"{{worst}}{{at}}: {reason}.",
    )
