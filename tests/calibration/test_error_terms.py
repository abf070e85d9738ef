"""Error terms with labels: correct and predict over any leading dims, ports by number, the turned part, bad input."""

import re

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.calibration import correct, predict_raw
from deembed.calibration.error_terms import build_terms, plain_terms
from deembed.errors import DeembedError, GridError, PortError
from deembed.labels import relabel_ports, select_ports, sparams, z0_of
from deembed.numeric.error_terms import Terms

F = np.linspace(1e9, 4e9, 4)
LEADING = [(), (("draw", 3),), (("part", 2), ("draw", 3))]


def whole(text):
    return f"^{re.escape(text)}$"


@given(st.integers(0, 2**32 - 1), st.integers(1, 4), st.sampled_from(LEADING), st.sampled_from(LEADING))
@settings(max_examples=60)
def test_correct_undoes_predict_over_any_leading_dims(bench, seed, count, on_terms, on_part):
    rng = np.random.default_rng(seed)
    ports = tuple(int(p) for p in rng.choice(np.arange(1, 9), count, replace=False))
    terms = bench.random_terms(rng, F, ports, leading=on_terms, isolation=True)
    part = bench.random_part(rng, F, ports, leading=on_part)
    raw = predict_raw(terms, part)
    found = correct(terms, raw)
    assert set(found.dims) == {"frequency", "port_out", "port_in", *dict(on_terms), *dict(on_part)}
    assert bench.worst(found, part + 0 * found) < 1e-9


def test_ports_are_found_by_number_in_any_order_and_any_choice(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2, 3, 4))
    part = bench.random_part(rng, F, (4, 2))
    raw = predict_raw(terms, part)
    own = terms.sel(port_out=[2, 4], port_in=[2, 4])
    assert bench.worst(raw, predict_raw(own, part)) < 1e-15
    swapped = correct(terms, select_ports(raw, [2, 4]))
    assert tuple(swapped.port_out.values) == (2, 4)
    assert bench.worst(swapped, part) < 1e-9


def test_one_port_reads_by_the_three_terms_alone(bench, rng):
    """M = e00 + e10e01 G / (1 - e11 G)."""
    terms = bench.random_terms(rng, F, (1, 2))
    load = sparams(np.full((4, 1, 1), 0.3 - 0.4j), F, ports=[2])
    e00, e11, tracking = (
        terms[n].sel(port_in=2).values for n in ("directivity", "source_match", "reflection_tracking")
    )
    expected = e00 + tracking * (0.3 - 0.4j) / (1 - e11 * (0.3 - 0.4j))
    np.testing.assert_allclose(predict_raw(terms, load).values[:, 0, 0], expected, rtol=0, atol=1e-12)


def test_labels_of_leading_dims_and_impedances_come_through(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2), leading=(("draw", 3),))
    terms = terms.assign_coords(draw=[10, 20, 30], z0=("port_out", [75.0 + 0j, 25.0 + 0j]))
    found = correct(terms, predict_raw(terms, bench.random_part(rng, F, (2, 1))))
    np.testing.assert_array_equal(found.draw, [10, 20, 30])
    np.testing.assert_array_equal(z0_of(found).reshape(-1, 2)[0], [25.0, 75.0])


def test_impedances_may_vary_over_frequency(bench, rng):
    plain, _ = plain_terms(bench.random_terms(rng, F, (1, 2)), (1, 2))
    z0 = np.linspace(40, 60, 8).reshape(4, 2)
    terms = build_terms(
        plain, ports=(1, 2), coords={"frequency": F}, dims=("frequency",), z0=z0, method="drawn"
    )
    part = bench.random_part(rng, F, (1, 2))
    found = correct(terms, predict_raw(terms, part))
    np.testing.assert_array_equal(z0_of(found), z0)


def test_the_diagonal_of_two_index_terms_is_nan_and_the_given_arrays_are_left_alone(rng):
    two = np.ones((4, 2, 2), dtype=complex)
    one = np.full((4, 2), 0.1 + 0j)
    terms = build_terms(
        Terms(one, one, one, two, two, two),
        ports=(3, 1),
        coords={"frequency": F},
        dims=("frequency",),
        z0=50.0,
        method="drawn",
    )
    assert np.isfinite(two).all()
    for name in ("load_match", "transmission_tracking", "isolation"):
        assert np.isnan(terms[name].sel(port_out=3, port_in=3)).all()
        assert np.isfinite(terms[name].sel(port_out=3, port_in=1)).all()
    assert list(terms.pair.values) == ["3-1"]


def test_a_single_port_has_no_redundancy_and_says_why(bench, rng):
    terms = bench.random_terms(rng, F, (1,))
    assert "redundancy" not in terms
    assert terms.attrs["redundancy_absent"] == "one port alone holds no redundant relation"


# ---- only the first port drives


@pytest.fixture
def one_sided(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2))
    undriven = terms.port_in == 2
    dead = terms.where(~undriven) if "port_in" in terms.dims else terms
    dead = dead.drop_vars("redundancy", errors="ignore").assign_attrs(drive="first-port-only")
    return terms, dead, bench.random_part(rng, F, (1, 2))


def turned_round(part):
    return relabel_ports(select_ports(part, [2, 1]), [1, 2])


def zeroed(raw):
    return raw.where(raw.port_in == 1, 0.0)


def test_two_sweeps_give_the_whole_part(bench, one_sided):
    true, terms, part = one_sided
    sweeps = [zeroed(predict_raw(true, s)) for s in (part, turned_round(part))]
    assert bench.worst(correct(terms, sweeps[0], turned=sweeps[1]), part) < 1e-9
    # The other way round: the result follows the first sweep.
    assert bench.worst(correct(terms, sweeps[1], turned=sweeps[0]), turned_round(part)) < 1e-9
    # Ports of either sweep in another order are the same sweep.
    swapped = correct(terms, select_ports(sweeps[0], [2, 1]), turned=sweeps[1])
    assert bench.worst(swapped, part) < 1e-9
    garbage = sweeps[0].where(sweeps[0].port_in == 1, np.nan)
    assert bench.worst(correct(terms, garbage, turned=sweeps[1]), part) < 1e-9


def test_sweeps_with_different_leading_dims(bench, one_sided):
    true, terms, part = one_sided
    noise = 1 + xr.DataArray([0.0, 1e-3], dims="sweep")
    first = (zeroed(predict_raw(true, part)) * noise).transpose("sweep", ...)
    found = correct(terms, first, turned=zeroed(predict_raw(true, turned_round(part))))
    assert bench.worst(found.isel(sweep=0), part) < 1e-9


def test_the_prediction_has_nothing_for_ports_that_do_not_drive(bench, one_sided):
    true, terms, part = one_sided
    raw = predict_raw(terms, part)
    assert np.isnan(raw.sel(port_in=2)).all()
    assert bench.worst(raw.sel(port_in=1), predict_raw(true, part).sel(port_in=1)) < 1e-12


def test_a_reflection_needs_no_turning(bench, one_sided):
    true, terms, _ = one_sided
    load = sparams(np.full((4, 1, 1), 0.5j), F, ports=[1])
    assert bench.worst(correct(terms, predict_raw(true, load)), load) < 1e-12


def test_no_turned_sweep(one_sided):
    true, terms, part = one_sided
    text = (
        "correction: only port 1 drives, so one sweep does not determine the part. "
        "Turn the part round, read it again and give that sweep as turned."
    )
    with pytest.raises(PortError, match=whole(text)):
        correct(terms, predict_raw(true, part))


def test_a_turned_sweep_that_nobody_needs(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2))
    raw = predict_raw(terms, bench.random_part(rng, F, (1, 2)))
    text = "correction: a turned sweep came, but every port drives. Correct each sweep alone."
    with pytest.raises(PortError, match=whole(text)):
        correct(terms, raw, turned=raw)


def test_a_turned_sweep_on_other_ports(one_sided):
    true, terms, part = one_sided
    raw = predict_raw(true, part)
    text = (
        "correction: the first sweep has ports [1, 2], the turned one [1, 3], driven [1]. "
        "Two sweeps of a two-port on the same two analyzer ports are needed."
    )
    with pytest.raises(PortError, match=whole(text)):
        correct(terms, raw, turned=relabel_ports(raw, [1, 3]))


def test_a_turned_sweep_on_another_grid(one_sided):
    true, terms, part = one_sided
    raw = predict_raw(true, part)
    text = (
        "frequency grids differ: the first sweep has 4 points, 1 GHz to 4 GHz; the turned sweep has 3 points, "
        "2 GHz to 4 GHz. Read both on one grid."
    )
    with pytest.raises(GridError, match=whole(text)):
        correct(terms, raw, turned=raw.isel(frequency=slice(1, None)))


# ---- bad input


def test_a_port_without_terms(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2))
    part = bench.random_part(rng, F, (1, 3))
    text = "error terms: port 3 is not calibrated; the error terms hold ports [1, 2]"
    for work in (correct, predict_raw):
        with pytest.raises(PortError, match=whole(text)):
            work(terms, part)


def test_another_grid_is_named(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2))
    part = bench.random_part(rng, F * 2, (1, 2))
    with pytest.raises(
        GridError, match=r"^frequency grids differ: the error terms has 4 points, 1 GHz to 4 GHz; the raw"
    ):
        correct(terms, part)
    with pytest.raises(
        GridError, match=r"; the part has 4 points, 2 GHz to 8 GHz; they first differ at point 1: 1000"
    ):
        predict_raw(terms, part)


def test_no_labels(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2))
    with pytest.raises(
        DeembedError, match=r"^raw reading: a ndarray came; needed a labelled array\. Build it with"
    ):
        correct(terms, np.zeros((4, 2, 2)))


def test_what_cannot_be_computed_is_nan_at_its_frequency_alone(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2))
    part = bench.random_part(rng, F, (1, 2))
    raw = predict_raw(terms, part)
    raw[2, 0, 1] = np.nan
    found = correct(terms, raw)
    np.testing.assert_array_equal(np.isnan(found).all(["port_out", "port_in"]), [False, False, True, False])
    assert bench.worst(found.isel(frequency=[0, 1, 3]), part.isel(frequency=[0, 1, 3])) < 1e-9
