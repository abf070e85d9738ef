"""Normalized error of check standards: the definition, its coverage by simulation, and what is said of it."""

import re

import numpy as np
import pytest
import xarray as xr

from deembed.calibration.check_standards import COVERAGE, check_findings, normalized_error
from deembed.errors import DeembedError, GridError, PortError
from deembed.labels import sparams
from deembed.networks import renormalize

F = np.linspace(1e9, 2e9, 5)
KNOWN = sparams(np.full((5, 2, 2), 0.3 + 0.1j), F)


def test_the_definition():
    """E_n = (x - X) / sqrt(U^2 + U_ref^2), ISO/IEC 17043, U = 2.45 u for a complex quantity."""
    error = normalized_error(KNOWN + (0.03 - 0.04j), KNOWN, uncertainty=0.01, reference_uncertainty=0.02)
    np.testing.assert_allclose(error, 0.05 / (2.45 * np.hypot(0.01, 0.02)), rtol=1e-12)
    assert error.dims == KNOWN.dims and error.name == "normalized_error"


def test_the_coverage_factor_holds_95_percent():
    assert pytest.approx(np.sqrt(-2 * np.log(0.05)), abs=0.005) == COVERAGE
    rng = np.random.default_rng(1)
    draws = KNOWN + xr.DataArray(
        0.01 * (rng.normal(size=(4000, 5, 2, 2)) + 1j * rng.normal(size=(4000, 5, 2, 2))),
        dims=("draw", *KNOWN.dims),
    )
    inside = float((normalized_error(draws.assign_coords(z0=KNOWN.z0), KNOWN, uncertainty=0.01) <= 1).mean())
    assert inside == pytest.approx(0.95, abs=0.004)


def test_a_reference_in_another_impedance_is_the_same_part():
    error = normalized_error(KNOWN, renormalize(KNOWN, 75.0), uncertainty=0.01)
    np.testing.assert_allclose(error, 0, atol=1e-12)


def test_uncertainty_may_vary_over_frequency():
    u = xr.DataArray([0.01, 0.02, 0.01, 0.02, 0.01], dims="frequency", coords={"frequency": F})
    error = normalized_error(KNOWN + 0.0245, KNOWN, uncertainty=u)
    np.testing.assert_allclose(error.sel(port_out=1, port_in=1), [1, 0.5, 1, 0.5, 1], rtol=1e-12)


@pytest.mark.parametrize(
    ("call", "error", "message"),
    [
        (
            lambda: normalized_error(KNOWN, KNOWN, uncertainty=-0.1),
            DeembedError,
            "uncertainty holds -0.1. Give a stand",
        ),
        (lambda: normalized_error(KNOWN, KNOWN, uncertainty=np.nan), DeembedError, "uncertainty holds nan"),
        (
            lambda: normalized_error(KNOWN, KNOWN, uncertainty=0.0),
            DeembedError,
            "both uncertainties are zero. State at",
        ),
        (
            lambda: normalized_error(KNOWN, KNOWN.isel(frequency=[0, 1]), uncertainty=0.1),
            GridError,
            "the check standard has 5 points, 1 GHz to 2 GHz; its reference has 2 points",
        ),
        (
            lambda: normalized_error(KNOWN, KNOWN.sel(port_out=[1], port_in=[1]), uncertainty=0.1),
            PortError,
            "ports [1, 2] asked for; there are [1]",
        ),
    ],
)
def test_what_cannot_be_is_said(call, error, message):
    with pytest.raises(error, match=re.escape(message)):
        call()


def test_findings_name_the_parameter_band_and_size():
    off = KNOWN.copy(deep=True)
    off.values[1:3, 1, 0] += 0.049
    found = check_findings(
        normalized_error(off, KNOWN, uncertainty=0.01), name="pad 3", where="port 1, port 2"
    )
    assert [(f.kind, f.severity, f.from_hz, f.to_hz, f.where) for f in found] == [
        ("check-standard", "warning", 1.25e9, 1.5e9, "port 1, port 2")
    ]
    assert found[0].worst == pytest.approx(2.0)
    assert found[0].text.startswith(
        "Between 1.25 and 1.5 GHz S21 of check standard pad 3 is off its known value by up"
    )


def test_agreement_is_a_note_with_its_largest_error():
    (found,) = check_findings(
        normalized_error(KNOWN + 0.00245, KNOWN, uncertainty=0.01), name="pad", where="port 1"
    )
    assert found.severity == "note" and found.worst == pytest.approx(0.1)
    assert "the largest normalized error is 0.1 (S11 at 1 GHz), 1 being the limit" in found.text
