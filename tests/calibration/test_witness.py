"""Recorded switch terms beside what the error terms imply: silent when right, specific when not."""

import re

import numpy as np
import pytest

import deembed
from deembed.calibration.witness import implied_switch_terms, switch_term_findings
from deembed.errors import GridError, PortError
from deembed.labels import relabel_ports, sparams
from deembed.numeric.trl import remove_switch_terms
from deembed.simulate.analyzer import Imperfections, random_analyzer

F = np.linspace(50e6, 8.05e9, 201)
KIT = deembed.load_kit("ideal")
QUIET = Imperfections(0.0, 0.0, 0.0, 0.0)


def bench(seed=3, *, ports=2, imperfections=QUIET, freed=False, loud=1.0):
    """Terms and recorded switch terms of one analyzer; `freed`: its readings have lost their switch terms already."""
    analyzer = random_analyzer(F, rng=np.random.default_rng(seed), ports=ports, imperfections=imperfections)
    analyzer.leakage[:] = 0
    analyzer.switch_terms *= loud
    readings = []
    for port in range(1, ports + 1):
        for standard in ("open", "short", "load"):
            raw = analyzer.read(relabel_ports(KIT.response(standard, F), [port]))
            readings.append(deembed.Reading(standard, (port,), raw))
    for a in range(1, ports + 1):
        for b in range(a + 1, ports + 1):
            raw = analyzer.read(relabel_ports(KIT.response("thru", F), [a, b]))
            if freed:
                own = np.stack([analyzer.switch_terms[p - 1] for p in (a, b)], axis=-1)
                raw = raw.copy(data=remove_switch_terms(raw.values, own))
            readings.append(deembed.Reading("thru", (a, b), raw))
    terms = deembed.solve_solt(readings, KIT, ports=tuple(range(1, ports + 1)))
    return terms, analyzer.recorded_switch_terms()


@pytest.mark.parametrize("ports", [2, 3])
def test_the_implied_switch_terms_are_those_of_the_analyzer(ports):
    terms, recorded = bench(ports=ports)
    implied = implied_switch_terms(terms)
    for r in range(1, ports + 1):
        for d in range(1, ports + 1):
            own = implied.sel(port_out=r, port_in=d).values
            if r == d:
                assert np.isnan(own).all()
            else:
                np.testing.assert_allclose(own, recorded[r].values[:, 0, 0], atol=1e-9)


def test_right_recordings_are_not_accused():
    for seed in range(6):
        assert switch_term_findings(*bench(seed, imperfections=Imperfections())) == []


def test_recordings_of_the_other_port_are_named():
    terms, recorded = bench(loud=2.0)
    found = switch_term_findings(terms, {1: recorded[2], 2: recorded[1]})
    assert {f.where for f in found} == {"switch 1", "switch 2"}
    assert all("belongs to another port or set-up" in f.text for f in found)


def test_readings_freed_of_their_switch_terms_are_told_apart():
    terms, recorded = bench(freed=True, loud=2.0)
    found = switch_term_findings(terms, recorded)
    assert {f.where for f in found} == {"switch 1", "switch 2"}
    assert all(
        "look already freed of their switch terms" in f.text and f.kind == "switch-terms" for f in found
    )
    assert max(f.worst for f in found) == pytest.approx(np.abs(recorded[1].values).max(), rel=0.5)


def test_one_port_alone_is_compared_alone_and_terms_without_load_match_say_nothing():
    terms, recorded = bench()
    assert switch_term_findings(terms, {2: recorded[2]}) == []
    nothing = terms.assign(load_match=terms.load_match * np.nan)
    assert switch_term_findings(nothing, recorded) == []


def test_what_cannot_be_compared():
    terms, recorded = bench()
    with pytest.raises(PortError, match="switch 3: port 3 is not calibrated"):
        switch_term_findings(terms, {3: recorded[1]})
    with pytest.raises(GridError, match=re.escape("switch 1 has 2 points, 1 GHz to 2 GHz")):
        switch_term_findings(terms, {1: sparams(np.zeros((2, 1, 1)), [1e9, 2e9])})
