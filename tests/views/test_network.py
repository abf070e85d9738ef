"""Pictures of S arrays carry the array's own numbers."""

import numpy as np
import pytest

from deembed.errors import DeembedError
from deembed.labels import sparams
from deembed.views import network
from deembed.views.model import Trace

F = np.linspace(1e9, 2e9, 21)


@pytest.fixture
def s():
    rng = np.random.default_rng(7)
    values = rng.normal(size=(21, 3, 3)) + 1j * rng.normal(size=(21, 3, 3))
    return sparams(values, F, ports=[1, 2, 4])


def test_transmission_holds_every_pair_both_ways_in_decibels(s):
    p = network.transmission(s)
    assert {t.name for t in p.traces} == {"S21", "S12", "S41", "S14", "S42", "S24"}
    for t in p.traces:
        out, into = int(t.name[1]), int(t.name[2])
        want = 20 * np.log10(np.abs(s.sel(port_out=out, port_in=into).values))
        assert np.allclose(t.y, want, rtol=0, atol=1e-12)
        assert np.array_equal(t.x, F)
    assert (p.y_label, p.unit, p.x_label) == ("Magnitude (dB)", "dB", "Frequency")


def test_the_two_directions_share_a_hue_and_differ_in_dash(s):
    by_name = {t.name: t for t in network.transmission(s).traces}
    assert by_name["S21"].hue == by_name["S12"].hue
    assert (by_name["S21"].dash, by_name["S12"].dash) == (0, 1)
    assert len({by_name[n].hue for n in ("S21", "S41", "S42")}) == 3


def test_reflections_and_all_have_the_right_curves(s):
    assert [t.name for t in network.reflection(s).traces] == ["S11", "S22", "S44"]
    whole = network.magnitude(s, which="all", name="x", title="X")
    assert len(whole.traces) == 9
    assert len({(t.hue, t.dash) for t in whole.traces}) == 9


def test_phase_is_in_degrees_and_never_unwrapped(s):
    p = network.phase(s)
    t = next(t for t in p.traces if t.name == "S41")
    assert np.allclose(t.y, np.degrees(np.angle(s.sel(port_out=4, port_in=1).values)), atol=1e-12)
    assert all(t.wraps for t in p.traces)
    assert p.y_label == "Phase (degrees)"


def test_delay_of_a_line_is_its_length_in_picoseconds():
    through = np.exp(-2j * np.pi * F * 123e-12)
    values = np.zeros((21, 2, 2), complex)
    values[:, 0, 1] = values[:, 1, 0] = through
    p = network.delay(sparams(values, F))
    assert np.allclose(p.traces[0].y, 123.0, rtol=1e-9)
    assert "aperture 100 MHz" in p.title


def test_chart_holds_real_and_imaginary_part_and_names_the_impedance(s):
    p = network.chart(s)
    assert p.kind == "reflection"
    assert np.array_equal(p.traces[1].x + 1j * p.traces[1].y, s.sel(port_out=2, port_in=2).values)
    assert "reference 50 ohm" in p.title
    assert "reference impedance not stated" in network.chart(s.drop_vars("z0")).title
    mixed = sparams(s.values, F, z0=[50, 75, 50])
    assert "reference impedances differ" in network.chart(mixed).title
    assert "reference 50+5j ohm" in network.chart(sparams(s.values, F, z0=50 + 5j)).title


def test_alternative_text_states_the_extremes_and_where_they_are():
    values = np.full((21, 2, 2), 0.1, complex)
    values[5, 1, 0], values[9, 0, 1] = 1.0, 0.01
    alt = network.transmission(sparams(values, F)).alt
    assert alt == (
        "Transmission, magnitude over 1 to 2 GHz: highest 0 dB (S21 at 1.25 GHz), "
        "lowest -40 dB (S12 at 1.45 GHz)."
    )


def test_an_exact_zero_has_no_decibels():
    assert np.isnan(network.decibels(np.array([0.0])))[0]
    p = network.transmission(sparams(np.zeros((21, 2, 2)), F))
    assert p.missing == ("S21", "S12")
    assert "no values" in p.alt


def test_a_one_port_shows_its_reflection_where_others_show_transmission():
    s = sparams(np.full((21, 1, 1), 0.5j), F)
    assert [t.name for t in network.phase(s).traces] == ["S11"]
    assert network.phase(s).title == "Phase of reflection"
    assert np.allclose(network.phase(s).traces[0].y, 90.0)
    assert np.allclose(network.delay(s).traces[0].y, 0.0)


def test_leading_dimensions_are_refused():
    s = sparams(np.zeros((2, 21, 2, 2)), F, leading=["draw"])
    with pytest.raises(DeembedError, match="the S array also runs along draw"):
        network.transmission(s)


def test_peak_looks_over_all_curves():
    traces = [Trace("a", F, F * 0 + 1), Trace("b", F, F), Trace("c", F, F * np.nan)]
    assert network.peak(traces) == ("b", 2e9, 2e9)
    assert network.peak(traces, lowest=True) == ("a", 1.0, 1e9)
    assert network.peak([]) is None
