"""Which pictures a segment offers, and where a finding is seen."""

from deembed.findings import Finding
from deembed.views import lane_map, pictures
from deembed.views.offered import offered, seen_in


def test_a_segment_offers_its_own_pictures_first_then_those_of_the_part(outcome):
    inventory, lanes = pictures(outcome), lane_map(outcome)
    part = inventory.group("part")
    own = {
        s.id: tuple(n for n in offered(inventory, s) if n not in part or n == s.picture_name)
        for s in lanes.segments
    }
    assert own["lane-2/arm"] == ("arm.2", "arm.2.delay")
    assert own["lane-3/cable-plane"] == ("cable-plane.3", "rounds.disagreement", "round.2-3", "round.3-1")
    assert own["lane-1/round-1-2/error-box"] == ("terms.port-1", "terms.redundancy", "raw.raw/open_1.s1p")
    assert own["lane-1/round-1-2/analyzer-port"] == ("raw.raw/part_12.s2p",)
    assert own["part"] == ("part.transmission",)
    for s in lanes.segments:
        names = offered(inventory, s)
        assert set(part) <= set(names) <= set(inventory)
        assert len(set(names)) == len(names)
        assert names[0] == s.picture_name


def test_a_segment_that_holds_nothing_offers_the_part(outcome):
    bare = outcome.changed(terms=None, shell=None, findings=(), disagreement=None)
    inventory, lanes = pictures(bare), lane_map(bare)
    for kind in ("arm", "error-box"):
        assert offered(inventory, lanes.lanes[0].of(kind)[0]) == inventory.group("part")


def test_a_finding_is_seen_by_its_kind_or_else_where_it_is(outcome):
    inventory, lanes = pictures(outcome), lane_map(outcome)
    seen = {f.kind: seen_in(inventory, lanes, f) for f in outcome.findings}
    assert seen == {
        "gain": "part.gain",
        "disagreement": "rounds.disagreement",
        "arm-loss": "arm.3",
        "redundancy": "terms.redundancy",
        "odd": "",
    }
    elsewhere = Finding("three-way-part-1", "three-way", "", "note", "A two-port has no such law.")
    two = outcome.changed(metrics=outcome.metrics.drop_vars(["three_way_floor"]), findings=(elsewhere,))
    assert seen_in(pictures(two), lane_map(two), elsewhere) == "part.transmission"
