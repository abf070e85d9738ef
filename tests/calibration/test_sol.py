"""Reflection calibration with labels: any number of ports and standards, scikit-rf beside it, bad input."""

import json
import re
import warnings

import numpy as np
import pytest
import skrf
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.calibration import Reading, correct, predict_raw, solve_sol
from deembed.errors import GridError, KitError, PortError, SolveError
from deembed.findings import findings_of
from deembed.labels import select_ports, sparams
from deembed.standards import kit_from_text, load_kit

F = np.linspace(0.5e9, 8e9, 7)
ONE_INDEX = ("directivity", "source_match", "reflection_tracking")
KIT = kit_from_text(
    """
[kit]
name = "reflections"
[standards.open]
kind = "open"
offset_delay_ps = 12.0
capacitance = [40e-15]
[standards.short]
kind = "short"
offset_delay_ps = 9.0
[standards.load]
kind = "load"
resistance_ohm = 47.0
[standards.long-short]
kind = "short"
offset_delay_ps = 31.0
[standards.thru]
kind = "thru"
""",
    where="reflections.toml",
)
ALL = ("open", "short", "load", "long-short")


@given(
    st.integers(0, 2**32 - 1),
    st.integers(1, 4),
    st.integers(3, 4),
    st.sampled_from([(), (("draw", 3),), (("part", 2), ("draw", 2))]),
)
@settings(max_examples=40)
def test_random_ports_are_recovered(bench, seed, count, standards, leading):
    rng = np.random.default_rng(seed)
    ports = tuple(int(p) for p in rng.choice(np.arange(1, 9), count, replace=False))
    true = bench.random_terms(rng, F, ports, leading=leading)
    terms = solve_sol(bench.one_port_readings(true, KIT, ports, ALL[:standards]), KIT, ports=ports)
    assert tuple(terms.port_in.values) == ports
    for name in ONE_INDEX:
        assert bench.worst(terms[name], true[name]) < 1e-9, name
    assert np.isnan(terms.load_match).all() and np.isnan(terms.transmission_tracking).all()
    for port in ports:
        part = bench.random_part(rng, F, [port], leading=leading)
        assert bench.worst(correct(terms, predict_raw(true, part)), part) < 1e-9


@pytest.mark.parametrize("count", [3, 4])
def test_terms_are_those_of_scikit_rf(bench, count, rng):
    """`OnePort` of scikit-rf 2.2, exact for three standards and least squares for four."""
    true = bench.random_terms(rng, F, (1,))
    readings = bench.one_port_readings(true, KIT, [1], ALL[:count])
    noise = 1 + 1e-3 * rng.normal(size=(count, F.size, 1, 1))
    readings = [Reading(r.standard, (1,), r.raw * n) for r, n in zip(readings, noise, strict=True)]
    terms = solve_sol(readings, KIT)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        theirs = skrf.calibration.OnePort(
            measured=[bench.network(F, r.raw.values) for r in readings],
            ideals=[bench.network(F, KIT.response(r.standard, F).values) for r in readings],
        )
        theirs.run()
    for name in ONE_INDEX:
        other = theirs.coefs[name.replace("_", " ")]
        np.testing.assert_allclose(terms[name].sel(port_in=1), other, rtol=0, atol=1e-9, err_msg=name)


def test_one_standard_on_several_ports_at_once_means_one_on_each(bench, rng):
    true = bench.random_terms(rng, F, (1, 3))
    apart = bench.one_port_readings(true, KIT, (1, 3), ALL[:3])
    together = []
    for name in ALL[:3]:
        both = predict_raw(true, bench.random_part(rng, F, (1, 3))).copy()
        for port in (1, 3):
            own = next(r for r in apart if r.name == f"{name} {port}")
            both.loc[{"port_out": port, "port_in": port}] = own.raw.values[:, 0, 0]
        together.append(Reading(name, (3, 1), both))
    one, other = (solve_sol(r, KIT, ports=(1, 3)) for r in (apart, together))
    for name in ONE_INDEX:
        assert bench.worst(one[name], other[name]) < 1e-12


def test_draws_of_the_kit_and_of_the_readings(bench, rng):
    true = bench.random_terms(rng, F, (1, 2), leading=(("draw", 3),))
    readings = bench.one_port_readings(true, KIT, (1, 2), ALL[:3])
    resistance = xr.DataArray([46.0, 47.0, 48.0], dims="draw", coords={"draw": [0, 1, 2]})
    terms = solve_sol(readings, KIT.changed("load", resistance_ohm=resistance), ports=(1, 2))
    assert bench.worst(terms.directivity.isel(draw=1), true.directivity.isel(draw=1)) < 1e-9
    assert float(abs(terms.directivity - true.directivity).isel(draw=2).min()) > 1e-3
    alone = solve_sol(
        [Reading(r.standard, r.ports, r.raw.isel(draw=2)) for r in readings],
        KIT.changed("load", resistance_ohm=48.0),
        ports=(1, 2),
    )
    assert bench.worst(terms.directivity.isel(draw=2), alone.directivity) < 1e-12


def test_what_the_terms_say_of_themselves(bench, rng):
    true = bench.random_terms(rng, F, (1, 2))
    terms = solve_sol(bench.one_port_readings(true, KIT, (1, 2), ALL), KIT, ports=(1, 2))
    assert terms.attrs["method"] == "sol" and "redundancy" not in terms
    assert terms.attrs["redundancy_absent"] == "method sol finds no transmission terms"
    signed = ["open", "short", "long-short"]
    assert json.loads(terms.attrs["signed_standards"]) == {"1": signed, "2": signed}
    assert findings_of(terms) == ()


def whole(text):
    return f"^{re.escape(text)}$"


@pytest.fixture
def good(bench, rng):
    return bench.one_port_readings(bench.random_terms(rng, F, (1, 2)), KIT, (1, 2), ALL[:3])


def test_two_standards_are_not_enough(good):
    text = (
        "calibration: only load, short read at port 1; three different reflections are needed. "
        "Read another at port 1."
    )
    with pytest.raises(SolveError, match=whole(text)):
        solve_sol([r for r in good if r.name in ("load 1", "short 1")], KIT)


def test_a_thru_is_not_used(good, bench, rng):
    thru = bench.read(bench.random_terms(rng, F, (1, 2)), KIT, "thru", (1, 2))
    text = (
        "calibration: thru 1-2 sits between two ports; method sol uses reflections only. "
        "Use method solt, or leave that reading out."
    )
    with pytest.raises(SolveError, match=whole(text)):
        solve_sol([*good, thru], KIT, ports=(1, 2))


def test_a_port_that_is_not_calibrated(good):
    with pytest.raises(PortError, match=whole("open 2: port 2 is not among the calibrated ports [1]")):
        solve_sol(good, KIT)
    with pytest.raises(PortError, match=whole("calibration: ports are [1, 1]. Name one or more, each once.")):
        solve_sol(good, KIT, ports=(1, 1))
    with pytest.raises(PortError, match=whole("calibration: ports are []. Name one or more, each once.")):
        solve_sol(good, KIT, ports=())


def test_an_unknown_standard(good):
    odd = Reading("lod", (1,), good[2].raw)
    text = (
        "kit reflections: no standard 'lod'. Did you mean 'load'? It has open, short, load, long-short, thru."
    )
    with pytest.raises(KitError, match=whole(text)):
        solve_sol([*good, odd], KIT, ports=(1, 2))


def test_identical_readings_are_named_by_frequency(good):
    same = good[0].raw.copy()
    same[4] = good[1].raw[4]
    with pytest.raises(
        SolveError, match=r"^port 1: no solution at 1 frequency \(5\.5 GHz\) of 7: the readings or the"
    ):
        solve_sol([Reading("open", (1,), same), *good[1:3]], KIT)


def test_a_table_on_another_grid_is_named():
    kit = load_kit("ideal")
    table = sparams(np.zeros((3, 1, 1)), F[:3])
    own = kit_from_text(
        kit.text + '\n[standards.measured-load]\nkind = "table"\nfile = "load.s1p"\n',
        where="own.toml",
        read_table=lambda _: table,
    )
    raw = sparams(np.zeros((7, 1, 1)), F)
    readings = [Reading(n, (1,), raw) for n in ("open", "short", "measured-load")]
    with pytest.raises(
        GridError, match=r"^kit ideal, standards\.measured-load: the table has 3 points, 500 MHz to"
    ):
        solve_sol(readings, own)
    shorter = [
        Reading(n, (1,), select_ports(raw.isel(frequency=slice(0, 3)), [1])) for n in ("open", "short")
    ]
    with pytest.raises(SolveError, match=r"^calibration: only open, short read at port 1"):
        solve_sol(shorter, own)
