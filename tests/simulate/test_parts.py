"""Simulated parts are what they are said to be, whatever their parameters."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed import networks
from deembed.simulate.circuit import Circuit
from deembed.simulate.fixtures import edge_launch_arm
from deembed.simulate.parts import PARTS, circulator, isolating_splitter, reactive_tee, resistive_divider
from deembed.simulate.passives import line, pad, termination

F = np.linspace(50e6, 12e9, 60)


def gain(s):
    return np.linalg.svd(s.values, compute_uv=False)[:, 0].max()


@pytest.mark.parametrize("name", PARTS)
def test_every_part_is_passive_and_reciprocal_unless_it_circulates(name):
    s = PARTS[name](F)
    assert gain(s) <= 1 + 1e-12
    uneven = np.abs(s.values - s.values.swapaxes(-1, -2)).max()
    assert uneven > 0.5 if name == "circulator" else uneven < 1e-12


@settings(max_examples=25, derandomize=True, deadline=None)
@given(
    centre=st.floats(2e9, 10e9),
    loss=st.floats(0.1, 30.0),
    ohm=st.floats(20.0, 400.0),
    farad=st.floats(0, 1e-12),
)
def test_lossy_parts_stay_passive_for_any_parameters(centre, loss, ohm, farad):
    assert gain(isolating_splitter(F, centre_hz=centre, loss_db_per_m=loss, resistor_ohm=ohm)) <= 1 + 1e-10
    assert gain(resistive_divider(F, ohm=ohm / 3, shunt_farad=farad)) <= 1 + 1e-10
    assert gain(reactive_tee(F, loss_db_per_m=loss)) <= 1 + 1e-10


def early(trace):
    """Share of energy that answers before time zero, of a trace from one step above 0 Hz, tapered to its end."""
    spectrum = np.concatenate([[trace[0].real], trace])
    power = np.fft.irfft(spectrum * np.cos(np.linspace(0, np.pi / 2, spectrum.size)) ** 2) ** 2
    return power[power.size // 2 : -12].sum() / power.sum()


def test_nothing_answers_before_it_is_asked():
    f = np.arange(1, 4001) * 10e6
    things = {name: make(f) for name, make in PARTS.items()}
    things |= {"arm": edge_launch_arm(f, length_m=0.02), "pad": pad(f, loss_db=3.0, shunt_farad=0.1e-12)}
    things |= {"line": line(f, length_m=0.03, impedance_ohm=60.0)}
    things |= {"termination": termination(f, resistance_ohm=52.0, inductance_h=0.1e-9, delay_s=40e-12)}
    shares = {
        name: max(early(t) for t in s.values.reshape(f.size, -1).T if np.abs(t).max() > 1e-9)
        for name, s in things.items()
    }
    assert {name: share for name, share in shares.items() if share > 1e-6} == {}
    # A phase that is the same at every frequency is what this must catch.
    assert early(np.full(f.size, np.exp(0.1j))) > 1e-4


@settings(max_examples=25, derandomize=True, deadline=None)
@given(
    centre=st.floats(2e9, 10e9),
    slope=st.floats(0.05, 5.0),
    quality=st.floats(2.0, 1e4),
    gyration=st.floats(0.2, 3.0),
)
def test_a_circulator_stays_passive_for_any_parameters(centre, slope, quality, gyration):
    s = circulator(F, centre_hz=centre, slope=slope, quality=quality, gyration=gyration)
    assert gain(s) <= 1 + 1e-10


def test_a_perfect_circulator_at_its_centre_passes_1_to_2_to_3_to_1():
    s = circulator([6e9], quality=np.inf, gyration=1.0).values[0]
    np.testing.assert_allclose(s, [[0, 0, 1], [1, 0, 0], [0, 1, 0]], atol=1e-12)


def test_a_real_circulator_is_one_in_its_band_only():
    s = 20 * np.log10(np.abs(circulator([3e9, 6e9]).values))
    assert s[1, 1, 0] > -0.3 and s[1, 0, 1] < -20 and s[1, 0, 0] < -20
    assert s[0, 0, 1] > -15


@pytest.mark.parametrize("name", ["closed-coupler", "balun", "isolating-splitter"])
def test_couplers_at_their_centre(name):
    """-3.01 dB to each output and the phase between them: 90 degrees, 180, 0 (common textbook results)."""
    make = PARTS[name]
    s = make(np.array([6e9]), loss_db_per_m=0.0).values[0]
    phase = np.degrees(np.angle(s[1, 0] / s[2, 0]))
    np.testing.assert_allclose(20 * np.log10(np.abs(s[1:, 0])), -3.0103, atol=0.15)
    wanted = {"closed-coupler": 90.0, "balun": 180.0, "isolating-splitter": 0.0}[name]
    assert abs((phase - wanted + 180) % 360 - 180) < 2.0


def test_splitter_isolates_at_its_centre():
    s = isolating_splitter(np.array([6e9]), loss_db_per_m=0.0).values[0]
    assert 20 * np.log10(abs(s[2, 1])) < -30


def test_the_plain_divider_is_6_02_db_and_matched():
    s = resistive_divider(F).values
    np.testing.assert_allclose(np.abs(s[:, 1, 0]), 0.5, atol=1e-12)
    np.testing.assert_allclose(s[:, 0, 0], 0.0, atol=1e-12)


def test_a_lossless_tee_keeps_all_power_and_reflects_a_third():
    s = reactive_tee(F).values
    np.testing.assert_allclose(s.conj().swapaxes(-1, -2) @ s, np.broadcast_to(np.eye(3), s.shape), atol=1e-12)
    np.testing.assert_allclose(np.abs(s[:, 0, 0]), 1 / 3, atol=1e-12)


def test_an_arm_is_passive_reciprocal_and_not_symmetric():
    arm = edge_launch_arm(F, length_m=0.02)
    assert gain(arm) <= 1 + 1e-12
    np.testing.assert_allclose(arm.values[:, 0, 1], arm.values[:, 1, 0], atol=1e-12)
    assert np.abs(arm.values[:, 0, 0] - arm.values[:, 1, 1]).max() > 0.02


def test_the_launch_sits_at_the_connector_capacitance_first():
    """Chain matrices of shunt C and series L, then the line (common circuit theory)."""
    w = 2j * np.pi * F
    zero, one = np.zeros_like(w), np.ones_like(w)
    shunt = np.stack([one, zero, w * 0.15e-12, one], -1).reshape(-1, 2, 2)
    series = np.stack([one, w * 0.3e-9, zero, one], -1).reshape(-1, 2, 2)
    launch = networks.from_chain(networks.chain(line(F, length_m=0.0)).copy(data=shunt @ series))
    wanted = networks.cascade(launch, line(F, length_m=0.02, impedance_ohm=52.0))
    arm = edge_launch_arm(F, length_m=0.02, impedance_ohm=52.0)
    np.testing.assert_allclose(arm.values, wanted.values, atol=1e-12)


def test_an_arm_delays_as_long_as_its_line():
    """length sqrt(eps) / c, plus sqrt(L C) of a launch that is matched at low frequency."""
    f = np.linspace(1e8, 5e8, 41)
    plain = {"loss_db_per_m": 0.0, "permittivity": 4.0, "launch_farad": 1e-18, "launch_henry": 1e-15}
    arm = edge_launch_arm(f, length_m=0.03, **plain)
    slope = np.polyfit(f, np.unwrap(np.angle(arm.values[:, 1, 0])), 1)[0]
    assert -slope / (2 * np.pi) == pytest.approx(0.03 * 2 / 299_792_458, rel=1e-4)


def test_a_circuit_says_no_to_zero_frequency():
    with pytest.raises(ValueError, match="frequencies above 0 Hz"):
        Circuit([0.0, 1e9], 2)


def test_a_circuit_says_no_to_a_line_without_admittance():
    f = np.array([1e9])
    half_wave = 2j * np.pi * f / 1e9 * 0.5
    with pytest.raises(ValueError, match="a lossless line of whole half wavelengths has no admittance"):
        Circuit(f, 2).line(0, 1, ohm=50.0, gamma=half_wave, length=1.0)
