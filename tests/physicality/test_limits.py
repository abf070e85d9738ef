"""Figures of physicality against closed forms and scikit-rf."""

import numpy as np
import pytest
import skrf
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.errors import JobError
from deembed.labels import sparams
from deembed.networks import renormalize
from deembed.physicality.limits import limits, real_impedance, tolerances

F = np.linspace(1e9, 2e9, 11)
FIXED = settings(derandomize=True, deadline=None, max_examples=40)
SEEDS = st.integers(0, 2**32 - 1)


def random_s(rng, n=3, lead=()):
    shape = (*lead, F.size, n, n)
    return (rng.normal(size=shape) + 1j * rng.normal(size=shape)) / (2 * n)


@FIXED
@given(seed=SEEDS, n=st.integers(1, 5))
def test_figures_follow_their_definitions(seed, n):
    s = random_s(np.random.default_rng(seed), n)
    got = limits(sparams(s, F))
    gram = s.conj().swapaxes(1, 2) @ s
    eigen = np.linalg.eigvalsh(gram)
    np.testing.assert_allclose(got.largest_singular_value, np.sqrt(eigen[:, -1]), atol=1e-12)
    np.testing.assert_allclose(got.smallest_singular_value**2, np.maximum(eigen[:, 0], 0), atol=1e-12)
    np.testing.assert_allclose(
        got.lossless_error, np.linalg.norm(gram - np.eye(n), 2, axis=(1, 2)), atol=1e-12
    )
    np.testing.assert_allclose(got.power_balance, np.diagonal(gram, axis1=1, axis2=2).real, atol=1e-12)
    np.testing.assert_allclose(got.dissipation, 1 - np.trace(gram, axis1=1, axis2=2).real / n, atol=1e-12)
    np.testing.assert_array_equal(got.reciprocity_error, np.abs(s - s.swapaxes(1, 2)))
    np.testing.assert_array_equal(
        got.reciprocity_error_max, got.reciprocity_error.max(["port_out", "port_in"])
    )
    np.testing.assert_allclose(got.reflection_sum, np.abs(s[:, range(n), range(n)]).sum(axis=1), atol=1e-14)
    assert got.singular_values.sizes["rank"] == n


def test_gain_agrees_with_scikit_rf():
    """scikit-rf 2.2: `Network.passivity` is the element-wise root of S^H S."""
    s = random_s(np.random.default_rng(1))
    network = skrf.Network(frequency=skrf.Frequency.from_f(F, unit="hz"), s=s, z0=50)
    largest = np.linalg.eigvalsh(network.passivity**2).max(axis=1)
    np.testing.assert_allclose(limits(sparams(s, F)).largest_singular_value ** 2, largest, atol=1e-12)


def test_leading_dims_keep_every_entry():
    s = random_s(np.random.default_rng(2), lead=(2, 3))
    got = limits(sparams(s, F, leading=("part", "draw")))
    assert got.largest_singular_value.dims == ("part", "draw", "frequency")
    one = limits(sparams(s[1, 2], F))
    for name in one.data_vars:
        np.testing.assert_array_equal(got[name].isel(part=1, draw=2), one[name])


def test_missing_points_are_nan_and_hold_nothing():
    s = random_s(np.random.default_rng(3)) * 0
    s[4, 0, 1] = np.nan
    got = limits(sparams(s, F))
    for name in ("largest_singular_value", "lossless_error", "reciprocity_error_max", "three_way_slack"):
        assert np.flatnonzero(np.isnan(got[name])).tolist() == [4]
    assert got.holds.sel(property="reciprocal").values.tolist() == [True] * 4 + [False] + [True] * 6


def test_three_way_figures_are_for_three_ports():
    got = limits(sparams(random_s(np.random.default_rng(4), n=2), F))
    assert "three_way_slack" not in got
    assert got.attrs["three_way_absent"] == "the three-way law is for three-ports; this part has 2"


@FIXED
@given(seed=SEEDS)
def test_complex_reference_impedance_is_judged_in_its_real_part(seed):
    """A passive part stays passive whatever impedance its file was written in (Marks & Williams 1992)."""
    rng = np.random.default_rng(seed)
    u, _, v = np.linalg.svd(random_s(rng))
    part = sparams(u * rng.uniform(0, 1, (F.size, 1, 3)) @ v, F, z0=[40, 50, 75])
    written = renormalize(part, np.array([40 + 30j, 50 - 45j, 75 + 10j]))
    same, changed = real_impedance(written)
    assert changed and not real_impedance(part)[1]
    np.testing.assert_allclose(same, part, atol=1e-10)
    assert limits(written).largest_singular_value.max() < 1 + 1e-10
    assert limits(written).attrs["reference_impedance"].startswith("real part")


def test_tolerances_by_name_or_all_at_once():
    assert tolerances(None) == dict.fromkeys(tolerances(None), 0.01)
    assert tolerances(0.05)["match"] == 0.05
    assert tolerances({"gain": 0.2})["gain"] == 0.2 and tolerances({"gain": 0.2})["match"] == 0.01


@pytest.mark.parametrize(
    ("given_", "message"),
    [
        ({"gian": 0.1}, "tolerance: unknown tolerance 'gian'. Did you mean 'gain'?"),
        ({"xyz": 0.1}, "unknown tolerance 'xyz'. Known are gain, reciprocity, lossless, match and three_way"),
        (-0.1, "tolerance 'gain' is -0.1. Give a wave amplitude from 0 to 1"),
        ({"match": 2}, "tolerance 'match' is 2. Give a wave amplitude from 0 to 1"),
    ],
)
def test_impossible_tolerances_are_refused(given_, message):
    with pytest.raises(JobError, match=message.replace("?", r"\?")):
        tolerances(given_)
