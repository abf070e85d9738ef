"""Draw the pictures of the README again: python docs/make_pictures.py"""

import tempfile
from pathlib import Path

import deembed
from deembed.plots import lane_map_svg
from deembed.simulate.demo import write_demo
from deembed.views import lane_map


def main() -> None:
    with tempfile.TemporaryDirectory() as folder:
        outcome = deembed.load_job(write_demo(Path(folder) / "demo")).run()
    drawing = lane_map_svg(lane_map(outcome))
    Path(__file__).with_name("lane-map.svg").write_text(f"{drawing}\n", encoding="utf-8")


if __name__ == "__main__":
    main()
