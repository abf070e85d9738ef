"""Figures people quote: value, unit and frequency, as the arrays have them."""

from types import SimpleNamespace

import numpy as np
import pytest

from deembed.job.figures import figures
from deembed.labels import sparams
from deembed.physicality import assess

F = np.array([1e9, 2e9, 3e9])


def of(values, **more):
    part = sparams(values, F, **more)
    found = figures(SimpleNamespace(part=part, metrics=assess(part)[0]))
    return {entry["figure"]: entry for entry in found}


def test_extremes_with_their_frequencies():
    s = np.zeros((3, 2, 2))
    s[:, 1, 0] = [0.5, 1.1, 0.25]
    s[:, 0, 1] = [0.5, 0.9, 0.25]
    found = of(s, ports=[1, 3])
    gain = {
        "figure": "largest singular value",
        "value": pytest.approx(1.1),
        "unit": "wave amplitude",
        "at_hz": 2e9,
    }
    assert found["largest singular value"] == gain
    assert found["largest reciprocity error"]["value"] == pytest.approx(0.2)
    assert (found["highest |S31|"]["value"], found["highest |S31|"]["at_hz"]) == (
        pytest.approx(0.8279, abs=1e-4),
        2e9,
    )
    assert (found["lowest |S31|"]["value"], found["lowest |S31|"]["at_hz"]) == (
        pytest.approx(-12.041, abs=1e-3),
        3e9,
    )
    assert found["highest |S31|"]["unit"] == "dB"
    assert "highest |S11|" not in found  # no reflection at all has no level


def test_missing_points_are_left_out_and_draws_give_the_largest():
    s = np.full((2, 3, 1, 1), 0.5)
    s[1, 0] = 0.8
    s[:, 1] = np.nan
    found = of(s)
    assert found["highest |S11|"]["value"] == pytest.approx(20 * np.log10(0.8))
    assert found["largest singular value"]["at_hz"] == 1e9
    assert of(np.full((3, 1, 1), np.nan)) == {}
