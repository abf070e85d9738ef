"""The inventory: what applies is there, made when asked for, with values that match the outcome."""

import numpy as np
import pytest

from deembed.views import pictures


@pytest.fixture(scope="module")
def inventory(outcome):
    return pictures(outcome)


def test_everything_that_applies_is_listed(inventory):
    names = set(inventory)
    assert {f"part.{n}" for n in ("transmission", "reflection", "phase", "delay", "chart", "gain")} <= names
    assert {"part.reciprocity", "part.power", "part.three-way", "part.lossless"} <= names
    assert {"cable-plane.1", "rounds.disagreement", "round.2-3", "terms.port-1", "terms.redundancy"} <= names
    assert {"arm.3", "arm.3.delay", "raw.raw/part_31.s2p"} <= names
    assert "fixture.coupling" not in names
    assert "terms.line-phase" not in names
    assert len(inventory) == len(names)


def test_pictures_are_made_once_and_only_when_asked_for(outcome):
    inventory = pictures(outcome.changed(metrics=outcome.metrics.drop_vars("largest_singular_value")))
    assert "part.gain" in inventory
    with pytest.raises(KeyError, match="largest_singular_value"):
        inventory["part.gain"]
    assert inventory["part.power"] is inventory["part.power"]


def test_an_unknown_picture_is_refused_by_name(inventory):
    with pytest.raises(KeyError, match=r"no picture 'part\.gian'; there are part\.transmission"):
        inventory["part.gian"]


def test_groups_are_found_by_their_first_word(inventory):
    assert inventory.group("arm") == ("arm.1", "arm.1.delay", "arm.2", "arm.2.delay", "arm.3", "arm.3.delay")
    assert inventory.group("round") == ("round.1-2", "round.2-3", "round.3-1")


def test_every_picture_has_a_title_units_and_words_with_a_value(inventory):
    for name, p in inventory.items():
        assert p.name == name
        assert p.title
        assert p.y_label
        assert any(c.isdigit() for c in p.alt), name
        assert p.alt.endswith("."), name


def test_bands_are_where_their_finding_is_about(inventory):
    assert [b.word for b in inventory["part.transmission"].bands] == ["gain above 1"]
    assert [b.finding for b in inventory["part.gain"].bands] == ["gain-part-1"]
    assert [b.finding for b in inventory["rounds.disagreement"].bands] == ["disagreement-part-port-2-1"]
    assert inventory["part.power"].bands == ()
    assert inventory["arm.3"].bands == ()


def test_values_are_the_outcomes_own(inventory, outcome):
    assert np.array_equal(inventory["part.gain"].traces[0].y, outcome.metrics.largest_singular_value.values)
    t = next(t for t in inventory["part.transmission"].traces if t.name == "S31")
    want = outcome.part.sel(port_out=3, port_in=1).values
    assert np.allclose(10 ** (t.y / 20), np.abs(want), rtol=1e-12)


def test_what_is_not_there_is_not_listed(outcome):
    bare = pictures(outcome.changed(terms=None, shell=None, disagreement=None, rounds=(), raw={}))
    assert {n.split(".")[0] for n in bare} == {"part"}


def test_a_coupled_fixture_shows_its_leakage(outcome, fake):
    job = fake.job()
    job.spec.fixture.arms, job.spec.fixture.coupled = (), type("Coupled", (), {"file": "fixture/all.s6p"})()
    coupled = outcome.changed(job=job)
    assert {"fixture.coupling", "arm.1"} <= set(pictures(coupled))
    from deembed.views import lane_map
    from deembed.views.sentences import facts_rows

    assert dict(facts_rows(coupled))["Fixture"] == "coupled, fixture/all.s6p"
    assert dict(lane_map(coupled).segment("lane-1/arm").holds)["File"] == "fixture/all.s6p (coupled fixture)"


def test_a_one_port_part_has_no_pictures_of_pairs(outcome, fake):
    from deembed.labels import sparams

    s = sparams(outcome.part.values[:, :1, :1], outcome.part.frequency.values)
    names = set(pictures(outcome.changed(part=s, metrics=fake.metrics_of(s))))
    assert "part.transmission" not in names
    assert "part.reciprocity" not in names
    assert "part.three-way" not in names
    assert {"part.reflection", "part.chart", "part.gain"} <= names


def test_line_phase_is_listed_where_the_terms_hold_it(outcome):
    phased = outcome.terms.assign(line_phase=("frequency", np.linspace(20, 160, 401)))
    assert "20 to 160 degrees" in pictures(outcome.changed(terms=phased))["terms.line-phase"].alt
