"""The lane map in a real browser: by mouse, by key, finding by finding."""

import importlib.util
import json
import re
import shutil
from pathlib import Path

import pytest

from deembed.simulate.demo import write_demo

pytestmark = pytest.mark.browser
ROOT = Path(__file__).parents[2]
_spec = importlib.util.spec_from_file_location("browser_help", Path(__file__).with_name("conftest.py"))
help_ = importlib.util.module_from_spec(_spec)
_spec.loader.exec_module(help_)
POINTS = 401


def status(page):
    return page.locator(".deembed-lanes .deembed-status span")


@pytest.fixture(scope="module")
def jobs(lab):
    """Demonstration jobs in the served folder: one believed, one not."""
    _, _, served = lab
    write_demo(served / "good", points=POINTS)
    write_demo(served / "bad", points=POINTS, mistake="thru-length")
    return served


def show(page, lab, jobs, name, source, theme="light"):
    from playwright.sync_api import expect

    help_.write_notebook(
        jobs / f"{name}.ipynb", "from deembed.widgets import Lanes", f"Lanes({source!r}, theme={theme!r})"
    )
    help_.open_and_run(page, lab, f"{name}.ipynb")
    expect(page.locator(".deembed-lanes")).to_be_visible()
    return expect


def centre(page, segment):
    """Where the drawing has the middle of a segment, on the screen."""
    drawn = page.locator(f'.deembed-map g[data-segment="{segment}"]')
    drawn.scroll_into_view_if_needed()
    box = drawn.bounding_box()
    return box["x"] + box["width"] / 2, box["y"] + box["height"] / 2


def test_a_walk_by_mouse(page, lab, jobs):
    expect = show(page, lab, jobs, "walk", "bad/job.toml")
    expect(status(page)).to_have_attribute("data-state", "ready")
    expect(page.locator(".deembed-verdict")).to_contain_text("Not believable as a passive part")
    expect(page.get_by_role("img", name=re.compile("^Lane map, 3 lanes meeting at the part"))).to_be_visible()
    help_.look(page, "lanes-first")

    page.mouse.click(*centre(page, "lane-2/arm"))
    expect(status(page)).to_have_attribute("data-segment", "lane-2/arm")
    expect(status(page)).to_have_attribute("data-picture", "arm.2")
    expect(page.locator('.deembed-map g[data-segment="lane-2/arm"]')).to_have_attribute("data-chosen", "yes")
    expect(page.get_by_role("button", name="Arm 2: nothing noted, chosen", exact=True)).to_have_count(1)
    expect(page.locator(".deembed-holding")).to_contain_text("142.")
    expect(page.get_by_role("img", name=re.compile(r"^Arm 2 .*dB"))).to_be_visible()
    help_.look(page, "lanes-arm")

    # Every finding takes the pictures to its band, in sight of the one who asked; the way back is in words.
    links = page.locator(".deembed-findings button")
    assert links.count() >= 4
    for k in range(links.count()):
        links.nth(k).scroll_into_view_if_needed()
        links.nth(k).click()
        expect(links.nth(k)).to_contain_text("Shown: ")
        expect(page.locator(".deembed-picture svg")).to_be_in_viewport(ratio=0.6)
    links.first.click()
    expect(status(page)).to_have_attribute("data-picture", "part.gain")
    expect(status(page)).to_have_attribute("data-band", re.compile(r"^\d+-\d+$"))
    before = page.locator(".deembed-picture").inner_html()
    help_.look(page, "lanes-finding")
    page.get_by_role("button", name="Back to the whole sweep").click()
    expect(status(page)).to_have_attribute("data-band", "whole")
    expect(links.first).to_contain_text("Show ")
    expect(page.get_by_role("button", name="Back to the whole sweep")).to_have_count(0)
    assert page.locator(".deembed-picture").inner_html() != before


def test_every_picture_of_the_part_draws(page, lab, jobs):
    expect = show(page, lab, jobs, "pictures", "bad/job.toml")
    expect(status(page)).to_have_attribute("data-state", "ready")
    choice = page.get_by_role("combobox", name="Picture")
    options = choice.locator("option").all_inner_texts()
    assert len(options) >= 8
    seen = set()
    for option in options:
        before = status(page).get_attribute("data-picture")
        choice.select_option(label=option)
        if option != options[0]:
            expect(status(page)).not_to_have_attribute("data-picture", before)
        expect(page.locator(".deembed-picture svg")).to_have_attribute("aria-label", re.compile(r"\d"))
        # Words are words, not outlines, also when clicks come faster than pictures.
        assert page.locator(".deembed-picture svg text").count() >= 5
        seen.add(page.locator(".deembed-picture").inner_html())
    assert len(seen) == len(options)
    for _ in range(4):
        page.locator(".deembed-findings button").first.click()
        choice.select_option(label=options[0])
        choice.select_option(label=next(o for o in options if "chart" in o))
        expect(status(page)).to_have_attribute("data-picture", "part.chart")
        expect(page.get_by_role("img", name=re.compile("^Reflection chart"))).to_be_visible()
        assert page.locator(".deembed-picture svg text").count() >= 5
    help_.look(page, "lanes-chart")


def test_a_walk_by_key_alone(page, lab, jobs):
    expect = show(page, lab, jobs, "keys", "bad/job.toml")
    expect(status(page)).to_have_attribute("data-state", "ready")
    buttons = page.locator("button.deembed-segment")
    order = page.locator(".deembed-map g.segment").evaluate_all("all => all.map(g => g.dataset.segment)")
    assert buttons.count() == len(order)
    buttons.first.focus()
    for k, key in enumerate(("Enter", "Space", "Enter", "Space", "Enter", "Space")):
        name = buttons.nth(k).get_attribute("title").removesuffix(", chosen")
        page.keyboard.press(key)
        expect(status(page)).to_have_attribute("data-segment", order[k])
        expect(page.locator(".deembed-holding h4")).to_have_text(name.split(": ")[0])
        # Choosing draws the map again; the focus must not be lost by it.
        expect(buttons.nth(k)).to_be_focused()
        page.keyboard.press("Tab")
        ring = buttons.nth(k + 1).evaluate("e => getComputedStyle(e).outline")
        assert "solid" in ring and "3px" in ring
    help_.look(page, "lanes-key")

    buttons.last.focus()
    page.keyboard.press("Enter")
    expect(status(page)).to_have_attribute("data-segment", "part")
    page.keyboard.press("Tab")
    expect(page.get_by_role("combobox", name="Picture")).to_be_focused()
    for key in ("Space", "ArrowDown", "Enter"):  # a closed list would leave the arrow to Lab
        page.keyboard.press(key)
    expect(status(page)).to_have_attribute("data-picture", "part.reflection")
    page.keyboard.press("Tab")
    link = page.locator(".deembed-findings button").first
    expect(link).to_be_focused()
    page.keyboard.press("Space")
    expect(status(page)).to_have_attribute("data-band", re.compile(r"^\d+-\d+$"))
    expect(link).to_be_focused()
    page.keyboard.press("Shift+Tab")
    expect(page.get_by_role("button", name="Back to the whole sweep")).to_be_focused()
    page.keyboard.press("Enter")
    expect(status(page)).to_have_attribute("data-band", "whole")


@pytest.mark.parametrize("width", [960, 1280, 1920])
def test_every_segment_is_chosen_where_it_is_drawn(page, lab, jobs, width):
    page.set_viewport_size({"width": width, "height": 1000})
    expect = show(page, lab, jobs, f"places-{width}", "good/job.toml")
    expect(status(page)).to_have_attribute("data-state", "ready")
    segments = page.locator(".deembed-map g.segment").evaluate_all("all => all.map(g => g.dataset.segment)")
    assert len(segments) == len(set(segments)) > 12
    for segment in segments:
        page.mouse.click(*centre(page, segment))
        expect(status(page)).to_have_attribute("data-segment", segment)
    inside = page.locator(".deembed-lanes").bounding_box()
    drawn = page.locator(".deembed-map svg").bounding_box()
    assert drawn["x"] + drawn["width"] <= inside["x"] + inside["width"]
    help_.look(page, f"lanes-{width}")


def test_without_a_fixture_the_planes_can_still_be_chosen(page, lab, jobs):
    from playwright.sync_api import expect

    help_.write_notebook(
        jobs / "bare.ipynb",
        "from deembed import load_job\nfrom deembed.widgets import Lanes",
        "Lanes(load_job('good/job.toml').changed({'fixture.arms': None}))",
    )
    help_.open_and_run(page, lab, "bare.ipynb")
    expect(status(page)).to_have_attribute("data-state", "ready")
    for segment in (
        "lane-1/cable-plane",
        "lane-3/cable-plane",
        "lane-2/part-port",
        "lane-2/round-1-2/error-box",
    ):
        page.mouse.click(*centre(page, segment))
        expect(status(page)).to_have_attribute("data-segment", segment)
    # Nothing is drawn of an arm that is not there; the keyboard still finds out why.
    page.get_by_role("button", name=re.compile("^Arm 1: ")).focus()
    page.keyboard.press("Enter")
    expect(status(page)).to_have_attribute("data-segment", "lane-1/arm")
    expect(page.locator(".deembed-holding")).to_contain_text("none given")
    help_.look(page, "lanes-bare")


def test_a_dark_lab_can_be_read(page, lab, jobs):
    expect = show(page, lab, jobs, "dark", "bad/job.toml", theme="dark")
    help_.use_theme(page, "Dark")
    expect(status(page)).to_have_attribute("data-state", "ready")
    help_.look(page, "lanes-dark")
    help_.use_theme(page, "Light")
    ink, paper = (
        page.locator(".deembed-lanes").evaluate(f"e => getComputedStyle(e).{what}")
        for what in ("color", "backgroundColor")
    )
    brightness = [sum(map(int, re.findall(r"\d+", c)[:3])) for c in (ink, paper)]
    assert brightness[0] - brightness[1] > 400


def test_what_is_wrong_with_a_job_is_said_in_words(page, lab, jobs):
    (jobs / "good/broken.toml").write_text(
        (jobs / "good/job.toml").read_text().replace("open_2.s1p", "open_9.s1p")
    )
    expect = show(page, lab, jobs, "broken", "good/broken.toml")
    expect(status(page)).to_have_attribute("data-state", "failed")
    expect(page.locator(".deembed-verdict")).to_contain_text("open_9.s1p")
    assert "Traceback" not in page.locator(".deembed-lanes").inner_text()


def test_the_first_notebook_runs_from_top_to_bottom(page, lab):
    from playwright.sync_api import expect

    _, _, served = lab
    folder = served / "first"
    folder.mkdir()
    shutil.copy(ROOT / "notebooks/start_here.ipynb", folder)
    help_.open_and_run(page, lab, "first/start_here.ipynb")
    expect(status(page)).to_have_attribute("data-state", "ready")
    expect(page.locator(".deembed-verdict")).to_contain_text("Physical as far as these readings can show")
    said = page.locator(".jp-OutputArea-output").all_inner_texts()
    assert any("open 2, short 2" in text for text in said)
    assert json.loads((folder / "start_here.ipynb").read_text())["cells"]
    help_.look(page, "start-here")
