"""The labelled array: built, checked, selected; every refusal read in full."""

import re

import numpy as np
import pytest
import xarray as xr

from deembed.errors import DeembedError, GridError, PortError
from deembed.labels import (
    check,
    ports_of,
    relabel_ports,
    same_grid,
    same_impedance,
    select_ports,
    sparams,
    with_z0,
    z0_of,
)

F = np.array([1e9, 2e9, 3e9])


def some(*leading, n=2, **more):
    rng = np.random.default_rng(3)
    shape = (*leading, 3, n, n)
    return sparams(rng.normal(size=shape) + 1j * rng.normal(size=shape), F, **more)


def test_what_is_built():
    s = some(4, n=3, ports=[1, 2, 5], z0=[50, 75, 25 + 1j])
    assert s.dims == ("draw", "frequency", "port_out", "port_in") and s.dtype == np.complex128
    assert ports_of(s) == (1, 2, 5)
    np.testing.assert_array_equal(s.z0, [50, 75, 25 + 1j])
    assert some(2, 4).dims[:2] == ("extra_1", "extra_2")
    assert some(2, 4, leading=["part", "sweep"]).dims[:2] == ("part", "sweep")


@pytest.mark.parametrize(
    ("make", "error", "message"),
    [
        (
            lambda: sparams(np.zeros((3, 2, 1)), F),
            DeembedError,
            "values have shape (3, 2, 1) for 3 frequencies",
        ),
        (
            lambda: sparams(np.zeros((2, 2, 2)), F),
            DeembedError,
            "needed (..., 3, ports, ports). Put frequency third",
        ),
        (lambda: sparams(np.zeros((2, 2)), F), DeembedError, "values have shape (2, 2) for 3 frequencies"),
        (lambda: some(ports=[1]), PortError, "S-parameters: 2 ports but labels [1]. Name each port once."),
        (
            lambda: some(ports=[1, 1]),
            PortError,
            "port_out labels are [1, 1]. Ports are whole numbers from 1, each",
        ),
        (lambda: some(ports=[0, 1]), PortError, "port_out labels are [0, 1]."),
        (lambda: some(ports=[1.5, 2]), PortError, "port_out labels are [1.5, 2.0]."),
        (lambda: some(leading=["draw"]), DeembedError, "0 leading dims but 1 names ('draw',)"),
        (
            lambda: some(z0=-50),
            DeembedError,
            "reference impedance z0: -50+0j ohm; the real part must be positive",
        ),
        (
            lambda: some(z0=[50, 0]),
            DeembedError,
            "0+0j ohm; the real part must be positive and finite. Pseudo-waves",
        ),
        (lambda: some(z0=[50, np.nan]), DeembedError, "the real part must be positive and finite"),
        (
            lambda: some(z0=[50, 50, 50]),
            DeembedError,
            "z0 has shape (3,); needed one value, one per port (2) or one",
        ),
        (
            lambda: sparams(np.zeros((2, 1, 1)), [1e9, 1e9]),
            GridError,
            "from point 1 (1e+09 Hz) to point 2 (1e+09 Hz)",
        ),
        (lambda: sparams(np.zeros((2, 1, 1)), [2e9, 1e9]), GridError, "frequency does not rise. Sort"[:23]),
        (
            lambda: sparams(np.zeros((1, 1, 1)), [-1.0]),
            GridError,
            "S-parameters: frequency -1 Hz. Needed: 0 Hz or",
        ),
        (lambda: sparams(np.zeros((1, 1, 1)), [np.nan]), GridError, "frequency nan Hz"),
        (lambda: sparams(np.zeros((0, 1, 1)), []), GridError, "S-parameters: no frequency points"),
        (
            lambda: check(3, what="arm 1"),
            DeembedError,
            "arm 1: a int came; needed a labelled array. Build it with",
        ),
        (lambda: check(some().rename(port_in="x")), DeembedError, "port_in missing or without labels"),
        (
            lambda: check(some().drop_vars("z0")),
            DeembedError,
            "no reference impedance. Give it with deembed.sparams",
        ),
        (
            lambda: check(some().assign_coords(port_in=[1, 3])),
            PortError,
            "port_out is [1, 2] but port_in is [1, 3]",
        ),
        (
            lambda: select_ports(some(), [3]),
            PortError,
            "ports [3] asked for; there are [1, 2]. Name ports that exist",
        ),
        (lambda: select_ports(some(), [1, 1]), PortError, "ports [1, 1] asked for; there are [1, 2]."),
        (lambda: select_ports(some(), []), PortError, "ports [] asked for"),
        (
            lambda: relabel_ports(some(), [4]),
            PortError,
            "new port numbers: labels [4] for the 2 ports [1, 2]",
        ),
        (lambda: relabel_ports(some(), {1: 2}), PortError, "labels [2, 2] for the 2 ports [1, 2]"),
    ],
)
def test_what_cannot_be_is_said(make, error, message):
    with pytest.raises(error, match=re.escape(message)):
        make()


def test_check_puts_dims_and_ports_in_order():
    s = some(4, n=3)
    shuffled = s.transpose("port_in", "frequency", "draw", "port_out").sel(port_in=[3, 1, 2])
    xr.testing.assert_identical(check(shuffled), s)
    assert check(s.real).dtype == np.complex128


def test_ports_are_selected_reordered_and_renamed():
    s = some(n=3, z0=[10, 20, 30])
    picked = select_ports(s, [3, 1])
    assert ports_of(picked) == (3, 1)
    assert picked.values[0, 0, 1] == s.values[0, 2, 0]
    np.testing.assert_array_equal(picked.z0, [30, 10])
    assert ports_of(relabel_ports(s, {3: 7})) == (1, 2, 7)


def test_impedances_line_up_with_the_leading_dims():
    s = some(4)
    assert z0_of(s).shape == (1, 2)
    assert z0_of(with_z0(s, np.full((3, 2), 60))).shape == (1, 3, 2)
    z = xr.DataArray(50 + np.arange(4.0), dims="draw")
    each = z0_of(with_z0(s, z))
    assert each.shape == (4, 1, 2)
    np.testing.assert_array_equal(each[:, 0, 1], 50 + np.arange(4))


def test_two_grids_that_differ_are_both_named():
    a, b = some(), sparams(np.zeros((2, 1, 1)), [1e9, 4e9])
    with pytest.raises(
        GridError,
        match=re.escape(
            "frequency grids differ: open 1 has 3 points, 1 GHz to 3 GHz; short 1 has 2 points, 1 GHz to 4 GHz"
        ),
    ):
        same_grid(a, b, names=("open 1", "short 1"))
    c = a.assign_coords(frequency=[1e9, 2.5e9, 3e9])
    with pytest.raises(GridError, match="they first differ at point 2: 2000000000 Hz and 2500000000 Hz"):
        same_grid(a, c, names=("open 1", "short 1"))
    same_grid(a, a.copy(deep=True), names=("a", "b"))


def test_two_impedances_that_differ_are_both_named():
    with pytest.raises(
        DeembedError,
        match=re.escape("impedances differ: the part is in 50 and 50 ohm, arm 1 in 50 and 75 ohm"),
    ):
        same_impedance(some(), some(z0=[50, 75]), names=("the part", "arm 1"))
