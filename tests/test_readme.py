"""The README tells the truth: its commands, its links, its picture."""

import re
from pathlib import Path

import deembed
from deembed.plots import lane_map_svg
from deembed.simulate.demo import MISTAKES, write_demo
from deembed.views import lane_map

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text()


def blocks(language):
    return re.findall(rf"```{language}\n(.*?)```", README, re.DOTALL)


def test_its_first_two_commands_are_complete_in_themselves():
    first, second = blocks("sh")[:2]
    for command in (first, second):
        assert command.startswith("python3 -m venv .venv && .venv/bin/pip install")
        assert command.count("\n") == 1
    assert "jupyter lab" in first and "notebooks/start_here.ipynb" in first
    assert "-m pytest" in second
    assert README.index("<!-- test command -->") < README.index(second)


def test_its_links_lead_somewhere():
    for link in re.findall(r"\]\(([^)#]+)\)", README):
        assert (ROOT / link).is_file(), link


def test_it_names_every_mistake_that_can_be_planted():
    assert all(f"`{name}`" in README for name in MISTAKES)


def test_its_picture_is_the_lane_map_of_the_demonstration(tmp_path):
    outcome = deembed.load_job(write_demo(tmp_path / "demo")).run()
    fresh = re.findall(r">([^<>]+)</text>", lane_map_svg(lane_map(outcome)))
    kept = re.findall(r">([^<>]+)</text>", (ROOT / "docs/lane-map.svg").read_text())
    assert kept == fresh and any("arm 1" in label for label in kept)
