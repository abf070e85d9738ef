"""Labelled algebra passes its arguments on and keeps labels, impedances and leading dims; values against scikit-rf."""

import re

import numpy as np
import pytest
import skrf
import xarray as xr

import deembed
from deembed import networks
from deembed.errors import DeembedError, GridError, PortError
from deembed.labels import ports_of, relabel_ports, sparams

F = np.linspace(1e9, 2e9, 4)


def some(rng, n=2, *leading, **more):
    shape = (*leading, 4, n, n)
    return sparams(0.3 * (rng.normal(size=shape) + 1j * rng.normal(size=shape)), F, **more)


def test_renormalize_keeps_labels_and_says_its_new_impedances(rng):
    s = some(rng, 3, 5, ports=[2, 4, 6])
    z = np.array([20, 30 + 4j, 70])
    out = networks.renormalize(s, z)
    assert ports_of(out) == (2, 4, 6) and out.dims == s.dims
    np.testing.assert_array_equal(out.z0, z)
    network = skrf.Network(f=F, f_unit="Hz", s=s.values[2], z0=50, s_def="pseudo")
    network.renormalize(z, s_def="pseudo")
    np.testing.assert_allclose(out.values[2], network.s, atol=1e-12)
    np.testing.assert_allclose(networks.renormalize(out, 50.0).values, s.values, atol=1e-12)


@pytest.mark.parametrize(
    ("there", "back"),
    [("impedance", "from_impedance"), ("admittance", "from_admittance"), ("chain", "from_chain")],
)
def test_conversions_return(there, back, rng):
    s = some(rng, 2, 5, z0=np.full((4, 2), 40 + 3j))
    again = getattr(networks, back)(getattr(networks, there)(s))
    np.testing.assert_allclose(again.values, s.values, atol=1e-10)
    np.testing.assert_array_equal(again.z0, s.z0)
    elsewhere = getattr(networks, back)(getattr(networks, there)(s), z0=75.0)
    np.testing.assert_allclose(elsewhere.values, networks.renormalize(s, 75.0).values, atol=1e-10)


def test_transfer_returns(rng):
    s = some(rng, 4, 2)
    np.testing.assert_allclose(networks.from_transfer(networks.transfer(s)).values, s.values, atol=1e-10)


def test_cascade_is_scikit_rf_s(rng):
    a, b = some(rng), some(rng, ports=[3, 9])
    both = deembed.cascade(a, b)
    first, second = (skrf.Network(f=F, f_unit="Hz", s=x.values, z0=50) for x in (a, b))
    np.testing.assert_allclose(both.values, (first**second).s, atol=1e-12)
    assert ports_of(both) == (1, 2)


def test_cascade_keeps_the_outer_impedances(rng):
    both = deembed.cascade(some(rng, z0=[50, 75]), some(rng, z0=[75, 25]))
    np.testing.assert_array_equal(both.z0, [50, 25])


def test_closed_ports_leave_the_others_under_their_own_numbers(rng):
    s = some(rng, 3, 5, z0=[50, 75, 50])
    g = sparams(np.full((4, 1, 1), 0.2), F, z0=75)
    closed = deembed.close_ports(s, {2: g})
    assert ports_of(closed) == (1, 3) and closed.dims == s.dims
    by_hand = s.values[..., 0, 2] + s.values[..., 0, 1] * 0.2 * s.values[..., 1, 2] / (
        1 - 0.2 * s.values[..., 1, 1]
    )
    np.testing.assert_allclose(closed.values[..., 0, 1], by_hand, atol=1e-12)


def test_a_closing_reflection_in_another_impedance_is_renormalized(rng):
    """75 ohm closes a port of 75 ohm without reflection, whatever impedance its file is in."""
    s = some(rng, 2, z0=[50, 75])
    in_fifty = sparams(np.full((4, 1, 1), 0.2), F, z0=50)
    np.testing.assert_allclose(
        deembed.close_ports(s, {2: in_fifty}).values[:, 0, 0], s.values[:, 0, 0], atol=1e-12
    )


def test_closings_with_a_draw_dim_broadcast(rng):
    s = some(rng, 2)
    g = xr.DataArray([0.1, 0.2, 0.3j], dims="draw")
    assert deembed.close_ports(s, {2: g}).dims == ("draw", "frequency", "port_out", "port_in")


def bad_cases(rng):
    a, b3 = some(rng), some(rng, 3)
    other = sparams(np.zeros((2, 2, 2)), [1e9, 2e9])
    return [
        (
            lambda: deembed.cascade(a, b3),
            PortError,
            "second of a cascade: 3 ports came; needed an even number",
        ),
        (lambda: deembed.cascade(a, some(rng, 4)), PortError, "cascade: 2 and 4 ports cannot be cascaded"),
        (
            lambda: deembed.cascade(a, other),
            GridError,
            "the first network has 4 points, 1 GHz to 2 GHz; the second",
        ),
        (
            lambda: deembed.cascade(a, some(rng, z0=75)),
            DeembedError,
            "the first ends in 50+0j ohm, the second starts in 75+0j ohm. Renormalize one of them first.",
        ),
        (lambda: deembed.chain(b3), PortError, "chain matrix: 3 ports came; needed two"),
        (
            lambda: deembed.transfer(b3),
            PortError,
            "wave-transfer matrix: 3 ports came; needed an even number",
        ),
        (
            lambda: deembed.close_ports(a, {3: 0.1}),
            PortError,
            "ports [3] are to be closed; there are [1, 2]. Close",
        ),
        (lambda: deembed.close_ports(a, {1: 0, 2: 0}), PortError, "leave at least one open"),
        (lambda: deembed.close_ports(a, {1: a}), PortError, "reflection at port 1: 2 ports came; needed one"),
        (
            lambda: deembed.close_ports(a, {1: sparams(np.zeros((1, 1, 1)), [1e9])}),
            GridError,
            "the reflection at port 1 has 1 point, 1 GHz",
        ),
    ]


@pytest.mark.parametrize("case", range(10))
def test_what_cannot_be_is_said(case, rng):
    act, error, message = bad_cases(rng)[case]
    with pytest.raises(error, match=re.escape(message)):
        act()


def test_nothing_closed_is_nothing_changed(rng):
    s = some(rng)
    xr.testing.assert_identical(deembed.close_ports(s, {}), s)
    assert relabel_ports(s, [1, 2]).equals(s)
