"""Check standards: known parts read after a calibration and not used in it, judged by normalized error."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike

from deembed.banding import banded_findings, over_leading
from deembed.errors import DeembedError
from deembed.findings import Finding
from deembed.labels import CORE, check, ports_of, same_grid, select_ports
from deembed.networks import renormalize

__all__ = ["COVERAGE", "check_findings", "normalized_error"]

# Standard uncertainties that a circle in the complex plane needs to hold 95 % of a bivariate normal: sqrt(-2 ln 0.05).
COVERAGE = 2.45


def normalized_error(
    measured: xr.DataArray,
    reference: xr.DataArray,
    *,
    uncertainty: ArrayLike | xr.DataArray,
    reference_uncertainty: ArrayLike | xr.DataArray = 0.0,
) -> xr.DataArray:
    """Normalized error E_n of each S-parameter of a check standard.

    Parameters
    ----------
    measured : DataArray of shape (..., frequency, port_out, port_in)
        The check standard as corrected with the calibration under test.
    reference : DataArray of shape (..., frequency, port_out, port_in)
        Its known S-parameters; renormalized to the impedances of `measured`.
    uncertainty, reference_uncertainty : scalar or DataArray with dims among those of `measured`
        Standard uncertainty of the complex values [wave amplitude], of each of the two.

    Returns
    -------
    DataArray of shape (..., frequency, port_out, port_in)
        ``|measured - reference| / sqrt(U^2 + U_ref^2)`` with expanded uncertainties U = 2.45 u; up to 1 is agreement.

    Raises
    ------
    DeembedError
        An uncertainty that is negative, not a number, or zero on both sides.
    GridError, PortError
        Other frequencies or ports than the reference's.

    References
    ----------
    ISO/IEC 17043, performance statistic E_n; JCGM 102:2011 for the coverage factor of a complex quantity.

    Examples
    --------
    >>> import numpy as np
    >>> from deembed import sparams
    >>> known, read = (sparams(np.full((1, 1, 1), v), [1e9]) for v in (0.10, 0.11))
    >>> round(float(normalized_error(read, known, uncertainty=0.004).item()), 2)
    1.02
    """
    measured, reference = check(measured, what="check standard"), check(reference, what="its reference")
    same_grid(measured, reference, names=("the check standard", "its reference"))
    reference = select_ports(reference, ports_of(measured))
    z0 = measured.z0.drop_vars([c for c in measured.z0.coords if c not in measured.z0.dims])
    reference = renormalize(reference, z0)
    total = xr.DataArray(0.0)
    for name, value in (("uncertainty", uncertainty), ("reference_uncertainty", reference_uncertainty)):
        u = value if isinstance(value, xr.DataArray) else xr.DataArray(np.asarray(value, dtype=float))
        if not (np.isfinite(u) & (u >= 0)).all():
            raise DeembedError(
                f"{name} holds {float(u.where(~(np.isfinite(u) & (u >= 0))).max()):.3g}",
                where="check standard",
                do="Give a standard uncertainty of 0 or more, as wave amplitude.",
            )
        total = total + (COVERAGE * u) ** 2
    if bool((total == 0).any()):
        raise DeembedError(
            "both uncertainties are zero", where="check standard", do="State at least one of them."
        )
    error = abs(measured.drop_vars("z0") - reference.drop_vars("z0")) / total**0.5
    return error.transpose(..., *CORE).rename("normalized_error")


def check_findings(error: xr.DataArray, *, name: str, where: str) -> list[Finding]:
    """A warning for each band and S-parameter in which E_n exceeds 1; a note when it nowhere does.

    Parameters
    ----------
    error : DataArray of shape (..., frequency, port_out, port_in)
        From `normalized_error`.
    name : str
        What the check standard is called.
    where : str
        Place for the findings, e.g. ``port 2``.

    Returns
    -------
    list of Finding
        Kind ``check-standard``; ``worst`` is E_n.
    """
    f = error.frequency.values
    found: list[Finding] = []
    sizes = {(int(r), int(d)): over_leading(error.sel(port_out=r, port_in=d).transpose(..., "frequency").values, keep=1)
             for r in error.port_out.values for d in error.port_in.values}  # fmt: skip
    for (r, d), size in sizes.items():
        found += banded_findings(
            f,
            size,
            size > 1.0,
            kind="check-standard",
            where=where,
            severity="warning",
            sentence=f"{{start}} S{r}{d} of check standard {name} is off its known value by up to {{worst}} times "
            "the stated expanded uncertainty{at}: something has changed, or the calibration is not as good as stated.",
        )
    if found:
        return found
    (r, d), size = max(sizes.items(), key=lambda item: float(np.nanmax(item[1])))
    k = int(np.nanargmax(size))
    text = (
        f"Check standard {name} agrees with its known values: the largest normalized error is {size[k]:.2g} "
        f"(S{r}{d} at {f[k] / 1e9:.4g} GHz), 1 being the limit."
    )
    return [
        Finding(f"check-standard-{name}-1", "check-standard", where, "note", text, float(f[0]), float(f[-1]),
                float(size[k]), float(f[k]))
    ]  # fmt: skip
