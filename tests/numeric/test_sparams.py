"""S-parameter algebra against scikit-rf (pseudo-waves) and against itself, over every leading dim."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from skrf import network as skrf_network

from deembed.numeric import sparams as k

seeds = st.integers(0, 100_000)


def draw(rng, *shape, scale=0.3):
    return scale * (rng.normal(size=shape) + 1j * rng.normal(size=shape))


def impedances(rng, *shape):
    return rng.uniform(10, 150, size=shape) + 1j * rng.uniform(-60, 60, size=shape)


@given(seed=seeds, n=st.integers(1, 5))
def test_renormalize_z_and_y_agree_with_scikit_rf(seed, n):
    rng = np.random.default_rng(seed)
    s, z1, z2 = draw(rng, 6, n, n), impedances(rng, 6, n), impedances(rng, 6, n)
    np.testing.assert_allclose(
        k.renormalize(s, z1, z2), skrf_network.renormalize_s(s, z1, z2, s_def="pseudo"), atol=1e-9
    )
    z = skrf_network.s2z(s, z1, s_def="pseudo")
    np.testing.assert_allclose(k.s_to_z(s, z1), z, rtol=1e-9, atol=1e-9 * np.abs(z).max())
    y = skrf_network.s2y(s, z1, s_def="pseudo")
    np.testing.assert_allclose(k.s_to_y(s, z1), y, rtol=1e-9, atol=1e-9 * np.abs(y).max())


@given(seed=seeds, n=st.integers(1, 5))
def test_there_and_back_again(seed, n):
    rng = np.random.default_rng(seed)
    s, z1, z2 = draw(rng, 2, 4, n, n), impedances(rng, 4, n), impedances(rng, 2, 4, n)
    np.testing.assert_allclose(k.renormalize(k.renormalize(s, z1, z2), z2, z1), s, atol=1e-9)
    np.testing.assert_allclose(k.z_to_s(k.s_to_z(s, z2), z2), s, atol=1e-9)
    np.testing.assert_allclose(k.y_to_s(k.s_to_y(s, z2), z2), s, atol=1e-9)


@given(seed=seeds)
def test_chain_matrix_is_that_of_z(seed):
    """A = z11/z21, B = det Z/z21, C = 1/z21, D = z22/z21 (Pozar, Microwave Engineering, table of conversions)."""
    rng = np.random.default_rng(seed)
    s, z0 = draw(rng, 5, 2, 2), impedances(rng, 5, 2)
    z, abcd = k.s_to_z(s, z0), k.s_to_abcd(s, z0)
    by_z = np.stack([z[:, 0, 0], np.linalg.det(z), np.ones(5), z[:, 1, 1]], axis=-1) / z[:, 1, 0, None]
    np.testing.assert_allclose(abcd.reshape(5, 4), by_z, rtol=1e-8, atol=1e-8 * np.abs(by_z).max())
    np.testing.assert_allclose(k.abcd_to_s(abcd, z0), s, atol=1e-8)


@given(seed=seeds, m=st.integers(1, 3))
def test_transfer_matrices_multiply_as_networks_cascade(seed, m):
    rng = np.random.default_rng(seed)
    a, b = draw(rng, 3, 4, 2 * m, 2 * m), draw(rng, 4, 2 * m, 2 * m)
    both = k.cascade(a, b)
    product = k.t_to_s(k.s_to_t(a) @ k.s_to_t(b))
    np.testing.assert_allclose(product, both, atol=1e-7)
    np.testing.assert_allclose(k.t_to_s(k.s_to_t(a)), a, atol=1e-9)


def test_transfer_matrix_is_scikit_rf_s(rng):
    s = draw(rng, 5, 2, 2)
    np.testing.assert_allclose(k.s_to_t(s), skrf_network.s2t(s), atol=1e-12)


def test_cascade_works_where_nothing_passes():
    open_ended = np.array([[[0.5, 0], [0, 0.2]]])
    through = np.array([[[0, 1], [1, 0]]])
    np.testing.assert_array_equal(k.cascade(open_ended, through)[0], [[0.5, 0], [0, 0.2]])
    assert np.isnan(k.s_to_t(open_ended)).all()


@given(seed=seeds, n=st.integers(2, 5))
def test_closing_ports_is_connecting_loads(seed, n):
    """Waves: b = S a with a = G b at the closed ports, solved whole."""
    rng = np.random.default_rng(seed)
    s = draw(rng, 3, n, n)
    closed = rng.choice(n, size=rng.integers(1, n), replace=False)
    g = draw(rng, 3, closed.size)
    back = np.zeros((3, n, n), dtype=complex)
    back[:, closed, closed] = g
    kept = np.setdiff1d(np.arange(n), closed)
    whole = np.linalg.inv(np.eye(n) - s @ back) @ s
    np.testing.assert_allclose(k.close_ports(s, closed, g), whole[:, kept[:, None], kept], atol=1e-9)


def test_an_ideal_open_survives_renormalizing_and_has_no_impedance():
    one = np.array([[[1.0 + 0j]]])
    np.testing.assert_allclose(k.renormalize(one, [50.0], [75.0]), one, atol=1e-15)
    assert np.isnan(k.s_to_z(one, [50.0])).all()
    assert np.isnan(k.s_to_y(-one, [50.0])).all()


def test_a_load_in_its_own_impedance_is_matched():
    """Reflection of 75 ohm in 50 ohm is 0.2; renormalized to 75 ohm it is 0."""
    s = k.z_to_s(np.array([[[75.0 + 0j]]]), [50.0])
    np.testing.assert_allclose(s.item(), 0.2, atol=1e-15)
    np.testing.assert_allclose(k.renormalize(s, [50.0], [75.0]).item(), 0.0, atol=1e-15)
