"""Short-open-load-thru: random analyzers recovered, leading dims, scikit-rf beside it, bad input."""

import re
import warnings
from types import MappingProxyType

import numpy as np
import pytest
import skrf
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.calibration import Reading, correct, predict_raw, solve_solt
from deembed.errors import GridError, JobError, KitError, PortError, SolveError
from deembed.findings import findings_of
from deembed.labels import relabel_ports, select_ports, sparams
from deembed.simulate.analyzer import Imperfections, random_analyzer
from deembed.standards import kit_from_text, load_kit
from deembed.touchstone import read_touchstone

F = np.linspace(1e9, 8e9, 5)
SEEDS = st.integers(0, 2**32 - 1)
TERMS = (
    "directivity",
    "source_match",
    "reflection_tracking",
    "load_match",
    "transmission_tracking",
    "isolation",
)
THRUS = kit_from_text(
    """
[kit]
name = "thrus"
[standards.open]
kind = "open"
offset_delay_ps = 12.0
capacitance = [40e-15]
[standards.short]
kind = "short"
offset_delay_ps = 9.0
[standards.load]
kind = "load"
resistance_ohm = 48.0
inductance_h = 5e-12
[standards.thru]
kind = "thru"
[standards.delayed]
kind = "thru"
delay_ps = 73.0
[standards.mismatched]
kind = "line"
length_m = 0.021
effective_permittivity = 2.2
loss_db_per_m_at_1ghz = 9.0
impedance_ohm = 61.0
""",
    where="thrus.toml",
)


@given(
    SEEDS,
    st.integers(2, 4),
    st.sampled_from(["thru", "delayed", "mismatched"]),
    st.booleans(),
    st.sampled_from([(), (("draw", 3),), (("part", 2), ("draw", 2))]),
)
@settings(max_examples=40)
def test_random_analyzers_are_recovered(bench, seed, count, thru, isolation, leading):
    rng = np.random.default_rng(seed)
    ports = tuple(int(p) for p in rng.permutation(np.arange(1, count + 1)))
    true = bench.random_terms(rng, F, ports, leading=leading, isolation=isolation)
    readings = bench.solt_readings(true, THRUS, ports, thru=thru, isolation=isolation)
    terms = solve_solt(readings, THRUS, ports=ports, isolation=isolation)
    for name in TERMS:
        assert bench.worst(terms[name], true[name]) < 1e-9, name
    part = bench.random_part(rng, F, ports, leading=leading)
    assert bench.worst(correct(terms, predict_raw(true, part)), part) < 1e-9


@pytest.mark.parametrize("count", [2, 3, 4])
def test_leading_dims_of_readings_and_of_the_kit_meet_by_name(bench, count, rng):
    """The open's delay uncertain along draw, the readings taken in three sweeps: each pair is its own solve."""
    ports = tuple(range(1, count + 1))
    true = bench.random_terms(rng, F, ports, leading=(("sweep", 3),))
    readings = bench.solt_readings(true, THRUS, ports, thru="delayed")
    delays = xr.DataArray([11.0, 12.0, 13.5, 14.0], dims="draw", coords={"draw": [10, 11, 12, 13]})
    together = solve_solt(readings, THRUS.changed("open", offset_delay_ps=delays), ports=ports)
    assert together.directivity.sizes["draw"] == 4 and together.directivity.sizes["sweep"] == 3
    np.testing.assert_array_equal(together.draw, [10, 11, 12, 13])
    for draw in (10, 13):
        kit = THRUS.changed("open", offset_delay_ps=float(delays.sel(draw=draw)))
        alone = solve_solt(readings, kit, ports=ports)
        for name in TERMS:
            assert bench.worst(together[name].sel(draw=draw), alone[name]) < 1e-12, name
    assert bench.worst(together.directivity.sel(draw=11), true.directivity) < 1e-9


@pytest.mark.parametrize("count", [2, 4])
def test_a_thru_alone_may_carry_the_leading_dim(bench, count, rng):
    ports = tuple(range(1, count + 1))
    true = bench.random_terms(rng, F, ports)
    readings = bench.solt_readings(true, THRUS, ports, thru="delayed")
    delays = xr.DataArray([73.0, 80.0], dims="draw")
    terms = solve_solt(readings, THRUS.changed("delayed", delay_ps=delays), ports=ports)
    assert terms.load_match.sizes["draw"] == 2
    for name in TERMS:
        assert bench.worst(terms[name].isel(draw=0), true[name]) < 1e-9, name
    assert float(abs(terms.transmission_tracking.diff("draw")).max()) > 0.01


def test_readings_that_vary_on_different_dims_broadcast(bench, rng):
    true = bench.random_terms(rng, F, (1, 2))
    readings = bench.solt_readings(true, THRUS, (1, 2))
    noise = 1 + 1e-3 * xr.DataArray([0.0, 1.0, 2.0], dims="draw")
    readings[0] = Reading("open", (1,), (readings[0].raw * noise).transpose("draw", ...))
    terms = solve_solt(readings, THRUS)
    for name in TERMS:
        assert bench.worst(terms[name].isel(draw=0), true[name]) < 1e-9, name


def test_standards_read_on_two_ports_at_once_and_a_thru_named_backwards(bench, rng):
    true = bench.random_terms(rng, F, (1, 2))
    readings = []
    for name in ("open", "short", "load"):
        own = THRUS.response(name, F).values[..., 0, 0]
        both = sparams(own[:, None, None] * np.eye(2), F)
        readings.append(Reading(name, (1, 2), predict_raw(true, both)))
    backwards = bench.read(true, THRUS, "mismatched", (2, 1))
    terms = solve_solt([*readings, backwards], THRUS)
    for name in TERMS:
        assert bench.worst(terms[name], true[name]) < 1e-9, name


def test_a_nonreciprocal_tabulated_thru_is_taken_the_way_it_was_connected(bench, rng):
    table = bench.random_part(rng, F, (1, 2)) * 0.5 + sparams([[[0, 0.6], [0.5, 0]]] * F.size, F)
    text = "".join(f'[standards.{kind}]\nkind = "{kind}"\n' for kind in ("open", "short", "load"))
    text = f'[kit]\nname = "own"\n{text}\n[standards.amplifier]\nkind = "table"\nfile = "a.s2p"\n'
    kit = kit_from_text(text, where="own.toml", read_table=lambda _: table)
    true = bench.random_terms(rng, F, (1, 2))
    for pair in ((1, 2), (2, 1)):
        readings = [*bench.one_port_readings(true, kit, (1, 2)), bench.read(true, kit, "amplifier", pair)]
        terms = solve_solt(readings, kit)
        for name in TERMS:
            assert bench.worst(terms[name], true[name]) < 1e-9, (pair, name)


@given(SEEDS, st.integers(2, 4))
@settings(max_examples=25)
def test_where_the_first_port_alone_drives(bench, seed, count):
    rng = np.random.default_rng(seed)
    ports = tuple(range(1, count + 1))
    true = bench.random_terms(rng, F, ports)
    readings = bench.one_port_readings(true, THRUS, [1])
    for other in ports[1:]:
        reading = bench.read(true, THRUS, "delayed", (1, other))
        dead = reading.raw.where(reading.raw.port_in == 1, 0.0)  # columns that are not driven are zero
        readings.append(Reading("delayed", (1, other), dead))
    terms = solve_solt(readings, THRUS, ports=ports, drive="first-port-only")
    for name in TERMS:
        assert bench.worst(terms[name].sel(port_in=1), true[name].sel(port_in=1)) < 1e-9
        assert np.isnan(terms[name].sel(port_in=list(ports[1:]))).all()
    assert "redundancy" not in terms
    assert terms.attrs["redundancy_absent"] == "only the first port drives, so no relation is left over"
    part = bench.random_part(rng, F, (1, 2))
    first = predict_raw(true, part)
    turned = predict_raw(true, relabel_ports(select_ports(part, [2, 1]), [1, 2]))
    found = correct(terms, *(s.where(s.port_in == 1, 0.0) for s in (first,)), turned=turned)
    assert bench.worst(found, part) < 1e-9


def test_redundancy_of_true_boxes_is_nil_and_is_kept_per_pair(bench, rng):
    true = bench.random_terms(rng, F, (1, 2, 3))
    terms = solve_solt(bench.solt_readings(true, THRUS, (1, 2, 3)), THRUS, ports=(1, 2, 3))
    assert list(terms.pair.values) == ["1-2", "1-3", "2-3"]
    assert bench.worst(terms.redundancy, true.redundancy) < 1e-8


# ---- beside scikit-rf 2.2


def skrf_solt(measured, ideals, **options):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        calibration = skrf.calibration.SOLT(measured=measured, ideals=ideals, n_thrus=1, **options)
        calibration.run()
    return calibration


def test_twelve_terms_are_those_of_scikit_rf(bench, rng):
    true = bench.random_terms(rng, F, (1, 2), isolation=True)
    readings = bench.solt_readings(true, THRUS, (1, 2), thru="delayed", isolation=True)
    terms = solve_solt(readings, THRUS, isolation=True)
    by_name = {r.name: r.raw.values for r in readings}
    measured, ideals = [], []
    for name in ("short", "open", "load"):
        raw = np.zeros((F.size, 2, 2), dtype=complex)
        raw[:, 0, 0], raw[:, 1, 1] = (by_name[f"{name} {p}"][:, 0, 0] for p in (1, 2))
        measured.append(bench.network(F, raw))
        ideals.append(bench.network(F, THRUS.response(name, F).values * np.eye(2)))
    measured.append(bench.network(F, by_name["delayed 1-2"]))
    ideals.append(bench.network(F, THRUS.response("delayed", F).values))
    apart = bench.network(F, by_name["isolation 1-2"])
    theirs = skrf_solt(measured, ideals, isolation=apart)
    for (d, r), way in (((1, 2), "forward"), ((2, 1), "reverse")):
        pairs = {
            "directivity": terms.directivity.sel(port_in=d),
            "source match": terms.source_match.sel(port_in=d),
            "reflection tracking": terms.reflection_tracking.sel(port_in=d),
            "load match": terms.load_match.sel(port_in=d, port_out=r),
            "transmission tracking": terms.transmission_tracking.sel(port_in=d, port_out=r),
            "isolation": terms.isolation.sel(port_in=d, port_out=r),
        }
        for name, ours in pairs.items():
            np.testing.assert_allclose(ours, theirs.coefs[f"{way} {name}"], rtol=0, atol=1e-9, err_msg=name)
    part = bench.random_part(rng, F, (1, 2))
    raw = predict_raw(true, part)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        other = theirs.apply_cal(bench.network(F, raw.values)).s
    np.testing.assert_allclose(correct(terms, raw), other, rtol=0, atol=1e-9)


def test_one_path_terms_of_real_readings_are_those_of_scikit_rf(measured):
    """`four_port_hybrid`, standards taken as ideal by whoever read them."""
    folder = measured / "four_port_hybrid"
    files = {"open": "open", "short": "short", "load": "match"}
    readings = [
        Reading(name, (1,), select_ports(read_touchstone(folder / f"standard_{file}.s2p"), [1]))
        for name, file in files.items()
    ]
    readings.append(Reading("thru", (1, 2), read_touchstone(folder / "standard_thru.s2p")))
    terms = solve_solt(readings, load_kit("ideal"), drive="first-port-only")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        theirs = {
            k: skrf.Network(str(folder / f"standard_{k}.s2p")) for k in ("short", "open", "match", "thru")
        }
        media = skrf.media.DefinedGammaZ0(theirs["thru"].frequency, z0=50)
        ideals = [media.short(nports=2), media.open(nports=2), media.match(nports=2), media.thru()]
        path = skrf.calibration.TwoPortOnePath(
            measured=list(theirs.values()), ideals=ideals, n_thrus=1, source_port=1
        )
        path.run()
    ours = {
        "directivity": terms.directivity.sel(port_in=1),
        "source match": terms.source_match.sel(port_in=1),
        "reflection tracking": terms.reflection_tracking.sel(port_in=1),
        "load match": terms.load_match.sel(port_in=1, port_out=2),
        "transmission tracking": terms.transmission_tracking.sel(port_in=1, port_out=2),
    }
    for name, values in ours.items():
        np.testing.assert_allclose(values, path.coefs[f"forward {name}"], rtol=0, atol=1e-9, err_msg=name)


# ---- bad input


def whole(text):
    return f"^{re.escape(text)}$"


@pytest.fixture
def good(bench, rng):
    return bench.solt_readings(bench.random_terms(rng, F, (1, 2)), THRUS, (1, 2))


def without(readings, *names):
    return [r for r in readings if r.name not in names]


def test_no_readings():
    with pytest.raises(
        SolveError, match=whole("calibration: no readings of standards. Read the standards first.")
    ):
        solve_solt([], THRUS)


def test_a_standard_missing_at_a_port(good):
    text = (
        "calibration: only load, open read at port 2; three different reflections are needed. "
        "Read another at port 2."
    )
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt(without(good, "short 2"), THRUS)


def test_a_standard_read_twice_is_not_two_standards(good):
    readings = without(good, "short 2") + [r for r in good if r.name == "open 2"]
    with pytest.raises(SolveError, match=r"^calibration: only load, open read at port 2; three different"):
        solve_solt(readings, THRUS)


def test_no_reflection_at_a_port_at_all(good):
    text = (
        "calibration: no reflection standard read at port 2; three different reflections are needed. "
        "Read an open, a short and a load at port 2."
    )
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt(without(good, "open 2", "short 2", "load 2"), THRUS)
    with pytest.raises(SolveError, match=r"^calibration: no reflection standard read at port 1; three"):
        solve_solt([r for r in good if r.name == "thru 1-2"], THRUS)


def test_a_missing_thru_is_named_by_its_ports(good, bench, rng):
    text = "calibration: no thru reading between ports 1 and 2. Read the thru with ports [1, 2]."
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt(without(good, "thru 1-2"), THRUS)
    three = bench.solt_readings(bench.random_terms(rng, F, (1, 2, 3)), THRUS, (1, 2, 3))
    text = "calibration: no thru connects ports 1 and 2 with 3. Read the thru with ports [1, 3]."
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt(without(three, "thru 1-3", "thru 2-3"), THRUS, ports=(1, 2, 3))


@pytest.mark.parametrize(
    "thrus", [((1, 2), (2, 3), (3, 4)), ((1, 2), (1, 3), (1, 4)), ((1, 2), (2, 3), (3, 4), (4, 1))]
)
def test_thrus_that_connect_all_ports_are_enough(thrus):
    """Boxes and switch terms of a simulated analyzer: its load match does not depend on which port drives."""
    analyzer = random_analyzer(
        F, rng=np.random.default_rng(7), ports=4, imperfections=Imperfections(0, 0, 0, 0)
    )
    analyzer.leakage[:] = 0
    kit, ports = load_kit("ideal"), (1, 2, 3, 4)
    given = [
        Reading(s, (p,), analyzer.read(relabel_ports(kit.response(s, F), [p])))
        for p in ports
        for s in ("open", "short", "load")
    ]
    given += [Reading("thru", t, analyzer.read(relabel_ports(kit.response("thru", F), t))) for t in thrus]
    terms = solve_solt(given, kit, ports=ports)
    part = sparams(0.3 * np.random.default_rng(1).normal(size=(F.size, 4, 4)), F)
    assert float(np.abs(correct(terms, analyzer.read(part)) - part).max()) < 1e-9
    (note,) = findings_of(terms)
    missing = {(a, b) for a in ports for b in ports if a < b} - {(min(t), max(t)) for t in thrus}
    assert note.kind == "thru-followed" and set(note.where.split(", ")) == {
        f"thru {a}-{b}" for a, b in missing
    }
    assert "only if load match does not depend on which port drives" in note.text


def test_a_load_match_that_depends_on_the_drive_makes_followed_pairs_doubtful(bench, rng):
    terms = bench.random_terms(rng, F, (1, 2, 3))
    readings = bench.solt_readings(terms, THRUS, (1, 2, 3))
    found = findings_of(solve_solt(without(readings, "thru 1-3"), THRUS, ports=(1, 2, 3)))
    assert {f.where for f in found if f.kind == "load-match-depends"} == {"port 2"}
    assert all("read their thrus" in f.text for f in found if f.kind == "load-match-depends")


def test_leakage_of_a_pair_without_a_thru_is_still_taken_off():
    analyzer = random_analyzer(
        F, rng=np.random.default_rng(8), ports=3, imperfections=Imperfections(0, 0, 0, 0)
    )
    kit, ports = load_kit("ideal"), (1, 2, 3)
    given = [
        Reading(s, (p,), analyzer.read(relabel_ports(kit.response(s, F), [p])))
        for p in ports
        for s in ("open", "short", "load")
    ]
    given += [
        Reading("thru", t, analyzer.read(relabel_ports(kit.response("thru", F), t))) for t in ((1, 2), (2, 3))
    ]
    nothing = sparams(np.zeros((F.size, 2, 2)), F)
    given += [
        Reading("isolation", t, analyzer.read(relabel_ports(nothing, t))) for t in ((1, 2), (2, 3), (1, 3))
    ]
    terms = solve_solt(given, kit, ports=ports, isolation=True)
    np.testing.assert_allclose(
        terms.isolation.sel(port_out=3, port_in=1), analyzer.leakage[:, 2, 0], atol=1e-12
    )


def test_isolation_asked_for_and_not_read(good):
    text = "calibration: no isolation reading between ports 1 and 2. Read the isolation with ports [1, 2]."
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt(good, THRUS, isolation=True)


def test_two_thrus_for_one_pair(good, bench, rng):
    other = bench.read(bench.random_terms(rng, F, (1, 2)), THRUS, "delayed", (2, 1))
    text = "calibration: thru 1-2 and delayed 2-1 are both given. Keep one."
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt([*good, other], THRUS)


def test_an_unknown_standard_and_its_nearest(good):
    short = next(r for r in good if r.name == "short 1")
    readings = [*without(good, "short 1"), Reading("shrot", (1,), short.raw)]
    text = (
        "kit thrus: no standard 'shrot'. Did you mean 'short'? "
        "It has open, short, load, thru, delayed, mismatched."
    )
    with pytest.raises(KitError, match=whole(text)):
        solve_solt(readings, THRUS)


def test_readings_on_different_grids_are_both_named(good):
    odd = next(r for r in good if r.name == "load 2")
    moved = odd.raw.assign_coords(frequency=F + 1e6)
    text = (
        "frequency grids differ: open 1 has 5 points, 1 GHz to 8 GHz; load 2 has 5 points, 1.001 GHz to "
        "8.001 GHz; they first differ at point 1: 1000000000 Hz and 1001000000 Hz. Read both on one grid."
    )
    with pytest.raises(GridError, match=whole(text)):
        solve_solt([*without(good, "load 2"), Reading("load", (2,), moved)], THRUS)
    shorter = odd.raw.isel(frequency=slice(1, None))
    text = (
        "frequency grids differ: open 1 has 5 points, 1 GHz to 8 GHz; "
        "load 2 has 4 points, 2.75 GHz to 8 GHz. Read both on one grid."
    )
    with pytest.raises(GridError, match=whole(text)):
        solve_solt([*without(good, "load 2"), Reading("load", (2,), shorter)], THRUS)


def test_identical_standards_are_singular_and_named(good):
    """An ideal open and short of equal definition cannot be told apart at any frequency."""
    twins = MappingProxyType({**THRUS.standards, "short": THRUS.standards["open"]})
    kit = THRUS.__class__("twins", "", 50.0, twins)
    text = (
        "port 1: no solution at 5 frequencies (1 GHz, 2.75 GHz, 4.5 GHz, 6.25 GHz ... 8 GHz) of 5: the readings "
        "or the definitions of open, short, load do not differ from each other there, or are not numbers. "
        "Check those readings, or leave these frequencies out."
    )
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt(good, kit)


def test_readings_that_agree_at_one_frequency_name_it(good):
    opened, shorted = (next(r for r in good if r.name == f"{n} 2") for n in ("open", "short"))
    same = shorted.raw.copy()
    same[3] = opened.raw[3]
    text = (
        "port 2: no solution at 1 frequency (6.25 GHz) of 5: the readings or the definitions of open, load, "
        "short do not differ from each other there, or are not numbers. "
        "Check those readings, or leave these frequencies out."
    )
    with pytest.raises(SolveError, match=whole(text)):
        solve_solt([*without(good, "short 2"), Reading("short", (2,), same)], THRUS)


@pytest.mark.parametrize("name", ["open 1", "thru 1-2"])
def test_not_a_number_is_named(good, name):
    reading = next(r for r in good if r.name == name)
    raw = reading.raw.copy()
    raw[2, -1, 0] = np.nan
    place = {
        "open 1": "port 1: no solution at 1 frequency (4.5 GHz) of 5: ",
        "thru 1-2": "thru 1-2, port 1 driving: no solution at 1 frequency (4.5 GHz) of 5: "
        "the thru passes nothing there, or its reading is not a number. ",
    }[name]
    with pytest.raises(SolveError, match="^" + re.escape(place)):
        solve_solt([*without(good, name), Reading(reading.standard, reading.ports, raw)], THRUS)


def test_a_thru_that_passes_nothing(good):
    thru = next(r for r in good if r.name == "thru 1-2")
    table = sparams(np.zeros((F.size, 2, 2)), F)
    text = '[standards.open]\nkind="open"\n[standards.short]\nkind="short"\n[standards.load]\nkind="load"\n'
    kit = kit_from_text(
        f'[kit]\nname = "cut"\n{text}[standards.thru]\nkind = "table"\nfile = "cut.s2p"\n',
        where="cut.toml",
        read_table=lambda _: table,
    )
    with pytest.raises(
        SolveError, match=r"^thru 1-2, port 1 driving: no solution at 5 frequencies .* passes nothing"
    ):
        solve_solt([*without(good, "thru 1-2"), thru], kit)


def test_ports_that_cannot_be(good):
    text = "calibration: ports are [1, 1]. Name two or more, each once."
    with pytest.raises(PortError, match=whole(text)):
        solve_solt(good, THRUS, ports=(1, 1))
    with pytest.raises(PortError, match=whole("calibration: ports are [1]. Name two or more, each once.")):
        solve_solt(good, THRUS, ports=(1,))
    text = "open 2: port 2 is not among the calibrated ports [1, 3]"
    with pytest.raises(PortError, match=whole(text)):
        solve_solt(good, THRUS, ports=(1, 3))


def test_a_drive_that_does_not_exist(good):
    text = "calibration: drive is 'first'. Use one of every-port, first-port-only."
    with pytest.raises(JobError, match=whole(text)):
        solve_solt(good, THRUS, drive="first")


def test_a_thru_on_one_port(good, bench):
    thru = next(r for r in good if r.name == "thru 1-2")
    half = Reading("thru", (1,), select_ports(thru.raw, [1]))
    with pytest.raises(PortError, match=whole("thru 1: read on port 1; it sits between two ports")):
        solve_solt([*without(good, "thru 1-2"), half], THRUS)


def test_use_outside_the_stated_band_is_a_finding_not_an_error(bench, rng):
    kit = load_kit("generic-coax-3p5mm")
    f = np.linspace(6e9, 12e9, 7)
    true = bench.random_terms(rng, f, (1, 2))
    terms = solve_solt(bench.solt_readings(true, kit, (1, 2)), kit)
    assert bench.worst(terms.directivity, true.directivity) < 1e-9
    found = {x.where: x for x in findings_of(terms)}
    assert set(found) == {f"{s} {p}" for s in ("open", "short", "load") for p in (1, 2)}
    assert found["open 2"].text == (
        "The definition of open 2 is used at 10 to 12 GHz, outside the 0 Hz to 9 GHz that kit "
        "generic-coax-3p5mm states for it."
    )
    assert (found["open 2"].from_hz, found["open 2"].to_hz) == (10e9, 12e9)
