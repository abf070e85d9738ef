"""Other grids: exact on known points, on delays and on cubics."""

from __future__ import annotations

import numpy as np

from deembed.numeric.regrid import delay_of, onto_grid


def test_the_delay_is_found_and_a_pure_delay_survives_exactly() -> None:
    own = np.linspace(1e9, 3e9, 41)
    target = np.linspace(1e9, 3e9, 57)
    values = np.exp(-2j * np.pi * own * np.array([[0.3e-9], [5e-9]])) * np.array([[0.5], [2.0]])
    assert np.allclose(delay_of(values, own), [0.3e-9, 5e-9], rtol=1e-9)
    exact = np.exp(-2j * np.pi * target * np.array([[0.3e-9], [5e-9]])) * np.array([[0.5], [2.0]])
    assert np.abs(onto_grid(values, own, target) - exact).max() < 1e-12


def test_a_cubic_is_met_exactly_also_on_an_uneven_grid() -> None:
    own = np.array([0.0, 1.0, 3.0, 4.0, 7.0, 9.0])
    target = np.array([0.5, 3.5, 8.9])
    cubic = lambda f: 1 + 0.1 * f - 0.02 * f**2 + 0.003 * f**3  # noqa: E731
    assert np.abs(onto_grid(cubic(own).astype(complex), own, target) - cubic(target)).max() < 1e-12


def test_what_is_not_a_number_stays_local_and_known_points_are_kept_bit_for_bit() -> None:
    own = np.linspace(0.0, 10.0, 11)
    values = np.exp(-1j * own)
    values[5] = np.nan
    out = onto_grid(values, own, np.array([0.0, 1.5, 4.0, 4.5, 9.5]))
    assert out[0] == values[0] and out[2] == values[4]
    assert np.isnan(out).tolist() == [False, False, False, True, False]
    assert np.isnan(onto_grid(np.full(11, np.nan + 0j), own, np.array([0.5]))).all()
    assert onto_grid(np.array([1j]), np.array([5.0]), np.array([5.0])) == 1j
