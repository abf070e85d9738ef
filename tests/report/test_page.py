"""The report: verdict first, nothing lost, nothing loaded from outside, everything typed escaped."""

import re
from html.parser import HTMLParser

import pytest

from deembed.findings import BlindSpot, Suspect
from deembed.report import report_html

VOID = {"meta", "br", "hr", "img", "input", "link"}


class Outline(HTMLParser):
    """Tags, attributes and text of a page; fails on tags that do not close in order."""

    def __init__(self):
        super().__init__()
        self.tags, self.stack, self.text = [], [], []

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.stack.append(tag)

    def handle_startendtag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag):
        assert self.stack.pop() == tag

    def handle_data(self, data):
        if self.stack and self.stack[-1] not in ("style",):
            self.text.append(data)


def outline(page):
    found = Outline()
    found.feed(page)
    assert found.stack == []
    return found


@pytest.fixture(scope="module")
def page(outcome):
    return report_html(outcome)


@pytest.fixture(scope="module")
def parsed(page):
    return outline(page)


def test_the_verdict_comes_first(page, parsed, outcome):
    heads = [t for t, _ in parsed.tags if re.fullmatch(r"h\d", t)]
    assert heads[0] == "h1"
    assert outcome.verdict in page
    assert page.index(outcome.verdict) < page.index("<h2")


def test_no_finding_is_lost(parsed, outcome):
    said = " ".join(" ".join(parsed.text).split())
    for f in outcome.findings:
        assert f.text in said
        assert ("li", f.id) in [(t, a.get("id")) for t, a in parsed.tags]
    assert "◆ contradiction" in said
    assert "3.86 to 4.26 GHz, worst at 4.06 GHz" in said
    assert "Where: part port 2, round 1-2, round 2-3." in said
    assert "12 standard uncertainties" in said


def test_everything_the_user_typed_is_escaped(page, parsed):
    assert "<script" not in page
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in page
    assert "board &lt;B&gt;" in page
    assert "<script>alert(1)</script>" in " ".join(parsed.text)


def test_nothing_is_loaded_from_outside(page, parsed):
    namespaces = {"http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"}
    assert set(re.findall(r"https?://[^\"'\s<>)]+", page)) <= namespaces
    assert not {"script", "link", "iframe", "img", "object"} & {t for t, _ in parsed.tags}
    for _, attributes in parsed.tags:
        for key in ("src", "href", "xlink:href"):
            assert (attributes.get(key) or "#").startswith("#")
    assert "@import" not in page
    assert all(inside.startswith("#") for inside in re.findall(r"url\(([^)]+)\)", page))


def test_every_picture_has_words(parsed):
    pictures = [a for t, a in parsed.tags if t == "svg"]
    assert len(pictures) >= 20
    assert all(a["role"] == "img" and len(a["aria-label"]) > 20 for a in pictures)
    drawn = {a["id"] for t, a in parsed.tags if t == "figure" and "id" in a}
    assert {"picture-part-gain", "picture-part-chart", "picture-terms-port-2", "picture-arm-3"} <= drawn


def test_ids_are_unique(parsed):
    ids = [a["id"] for _, a in parsed.tags if "id" in a]
    assert len(ids) == len(set(ids))


def test_what_went_in_is_listed_with_hashes(page, outcome):
    for key, name in outcome.job.input_names():
        assert name in page
        assert outcome.job.get(name, key=key).sha256 in page
    assert "generic-coax-3p5mm" in page


def test_cautions_versions_and_the_disclaimer_are_there(page):
    for words in (
        "not a calibration certificate",
        "RF power",
        "Static",
        "torque",
        "Local rules",
        "Computed with Python",
    ):
        assert words in page


def test_it_prints_on_a4(page):
    assert "@media print" in page
    assert "size: A4" in page
    assert "break-inside: avoid" in page


def test_blind_spots_and_suspects_are_shown(outcome):
    full = outcome.changed(
        blind_spots=(BlindSpot("arm reversed", "arm 2", 0.34, "a short behind arm 2", "Arm 2 < turned."),),
        suspects=(
            Suspect("exchanged", "port 2", 0.8, "Open and short exchanged & read."),
            Suspect("x", "", None, "Other."),
        ),
    )
    page = report_html(full)
    assert "Arm 2 &lt; turned." in page
    assert "0.34 dB" in page
    assert "Open and short exchanged &amp; read. (port 2, belief 0.80)" in page
    assert "Other. (the part)" in page


def test_without_blind_spots_it_still_says_what_was_not_seen(page):
    assert "What these readings could not have shown" in page
    assert "can look just like a good part" in page
    assert "Not judged, because [expect] does not say: lossless." in page


def test_absent_redundancy_gives_its_reason(outcome):
    bare = outcome.terms.drop_vars("redundancy").assign_attrs(redundancy_absent="one port alone drives")
    assert "No redundancy residual: one port alone drives." in report_html(outcome.changed(terms=bare))


def test_a_bare_job_gives_a_whole_page(outcome):
    bare = outcome.changed(terms=None, shell=None, disagreement=None, findings=())
    parsed = outline(report_html(bare))
    assert "No findings." in " ".join(parsed.text)


def test_a_one_port_part_gives_a_whole_page(outcome, fake):
    from deembed.labels import sparams

    s = sparams(outcome.part.values[:, :1, :1], outcome.part.frequency.values)
    one = outcome.changed(part=s, metrics=fake.metrics_of(s), terms=None, shell=None, disagreement=None)
    drawn = {a["id"] for t, a in outline(report_html(one)).tags if t == "figure" and "id" in a}
    assert "picture-part-chart" in drawn
    assert "picture-part-transmission" not in drawn


def test_size_at_1601_points(fake):
    assert len(report_html(fake.fake_outcome(1601)).encode()) < 3e6


def test_the_same_outcome_gives_the_same_page(outcome, page):
    assert report_html(outcome) == page
