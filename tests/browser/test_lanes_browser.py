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


def test_a_walk_by_mouse_and_by_key(page, lab, jobs):
    expect = show(page, lab, jobs, "walk", "bad/job.toml")
    expect(status(page)).to_have_attribute("data-state", "ready")
    expect(page.locator(".deembed-verdict")).to_contain_text("Not believable as a passive part")
    expect(page.locator(".deembed-map svg")).to_have_attribute(
        "aria-label", re.compile("lane", re.IGNORECASE)
    )
    help_.look(page, "lanes-first")

    # By mouse: the arm of part port 2, where the drawing has it.
    arm = page.locator('.deembed-map g[data-segment="lane-2/arm"]').bounding_box()
    page.mouse.click(arm["x"] + arm["width"] / 3, arm["y"] + arm["height"] / 2)
    expect(status(page)).to_have_attribute("data-segment", "lane-2/arm")
    expect(status(page)).to_have_attribute("data-picture", "arm.2")
    expect(page.locator('.deembed-map g[data-segment="lane-2/arm"]')).to_have_attribute("data-chosen", "yes")
    expect(page.locator(".deembed-holding h4")).to_contain_text("2")
    expect(page.locator(".deembed-picture svg")).to_have_attribute("aria-label", re.compile(r"\d"))
    help_.look(page, "lanes-arm")

    # By key: Tab to the next segment, Enter chooses it.
    chosen = page.locator("button.deembed-segment:focus")
    page.keyboard.press("Tab")
    name = chosen.get_attribute("title")
    page.keyboard.press("Enter")
    expect(status(page)).not_to_have_attribute("data-segment", "lane-2/arm")
    expect(page.locator(".deembed-holding h4")).to_have_text(name.split(":")[0])

    # A finding takes the pictures to its band, and Whole sweep brings them back.
    button = page.locator(".deembed-findings button").first
    button.scroll_into_view_if_needed()
    button.click()
    expect(status(page)).to_have_attribute("data-picture", "part.gain")
    expect(status(page)).to_have_attribute("data-band", re.compile(r"^\d+-\d+$"))
    before = page.locator(".deembed-picture").inner_html()
    help_.look(page, "lanes-finding")
    page.get_by_role("button", name="Whole sweep").click()
    expect(status(page)).to_have_attribute("data-band", "whole")
    assert page.locator(".deembed-picture").inner_html() != before

    # Every picture of the part draws, and says something with a number in it.
    options = page.locator(".deembed-choice select option").all_inner_texts()
    assert len(options) >= 8
    for option in options:
        page.locator(".deembed-choice select").select_option(label=option)
        expect(page.locator(".deembed-picture svg")).to_have_attribute("aria-label", re.compile(r"\d"))
    page.locator(".deembed-choice select").select_option(label=next(o for o in options if "chart" in o))
    expect(status(page)).to_have_attribute("data-picture", "part.chart")
    help_.look(page, "lanes-chart")


def test_every_segment_has_a_button_where_it_is_drawn(page, lab, jobs):
    expect = show(page, lab, jobs, "places", "good/job.toml")
    expect(status(page)).to_have_attribute("data-state", "ready")
    drawn = page.locator(".deembed-map g.segment").evaluate_all(
        "all => all.map(g => { const b = g.getBoundingClientRect(); return [b.x + b.width / 2, b.y + b.height / 2]; })"
    )
    buttons = page.locator("button.deembed-segment").evaluate_all(
        "all => all.map(e => { const b = e.getBoundingClientRect();"
        " return [b.x, b.y, b.x + b.width, b.y + b.height]; })"
    )
    assert len(drawn) == len(buttons) > 12
    for x, y in drawn:
        assert any(x0 <= x <= x1 and y0 <= y <= y1 for x0, y0, x1, y1 in buttons)
    names = page.locator("button.deembed-segment").evaluate_all("all => all.map(e => e.title)")
    assert all(re.match(r".+: .+", n) for n in names)


def test_a_dark_lab_can_be_read(page, lab, jobs):
    expect = show(page, lab, jobs, "dark", "bad/job.toml", theme="dark")
    page.evaluate(
        "() => window.jupyterapp.commands.execute('apputils:change-theme', {theme: 'JupyterLab Dark'})"
    )
    expect(status(page)).to_have_attribute("data-state", "ready")
    page.wait_for_timeout(500)
    help_.look(page, "lanes-dark")
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
