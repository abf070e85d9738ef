"""Conversion tables, a lossless line's transfer matrix and resistive pads, from textbooks.

Two-port conversions in one real impedance as tabulated in Pozar, Microwave Engineering, chapter on network analysis
(from memory), and the same with two complex impedances as in Frickey, "Conversions between S, Z, Y, h, ABCD, and T
parameters which are valid for complex source and load impedances", IEEE Trans. MTT 42(2), 205-211, 1994, whose power
waves equal pseudo-waves where impedances are real. Every table entry is written out here, element by element.
"""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.labels import sparams
from deembed.networks import (
    admittance,
    cascade,
    chain,
    from_admittance,
    from_chain,
    from_impedance,
    impedance,
    transfer,
)

F = np.array([1e9, 2e9, 3e9])
SEEDS = st.integers(0, 2**32 - 1)


def labelled(rows, z0=50.0):
    """A two-port from its four elements, numbers or arrays over frequency."""
    (a, b), (c, d) = rows
    s = np.stack([np.broadcast_to(np.asarray(v, dtype=complex), F.shape) for v in (a, b, c, d)], axis=-1)
    return sparams(s.reshape(F.size, 2, 2), F, z0=z0)


def four(s):
    return [s.values[..., i, j] for i in (0, 1) for j in (0, 1)]


def random_two_port(seed):
    rng = np.random.default_rng(seed)
    s = 0.45 * (rng.uniform(-1, 1, (4, F.size)) + 1j * rng.uniform(-1, 1, (4, F.size)))
    s[1:3] += 0.3 * np.exp(2j * np.pi * rng.uniform(size=(2, F.size)))  # it passes something
    return s


def close(found, rows):
    for ours, table in zip(four(found), [v for row in rows for v in row], strict=True):
        np.testing.assert_allclose(ours, np.broadcast_to(table, F.shape), rtol=1e-9, atol=1e-9)


@given(SEEDS, st.sampled_from([50.0, 75.0, 12.5]))
@settings(max_examples=40)
def test_the_table_of_z_y_and_abcd(seed, z0):
    s11, s12, s21, s22 = random_two_port(seed)
    s = labelled([[s11, s12], [s21, s22]], z0)
    y0, cross = 1 / z0, s12 * s21
    below = (1 - s11) * (1 - s22) - cross
    close(
        impedance(s),
        [
            [z0 * ((1 + s11) * (1 - s22) + cross) / below, z0 * 2 * s12 / below],
            [z0 * 2 * s21 / below, z0 * ((1 - s11) * (1 + s22) + cross) / below],
        ],
    )
    below = (1 + s11) * (1 + s22) - cross
    close(
        admittance(s),
        [
            [y0 * ((1 - s11) * (1 + s22) + cross) / below, -y0 * 2 * s12 / below],
            [-y0 * 2 * s21 / below, y0 * ((1 + s11) * (1 - s22) + cross) / below],
        ],
    )
    close(
        chain(s),
        [
            [((1 + s11) * (1 - s22) + cross) / (2 * s21), z0 * ((1 + s11) * (1 + s22) - cross) / (2 * s21)],
            [y0 * ((1 - s11) * (1 - s22) - cross) / (2 * s21), ((1 - s11) * (1 + s22) + cross) / (2 * s21)],
        ],
    )


@given(SEEDS)
@settings(max_examples=40)
def test_the_table_back_to_s(seed):
    z0, y0 = 50.0, 0.02
    z11, z12, z21, z22 = 100 * random_two_port(seed) + np.array([[60.0], [0], [0], [60.0]])
    below = (z11 + z0) * (z22 + z0) - z12 * z21
    close(
        from_impedance(labelled([[z11, z12], [z21, z22]])),
        [
            [((z11 - z0) * (z22 + z0) - z12 * z21) / below, 2 * z12 * z0 / below],
            [2 * z21 * z0 / below, ((z11 + z0) * (z22 - z0) - z12 * z21) / below],
        ],
    )
    y11, y12, y21, y22 = 0.01 * random_two_port(seed) + np.array([[0.02], [0], [0], [0.02]])
    below = (y11 + y0) * (y22 + y0) - y12 * y21
    close(
        from_admittance(labelled([[y11, y12], [y21, y22]])),
        [
            [((y0 - y11) * (y0 + y22) + y12 * y21) / below, -2 * y12 * y0 / below],
            [-2 * y21 * y0 / below, ((y0 + y11) * (y0 - y22) + y12 * y21) / below],
        ],
    )
    a, b, c, d = random_two_port(seed) * np.array([[1.0], [z0], [y0], [1.0]]) + np.array([[2], [0], [0], [2]])
    below = a + b / z0 + c * z0 + d
    close(
        from_chain(labelled([[a, b], [c, d]])),
        [
            [(a + b / z0 - c * z0 - d) / below, 2 * (a * d - b * c) / below],
            [2 / below, (-a + b / z0 - c * z0 + d) / below],
        ],
    )


@given(SEEDS)
@settings(max_examples=40)
def test_the_table_with_two_impedances(seed):
    """Frickey's entries for real source and load impedance: S21 carries sqrt(R1 R2)."""
    r1, r2 = 30.0, 110.0
    z11, z12, z21, z22 = 100 * random_two_port(seed) + np.array([[60.0], [0], [0], [60.0]])
    below = (z11 + r1) * (z22 + r2) - z12 * z21
    z = labelled([[z11, z12], [z21, z22]], z0=[r1, r2])
    s = [
        [((z11 - r1) * (z22 + r2) - z12 * z21) / below, 2 * z12 * np.sqrt(r1 * r2) / below],
        [2 * z21 * np.sqrt(r1 * r2) / below, ((z11 + r1) * (z22 - r2) - z12 * z21) / below],
    ]
    close(from_impedance(z), s)
    close(impedance(labelled(s, z0=[r1, r2])), [[z11, z12], [z21, z22]])


# ---- elements whose chain matrices every textbook prints


def series(z):
    return from_chain(labelled([[1, z], [0, 1]]))


def shunt(z):
    return from_chain(labelled([[1, 0], [1 / z, 1]]))


def test_a_series_and_a_shunt_element():
    """S11 = Z / (Z + 2 Z0) in series, -Z0 / (2 Z + Z0) in shunt (circuit theory)."""
    z = 30 + 40j
    close(series(z), [[z / (z + 100), 100 / (z + 100)], [100 / (z + 100), z / (z + 100)]])
    across = 2 * z / (2 * z + 50)
    close(shunt(z), [[-50 / (2 * z + 50), across], [across, -50 / (2 * z + 50)]])


@pytest.mark.parametrize(
    ("shape", "loss_db", "outer", "middle"),
    [
        # 3 dB in 50 ohm: printed in attenuator tables of handbooks (from memory), recomputed by the formulas below.
        ("T", 3.0, 8.550, 141.93),
        ("pi", 3.0, 292.40, 17.615),
    ],
)
def test_matched_pads(shape, loss_db, outer, middle):
    """T: R1 = Z0 (k-1)/(k+1), R2 = 2 Z0 k/(k^2-1); pi: R1 = Z0 (k+1)/(k-1), R2 = Z0 (k^2-1)/(2k); k = 10^(dB/20)."""
    k = 10 ** (loss_db / 20)
    if shape == "T":
        exact = 50 * (k - 1) / (k + 1), 100 * k / (k * k - 1)
        pad = cascade(cascade(series(exact[0]), shunt(exact[1])), series(exact[0]))
        printed = cascade(cascade(series(outer), shunt(middle)), series(outer))
    else:
        exact = 50 * (k + 1) / (k - 1), 50 * (k * k - 1) / (2 * k)
        pad = cascade(cascade(shunt(exact[0]), series(exact[1])), shunt(exact[0]))
        printed = cascade(cascade(shunt(outer), series(middle)), shunt(outer))
    assert exact == pytest.approx((outer, middle), rel=5e-5)
    close(pad, [[0, 1 / k], [1 / k, 0]])
    reflection = 20 * np.log10(np.abs(printed.values[:, 0, 0]))
    assert (reflection < -80).all()
    np.testing.assert_allclose(20 * np.log10(np.abs(printed.values[:, 1, 0])), -loss_db, atol=0.001)


@pytest.mark.parametrize("loss_db", [1.0, 6.0, 20.0, 40.0])
def test_pads_of_any_loss_are_matched_and_lose_that_much(loss_db):
    """The same handbook formulas at other losses."""
    k = 10 ** (loss_db / 20)
    arm, across = 50 * (k - 1) / (k + 1), 100 * k / (k * k - 1)
    close(cascade(cascade(series(arm), shunt(across)), series(arm)), [[0, 1 / k], [1 / k, 0]])


def test_a_lossless_line():
    """ABCD: cos, j Z sin, j sin / Z, cos; in its own impedance [b1; a1] = T [a2; b2] is diagonal (line theory)."""
    theta = 2 * np.pi * F * 35e-12
    abcd = [[np.cos(theta), 50j * np.sin(theta)], [1j * np.sin(theta) / 50, np.cos(theta)]]
    through = np.exp(-1j * theta)
    line = labelled([[0, through], [through, 0]])
    close(chain(line), abcd)
    close(from_chain(labelled(abcd)), [[0, through], [through, 0]])
    close(transfer(line), [[through, 0], [0, np.conj(through)]])
    close(transfer(cascade(line, line)), [[through**2, 0], [0, np.conj(through) ** 2]])


def test_a_quarter_wave_turns_an_impedance_over():
    """Zin = Z^2 / ZL: 70.7 ohm between 50 and 100 ohm is matched at mid band (line theory)."""
    z, theta = np.sqrt(50 * 100), np.pi / 2 * F / 2e9
    line = from_chain(
        labelled([[np.cos(theta), 1j * z * np.sin(theta)], [1j * np.sin(theta) / z, np.cos(theta)]]),
        z0=[50.0, 100.0],
    )
    np.testing.assert_allclose(np.abs(line.values[1]), [[0, 1], [1, 0]], atol=1e-12)
    assert (np.abs(line.values[[0, 2], 0, 0]) > 0.1).all()
