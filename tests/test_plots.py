"""Drawings show the numbers of their pictures, label themselves, and leave no figure behind."""

import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from concurrent.futures import ThreadPoolExecutor

import matplotlib
import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg

from deembed.errors import DeembedError
from deembed.plots import draw, figure, lane_map_svg, svg
from deembed.plots_chart import chart_grid
from deembed.plots_lanes_layout import layout_of, segment_boxes
from deembed.plots_lines import _placed, _spread, frequency_unit
from deembed.plots_style import LANE_THEMES, THEMES
from deembed.views import Picture, Trace, lane_map, pictures
from deembed.views.model import Band


@pytest.fixture(scope="module")
def inventory(outcome):
    return pictures(outcome)


def texts(element):
    return ["".join(t.itertext()) for t in ET.fromstring(element).iter("{http://www.w3.org/2000/svg}text")]


def test_curves_are_the_pictures_values(inventory):
    p = inventory["part.gain"]
    line = draw(p)[0]
    assert np.allclose(line.get_xdata() * 1e9, p.traces[0].x)
    assert np.array_equal(line.get_ydata(), p.traces[0].y)


def test_artists_come_back_curves_first(inventory):
    p = inventory["part.transmission"]
    artists = draw(p, cursor=4e9)
    assert [a.get_label() for a in artists[: len(p.traces)]] == [t.name for t in p.traces]
    assert len(artists) > 2 * len(p.traces)


def test_axes_say_quantity_and_unit(inventory):
    ax = draw(inventory["part.transmission"])[0].axes
    assert (ax.get_xlabel(), ax.get_ylabel()) == ("Frequency (GHz)", "Magnitude (dB)")


@pytest.mark.parametrize(
    ("highest", "unit"), [(6e9, "GHz"), (0.1e9, "GHz"), (9e7, "MHz"), (5e4, "kHz"), (20.0, "Hz"), (0.0, "Hz")]
)
def test_frequency_units_follow_the_sweep(highest, unit):
    assert frequency_unit(highest)[1] == unit


def test_every_curve_is_named_in_text_and_curves_differ_without_colour(inventory):
    for name in ("part.transmission", "terms.port-1", "cable-plane.2"):
        p = inventory[name]
        assert {t.name for t in p.traces} <= set(texts(svg(p)))
        looks = {(str(a.get_linestyle()), a.get_marker(), a.get_markerfacecolor() == "none")
                 for a in draw(p)[: len(p.traces)]}  # fmt: skip
        assert len(looks) == len(p.traces)


def test_text_is_at_least_eleven_points(inventory):
    for text in draw(inventory["part.gain"])[0].figure.findobj(lambda a: hasattr(a, "get_fontsize")):
        assert text.get_fontsize() >= 10.9 or not text.get_text()


def test_the_passive_limit_is_drawn_and_named(inventory):
    assert "passive limit 1" in texts(svg(inventory["part.gain"]))


def test_bands_are_shaded_and_named(inventory):
    p = inventory["part.gain"]
    assert "gain above 1" in texts(svg(p))
    assert "gain above 1" not in texts(svg(p, band=(1e9, 2e9)))
    many = p.with_bands([Band(1e9, 5e9, f"word {k}", "warning") for k in range(6)])
    assert {f"word {k}" for k in range(4)} <= set(texts(svg(many)))
    point = p.with_bands([Band(5.9e9, 5.9e9, "late", "contradiction")])
    assert "late" in texts(svg(point))


def test_words_of_bands_stand_apart_and_are_not_repeated_in_one_place():
    bands = [Band(1e9, 2e9, "gain", "warning"), Band(1.1e9, 1.4e9, "gain", "warning")]
    apart = [Band(1e9, 1.2e9, "gain above 1", "warning"), Band(1.25e9, 4e9, "gain above 1", "warning")]
    first = _placed(bands, 1e9, 5e9, 100.0)
    assert [p.row for p in first] == [0, None]
    second = _placed(apart, 1e9, 5e9, 300.0)
    assert [p.row for p in second] == [0, 0]
    assert second[1].start > second[1].left
    late = _placed([Band(4.99e9, 5e9, "gain above 1", "warning")], 1e9, 5e9, 300.0)[0]
    assert late.start < late.left
    assert _placed([Band(6e9, 7e9, "x", "warning")], 1e9, 5e9, 300.0) == []


def test_zooming_shows_only_the_band_and_fits_the_values_in_it(inventory):
    ax = draw(inventory["part.gain"], band=(3.9e9, 4.2e9))[0].axes
    assert ax.get_xlim() == pytest.approx((3.9, 4.2))
    ax = draw(inventory["part.gain"], band=(0.1e9, 1e9))[0].axes
    assert ax.get_ylim()[1] < 1.06


def test_the_cursor_says_its_frequency_and_marks_grid_values(inventory):
    p = inventory["part.power"]
    assert "4.06 GHz" in texts(svg(p, cursor=4.06e9))
    artists = draw(p, cursor=4.06e9)
    marks = [a for a in artists if getattr(a, "get_markersize", lambda: 0)() == 9]
    assert [float(m.get_ydata()[0]) for m in marks] == [r.value for r in p.at(4.06e9)]


def test_phase_jumps_are_gaps(inventory):
    p = inventory["part.phase"]
    y = draw(p)[0].get_ydata()
    jumps = int(np.sum(np.abs(np.diff(p.traces[0].y)) > 180))
    assert jumps > 0
    assert int(np.isnan(y).sum()) == jumps


def test_svg_is_an_image_with_the_pictures_words(inventory):
    for name in ("part.gain", "part.chart", "arm.1.delay"):
        root = ET.fromstring(svg(inventory[name]))
        assert root.get("role") == "img"
        assert root.get("aria-label") == inventory[name].alt


def test_svg_is_the_same_every_time_and_ids_do_not_meet(inventory):
    first, second = svg(inventory["part.gain"]), svg(inventory["part.power"])
    assert first == svg(inventory["part.gain"])
    ids = [re.findall(r'\bid="([^"]+)"', s) for s in (first, second)]
    assert ids[0]
    assert not set(ids[0]) & set(ids[1])
    for own, text in zip(ids, (first, second), strict=True):
        assert len(own) == len(set(own))
        used = re.findall(r'url\(#([^)]+)\)|href="#([^"]+)"', text)
        assert {a or b for a, b in used} <= set(own)


def test_tick_numbers_are_not_touched_by_rounding_of_places(inventory):
    assert "0.0005" in texts(svg(inventory["part.reciprocity"]))


def test_svg_escapes_what_a_file_may_be_called():
    name = 'a<b>"&.s1p'
    p = Picture(
        f"raw.{name}", name, "Magnitude (dB)", (Trace("S11", np.arange(3.0), np.arange(3.0)),), alt=name
    )
    root = ET.fromstring(svg(p))
    assert root.get("aria-label") == name


def test_long_sweeps_are_thinned_but_keep_their_peak():
    f = np.linspace(1e9, 2e9, 20_001)
    y = np.zeros(20_001)
    y[7_777] = 9.0
    line = draw(Picture("p", "t", "y", (Trace("S21", f, y),)))[0]
    assert line.get_xdata().size < 5000
    assert line.get_ydata().max() == 9.0


def test_pictures_of_nothing_say_so():
    p = Picture("p", "t", "y", (Trace("S12", np.arange(3.0), np.full(3, np.nan)),))
    assert any("S12 without values" in t for t in texts(svg(p)))


def test_a_band_without_values_still_has_axes():
    y = np.arange(11.0)
    y[3:8] = np.nan
    p = Picture("p", "t", "y", (Trace("S11", np.linspace(1e9, 2e9, 11), y),))
    ax = draw(p, band=(1.42e9, 1.58e9))[0].axes
    assert ax.get_xlim() == pytest.approx((1.42, 1.58))
    assert ax.get_ylim()[0] < ax.get_ylim()[1]


def test_one_point_is_drawn_as_a_mark():
    p = Picture("p", "t", "y", (Trace("S11", np.array([1e9]), np.array([0.5])),))
    (line, *_) = draw(p)
    assert line.get_marker() == "o"
    low, high = line.axes.get_xlim()
    assert low < 1.0 < high


def test_rounding_noise_is_not_blown_up():
    f = np.linspace(1e9, 2e9, 11)
    ax = draw(Picture("p", "t", "y", (Trace("S21", f, 1e-15 * np.arange(11)),), "dB"))[0].axes
    low, high = ax.get_ylim()
    assert high - low > 0.4


def test_grid_curves_keep_their_resistance_or_reactance():
    """Textbook conformal map: z = (1 + G) / (1 - G)."""
    curves = chart_grid()
    levels = (0.2, 0.5, 1.0, 2.0, 5.0)
    assert len(curves) == 15
    for g, r in zip(curves[:5], levels, strict=True):
        assert np.allclose(((1 + g) / (1 - g)).real, r, rtol=1e-6)
    for g, x in zip(curves[5:], [s * x for x in levels for s in (1, -1)], strict=True):
        assert np.allclose(((1 + g) / (1 - g)).imag, x, rtol=1e-6)
    assert all(np.abs(g).max() <= 1 for g in curves)


def test_the_chart_is_round_and_holds_the_reflections(inventory):
    p = inventory["part.chart"]
    artists = draw(p, cursor=2e9, admittance=True)
    assert np.array_equal(
        artists[0].get_xdata() + 1j * artists[0].get_ydata(), p.traces[0].x + 1j * p.traces[0].y
    )
    assert artists[0].axes.get_aspect() == 1.0
    part = draw(p, band=(1e9, 2e9))[0]
    inside = (p.traces[0].frequency >= 1e9) & (p.traces[0].frequency <= 2e9)
    assert part.get_xdata().size == inside.sum()


def test_the_chart_grows_with_reflections_above_one():
    f = np.linspace(1e9, 2e9, 5)
    p = Picture("c", "t", "", (Trace("S11", np.full(5, 1.5), np.zeros(5), frequency=f),), kind="reflection")
    assert draw(p)[0].axes.get_xlim()[1] > 1.5
    gone = Picture(
        "c",
        "t",
        "",
        (Trace("S11", np.array([0.1, np.nan]), np.zeros(2), frequency=f[:2]),),
        kind="reflection",
    )
    assert draw(gone, band=(f[1], f[1]))[0].get_xdata().size == 1


def test_labels_are_spread_in_order_and_stay_close():
    spots = _spread([0.0, 0.0, 0.0, 10.0], 1.0, -5.0, 12.0)
    assert spots == pytest.approx([-1.0, 0.0, 1.0, 10.0])
    assert _spread([11.9, 12.0], 1.0, 0.0, 12.0) == pytest.approx([11.0, 12.0])
    crowded = _spread([0.0] * 5, 1.0, 0.0, 2.0)
    assert np.allclose(np.diff(crowded), 1.0)
    assert _spread([], 1.0, 0.0, 1.0) == []


def test_an_unknown_theme_is_refused(inventory, outcome):
    with pytest.raises(DeembedError, match="theme 'sepia' is not one of light, dark"):
        svg(inventory["part.gain"], theme="sepia")
    with pytest.raises(DeembedError, match="theme 'sepia' is not one of light, dark"):
        lane_map_svg(lane_map(outcome), theme="sepia")


def contrast(a, b):
    """WCAG 2 contrast ratio of two colours."""

    def luminance(colour):
        c = np.array([int(colour[i : i + 2], 16) for i in (1, 3, 5)]) / 255
        return float(
            np.where(c <= 0.03928, c / 12.92, ((c + 0.055) / 1.055) ** 2.4) @ [0.2126, 0.7152, 0.0722]
        )

    high, low = sorted((luminance(a), luminance(b)), reverse=True)
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("theme", [*THEMES.values(), LANE_THEMES["dark"]])
def test_ink_is_readable_on_everything_it_stands_on(theme):
    for under in (theme.paper, theme.shade, theme.shade_strong):
        assert contrast(theme.ink, under) >= 7


def test_pictures_bring_their_own_sheet_so_that_any_page_will_do(inventory):
    for theme in THEMES:
        assert figure(inventory["part.gain"], theme=theme).patch.get_facecolor()[3] == 1.0
    assert THEMES["dark"].hues == THEMES["light"].hues


def test_drawings_made_at_the_same_time_are_the_same_as_one_by_one(inventory):
    names = ["part.gain", "part.chart", "part.phase", "terms.port-1"] * 4
    alone = {n: svg(inventory[n]) for n in set(names)}
    before = dict(matplotlib.rcParams)
    with ThreadPoolExecutor(4) as pool:
        together = list(pool.map(lambda n: svg(inventory[n]), names))
    assert all("<text" in t for t in together)
    assert together == [alone[n] for n in names]
    assert dict(matplotlib.rcParams) == before


def test_pyplot_is_never_loaded():
    code = "import sys, deembed.plots, deembed.report; print('matplotlib.pyplot' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"


# the lane map


def test_arms_are_drawn_to_scale(outcome, fake):
    lanes = lane_map(outcome)
    at = layout_of(lanes)
    wide = {p: at.boxes[f"lane-{p}/arm"][2] for p in (1, 2, 3)}
    assert wide[2] / wide[1] == pytest.approx(fake.ARM_PS[2] / fake.ARM_PS[1], rel=1e-6)
    assert wide[3] == pytest.approx(at.px_per_ps * fake.ARM_PS[3], rel=1e-6)
    for p in (1, 2, 3):
        x, _, w, _ = at.boxes[f"lane-{p}/arm"]
        assert x + w == pytest.approx(at.part_x)
    assert at.broken_at > 0
    assert "error boxes are cut short at the slanted strokes" in texts(lane_map_svg(lanes))


def test_short_error_boxes_are_drawn_whole(outcome):
    short = outcome.terms.copy()
    f = outcome.terms.frequency
    short["reflection_tracking"] = (
        short.reflection_tracking * 0 + 0.9 * np.exp(-2j * np.pi * f * 2 * 300e-12)
    ).transpose("frequency", "port_in")
    lanes = lane_map(outcome.changed(terms=short))
    at = layout_of(lanes)
    assert at.broken_at == 0
    w = at.boxes["lane-1/round-1-2/error-box"][2]
    assert w == pytest.approx(300 * at.px_per_ps, rel=1e-4)
    assert "error boxes are cut short at the slanted strokes" not in texts(lane_map_svg(lanes))
    assert {"0", "100", "200", "300"} <= set(texts(lane_map_svg(lanes)))


def test_every_segment_is_in_the_drawing_and_can_be_pointed_at(outcome):
    lanes = lane_map(outcome)
    drawn = re.findall(r'data-segment="([^"]+)"', lane_map_svg(lanes))
    assert drawn == [s.id for s in lanes.segments]
    boxes = segment_boxes(lanes, width=800)
    assert set(boxes) == set(drawn)
    assert all(w > 0 and h > 0 and x >= 0 and x + w <= 800 for x, y, w, h in boxes.values())


def test_state_shows_in_shape_and_words_and_choice_is_marked(outcome):
    lanes = lane_map(outcome)
    plain, chosen = lane_map_svg(lanes), lane_map_svg(lanes, selected="lane-2/arm")
    assert "data-chosen" not in plain
    assert re.findall(r'data-segment="([^"]+)" data-state="\w+" data-chosen="yes"', chosen) == ["lane-2/arm"]
    said = " ".join(texts(plain))
    assert "◈ arm 3: 1 warning" in said
    assert "◆ the part" in said
    assert "◆ 1 contradiction" in said
    assert "hatch" in plain
    root = ET.fromstring(plain)
    assert (root.get("role"), root.get("aria-label")) == ("img", lanes.alt)


def test_without_lengths_the_map_says_so(outcome):
    bare = lane_map(outcome.changed(terms=None, shell=None, findings=()))
    said = texts(lane_map_svg(bare, theme="dark"))
    assert "no lengths: every plane falls on the part plane" in said
    assert said.count("corrected before") == 6


def test_long_notes_are_wrapped(fake):
    from deembed.findings import Finding

    where = ("port 1", "port 2", "part port 2", "arm 2", "termination 2")
    found = [Finding(f"f{k}", "kind", w, "warning", "text") for k, w in enumerate(where)]
    lanes = lane_map(fake.fake_outcome(51, findings=found))
    narrow, wide = layout_of(lanes, width=640), layout_of(lanes, width=1400)
    assert narrow.height > wide.height
    assert all(len(t) * 7 < 640 for t in texts(lane_map_svg(lanes, width=640)))
    said = " ".join(texts(lane_map_svg(lanes, width=640)))
    assert "1 warning each: port 2, port 1, cable plane, arm 2, part port 2" in said


def test_names_of_curves_that_end_together_do_not_overlap():
    x = np.linspace(0.0, 0.5, 50)
    traces = tuple(
        Trace(n, x, 0 * x, hue=k, frequency=np.linspace(1e9, 2e9, 50)) for k, n in enumerate(("S22", "S33"))
    )
    picture = Picture("chart", "Chart", "", traces, kind="reflection")
    shown = figure(picture, width=500, height=500)
    FigureCanvasAgg(shown).draw()
    names = [t for t in shown.axes[0].texts if t.get_text() in ("S22", "S33")]
    first, second = (t.get_window_extent() for t in names)
    assert len(names) == 2 and not first.overlaps(second)
