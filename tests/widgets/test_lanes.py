"""The panels without a browser: what a click changes, what is said where, and that no callback fails unseen."""

import logging
import re
from html import escape

import pytest

from deembed.errors import DeembedError
from deembed.job import load_job
from deembed.simulate.demo import write_demo
from deembed.widgets import Lanes


@pytest.fixture(scope="module")
def bad_job(tmp_path_factory):
    return write_demo(tmp_path_factory.mktemp("widget") / "bad", points=101, mistake="thru-length")


@pytest.fixture(scope="module")
def outcome(bad_job):
    return load_job(bad_job).run()


@pytest.fixture
def lanes(outcome, caplog):
    """Panels of an outcome; a callback that failed would only be logged, so the log must stay empty."""
    shown = Lanes(outcome)
    yield shown
    assert [r.getMessage() for r in caplog.records if r.levelno >= logging.WARNING] == []


def told(lanes):
    return dict(re.findall(r'data-(\w+)="([^"]*)"', lanes.status.value))


def test_an_outcome_is_shown_at_once(lanes, outcome):
    assert outcome.verdict.split(";")[0] in lanes.verdict.value
    assert told(lanes) == {
        "state": "ready",
        "segment": "part",
        "picture": "part.transmission",
        "band": "whole",
    }
    assert repr(lanes) == f"Lanes({outcome.verdict})"
    assert 'role="img"' in lanes.pictures.picture.value and "aria-label" in lanes.lanes.picture.value


def test_every_segment_has_a_button_that_says_its_state(lanes):
    assert len(lanes.lanes.buttons) == len(lanes._map.segments)
    names = {key: b.tooltip for key, b in lanes.lanes.buttons.items()}
    for segment in lanes._map.segments:
        assert names[segment.id] == f"{segment.title}: {segment.state_words}"
    assert all("deembed-segment" in b._dom_classes for b in lanes.lanes.buttons.values())


def test_choosing_a_segment_shows_what_it_holds_and_its_picture(lanes):
    lanes.lanes.buttons["lane-2/arm"].click()
    assert told(lanes)["segment"] == "lane-2/arm" and told(lanes)["picture"] == "arm.2"
    segment = lanes._map.segment("lane-2/arm")
    for label, value in segment.holds:
        assert label in lanes.holding.value and value.split("<")[0] in lanes.holding.value
    assert 'data-chosen="yes"' in lanes.lanes.picture.value
    assert lanes.pictures.choice.value == "arm.2"


def test_every_segment_can_be_chosen(lanes):
    for key, button in lanes.lanes.buttons.items():
        button.click()
        assert told(lanes)["segment"] == key
        assert lanes._map.segment(key).title.split("&")[0] in lanes.holding.value


def test_a_finding_takes_the_pictures_to_its_band_and_back(lanes, outcome):
    gain = next(f for f in outcome.findings if f.kind == "gain")
    lanes.findings.buttons[gain.id].click()
    low, high = map(float, told(lanes)["band"].split("-"))
    assert low <= gain.from_hz < gain.to_hz <= high
    assert told(lanes)["picture"] == "part.gain"
    assert "deembed-shown" in lanes.findings.buttons[gain.id]._dom_classes
    assert "shown: " in lanes.pictures.shown.value and not lanes.pictures.whole.disabled
    other = next(f for f in outcome.findings if f.kind == "redundancy")
    lanes.findings.buttons[other.id].click()
    assert told(lanes)["picture"] == "terms.redundancy"
    assert "deembed-shown" not in lanes.findings.buttons[gain.id]._dom_classes
    lanes.pictures.whole.click()
    assert told(lanes)["band"] == "whole" and lanes.pictures.whole.disabled


def test_no_finding_is_left_out(lanes, outcome):
    panel = lanes.findings.children[1:]
    assert len(panel) == len(outcome.findings)
    for finding, row in zip(outcome.findings, panel, strict=True):
        assert (
            finding.text.split("'")[0] in row.children[-1].value
            and finding.severity in row.children[-1].value
        )


def test_the_list_of_pictures_changes_the_picture(lanes):
    before = lanes.pictures.picture.value
    for _, name in lanes.pictures.choice.options:
        lanes.pictures.choice.value = name
        assert told(lanes)["picture"] == name
    assert lanes.pictures.picture.value != before


def test_blind_spots_and_cautions_are_there(lanes, outcome):
    text = "".join(
        getattr(c, "value", "") for c in lanes.body.children if isinstance(getattr(c, "value", ""), str)
    )
    assert all(escape(b.reading) in text for b in outcome.blind_spots) and outcome.blind_spots
    assert "not a calibration certificate" in text


def test_a_job_file_is_run_in_the_background(bad_job, caplog):
    lanes = Lanes(bad_job).wait(60)
    assert told(lanes)["state"] == "ready" and lanes.outcome is not None
    assert lanes.progress.value == 1.0 and lanes._running.layout.display == "none"
    job = Lanes(load_job(bad_job), theme="dark").wait(60)
    assert job.outcome.verdict == lanes.outcome.verdict
    assert caplog.records == []


def test_a_job_that_cannot_run_says_why_and_nothing_is_raised(tmp_path):
    lanes = Lanes(tmp_path / "nowhere.toml").wait(60)
    assert told(lanes)["state"] == "failed"
    assert "The job could not be run." in lanes.verdict.value and "nowhere.toml" in lanes.verdict.value
    assert "Traceback" not in lanes.verdict.value and "nowhere.toml" in repr(lanes)


def test_something_unexpected_keeps_its_details_behind_a_click():
    class Broken:
        def run(self, progress=None):
            raise RuntimeError("disk <gone>")

    lanes = Lanes(Broken()).wait(60)
    assert "stopped unexpectedly: disk &lt;gone&gt;" in lanes.verdict.value
    assert "<details><summary>Details</summary><pre>Traceback" in lanes.verdict.value


def test_what_the_user_typed_is_escaped(outcome, bad_job):
    shown = Lanes(load_job(bad_job).changed(**{"job.title": "<b>x</b>", "job.operator": "<i>me</i>"}).run())
    texts = [shown.verdict.value, shown.holding.value, shown.lanes.picture.value]
    assert not any("<i>me</i>" in t or "<b>x</b>" in t for t in texts)


def test_an_unknown_theme_is_said():
    with pytest.raises(DeembedError, match="theme 'pink' is not one of light, dark"):
        Lanes("x.toml", theme="pink")
