"""What a calibration says of itself: clean set-ups are not accused, mistakes are named with place and size."""

import numpy as np
import pytest

import deembed
from deembed.calibration.self_check import check_terms, equivalent_delay
from deembed.labels import relabel_ports, sparams
from deembed.simulate.analyzer import Imperfections, random_analyzer

F = np.linspace(50e6, 8.05e9, 401)
# -50 dB connectors at 8 GHz and 0.003 dB trace noise.
REAL = Imperfections(trace_noise=3.5e-4, noise_floor=2e-6, repeatability=3.9e-3, drift_per_reading=2e-5)
KIT = deembed.load_kit("generic-coax-3p5mm")


def solved(seed, *, exchanged=(), thru_s=0.0, f=F, imperfections=REAL):
    analyzer = random_analyzer(f, rng=np.random.default_rng(seed), imperfections=imperfections)
    readings = []
    for port in (1, 2):
        for standard in ("open", "short", "load"):
            really = (
                {"open": "short", "short": "open"}.get(standard, standard) if port in exchanged else standard
            )
            raw = analyzer.read(relabel_ports(KIT.response(really, f), [port]))
            readings.append(deembed.Reading(standard, (port,), raw))
    through = np.exp(-2j * np.pi * f * thru_s)[:, None, None] * np.array([[0, 1], [1, 0]])
    readings.append(deembed.Reading("thru", (1, 2), analyzer.read(sparams(through, f))))
    return deembed.solve_solt(readings, KIT)


@pytest.mark.parametrize("points", [101, 201, 401, 1601])
def test_clean_set_ups_are_not_accused(points):
    f = np.linspace(50e6, 8.05e9, points)
    accused = [x.text for seed in range(8) for x in check_terms(solved(seed, f=f))]
    assert accused == []


@pytest.mark.parametrize("port", [1, 2])
@pytest.mark.parametrize("seed", range(4))
def test_open_and_short_exchanged_at_one_port_are_named(seed, port):
    found = check_terms(solved(seed, exchanged=[port]))
    sign = next(x for x in found if x.kind == "tracking-sign")
    assert (sign.where, sign.severity) == (f"open {port}, short {port}", "warning")
    assert "the readings of open and short there look exchanged" in sign.text
    redundancy = next(x for x in found if x.kind == "redundancy")
    assert redundancy.where == "thru 1-2" and f"inverted at port {port}" in redundancy.text
    assert redundancy.worst == pytest.approx(2.0, abs=0.4)


def test_exchanged_at_both_ports_cancels_in_redundancy_but_not_in_the_signs():
    found = check_terms(solved(1, exchanged=[1, 2]))
    assert [x.where for x in found if x.kind == "tracking-sign"] == ["open 1, short 1", "open 2, short 2"]


@pytest.mark.parametrize("picoseconds", [-8.0, 3.0, 12.0, 40.0])
def test_a_thru_of_another_length_is_said_with_its_picoseconds(picoseconds):
    (found,) = (x for x in check_terms(solved(3, thru_s=picoseconds * 1e-12)) if x.kind == "redundancy")
    size, rest = found.text.split("to blame, it is ")[1].split(" ps ")
    assert float(size) == pytest.approx(abs(picoseconds), rel=0.05, abs=0.4)  # -50 dB connectors
    assert rest == ("longer" if picoseconds > 0 else "shorter") + " than said."


def test_the_equivalent_delay_is_exact_for_a_pure_delay():
    for tau in (-30e-12, 1e-12, 100e-12):
        delay, left = equivalent_delay(F, np.exp(-4j * np.pi * F * tau))
        assert delay == pytest.approx(tau, rel=1e-9) and left < 1e-6
    # A constant factor is no delay.
    assert equivalent_delay(F, np.full(F.size, 1.5 + 0j))[1] > 0.9


def test_a_sweep_that_does_not_reach_low_says_nothing_of_signs():
    f = np.linspace(4e9, 8e9, 401)
    kinds = {x.kind for x in check_terms(solved(2, exchanged=[2], f=f))}
    assert "tracking-sign" not in kinds and "redundancy" in kinds


def test_a_redundancy_that_no_delay_explains_names_no_delay():
    terms = solved(5)
    terms["redundancy"] = terms.redundancy + 0.2
    (found,) = (x for x in check_terms(terms) if x.kind == "redundancy")
    assert "ps" not in found.text and "contradict each other by up to 2" in found.text


def test_noise_alone_does_not_count_and_a_single_point_is_chance():
    terms = solved(6)
    scatter = np.random.default_rng(0).normal(size=(F.size, 1)) * 0.02
    terms["redundancy"] = terms.redundancy + scatter
    assert check_terms(terms) == []
    terms["redundancy"][100] = 0.5
    assert check_terms(terms) == []


def test_a_port_that_sends_back_more_than_it_gets_is_said():
    terms = solved(7)
    terms["source_match"].values[50:60, 1] = 1.3
    (found,) = check_terms(terms)
    assert (found.kind, found.where, found.from_hz, found.to_hz) == ("terms-size", "port 2", F[50], F[59])
    assert "send back up to 1.3 times the wave it receives" in found.text


def test_boxes_and_one_way_analyzers_have_no_redundancy_to_judge():
    terms = solved(8).drop_vars("redundancy")
    assert [x for x in check_terms(terms) if x.kind == "redundancy"] == []


def test_missing_numbers_do_not_stop_the_check():
    terms = solved(9, exchanged=[2]).copy(deep=True)
    for name in ("redundancy", "reflection_tracking", "load_match"):
        terms[name].values[:3] = np.nan
    assert {x.kind for x in check_terms(terms)} == {"tracking-sign", "redundancy"}
    terms["redundancy"].values[:] = np.nan
    assert "redundancy" not in {x.kind for x in check_terms(terms)}


def test_a_reflect_of_the_other_sign_is_said_for_trl():
    terms = solved(10).assign_attrs(signed_standards='{"1": ["reflect"], "2": ["reflect"]}')
    terms["reflection_tracking"] = -terms.reflection_tracking
    found = [x for x in check_terms(terms) if x.kind == "tracking-sign"]
    assert [x.where for x in found] == ["reflect 1", "reflect 2"]
    assert "the reflect is of the other sign" in found[0].text
