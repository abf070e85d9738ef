"""Lines, pads and terminations against closed forms and handbook values."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed import networks
from deembed.simulate.passives import line, pad, termination

F = np.linspace(50e6, 12e9, 60)


def test_a_3_db_pad_is_the_handbook_one():
    """Pi pad, 50 ohm, 3 dB: 292.40 ohm to ground and 17.615 ohm across (attenuator tables, printed digits)."""
    s = pad(np.array([1e9]), loss_db=3.0)
    y = networks.admittance(s).values[0]
    assert -1 / y[0, 1].real == pytest.approx(17.615, abs=5e-4)
    assert 1 / (y[0, 0] + y[0, 1]).real == pytest.approx(292.40, abs=5e-3)


@settings(max_examples=20, derandomize=True, deadline=None)
@given(loss=st.floats(0.05, 40.0), farad=st.floats(0.0, 1e-12))
def test_a_pad_is_passive_and_loses_what_it_says(loss, farad):
    s = pad(F, loss_db=loss, shunt_farad=farad).values
    assert np.linalg.svd(s, compute_uv=False).max() <= 1 + 1e-12
    np.testing.assert_allclose(s[:, 0, 1], s[:, 1, 0], atol=1e-14)
    plain = pad(F, loss_db=loss).values
    np.testing.assert_allclose(-20 * np.log10(np.abs(plain[:, 1, 0])), loss, rtol=1e-9)
    np.testing.assert_allclose(plain[:, 0, 0], 0.0, atol=1e-12)


@pytest.mark.parametrize("loss", [0.0, -3.0])
def test_a_pad_without_loss_is_refused(loss):
    with pytest.raises(ValueError, match=rf"a pad of {loss} dB has no resistors: ask for a loss above 0 dB"):
        pad(F, loss_db=loss)


@settings(max_examples=20, derandomize=True, deadline=None)
@given(ohm=st.floats(15.0, 150.0), length=st.floats(0.0, 0.3), loss=st.floats(0.0, 30.0))
def test_a_line_is_passive_and_two_halves_make_one(ohm, length, loss):
    how = {"impedance_ohm": ohm, "loss_db_per_m": loss}
    whole, half = line(F, length_m=length, **how), line(F, length_m=length / 2, **how)
    assert np.linalg.svd(whole.values, compute_uv=False).max() <= 1 + 1e-12
    np.testing.assert_allclose(networks.cascade(half, half).values, whole.values, atol=1e-12)


def test_a_quarter_wave_turns_impedance_over():
    """A quarter wave of Z in front of 50 ohm shows Z^2 / 50 (common textbook result)."""
    s = line(np.array([299_792_458.0]), length_m=0.25, impedance_ohm=100.0, permittivity=1.0, loss_db_per_m=0)
    seen = 50 * (1 + s.values[0, 0, 0]) / (1 - s.values[0, 0, 0])
    assert seen == pytest.approx(200.0)


def test_a_termination_reflects_as_its_resistor_does():
    s = termination(F, resistance_ohm=60.0, delay_s=30e-12).values[:, 0, 0]
    np.testing.assert_allclose(s, 10 / 110 * np.exp(-2j * np.pi * F * 60e-12), atol=1e-15)
    assert np.abs(termination(F).values).max() == 0.0
    inductive = termination(F, inductance_h=0.1e-9).values[:, 0, 0]
    np.testing.assert_allclose(inductive.imag, 2 * np.pi * F * 0.1e-9 / 100, rtol=6e-3)
