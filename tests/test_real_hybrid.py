"""Real readings of a coaxial hybrid, first port driving only (from the documentation of scikit-rf)."""

import warnings

import numpy as np
import pytest
import skrf

from deembed.calibration import Reading, correct, solve_solt
from deembed.labels import ports_of, relabel_ports, select_ports
from deembed.physicality import assess, verdict
from deembed.standards import load_kit
from deembed.threeport import assemble
from deembed.touchstone import read_touchstone

EXPECT = {"passive": True, "reciprocal": True, "lossless": False}
CYCLIC = ((1, 2), (2, 3), (3, 1))


@pytest.fixture(scope="module")
def folder(measured):
    return measured / "four_port_hybrid"


@pytest.fixture(scope="module")
def rounds(folder):
    """Corrected rounds, labelled by part ports; whoever took the readings treated the standards as ideal."""
    one_port = [
        Reading(kind, (1,), select_ports(read_touchstone(folder / f"standard_{file}.s2p"), [1]))
        for kind, file in (("open", "open"), ("short", "short"), ("load", "match"))
    ]
    thru = Reading("thru", (1, 2), read_touchstone(folder / "standard_thru.s2p"))
    terms = solve_solt([*one_port, thru], load_kit("ideal"), drive="first-port-only")
    return [
        relabel_ports(
            correct(
                terms,
                read_touchstone(folder / f"part_source{a}_receive{b}.s2p"),
                turned=read_touchstone(folder / f"part_source{b}_receive{a}.s2p"),
            ),
            [a, b],
        )
        for a, b in CYCLIC
    ]


@pytest.fixture(scope="module")
def assembly(rounds):
    return assemble(rounds, part_ports=3)


def test_each_round_is_what_scikit_rf_makes_of_it(folder, rounds):
    """One-path correction by scikit-rf 2.2, same readings and ideal standards."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        read = {p.stem: skrf.Network(str(p)) for p in folder.glob("*.s2p")}
        media = skrf.media.DefinedGammaZ0(read["standard_thru"].frequency, z0=50)
        calibration = skrf.calibration.TwoPortOnePath(
            measured=[read[f"standard_{k}"] for k in ("short", "open", "match", "thru")],
            ideals=[media.short(nports=2), media.open(nports=2), media.match(nports=2), media.thru()],
            n_thrus=1,
            source_port=1,
        )
        theirs = [
            calibration.apply_cal((read[f"part_source{a}_receive{b}"], read[f"part_source{b}_receive{a}"])).s
            for a, b in CYCLIC
        ]
    for ours, other in zip(rounds, theirs, strict=True):
        assert np.abs(ours.values - other).max() < 1e-9, ports_of(ours)


def test_gain_above_unity_is_found_in_the_upper_band(assembly):
    metrics, findings = assess(assembly.part, expect=EXPECT)
    largest = metrics.largest_singular_value
    assert largest.max() == pytest.approx(1.110, abs=0.001)
    assert largest.frequency[int(largest.values.argmax())] == pytest.approx(4.06e9, abs=0.01e9)
    gains = [f for f in findings if f.kind == "gain"]
    assert gains and all(f.severity == "contradiction" for f in gains)
    worst = max(gains, key=lambda f: f.worst)
    assert worst.worst == pytest.approx(0.110, abs=0.001) and "up to 11 % more wave amplitude" in worst.text


def test_no_gain_is_claimed_below_2_ghz(assembly):
    metrics, findings = assess(assembly.part, expect=EXPECT)
    assert min(f.from_hz for f in findings if f.kind == "gain") > 2e9
    assert metrics.largest_singular_value.sel(frequency=slice(0, 2e9)).max() < 1.01


def test_the_verdict_says_so_and_names_the_rounds_that_disagree(assembly):
    findings = [*assembly.findings, *assess(assembly.part, expect=EXPECT)[1]]
    sentence = verdict(findings, expect=EXPECT)
    assert sentence.startswith("Not believable as a passive part in 2 bands between 2.463 and 4.4 GHz: ")
    assert "worst at 4.056 GHz" in sentence
    assert "look first at round 1-2, round 3-1, part port 1 (disagreement)" in sentence


def test_every_reflection_was_read_twice_and_its_mean_is_the_part(assembly, rounds):
    first = rounds[0].sel(port_out=1, port_in=1, drop=True)
    second = rounds[2].sel(port_out=1, port_in=1, drop=True)
    np.testing.assert_allclose(
        assembly.part.sel(port_out=1, port_in=1), (first + second) / 2, rtol=0, atol=1e-14
    )
    off = assembly.disagreement.sel(round="1-2", port=1)
    np.testing.assert_allclose(off, (first - second) / 2, rtol=0, atol=1e-14)
    assert abs(off).max() == pytest.approx(0.035, abs=0.001)
