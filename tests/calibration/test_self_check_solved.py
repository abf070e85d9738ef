"""The self-check on whole calibrations of a simulated analyzer: three ports, reflections alone, lines, high sweeps."""

import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from deembed.calibration import Reading, check_terms, solve_sol, solve_solt, solve_trl
from deembed.calibration.self_check import REDUNDANCY_FLOOR, equivalent_delay
from deembed.labels import relabel_ports, sparams
from deembed.simulate.analyzer import Imperfections, random_analyzer
from deembed.standards import load_kit

KIT = load_kit("generic-coax-3p5mm")
F = np.linspace(50e6, 8e9, 401)
HIGH = np.linspace(2e9, 8e9, 201)
# Connectors that repeat to -50 dB at 10 GHz, 0.003 dB of trace noise: a good bench (common practice, no source).
GOOD_BENCH = Imperfections(10 ** (0.003 / 20) - 1, 2e-6, 10 ** (-50 / 20), 2e-5)
QUIET = Imperfections(0.0, 0.0, 0.0, 0.0)


def bench_of(seed, f=F, *, imperfections=GOOD_BENCH, ports=2):
    return random_analyzer(f, rng=np.random.default_rng(seed), imperfections=imperfections, ports=ports)


def readings_of(analyzer, kit=KIT, *, ports=(1, 2), exchanged=()):
    """What was really connected comes from `kit`; at `exchanged` ports open and short changed places."""
    swap = {"open": "short", "short": "open"}
    readings = []
    for port in ports:
        for standard in ("open", "short", "load"):
            really = swap.get(standard, standard) if port in exchanged else standard
            s = relabel_ports(kit.response(really, analyzer.frequency), [port])
            readings.append(Reading(standard, (port,), analyzer.read(s)))
    for i, a in enumerate(ports):
        for b in ports[i + 1 :]:
            s = relabel_ports(kit.response("thru", analyzer.frequency), [a, b])
            readings.append(Reading("thru", (a, b), analyzer.read(s)))
    return readings


@pytest.mark.parametrize("f", [HIGH, np.linspace(10e6, 8.5e9, 801)], ids=["2 to 8 GHz", "10 MHz to 8.5 GHz"])
def test_a_clean_calibration_raises_nothing_on_other_sweeps(f):
    largest = 0.0
    for seed in range(20):
        terms = solve_solt(readings_of(bench_of(seed, f)), KIT)
        assert check_terms(terms) == [], seed
        largest = max(largest, float(abs(terms.redundancy).max()))
    assert 0.01 < largest < REDUNDANCY_FLOOR  # the scatter of connectors is there, below what is said aloud


def test_the_sentences_name_band_size_and_port():
    sign, redundancy = check_terms(solve_solt(readings_of(bench_of(1), exchanged=[2]), KIT))
    assert re.fullmatch(
        r"At port 2 the reflection tracking, followed down to zero frequency, is inverted \(-?1[678]\d degrees, near 0 "
        r"is usual\): the readings of open and short there look exchanged, or its sign is wrong in the kit\.",
        sign.text,
    )
    assert redundancy.text.startswith(
        "Between 50 MHz and 8 GHz the error terms of ports 1 and 2 contradict each other by up to 200 %"
    )
    assert redundancy.text.endswith(
        ": the sign of the reflections is inverted at port 2, as when open and short are exchanged."
    )


def test_where_the_sweep_starts_too_high_either_port_may_be_the_one():
    found = check_terms(solve_solt(readings_of(bench_of(4, HIGH), exchanged=[2]), KIT))
    assert [x.kind for x in found] == ["redundancy"]
    assert "inverted at one of ports 1 and 2, as when open and short are exchanged" in found[0].text


@pytest.mark.parametrize("delay_ps", [12.0, -12.0, 40.0])
def test_a_thru_of_another_length_is_found_from_a_high_sweep_too(delay_ps):
    thru = KIT.changed("thru", delay_ps=delay_ps)
    for seed in range(5):
        found = check_terms(solve_solt(readings_of(bench_of(seed, HIGH), thru), KIT))
        assert {(x.kind, x.where) for x in found} == {("redundancy", "thru 1-2")}
        said = re.search(
            r"if the thru is to blame, it is ([\d.]+) ps (longer|shorter) than said\.$", found[-1].text
        )
        assert said[2] == ("longer" if delay_ps > 0 else "shorter")
        assert float(said[1]) == pytest.approx(abs(delay_ps), rel=0.05)


def test_a_wrong_load_is_no_matter_of_the_thru():
    """75 ohm for 50 at port 1: the relation breaks, but no length explains it."""
    right, wrong = (
        readings_of(bench_of(6, imperfections=QUIET), kit)
        for kit in (KIT, KIT.changed("load", resistance_ohm=75.0))
    )
    assert check_terms(solve_solt(right, KIT)) == []
    found = check_terms(solve_solt([*right[:2], wrong[2], *right[3:]], KIT))
    assert {(x.kind, x.where) for x in found} == {("redundancy", "thru 1-2")}
    assert found[0].text.endswith("a standard at one of them, or the thru, is not what it is said to be.")


def test_three_ports_name_the_pairs_that_share_the_wrong_port():
    readings = readings_of(bench_of(8, ports=3), ports=(1, 2, 3), exchanged=[3])
    found = check_terms(solve_solt(readings, KIT, ports=(1, 2, 3)))
    assert [x.where for x in found] == ["open 3, short 3", "thru 1-3", "thru 2-3"]


def test_reflections_alone_are_checked_for_their_sign():
    for exchanged, places in (((), []), ((1,), ["open 1, short 1"])):
        readings = [r for r in readings_of(bench_of(2), exchanged=exchanged) if r.ports == (1,)]
        assert [x.where for x in check_terms(solve_sol(readings, KIT))] == places


@pytest.mark.parametrize(("sign", "places"), [(1, []), (-1, ["reflect 1", "reflect 2"])])
def test_a_reflect_of_the_other_sign_shows_at_both_ports(sign, places):
    f = np.linspace(300e6, 6e9, 301)
    kit = load_kit("demo-board-lines")
    analyzer = bench_of(5, f, imperfections=QUIET)
    connected = {n: kit.response(n, f) for n in ("thru", "line")}
    connected["reflect"] = sparams(np.broadcast_to(sign * 0.97 * np.eye(2), (f.size, 2, 2)), f)
    readings = [Reading(n, (1, 2), analyzer.read(s)) for n, s in connected.items()]
    terms = solve_trl(readings, kit, switch_terms=analyzer.recorded_switch_terms())
    found = [x for x in check_terms(terms) if x.kind == "tracking-sign"]
    assert [x.where for x in found] == places
    assert all("the reflect is of the other sign" in x.text for x in found)


def test_along_leading_dims_the_first_entry_is_checked():
    right, wrong = (solve_solt(readings_of(bench_of(1), exchanged=e), KIT) for e in ([], [2]))
    stacked = right.expand_dims(draw=2).copy(deep=True)
    stacked.reflection_tracking[1] = wrong.reflection_tracking
    assert check_terms(stacked) == []
    assert [x.kind for x in check_terms(stacked.isel(draw=[1]))] == ["tracking-sign"]


@given(
    st.floats(1.0, 60.0),
    st.sampled_from([-1, 1]),
    st.sampled_from([(10e6, 8e9), (1e9, 8e9), (4e9, 8e9)]),
    st.integers(0, 2**32 - 1),
)
@settings(max_examples=80)
def test_the_delay_is_found_from_wherever_the_sweep_starts(size_ps, sign, band, seed):
    """exp(-2 j w tau): whole turns before the first point must not be lost."""
    f = np.linspace(*band, 301)
    noise = 1e-3 * np.random.default_rng(seed).normal(size=(2, f.size))
    ratio = np.exp(-4j * np.pi * f * sign * size_ps * 1e-12) + noise[0] + 1j * noise[1]
    found, left = equivalent_delay(f, ratio)
    assert found * 1e12 == pytest.approx(sign * size_ps, rel=0.01, abs=0.05)
    assert left < 0.1
