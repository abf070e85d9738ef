"""The last step to the part's planes: reference impedances matched, the fixture taken off."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike

from deembed.labels import with_z0, z0_of
from deembed.networks import renormalize
from deembed.shell import strip

__all__ = ["in_reference", "strip_to"]


def in_reference(s: xr.DataArray, z0: ArrayLike | xr.DataArray) -> xr.DataArray:
    """S-parameters in other reference impedances [ohm]; the very same numbers where they already are."""
    return s if np.all(z0_of(s) == z0_of(with_z0(s, z0))) else renormalize(s, z0)


def strip_to(shell: xr.Dataset | None, whole: xr.DataArray, z0: float) -> xr.DataArray:
    """The part at its own planes.

    Parameters
    ----------
    shell : Dataset or None
        The fixture; None where there is none.
    whole : DataArray of shape (..., frequency, port_out, port_in)
        At the cable planes.
    z0 : float
        Reference impedance of the result [ohm].
    """
    if shell is None:
        return in_reference(whole, z0)
    outer = shell["z0_outer"].drop_vars(["z0_outer", "z0_inner"], errors="ignore")
    return in_reference(strip(shell, in_reference(whole, outer)), z0)
