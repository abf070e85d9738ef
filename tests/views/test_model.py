"""Pictures as data: what is missing is named, values are read off the grid, bands keep their words."""

import numpy as np
import pytest

from deembed.errors import DeembedError
from deembed.findings import Finding
from deembed.labels import sparams
from deembed.views.model import Picture, Trace, bands_of, one_sweep, room_around, s_name

F = np.linspace(1e9, 2e9, 11)


def picture(*traces, **more):
    return Picture("part.test", "A title", "Magnitude (dB)", traces, "dB", **more)


def test_curves_without_values_are_named_as_missing_and_not_drawn():
    p = picture(Trace("S21", F, F / 1e9), Trace("S12", F, np.full(11, np.nan)))
    assert [t.name for t in p.traces] == ["S21"]
    assert p.missing == ("S12",)


def test_values_are_read_at_the_nearest_grid_point():
    p = picture(Trace("S21", F, F / 1e9), Trace("S31", F, -F / 1e9))
    first, second = p.at(1.26e9)
    assert (first.name, first.value, first.unit, first.frequency) == ("S21", 1.3, "dB", 1.3e9)
    assert second.value == -1.3
    assert first.words == "S21 1.3 dB"


def test_a_reflection_chart_is_read_as_a_complex_number():
    p = picture(Trace("S11", np.full(11, 0.25), np.full(11, -0.5), frequency=F), kind="reflection")
    assert p.at(1e9)[0].value == 0.25 - 0.5j
    assert p.at(1e9)[0].words.startswith("S11 +0.2500 - j0.5000")


def test_a_point_without_a_value_says_so():
    y = np.array([np.nan, *np.ones(10)])
    assert picture(Trace("S21", F, y)).at(1e9)[0].words == "S21 no value dB"


def test_span_covers_every_curve():
    p = picture(Trace("a", F, F), Trace("b", F + 1e9, F))
    assert p.span == (1e9, 3e9)
    assert picture().span == (0.0, 0.0)


def test_an_unknown_kind_of_picture_is_refused():
    with pytest.raises(DeembedError, match=r"picture part\.test: kind 'pie' is not lines or reflection"):
        picture(kind="pie")


def test_two_digit_ports_get_a_comma():
    assert s_name(2, 1) == "S21"
    assert s_name(10, 2) == "S10,2"


def test_leading_dimensions_are_refused_by_name():
    s = sparams(np.zeros((4, 11, 2, 2)), F, leading=["draw"])
    with pytest.raises(DeembedError, match=r"the S array also runs along draw\. Select one entry"):
        one_sweep(s, what="the S array")


def test_room_around_a_band_stays_inside_the_sweep():
    assert room_around(2e9, 4e9, span=(1e9, 9e9)) == pytest.approx((1.7e9, 4.3e9))
    assert room_around(1e9, 1e9, span=(1e9, 9e9)) == pytest.approx((1e9, 1.16e9))


def test_bands_leave_notes_and_bandless_findings_out_and_keep_ids():
    findings = [
        Finding("a", "non-reciprocity", "", "contradiction", "text", 1e9, 2e9),
        Finding("b", "gain", "", "note", "text", 1e9, 2e9),
        Finding("c", "gain", "", "warning", "text"),
        Finding("d", "some-thing", "arm 1", "warning", "text", 3e9, 4e9),
    ]
    bands = bands_of(findings)
    assert [(b.finding, b.word, b.from_hz, b.to_hz) for b in bands] == [
        ("a", "not reciprocal", 1e9, 2e9),
        ("d", "some thing", 3e9, 4e9),
    ]
    assert [b.finding for b in bands_of(findings, kinds=["some-thing"])] == ["d"]
    assert picture().with_bands(bands).bands == bands
