"""Numbers as an engineer would say them."""

import numpy as np
import pytest

from deembed import words


@pytest.mark.parametrize(
    ("hz", "said"),
    [
        (4.06e9, "4.06 GHz"),
        (999e6, "999 MHz"),
        (1.5e3, "1.5 kHz"),
        (0.0, "0 Hz"),
        (12.0, "12 Hz"),
        (1e14, "100000 GHz"),
    ],
)
def test_frequencies(hz, said):
    assert words.frequency(hz) == said


def test_bands():
    assert words.band(2.6e9, 4.4e9) == "2.6 to 4.4 GHz"
    assert words.band(50e6, 4.4e9) == "50 MHz to 4.4 GHz"
    assert words.band(2e9, 2e9) == "2 GHz"


def test_grids():
    assert words.grid(np.linspace(1e6, 4.4e9, 4400)) == "4400 points, 1 MHz to 4.4 GHz"
    assert words.grid([1e9]) == "1 point, 1 GHz"
    assert words.grid([]) == "no points"


def test_some_frequencies():
    assert words.some_frequencies([1e9]) == "1 frequency (1 GHz)"
    assert words.some_frequencies(np.arange(1, 8) * 1e9) == (
        "7 frequencies (1 GHz, 2 GHz, 3 GHz, 4 GHz ... 7 GHz)"
    )


def test_levels_and_shares():
    assert words.decibel(0.5) == "-6.02 dB"
    assert words.decibel(0) == "-inf dB"
    assert words.percent(0.1) == "10 %"
    assert words.percent(0.0123) == "1.2 %"
    assert words.percent(1e-9) == "1.0e-07 %"
    assert words.times(398.1) == "398 times"


def test_lists_and_near_words():
    assert words.listed([1]) == "1" and words.listed([]) == ""
    assert words.listed([1, 2, 3]) == "1, 2 and 3"
    assert words.listed(["a", "b"], last="or") == "a or b"
    assert words.nearest("reciprocl", ["passive", "reciprocal"]) == "reciprocal"
    assert words.nearest("xyz", ["passive", "reciprocal"]) is None
