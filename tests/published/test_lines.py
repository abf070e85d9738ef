"""Offset terminations, coaxial line and rectangular waveguide against line theory and published figures.

Speed of light 299 792 458 m/s (SI, exact); impedance of free space 376.730 313 ohm (CODATA 2018, from memory).
"""

import numpy as np
import pytest

from deembed.numeric.standards import LIGHT_SPEED, line_constant
from deembed.standards import kit_from_text

F = np.linspace(0.5e9, 12e9, 24)
FREE_SPACE_OHM = 376.730313


def kit(body):
    return kit_from_text(f'[kit]\nname = "theory"\n{body}', where="theory.toml")


def reflection(body, f=F, **options):
    return kit(f"[standards.x]\n{body}").response("x", f, **options).values[..., 0, 0]


# ---- offset terminations: Gamma(l) = Gamma_end exp(-2 gamma l) (any textbook on lines)


def test_offset_short_and_open_without_loss():
    turn = np.exp(-2j * 2 * np.pi * F * 40e-12)
    np.testing.assert_allclose(reflection('kind = "short"\noffset_delay_ps = 40.0'), -turn, atol=1e-12)
    np.testing.assert_allclose(reflection('kind = "open"\noffset_delay_ps = 40.0'), turn, atol=1e-12)


def test_an_eighth_of_a_wave_makes_the_short_inductive_and_the_open_capacitive():
    """Zin = j Z0 tan(theta) and -j Z0 cot(theta): +j and -j times Z0 at 45 degrees, so Gamma is +j and -j."""
    eighth = 1e12 / (8 * 5e9)
    for kind, expected in (("short", 1j), ("open", -1j)):
        found = reflection(f'kind = "{kind}"\noffset_delay_ps = {eighth}', np.array([5e9]))
        np.testing.assert_allclose(found, expected, atol=1e-12)


def test_a_capacitance_turns_the_open_by_twice_its_arc():
    """Gamma = exp(-2j atan(w C Z0)) (circuit theory); the polynomial is C0 + C1 f + C2 f^2 + C3 f^3."""
    c = 51e-15 - 260e-27 * F + 21e-36 * F**2 - 0.14e-45 * F**3
    found = reflection('kind = "open"\ncapacitance = [51e-15, -260e-27, 21e-36, -0.14e-45]')
    np.testing.assert_allclose(found, np.exp(-2j * np.arctan(2 * np.pi * F * c * 50)), atol=1e-12)


def test_an_inductance_turns_the_short_the_same_way():
    """Gamma = -exp(-2j atan(w L / Z0)) (circuit theory)."""
    inductance = 2.3e-12 - 110e-24 * F + 2.0e-33 * F**2 - 0.01e-42 * F**3
    found = reflection('kind = "short"\ninductance = [2.3e-12, -110e-24, 2.0e-33, -0.01e-42]')
    np.testing.assert_allclose(found, -np.exp(-2j * np.arctan(2 * np.pi * F * inductance / 50)), atol=1e-12)


def test_a_short_behind_a_line_of_another_impedance():
    """Zin = j Z tan(theta) seen in 50 ohm (line theory)."""
    z_in = 75j * np.tan(2 * np.pi * F * 23e-12)
    found = reflection('kind = "short"\noffset_delay_ps = 23.0\noffset_impedance_ohm = 75.0')
    np.testing.assert_allclose(found, (z_in - 50) / (z_in + 50), atol=1e-12)


def test_a_lossy_offset_short_is_the_line_with_series_loss():
    """Zin = Zc tanh(gamma l), with gamma l = j w tau + (1+j) a and Zc as the kit file's law has them."""
    root, w, tau, loss = np.sqrt(F / 1e9), 2 * np.pi * F, 31e-12, 2.2e9
    a = loss * tau * root / (2 * 50)
    zc = 50 + (1 - 1j) * loss / (2 * w) * root
    z_in = zc * np.tanh(1j * w * tau + (1 + 1j) * a)
    found = reflection('kind = "short"\noffset_delay_ps = 31.0\noffset_loss_gohm_per_s = 2.2')
    np.testing.assert_allclose(found, (z_in - 50) / (z_in + 50), atol=1e-12)
    assert (np.abs(found) < 1).all()


def test_that_law_is_the_first_order_of_a_skin_effect_line():
    """gamma = sqrt((R + j w L')(j w C)), L' = L + R / w: series resistance and inner inductance of equal reactance."""
    tau, loss = 31e-12, 2.2e9
    w, resistance = 2 * np.pi * F, loss * tau * np.sqrt(F / 1e9)
    inductance, capacitance = 50 * tau, tau / 50
    z = resistance + 1j * (w * inductance + resistance)
    y = 1j * w * capacitance
    z_in = np.sqrt(z / y) * np.tanh(np.sqrt(z * y))
    found = reflection('kind = "short"\noffset_delay_ps = 31.0\noffset_loss_gohm_per_s = 2.2')
    np.testing.assert_allclose(found, (z_in - 50) / (z_in + 50), atol=2e-4)


def test_at_zero_frequency_only_the_termination_is_left():
    f = np.array([0.0, 1e9])
    lossy = "offset_delay_ps = 31.0\noffset_loss_gohm_per_s = 2.2"
    for kind, end in (("short", -1), ("open", 1), ('load"\nresistance_ohm = 75.0 #', 0.2)):
        assert reflection(f'kind = "{kind}"\n{lossy}', f)[0] == pytest.approx(end, abs=1e-12)


def test_a_load_of_75_ohm():
    """(75 - 50) / (75 + 50) = 0.2; with 10 nH at 1 GHz, Z = 75 + 62.83j (circuit theory)."""
    np.testing.assert_allclose(reflection('kind = "load"\nresistance_ohm = 75.0'), 0.2, atol=1e-15)
    found = reflection('kind = "load"\nresistance_ohm = 75.0\ninductance_h = 10e-9', np.array([1e9]))
    z = 75 + 2j * np.pi * 10
    np.testing.assert_allclose(found, (z - 50) / (z + 50), atol=1e-12)


# ---- coaxial line


def test_air_line_of_7_by_3_04_millimetres():
    """Z = (eta0 / 2 pi) ln(D / d): 50.01 ohm in vacuum. In air, eps 1.000 649 at 23 degrees C and 50 % humidity as
    IEEE Std 287 has it (from memory), 49.99 ohm, the figure printed for precision air lines."""
    vacuum = FREE_SPACE_OHM / (2 * np.pi) * np.log(7.0 / 3.04)
    air = 1.000649
    assert vacuum == pytest.approx(50.01, abs=0.005)
    assert vacuum / np.sqrt(air) == pytest.approx(49.99, abs=0.005)
    line = f"""
[standards.air]
kind = "line"
length_m = 0.15
effective_permittivity = {air}
impedance_ohm = {vacuum / np.sqrt(air)}
"""
    response = kit(line).response("air", F).values
    # All that is left of a mismatch this small is below 2e-4, and 15 cm of air delay by 500.5 ps.
    assert np.abs(response[:, 0, 0]).max() < 2e-4
    delay = -np.unwrap(np.angle(kit(line).transmission("air", F).values))[-1] / (2 * np.pi * F[-1])
    turns = np.round((0.15 * np.sqrt(air) / LIGHT_SPEED - delay) * F[-1])
    assert delay + turns / F[-1] == pytest.approx(500.5e-12, abs=0.05e-12)


# ---- rectangular waveguide


@pytest.mark.parametrize(
    ("name", "width_mm", "cutoff_ghz"),
    [
        # Widths in inches: 0.900 and 0.100 (EIA designations WR-90 and WR-10); cut-offs as printed in tables.
        ("WR-90", 22.86, 6.557),
        ("WR-10", 2.54, 59.01),
    ],
)
def test_cutoff_and_guide_wavelength(name, width_mm, cutoff_ghz):
    """f_c = c / 2a for TE10; lambda_g = lambda / sqrt(1 - (f_c / f)^2); Pozar, waveguide chapter (from memory)."""
    cutoff = LIGHT_SPEED / (2 * width_mm * 1e-3)
    assert cutoff / 1e9 == pytest.approx(cutoff_ghz, abs=0.0006 if cutoff_ghz < 10 else 0.006)
    f = cutoff * np.array([1.05, 1.25, 1.6, 1.9])
    gamma = line_constant(f, permittivity=1.0, loss_db_per_m=0.0, cutoff=cutoff)
    guide = LIGHT_SPEED / f / np.sqrt(1 - (cutoff / f) ** 2)
    np.testing.assert_allclose(gamma, 2j * np.pi / guide, rtol=1e-12, atol=0)
    quarter = f"""
[standards.quarter]
kind = "line"
length_m = {guide[2] / 4}
cutoff_hz = {cutoff}
"""
    through = kit(quarter).transmission("quarter", f[2:3]).values
    np.testing.assert_allclose(through, -1j, atol=1e-12)


def test_a_figure_for_wr90_at_10_ghz():
    """beta = 158 rad/m, guide wavelength 39.7 mm at 10 GHz (worked examples in textbooks, from memory)."""
    cutoff = LIGHT_SPEED / (2 * 22.86e-3)
    gamma = line_constant(np.array([10e9]), permittivity=1.0, loss_db_per_m=0.0, cutoff=cutoff)[0]
    assert gamma.imag == pytest.approx(158.2, abs=0.1) and abs(gamma.real) < 1e-9
    assert 2 * np.pi / gamma.imag == pytest.approx(39.7e-3, abs=0.05e-3)


def test_below_cutoff_the_field_dies_away():
    """alpha = (2 pi / c) sqrt(f_c^2 - f^2), no phase (waveguide theory)."""
    cutoff = 6.557e9
    f = np.array([0.0, 3e9, 6e9])
    gamma = line_constant(f, permittivity=1.0, loss_db_per_m=0.0, cutoff=cutoff)
    np.testing.assert_allclose(gamma, 2 * np.pi / LIGHT_SPEED * np.sqrt(cutoff**2 - f**2), rtol=1e-12)
    passed = kit(f'[standards.x]\nkind = "line"\nlength_m = 0.02\ncutoff_hz = {cutoff}').transmission("x", f)
    np.testing.assert_allclose(np.angle(passed), 0, atol=1e-12)
    assert (np.abs(passed) < 1).all()


def test_a_tem_line_has_no_cutoff_and_loses_with_the_root_of_frequency():
    """beta = w sqrt(eps) / c; 5 dB/m at 1 GHz are 10 dB/m at 4 GHz (skin effect)."""
    f = np.array([1e9, 4e9])
    gamma = line_constant(f, permittivity=2.9, loss_db_per_m=5.0, cutoff=0.0)
    np.testing.assert_allclose(gamma.imag, 2 * np.pi * f * np.sqrt(2.9) / LIGHT_SPEED, rtol=1e-12)
    np.testing.assert_allclose(20 * np.log10(np.exp(gamma.real)), [5.0, 10.0], rtol=1e-12)


def test_a_mismatched_line():
    """A 75 ohm line in 50 ohm, from its chain matrix (line theory)."""
    theta, g = 2 * np.pi * F * 60e-12, np.exp(-2j * np.pi * F * 60e-12)
    a, b, c = np.cos(theta), 75j * np.sin(theta), 1j * np.sin(theta) / 75
    below = 2 * a + b / 50 + c * 50
    length = 60e-12 * LIGHT_SPEED
    own = kit(f'[standards.x]\nkind = "line"\nlength_m = {length}\nimpedance_ohm = 75.0')
    s = own.response("x", F).values
    np.testing.assert_allclose(s[:, 0, 0], (b / 50 - c * 50) / below, atol=1e-12)
    np.testing.assert_allclose(s[:, 1, 0], 2 / below, atol=1e-12)
    np.testing.assert_allclose(own.transmission("x", F), g, atol=1e-12)
