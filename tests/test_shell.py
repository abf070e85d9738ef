"""Labelled shells: arms and coupled fixtures, put on and taken off, against scikit-rf."""

import re

import numpy as np
import pytest
import skrf
from hypothesis import assume, given
from hypothesis import strategies as st

from deembed.errors import DeembedError, GridError, PortError
from deembed.labels import ports_of, relabel_ports, select_ports, sparams
from deembed.shell import arm_of, embed, shell_from_arms, shell_from_network, strip

F = np.linspace(1e9, 2e9, 3)


def network(rng, n, *leading, scale=0.3, **more):
    shape = (*leading, 3, n, n)
    return sparams(scale * (rng.normal(size=shape) + 1j * rng.normal(size=shape)), F, **more)


def arm(rng, *leading, **more):
    s = network(rng, 2, *leading, scale=0.2, **more)
    s.values[..., 0, 1] += 0.8
    s.values[..., 1, 0] += 0.8
    return s


@given(seed=st.integers(0, 100_000), sides=st.lists(st.sampled_from([1, 2]), min_size=3, max_size=3))
def test_random_arms_come_off_exactly(seed, sides):
    rng = np.random.default_rng(seed)
    arms = {p: arm(rng) for p in (1, 2, 3)}
    shell = shell_from_arms(arms, analyzer_side=dict(zip((1, 2, 3), sides, strict=True)))
    part = network(rng, 3, 4)
    through = np.abs(np.concatenate([a.values[:, [0, 1], [1, 0]].ravel() for a in arms.values()]))
    assume(through.min() > 0.1)
    seen = embed(shell, part)
    assume(np.abs(seen).max() < 100)
    np.testing.assert_allclose(strip(shell, seen).values, part.values, atol=1e-9)


def test_arms_are_cascaded_as_scikit_rf_cascades_them(rng):
    arms = {1: arm(rng), 2: arm(rng)}
    part = network(rng, 2)
    seen = embed(shell_from_arms(arms, analyzer_side={1: 1, 2: 2}), part)
    first, middle, second = (
        skrf.Network(f=F, f_unit="Hz", s=x.values, z0=50) for x in (arms[1], part, arms[2])
    )
    np.testing.assert_allclose(seen.values, (first**middle**second).s, atol=1e-12)


def test_a_coupled_fixture_comes_off_and_keeps_its_port_map(rng):
    whole = network(rng, 6, scale=0.1, z0=[50, 75, 50, 25, 50, 60])
    for i, j in ((0, 4), (2, 3), (5, 1)):
        whole.values[:, [i, j], [j, i]] += 0.9
    shell = shell_from_network(
        whole, analyzer_side_ports=[1, 3, 6], part_side_ports=[5, 4, 2], ports=[1, 2, 3]
    )
    np.testing.assert_array_equal(shell.z0_outer, [50, 50, 60])
    np.testing.assert_array_equal(shell.z0_inner, [50, 25, 75])
    part = network(rng, 3, z0=[50, 25, 75])
    seen = embed(shell, part)
    np.testing.assert_array_equal(seen.z0, [50, 50, 60])
    back = strip(shell, seen)
    np.testing.assert_allclose(back.values, part.values, atol=1e-9)
    np.testing.assert_array_equal(back.z0, [50, 25, 75])


def test_a_coupled_network_of_plain_arms_is_those_arms(rng):
    arms = {1: arm(rng), 2: arm(rng)}
    joined = np.zeros((3, 4, 4), dtype=complex)
    for k, a in enumerate(arms.values()):
        joined[:, k::2, k::2] = a.values
    shell = shell_from_network(sparams(joined, F), analyzer_side_ports=[1, 2], part_side_ports=[3, 4])
    part = network(rng, 2)
    np.testing.assert_allclose(
        embed(shell, part).values, embed(shell_from_arms(arms), part).values, atol=1e-12
    )


def test_an_arm_is_given_back_analyzer_side_first(rng):
    own = arm(rng, z0=[50, 30])
    back = arm_of(shell_from_arms({2: own}, analyzer_side=2, ports=[1, 2]), 2)
    turned = relabel_ports(select_ports(own, [2, 1]), [1, 2])
    np.testing.assert_array_equal(back.values, turned.values)
    np.testing.assert_array_equal(back.z0, [30, 50])


def test_a_port_without_an_arm_passes_straight_through(rng):
    shell = shell_from_arms({2: arm(rng)}, ports=[1, 2, 3])
    np.testing.assert_array_equal(arm_of(shell, 3).values, np.broadcast_to([[0, 1], [1, 0]], (3, 2, 2)))


def test_arms_with_draws_give_a_part_with_draws(rng):
    shell = shell_from_arms({1: arm(rng, 5), 2: arm(rng)})
    out = strip(shell, network(rng, 2))
    assert dict(out.sizes) == {"draw": 5, "frequency": 3, "port_out": 2, "port_in": 2}


def test_ports_are_matched_by_number_not_by_place(rng):
    shell = shell_from_arms({1: arm(rng), 2: arm(rng)})
    part = network(rng, 2)
    turned = select_ports(part, [2, 1])
    np.testing.assert_allclose(embed(shell, turned).values, embed(shell, part).values, atol=1e-12)
    assert ports_of(embed(shell, turned)) == (1, 2)


CASES = [
    (
        lambda r: shell_from_arms({4: arm(r)}, ports=[1, 2]),
        PortError,
        "arms at part ports [4]; the part has [1, 2].",
    ),
    (lambda r: shell_from_arms({}, ports=[1]), PortError, "fixture: arms at part ports []"),
    (
        lambda r: shell_from_arms({1: arm(r)}, analyzer_side=3),
        PortError,
        "arm 1: the network has ports [1, 2] and analyzer_side is 3. An arm is a two-port",
    ),
    (lambda r: shell_from_arms({1: network(r, 3)}), PortError, "arm 1: the network has ports [1, 2, 3]"),
    (
        lambda r: shell_from_arms({1: arm(r), 2: arm(r).assign_coords(frequency=F * 2)}),
        GridError,
        "arm 1 has 3 points, 1 GHz to 2 GHz; arm 2 has 3 points, 2 GHz to 4 GHz",
    ),
    (
        lambda r: shell_from_network(network(r, 4), analyzer_side_ports=[1, 2], part_side_ports=[2, 3]),
        PortError,
        "fixture port map: analyzer side [1, 2], part side [2, 3] and part ports [1, 2] for a network with ports",
    ),
    (
        lambda r: arm_of(shell_from_arms({1: arm(r)}), 2),
        PortError,
        "no arm at part port 2; the fixture has [1]",
    ),
    (
        lambda r: strip(shell_from_arms({1: arm(r)}), network(r, 2)),
        PortError,
        "the reading has ports [1, 2]; the fixture has [1]",
    ),
    (
        lambda r: strip(shell_from_arms({1: arm(r, z0=75)}), network(r, 1)),
        DeembedError,
        "the reading is in 50 ohm, the fixture's analyzer side in 75 ohm. Renormalize one of them first.",
    ),
    (
        lambda r: embed(shell_from_arms({1: arm(r, z0=75)}), network(r, 1)),
        DeembedError,
        "the part is in 50 ohm, the fixture's part side in 75 ohm",
    ),
]


@pytest.mark.parametrize("case", range(len(CASES)))
def test_what_cannot_be_is_said(case, rng):
    act, error, message = CASES[case]
    with pytest.raises(error, match=re.escape(message)):
        act(rng)
