"""Models of standards on plain arrays: against closed forms and against scikit-rf's media."""

import numpy as np
import pytest
import skrf
from hypothesis import given
from hypothesis import strategies as st

from deembed.numeric import standards as k

F = np.array([0.0, 1e6, 1e9, 9e9])


def test_polynomial():
    np.testing.assert_allclose(k.polynomial(F, [1.0, 2e-9, 3e-18]), 1 + 2 * F / 1e9 + 3 * (F / 1e9) ** 2)
    np.testing.assert_array_equal(k.polynomial(F, []), 0)


@given(delay=st.floats(0, 200e-12), loss=st.floats(0, 20e9), z=st.floats(10, 200), f=st.floats(1e6, 50e9))
def test_offset_line_is_its_formula(delay, loss, z, f):
    """gamma l = j w tau + (1+j) a, Zc = Z + (1-j) (R/2w) sqrt(f/GHz), a = R tau sqrt(f/GHz) / 2Z (kit file format)."""
    gamma_l, zc = k.offset_constants(np.array([f]), delay=delay, loss=loss, impedance=z)
    w, root = 2 * np.pi * f, np.sqrt(f / 1e9)
    a = loss * delay * root / (2 * z)
    assert gamma_l[0] == pytest.approx(1j * w * delay + (1 + 1j) * a, rel=1e-12, abs=1e-15)
    assert zc[0] == pytest.approx(z + (1 - 1j) * loss / (2 * w) * root, rel=1e-12)


@given(delay=st.floats(0, 200e-12), loss=st.floats(0, 20e9), z=st.floats(10, 200))
def test_offset_line_is_the_first_order_of_a_line_with_skin_effect(delay, loss, z):
    """R' = X' = R1 sqrt(f/GHz), L' w = Z w, C' w = w / Z per second of delay: sqrt(Z'Y') to first order in R'."""
    f = np.array([5e9])
    w, r = 2 * np.pi * f, loss * np.sqrt(f / 1e9)
    series, shunt = r + 1j * (w * z + r), 1j * w / z
    exact_gamma, exact_z = np.sqrt(series * shunt), np.sqrt(series / shunt)
    gamma_l, zc = k.offset_constants(f, delay=delay, loss=loss, impedance=z)
    small = (r / (w * z)) ** 2
    np.testing.assert_allclose(gamma_l, exact_gamma * delay, atol=float((small * w * delay).item()) + 1e-12)
    np.testing.assert_allclose(zc, exact_z, atol=float((small * z).item()) + 1e-9)


def test_at_zero_frequency_only_the_termination_is_left():
    gamma_l, zc = k.offset_constants(F[:1], delay=40e-12, loss=2e9, impedance=50.0)
    np.testing.assert_array_equal(gamma_l, 0)
    np.testing.assert_array_equal(zc, 50)


@given(c=st.floats(0, 1e-12), f=st.floats(1e3, 50e9), z=st.floats(10, 200))
def test_a_capacitor_is_an_impedance(c, f, z):
    y = 2j * np.pi * f * c
    by_admittance = (1 / z - y) / (1 / z + y)
    assert k.capacitor_reflection(np.array([f]), c, z)[0] == pytest.approx(by_admittance, rel=1e-9)
    assert abs(k.capacitor_reflection(np.array([f]), c, z)[0]) == pytest.approx(1.0)


@given(
    zt=st.complex_numbers(max_magnitude=500),
    zc=st.floats(20, 150),
    tau=st.floats(0, 1e-10),
    loss=st.floats(0, 1),
)
def test_an_offset_termination_is_the_impedance_transformed_by_the_line(zt, zc, tau, loss):
    """Zin = Zc (Zt + Zc tanh gl) / (Zc + Zt tanh gl) (Pozar, Microwave Engineering, lossy line; from memory)."""
    zt = complex(abs(zt.real), zt.imag)
    gl = np.array([2j * np.pi * 3e9 * tau + loss])
    end = k.impedance_reflection(np.array([zt]), zc)
    zin = zc * (zt + zc * np.tanh(gl)) / (zc + zt * np.tanh(gl))
    got = k.offset_reflection(end, gl, np.array([zc + 0j]), 50.0)
    np.testing.assert_allclose(got, (zin - 50) / (zin + 50), atol=1e-9)


def test_against_networks_of_scikit_rf():
    """Short and shunt capacitor behind a lossy line of another impedance, joined and renormalized by scikit-rf."""
    f = np.linspace(1e8, 9e9, 31)
    gamma_l, zc = k.offset_constants(f, delay=40e-12, loss=3e9, impedance=47.0)
    through = np.exp(-gamma_l)
    line = np.zeros((31, 2, 2), dtype=complex)
    line[:, 0, 1] = line[:, 1, 0] = through
    made = {"f": f, "f_unit": "Hz", "s_def": "pseudo"}
    for end in (np.full(31, -1 + 0j), k.capacitor_reflection(f, 60e-15, zc)):
        ended = skrf.Network(s=line, z0=np.column_stack([zc, zc]), **made) ** skrf.Network(
            s=end, z0=zc, **made
        )
        ended.renormalize(50.0, s_def="pseudo")
        np.testing.assert_allclose(k.offset_reflection(end, gamma_l, zc, 50.0), ended.s[:, 0, 0], atol=1e-9)


def test_mismatched_line_against_scikit_rf():
    f = np.linspace(1e8, 9e9, 31)
    gamma = k.line_constant(f, permittivity=2.9, loss_db_per_m=5.0, cutoff=0.0)
    media = skrf.media.DefinedGammaZ0(frequency=skrf.Frequency.from_f(f, unit="Hz"), gamma=gamma, z0=63.0)
    network = media.line(0.03, "m")
    network.renormalize(50.0)
    ours = k.mismatched_line(k.matched_transmission(gamma, 0.03), 63.0, 50.0)
    np.testing.assert_allclose(ours, network.s, atol=1e-9)


def test_loss_is_what_it_says_and_grows_with_the_root_of_frequency():
    gamma = k.line_constant(np.array([1e9, 4e9]), permittivity=1.0, loss_db_per_m=2.0, cutoff=0.0)
    decibels = -20 * np.log10(np.abs(k.matched_transmission(gamma, 1.0)))
    np.testing.assert_allclose(decibels, [2.0, 4.0], rtol=1e-12)


def test_below_cut_off_a_waveguide_only_damps():
    gamma = k.line_constant(np.array([5e9, 10e9]), permittivity=1.0, loss_db_per_m=0.0, cutoff=6.557e9)
    assert gamma[0].imag == pytest.approx(0, abs=1e-9) and gamma[0].real > 0
    assert gamma[1].real == pytest.approx(0, abs=1e-9) and gamma[1].imag > 0
