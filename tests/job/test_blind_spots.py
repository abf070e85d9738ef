"""What no one could have seen is listed with its size, and evidence for a wrong arm is a finding."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from deembed.job import load_job
from deembed.job.blind_spots import turn_arm
from deembed.job.stripping import in_reference
from deembed.labels import relabel_ports, select_ports, sparams
from deembed.shell import arm_of, embed, shell_from_arms

Bench = Callable[..., Path]


def test_an_arm_that_could_be_either_way_round_is_a_blind_spot_of_true_size(bench: Bench) -> None:
    job = load_job(bench(method="solt"))
    outcome = job.run()
    spots = {b.where: b for b in outcome.blind_spots if b.cause == "arm-reversed"}
    assert "arm 1" in spots
    for where, spot in spots.items():
        index = int(where.split()[1]) - 1
        turned = job.changed({f"fixture.arms[{index}].analyzer_side": 2}).run()
        off = np.abs(turned.part - outcome.part).max(("port_out", "port_in"))
        assert spot.unseen_error_db == pytest.approx(20 * np.log10(float(off.max())), abs=1e-9)
        at = float(off.frequency[int(off.values.argmax())]) / 1e9
        assert f"Were {where} the wrong way round, nothing in this job would show it" in spot.text
        assert f"{spot.unseen_error_db:.2f} dB (worst at {at:.4g} GHz)" in spot.text
        assert spot.reading.startswith("a line of known length joining arms 1 and ")
        assert not any(f.severity == "contradiction" for f in turned.findings)


def test_an_arm_whose_turning_would_be_seen_is_not_listed_and_turned_it_is_found(bench: Bench) -> None:
    job = load_job(bench(method="solt"))
    assert "arm 2" not in {b.where for b in job.run().blind_spots}
    outcome = job.changed({"fixture.arms[1].analyzer_side": 2}).run()
    assert outcome.contradicts
    (found,) = [f for f in outcome.findings if f.kind == "arm-direction"]
    assert (found.id, found.where, found.severity) == ("arm-direction-arm-2-1", "arm 2", "warning")
    gain = max((f for f in outcome.findings if f.kind == "gain"), key=lambda f: f.worst)
    assert found.worst == gain.worst > 0.01 and found.worst_hz == gain.worst_hz
    assert found.text == (
        "Arm 2 looks the wrong way round: turned, it would take away what contradicts the part as written: "
        f"{gain.text[0].lower()}{gain.text[1:]}"
    )
    assert "arm 2" in outcome.verdict


@pytest.mark.parametrize(("gain", "accused"), [(0.9, ["arm 2"]), (1.007, [])])
def test_a_contradiction_at_the_edge_of_the_tolerance_accuses_no_arm(
    bench: Bench, make: dict, gain: float, accused: list[str]
) -> None:
    """With its arm the right way round, a part of gain 1.007 is inside the tolerance, but not inside half of it."""
    path = bench(method="none")
    f = make["grid"]()
    inner = make["part"](f)
    whole = embed(shell_from_arms({p: make["arm"](f, p) for p in (1, 2, 3)}), inner * (gain / 0.9))
    for a, b in ((1, 2), (2, 3), (3, 1)):
        make["save"](path.parent, f"raw/part_{a}{b}.s2p", relabel_ports(select_ports(whole, (a, b)), (1, 2)))
    turned = load_job(path).changed({"fixture.arms[1].analyzer_side": 2}).run()
    assert turned.contradicts
    assert [x.where for x in turned.findings if x.kind == "arm-direction"] == accused


def test_arms_that_are_the_same_from_both_ends_are_no_blind_spot(bench: Bench, make: dict) -> None:
    path = bench(method="none")
    for p in (1, 2, 3):
        one = make["arm"](make["grid"](), p)
        same = sparams((one.values + one.values[:, ::-1, ::-1]) / 2, one.frequency.values)
        make["save"](path.parent, f"fixture/arm_{p}.s2p", same)
    assert [b.cause for b in load_job(path).run().blind_spots] == ["calibration"]


def test_without_redundancy_the_calibration_is_a_blind_spot_that_says_why(bench: Bench) -> None:
    causes = {
        ("solt", "every-port"): [],
        ("solt", "first-port-only"): [("standards-exchanged", "port 1"), ("thru-length", "thru 1-2")],
        ("trl", "every-port"): [("line-length", "line 1-2"), ("reflect-sign", "port 1, port 2")],
        ("none", "every-port"): [("calibration", "")],
    }
    for (method, drive), expected in causes.items():
        outcome = load_job(bench(method=method, drive=drive, arms=False, points=5)).run()
        assert [(b.cause, b.where) for b in outcome.blind_spots] == expected, method
        for spot in outcome.blind_spots:
            assert "redundancy is absent because" in spot.text and spot.unseen_error_db is None
            assert spot.reading


def test_the_verdict_says_what_could_not_have_been_seen(bench: Bench) -> None:
    assert "arm 1" in load_job(bench(method="solt")).run().verdict


def test_turning_an_arm_twice_gives_it_back_and_once_is_the_other_way_round(make: dict) -> None:
    f = make["grid"](3)
    arms = {p: make["arm"](f, p) for p in (1, 2)}
    arms[2] = in_reference(arms[2], [50.0, 75.0])
    shell = shell_from_arms(arms)
    turned = turn_arm(shell, 2)
    assert np.array_equal(arm_of(turned, 1).values, arm_of(shell, 1).values)
    assert np.array_equal(arm_of(turned, 2).values, arm_of(shell, 2).values[:, ::-1, ::-1])
    assert arm_of(turned, 2).z0.values.tolist() == [75, 50]
    twice = turn_arm(turned, 2)
    for name in shell.data_vars:
        assert np.array_equal(twice[name].values, shell[name].values)
