"""The lane map: to scale, every finding at its place or said to be elsewhere."""

import numpy as np
import pytest

from deembed.findings import Finding
from deembed.views.lane_lengths import arm_length, box_lengths
from deembed.views.lane_map import KINDS, lane_map


@pytest.fixture(scope="module")
def lanes(outcome):
    return lane_map(outcome)


def with_findings(fake, *where):
    found = [Finding(f"f{k}", "kind", w, "warning", "text") for k, w in enumerate(where)]
    return lane_map(fake.fake_outcome(101, findings=found))


def noted(lanes):
    return {s.id for s in lanes.segments if s.findings}


def test_one_lane_per_part_port_and_a_box_per_round(lanes):
    assert [lane.part_port for lane in lanes.lanes] == [1, 2, 3]
    for lane in lanes.lanes:
        assert [len(lane.of(k)) for k in KINDS] == [2, 2, 1, 1, 1, 0]
    assert [s.round_label for s in lanes.lanes[0].of("error-box")] == ["1-2", "3-1"]
    assert [s.where for s in lanes.lanes[0].of("error-box")] == ["port 1", "port 2"]
    assert len({s.id for s in lanes.segments}) == len(lanes.segments)


def test_lengths_are_the_electrical_lengths(lanes, fake):
    for lane in lanes.lanes:
        arm = lane.of("arm")[0]
        assert arm.from_ps == pytest.approx(-fake.ARM_PS[lane.part_port], rel=1e-6)
        assert arm.to_ps == 0
        for box in lane.of("error-box"):
            port = int(box.where.split()[-1])
            assert box.to_ps == arm.from_ps
            assert box.to_ps - box.from_ps == pytest.approx(fake.BOX_PS[port], rel=1e-6)
    assert lanes.total_ps == pytest.approx(212 + 5200, rel=1e-6)


def test_planes_stand_where_segments_meet(lanes):
    at = {(p.words, p.lane): p.at_ps for p in lanes.planes}
    assert at["part plane", None] == 0
    assert at["cable plane", 2] == pytest.approx(-150, rel=1e-6)
    assert {p.lane for p in lanes.planes if p.words == "analyzer port"} == {1, 2, 3}


@pytest.mark.parametrize(
    ("where", "want"),
    [
        ("arm 3", {"lane-3/arm"}),
        ("part port 2", {"lane-2/part-port"}),
        ("termination 1", {"lane-1/cable-plane"}),
        ("round 2-3", {"lane-2/cable-plane", "lane-3/cable-plane"}),
        ("round 3-2", {"lane-2/cable-plane", "lane-3/cable-plane"}),
        ("part port 2, round 1-2", {"lane-2/cable-plane", "lane-2/part-port"}),
        ("", {"part"}),
        (
            "short 2",
            {"lane-1/round-3-1/error-box", "lane-2/round-1-2/error-box", "lane-3/round-2-3/error-box"},
        ),
        (
            "switch 2",
            {
                "lane-1/round-3-1/analyzer-port",
                "lane-2/round-1-2/analyzer-port",
                "lane-3/round-2-3/analyzer-port",
            },
        ),
    ],
)
def test_findings_are_at_the_segments_they_name(fake, where, want):
    assert noted(with_findings(fake, where)) == want


def test_a_thru_is_at_both_ports_and_a_port_at_its_box_and_socket(fake):
    assert len(noted(with_findings(fake, "thru 1-2"))) == 6
    marked = {s.kind for s in with_findings(fake, "port 1").segments if s.findings}
    assert marked == {"analyzer-port", "error-box"}


def test_no_finding_is_lost(outcome, lanes, fake):
    shown = {i for s in lanes.segments for i in s.findings} | {f.id for f in lanes.elsewhere}
    assert shown == {f.id for f in outcome.findings}
    odd = with_findings(fake, "arm 9", "round 4-5", "switch 7")
    assert [f.where for f in odd.elsewhere] == ["arm 9", "round 4-5", "switch 7"]


def test_states_are_in_words(lanes):
    assert lanes.segment("lane-3/arm").state == "warning"
    assert lanes.segment("lane-3/arm").state_words == "1 warning"
    assert lanes.part.state == "contradiction"
    assert lanes.segment("lane-1/arm").state_words == "nothing noted"
    assert "Arm 3: 1 warning" in lanes.alt
    assert "arm of 212 ps" in lanes.alt


def test_an_unknown_segment_is_refused_by_name(lanes):
    with pytest.raises(KeyError, match="no segment 'lane-9'; there are lane-1/round-1-2/analyzer-port"):
        lanes.segment("lane-9")


def test_segments_hold_what_they_stand_for(lanes, outcome):
    box = dict(lanes.segment("lane-1/round-3-1/error-box").holds)
    assert box["short on 2"] == "raw/short_2.s1p"
    assert box["One-way length"] == "5200.0 ps"
    assert box["Redundancy residual, ports 1-2"].startswith("at most 0.002")
    socket = dict(lanes.segment("lane-1/round-1-2/analyzer-port").holds)
    assert socket["File"] == "raw/part_12.s2p"
    assert socket["Switch terms"] == "not recorded"
    plane = dict(lanes.segment("lane-3/cable-plane").holds)
    assert plane["Closed in round 1-2 with"] == "raw/termination_3.s1p"
    assert plane["Difference between readings"].startswith("at most 0.012")
    assert dict(lanes.segment("lane-1/cable-plane").holds)["Closed in round 2-3 with"].startswith("a perfect")
    arm = dict(lanes.segment("lane-2/arm").holds)
    assert (arm["File"], arm["Faces the analyzer"]) == ("fixture/arm_2.s2p", "port 1 of the file")
    port = dict(lanes.segment("lane-1/part-port").holds)
    worst = float(outcome.metrics.power_balance.sel(port_in=1).max())
    assert port["Most power back"].startswith(f"{round(10 * worst) * 10} % at 4.05")
    assert dict(lanes.part.holds)["Verdict"] == outcome.verdict


def test_every_picture_a_segment_names_exists(lanes, outcome):
    from deembed.views import pictures

    inventory = pictures(outcome)
    named = {s.picture_name for s in lanes.segments}
    assert named <= set(inventory)
    assert {"arm.1", "terms.port-2", "cable-plane.3", "part.transmission"} <= named


def test_without_calibration_and_fixture_segments_say_so(outcome):
    bare = lane_map(outcome.changed(terms=None, shell=None, findings=(), disagreement=None))
    box, arm = bare.lanes[0].of("error-box")[0], bare.lanes[0].of("arm")[0]
    assert (box.state, box.state_words, box.picture_name) == (
        "absent",
        "already corrected by the instrument",
        "",
    )
    assert (arm.state, arm.picture_name) == ("absent", "")
    assert bare.total_ps == 0
    assert "part port 1, no arm" in bare.alt
    assert dict(arm.holds)["Arm"] == "none given"


def test_a_port_that_never_drives_gets_its_length_from_the_transmission(outcome, fake):
    one = outcome.terms.copy()
    one["reflection_tracking"] = one.reflection_tracking.where(one.port_in == 1)
    found = box_lengths(one)
    assert found[2] == pytest.approx(fake.BOX_PS[2], rel=1e-6)
    nothing = one.assign(transmission_tracking=one.transmission_tracking.where(False))
    assert np.isnan(box_lengths(nothing)[2])
    assert box_lengths(None) == {}


def test_a_plain_through_is_no_arm(outcome, fake):
    from deembed.shell import shell_from_arms

    f = outcome.part.frequency.values
    shell = shell_from_arms({1: fake.arm_files(f)[1]}, ports=[1, 2, 3])
    assert arm_length(shell, 1)[0] == pytest.approx(212, rel=1e-6)
    assert arm_length(shell, 2) == (0.0, "no arm here: the cable plane is the part's plane")
    assert arm_length(None, 1)[1].startswith("no arm here")


def test_what_has_no_value_is_said_where_it_is_held(outcome):
    terms = outcome.terms.where(False).drop_vars("redundancy").assign_attrs(redundancy_absent="boxes")
    dead = outcome.shell.copy()
    dead["inner_outer"] = dead.inner_outer * np.nan
    metrics = outcome.metrics.where(False)
    lanes = lane_map(outcome.changed(terms=terms, shell=dead, metrics=metrics, findings=()))
    box = dict(lanes.segment("lane-1/round-1-2/error-box").holds)
    assert box["One-way length"] == "could not be estimated from the phase"
    assert box["Highest directivity"] == "no value"
    assert box["Redundancy"] == "none: boxes"
    arm = dict(lanes.segment("lane-1/arm").holds)
    assert arm["Lowest transmission"] == "no value"
    assert dict(lanes.segment("lane-1/part-port").holds)["Most power back"] == "not driven"
    assert "Gain ceiling" not in dict(lanes.part.holds)


def test_a_negative_length_is_drawn_as_nothing_and_said(outcome):
    short = outcome.terms.copy()
    turn = np.exp(2j * np.pi * outcome.terms.frequency * 2 * 4e-12)
    short["reflection_tracking"] = (short.reflection_tracking * 0 + turn).transpose("frequency", "port_in")
    box = lane_map(outcome.changed(terms=short)).segment("lane-1/round-1-2/error-box")
    assert box.from_ps == box.to_ps
    assert dict(box.holds)["One-way length"] == "-4.0 ps (drawn as 0)"


def test_one_port_terms_still_give_a_length(outcome, fake):
    alone = outcome.terms[["directivity", "source_match", "reflection_tracking"]]
    assert box_lengths(alone)[1] == pytest.approx(fake.BOX_PS[1], rel=1e-6)
