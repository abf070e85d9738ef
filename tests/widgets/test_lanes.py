"""The panels without a browser: what a click changes, what is said where, and that no callback fails unseen."""

import logging
import re
import threading
from html import unescape

import pytest

from deembed.errors import DeembedError
from deembed.findings import Finding
from deembed.job import load_job
from deembed.simulate.demo import write_demo
from deembed.widgets import Lanes


@pytest.fixture(scope="module")
def bad_job(tmp_path_factory):
    return write_demo(tmp_path_factory.mktemp("widget") / "bad", points=101, mistake="thru-length")


@pytest.fixture(scope="module")
def bad(bad_job):
    return load_job(bad_job).run()


@pytest.fixture
def lanes(bad, caplog):
    """Panels of an outcome; a callback that failed would only be logged, so the log must stay empty."""
    shown = Lanes(bad)
    yield shown
    assert [r.getMessage() for r in caplog.records if r.levelno >= logging.WARNING] == []


def told(lanes):
    return dict(re.findall(r'data-(\w+)="([^"]*)"', lanes.status.value))


def plain(html):
    return unescape(re.sub(r"<[^>]+>", " ", html)).replace("\N{NO-BREAK SPACE}", " ")


def test_an_outcome_is_shown_at_once(lanes, bad):
    assert bad.verdict in plain(lanes.verdict.value)
    assert told(lanes) == {
        "state": "ready",
        "segment": "part",
        "picture": "part.transmission",
        "band": "whole",
    }
    assert "Chosen: The part. Picture: Transmission, whole sweep." in plain(lanes.status.value)
    assert 'role="img"' in lanes.pictures.picture.value and "aria-label" in lanes.lanes.picture.value
    assert lanes.running.layout.display == "none"


def test_every_segment_has_a_button_that_says_its_state(lanes):
    assert list(lanes.lanes.buttons) == [s.id for s in lanes._map.segments]
    for segment in lanes._map.segments:
        chosen = ", chosen" if segment.id == "part" else ""
        button = lanes.lanes.buttons[segment.id]
        assert button.description == f"{segment.title}: {segment.state_words}{chosen}"
        assert button.tooltip == button.description
        assert "deembed-segment" in button._dom_classes


def test_buttons_lie_where_the_drawing_has_their_segments(lanes):
    from deembed.plots import segment_boxes

    boxes = segment_boxes(lanes._map, width=960)
    for key, button in lanes.lanes.buttons.items():
        x, y, width, height = boxes[key]
        top, left = (float(button.layout.margin.split()[k].rstrip("%")) for k in (0, 3))
        wide, tall = float(button.layout.width.rstrip("%")), float(button.layout.height.rstrip("%"))
        assert top * 9.6 == pytest.approx(y, abs=0.02)
        assert (left + wide / 2) * 9.6 == pytest.approx(x + width / 2, abs=0.02)
        assert wide * 9.6 >= max(width, 16) - 0.02
        assert tall > 0 and height > 0
        assert ("deembed-thin" in button._dom_classes) == (0 < width < 16)


def test_choosing_a_segment_shows_what_it_holds_and_its_picture(lanes):
    lanes.lanes.buttons["lane-2/arm"].click()
    assert told(lanes)["segment"] == "lane-2/arm" and told(lanes)["picture"] == "arm.2"
    segment, said = lanes._map.segment("lane-2/arm"), plain(lanes.holding.value)
    assert segment.holds
    for label, value in segment.holds:
        assert label in said and value in said
    assert 'data-segment="lane-2/arm" data-state="plain" data-chosen="yes"' in lanes.lanes.picture.value
    assert lanes.pictures.choice.value == "arm.2"
    assert "arm.2.delay" in [name for _, name in lanes.pictures.choice.options]
    assert lanes.lanes.buttons["lane-2/arm"].description.endswith(", chosen")
    assert not lanes.lanes.buttons["part"].description.endswith(", chosen")


def test_every_segment_can_be_chosen_and_leads_back_to_the_part(lanes):
    for key, button in lanes.lanes.buttons.items():
        button.click()
        segment = lanes._map.segment(key)
        assert told(lanes)["segment"] == key and told(lanes)["picture"] == segment.picture_name
        assert segment.title in plain(lanes.holding.value)
        assert "part.gain" in [name for _, name in lanes.pictures.choice.options]


def test_findings_of_the_chosen_segment_are_marked(lanes):
    def marked():
        return {k for k, row in lanes.findings.rows.items() if "▸" in row.children[0].value}

    for key in ("part", "lane-1/round-1-2/error-box", "lane-2/arm"):
        lanes.lanes.buttons[key].click()
        segment = lanes._map.segment(key)
        assert marked() == set(segment.findings)
        assert marked() == {k for k, r in lanes.findings.rows.items() if "deembed-here" in r._dom_classes}
        assert ("marked ▸ in the findings" in lanes.holding.value) == bool(segment.findings)
    assert marked() == set()


def test_a_finding_takes_the_pictures_to_its_band_and_back(lanes, bad):
    gain = next(f for f in bad.findings if f.kind == "gain")
    link = lanes.findings.buttons[gain.id]
    assert link.description.startswith("Show ") and lanes.pictures.whole.layout.display == "none"
    drawn = lanes.pictures.drawn
    link.click()
    assert lanes.pictures.drawn == drawn + 1
    low, high = map(float, told(lanes)["band"].split("-"))
    assert low <= gain.from_hz < gain.to_hz <= high
    assert told(lanes)["picture"] == "part.gain"
    assert link.description.startswith("Shown: ") and "deembed-shown" in link._dom_classes
    assert "GHz" in lanes.pictures.shown.value and lanes.pictures.whole.layout.display == ""
    lanes.pictures.whole.click()
    assert told(lanes)["band"] == "whole" and lanes.pictures.whole.layout.display == "none"
    assert link.description.startswith("Show ") and "deembed-shown" not in link._dom_classes
    assert "whole sweep" in lanes.pictures.shown.value


def test_the_band_stays_when_another_picture_is_chosen(lanes, bad):
    lanes.findings.buttons[bad.findings[0].id].click()
    band = told(lanes)["band"]
    assert band != "whole"
    for name in ("part.phase", "part.chart"):
        lanes.pictures.choice.value = name
        assert (told(lanes)["picture"], told(lanes)["band"]) == (name, band)
    lanes.lanes.buttons["lane-1/arm"].click()
    assert (told(lanes)["picture"], told(lanes)["band"]) == ("arm.1", band)


@pytest.mark.parametrize("missing", [{"shell": None}, {"terms": None, "shell": None, "disagreement": None}])
def test_what_was_not_done_leaves_segments_that_say_so(fake, missing, caplog):
    lanes = Lanes(fake.fake_outcome(101).changed(**missing))
    for key, button in lanes.lanes.buttons.items():
        button.click()
        segment = lanes._map.segment(key)
        assert told(lanes)["segment"] == key and segment.state_words in plain(lanes.holding.value)
        assert told(lanes)["picture"] == (segment.picture_name or "part.reflection")
        lanes.lanes.buttons["lane-1/part-port"].click()
    arm = lanes.lanes.buttons["lane-1/arm"]
    assert "deembed-thin" not in arm._dom_classes
    assert "deembed-thin" in lanes.lanes.buttons["lane-1/cable-plane"]._dom_classes
    assert caplog.records == []


def test_one_finding_at_a_time_is_shown(lanes, bad):
    first, second = bad.findings[0], next(f for f in bad.findings if f.kind == "disagreement")
    for finding in (first, second):
        lanes.findings.buttons[finding.id].click()
        shown = [k for k, b in lanes.findings.buttons.items() if b.description.startswith("Shown")]
        assert shown == [finding.id]
    assert told(lanes)["picture"] == "rounds.disagreement"


def test_a_finding_over_the_whole_sweep_shows_the_whole_sweep(lanes, bad):
    f = bad.part.frequency.values
    whole = next(x for x in bad.findings if (x.from_hz, x.to_hz) == (f[0], f[-1]))
    lanes.findings.buttons[bad.findings[0].id].click()
    lanes.findings.buttons[whole.id].click()
    assert told(lanes)["band"] == "whole"
    assert lanes.findings.buttons[whole.id].description.startswith("Shown: ")
    assert lanes.findings.buttons[bad.findings[0].id].description.startswith("Show ")


def test_no_finding_is_left_out_and_one_without_a_band_has_no_link(fake):
    made = fake.fake_outcome(101)
    lanes = Lanes(made)
    assert list(lanes.findings.rows) == [f.id for f in made.findings]
    for finding in made.findings:
        row = lanes.findings.rows[finding.id]
        assert finding.text in plain(row.children[0].value) and finding.severity in row.children[0].value
        assert (finding.id in lanes.findings.buttons) == (finding.from_hz is not None)
        assert len(row.children) == (1 if finding.from_hz is None else 2)
    arm = next(f for f in made.findings if f.kind == "arm-loss")
    lanes.findings.buttons[arm.id].click()
    assert told(lanes)["picture"] == "arm.3"


def test_every_picture_in_the_list_can_be_shown(lanes):
    seen = set()
    for _, name in lanes.pictures.choice.options:
        lanes.pictures.choice.value = name
        assert told(lanes)["picture"] == name
        assert re.search(r'role="img" aria-label="[^"]*\d', lanes.pictures.picture.value)
        seen.add(lanes.pictures.picture.value)
    assert len(seen) == len(lanes.pictures.choice.options) >= 8


def test_a_picture_that_cannot_be_drawn_says_why_and_the_rest_stays(lanes):
    class Broken(dict):
        def __getitem__(self, name):
            if name == "part.phase":
                raise DeembedError("the part also runs along draw", where="picture", do="Select one.")
            return super().__getitem__(name)

    lanes.pictures._pictures = Broken(lanes._inventory)
    lanes.pictures.choice.value = "part.phase"
    assert "cannot be drawn. picture: the part also runs along draw. Select one." in plain(
        lanes.pictures.picture.value
    )
    lanes.pictures.choice.value = "part.gain"
    assert "<svg" in lanes.pictures.picture.value


def test_blind_spots_and_cautions_are_there(lanes, bad):
    text = plain(lanes.body.children[-1].value)
    assert bad.blind_spots and all(b.reading in text for b in bad.blind_spots)
    assert "not a calibration certificate" in text


def test_where_no_widget_can_be_shown_the_words_are(lanes, bad):
    said = lanes._repr_mimebundle_()
    assert said["text/plain"] == lanes.text
    assert lanes.text.startswith(bad.verdict) and all(f.text in lanes.text for f in bad.findings)
    assert "application/vnd.jupyter.widget-view+json" in said
    assert repr(lanes) == f"Lanes({bad.verdict})"


def test_a_job_file_is_run_in_the_background(bad_job, caplog):
    lanes = Lanes(bad_job).wait(60)
    assert told(lanes)["state"] == "ready" and lanes.outcome is not None
    assert lanes.running.progress.value == 1.0 and lanes.running.layout.display == "none"
    job = Lanes(load_job(bad_job), theme="dark").wait(60)
    assert job.outcome.verdict == lanes.outcome.verdict
    assert caplog.records == []


def test_while_a_job_runs_its_progress_is_shown(bad):
    reached, go_on = threading.Event(), threading.Event()

    class Slow:
        def run(self, progress=None):
            progress(0.4, "Correcting round <2-3>")
            reached.set()
            go_on.wait(60)
            return bad

    lanes = Lanes(Slow())
    assert reached.wait(60)
    assert told(lanes)["state"] == "running" and lanes.running.layout.display == ""
    assert lanes.running.progress.value == 0.4
    assert "Correcting round &lt;2-3&gt;" in lanes.running.doing.value
    assert repr(lanes) == "Lanes(running)" and "still running" in lanes._repr_mimebundle_()["text/plain"]
    go_on.set()
    lanes.wait(60)
    assert told(lanes)["state"] == "ready" and lanes.running.layout.display == "none"


def test_a_job_that_cannot_run_says_why_and_nothing_is_raised(tmp_path):
    lanes = Lanes(tmp_path / "nowhere.toml").wait(60)
    assert told(lanes)["state"] == "failed"
    assert "The job could not be run." in lanes.verdict.value and "nowhere.toml" in lanes.verdict.value
    assert "Traceback" not in lanes.verdict.value
    assert "nowhere.toml" in repr(lanes) and "nowhere.toml" in lanes.text
    assert lanes.running.layout.display == "none"


def test_what_is_not_a_job_is_said():
    said = plain(Lanes(3.5).wait(60).verdict.value)
    assert (
        "Lanes: float is neither a job nor an outcome. Give the path of a job.toml or an outcome.nc" in said
    )


def test_something_unexpected_keeps_its_details_behind_a_click():
    class Broken:
        def run(self, progress=None):
            raise RuntimeError("disk <gone>")

    lanes = Lanes(Broken()).wait(60)
    assert "stopped unexpectedly: disk &lt;gone&gt;" in lanes.verdict.value
    assert "<details><summary>Details</summary><pre>Traceback" in lanes.verdict.value


def test_what_the_user_typed_is_escaped(bad):
    typed = "<i>me</i> at 3 GHz"
    finding = Finding("x-arm-2-1", "x", "arm 2", "warning", typed, 1e9, 2e9)
    shown = Lanes(bad.__class__(**{**vars(bad), "findings": (finding,), "verdict": typed}))
    shown.lanes.buttons["lane-2/arm"].click()
    texts = [shown.verdict.value, shown.findings.rows[finding.id].children[0].value, shown.holding.value]
    assert not any("<i>" in t for t in texts)
    assert "&lt;i&gt;me&lt;/i&gt; at 3\N{NO-BREAK SPACE}GHz" in texts[0]
    assert all("&lt;i&gt;" in t for t in texts[:2])


def test_clicks_from_several_threads_leave_one_story(bad, caplog):
    lanes = Lanes(bad)
    links = list(lanes.findings.buttons.values())
    segments = [lanes.lanes.buttons[k] for k in ("lane-1/arm", "lane-2/arm", "part")]

    def press(buttons):
        for k in range(6):
            buttons[k % len(buttons)].click()

    threads = [threading.Thread(target=press, args=(b,)) for b in (links, segments, [lanes.pictures.whole])]
    for t in threads:
        t.start()
    for t in threads:
        t.join(60)
    band = lanes.pictures.band
    spoken = "whole" if band is None else f"{band[0]:.0f}-{band[1]:.0f}"
    assert told(lanes) == {
        "state": "ready",
        "segment": lanes.lanes.selected,
        "picture": lanes.pictures.name,
        "band": spoken,
    }
    alt = lanes._inventory[lanes.pictures.name].alt
    assert alt.split(":")[0] in unescape(lanes.pictures.picture.value)
    assert lanes.pictures.choice.value == lanes.pictures.name
    assert caplog.records == []


def test_an_unknown_theme_is_said():
    with pytest.raises(DeembedError, match="theme 'pink' is not one of light, dark"):
        Lanes("x.toml", theme="pink")
