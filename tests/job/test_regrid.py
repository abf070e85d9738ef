"""Other grids: labels kept, never beyond the ends, and always said."""

from __future__ import annotations

import re

import numpy as np
import pytest
import xarray as xr

from deembed.errors import GridError
from deembed.job.regrid import bring_onto
from deembed.labels import sparams


def test_a_labelled_array_keeps_its_ports_impedance_and_says_how_good_it_is() -> None:
    own, target = np.linspace(1e9, 2e9, 21), np.linspace(1.1e9, 1.9e9, 5)
    curve = 0.5 * np.exp(-2j * np.pi * own * 1e-9) / (1 + 1j * own / 5e9)
    z0 = np.stack([50 + own / 1e9, 75 + 0 * own], axis=-1)
    values = curve[:, None, None] * np.array([[1, 0.5], [0.5, 0.2]])
    moved, note = bring_onto(sparams(values, own, z0=z0, ports=(2, 5)), target, name="arm 3", where="arm 3")
    assert moved.dims == ("frequency", "port_out", "port_in") and moved.port_out.values.tolist() == [2, 5]
    assert np.allclose(moved.z0.values[:, 0], 50 + target / 1e9)
    exact = 0.5 * np.exp(-2j * np.pi * target * 1e-9) / (1 + 1j * target / 5e9)
    assert np.abs(moved.values[:, 0, 0] - exact).max() < 1e-6
    assert note.id == "interpolated-arm-3-1" and note.severity == "note"
    assert note.text.startswith(
        "Arm 3 went from 21 points, 1 GHz to 2 GHz onto the part's grid of 5 points, 1.1 GHz to 1.9 GHz by "
        "interpolation, as job.interpolate allows; leaving out every second point, it comes back within "
    )
    assert 0 < note.worst < 1e-4 and own[0] < note.worst_hz < own[-1]


def test_a_dataset_brings_over_what_varies_and_leaves_out_flags() -> None:
    own, target = np.linspace(1e9, 2e9, 5), np.array([1.3e9, 1.6e9])
    data = xr.Dataset(
        {
            "gain": ("frequency", own / 1e9),
            "phase": ("frequency", np.exp(-2j * np.pi * own * 1e-9)),
            "length": ((), 3.0),
            "flag": ("frequency", own > 1.5e9),
        },
        coords={"frequency": own},
        attrs={"method": "solt"},
    )
    moved, note = bring_onto(data, target, name="the error terms")
    assert set(moved.data_vars) == {"gain", "phase", "length"} and moved.attrs == {"method": "solt"}
    assert moved.gain.dtype == float and np.allclose(moved.gain, target / 1e9)
    assert np.allclose(moved.phase, np.exp(-2j * np.pi * target * 1e-9))
    assert moved.length == 3.0 and note.worst is None and note.text.endswith("as job.interpolate allows.")


def test_nothing_is_extrapolated() -> None:
    one = sparams(np.zeros((3, 1, 1)), [1e9, 2e9, 3e9])
    message = (
        "nothing is extrapolated: the error terms: only 3 points, 1 GHz to 3 GHz came; the part was read "
        "over "
        "2 points, 1 GHz to 3.5 GHz. Read it over the whole band of the part, or read the part over less."
    )
    with pytest.raises(GridError, match=f"^{re.escape(message)}$"):
        bring_onto(one, np.array([1e9, 3.5e9]), name="the error terms")
