"""An outcome as one HTML page that needs nothing from outside and prints on A4."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from deembed.plots import lane_map_svg, svg
from deembed.views import lane_map, pictures, sentences
from deembed.views.inventory import Inventory
from deembed.views.terms import redundancy_words

__all__ = ["report_html"]

_PART = (
    "part.gain",
    "part.reciprocity",
    "part.power",
    "part.transmission",
    "part.reflection",
    "part.phase",
    "part.delay",
    "part.chart",
    "part.three-way",
    "part.lossless",
)


@dataclass(frozen=True)
class Drawing:
    """One picture on the page."""

    name: str
    svg: Markup
    said: str
    missing: str


def _drawings(inventory: Inventory, names: Sequence[str]) -> list[Drawing]:
    out = []
    for name in names:
        if name not in inventory:
            continue
        picture = inventory[name]
        round_ = picture.kind == "reflection"
        drawn = svg(picture, width=600 if round_ else 760, height=560 if round_ else 330)
        missing = f"Without values: {', '.join(picture.missing)}." if picture.missing else ""
        out.append(Drawing(name, Markup(drawn), picture.alt, missing))
    return out


def report_html(outcome: Any) -> str:
    """The report of an outcome.

    Parameters
    ----------
    outcome : Outcome
        See `deembed.job`.

    Returns
    -------
    str
        A whole HTML page; everything the user typed is escaped, nothing is loaded from outside.
    """
    inventory = pictures(outcome)
    lanes = lane_map(outcome)
    disagreement = [n for n in inventory if n == "rounds.disagreement"]
    groups = (
        ("The part at its own planes", _drawings(inventory, _PART)),
        (
            "Readings at the cable planes",
            _drawings(inventory, [*disagreement, *inventory.group("cable-plane")]),
        ),
        ("Fixture", _drawings(inventory, [*inventory.group("arm"), *inventory.group("fixture")])),
        ("Error terms", _drawings(inventory, inventory.group("terms"))),
    )
    worst = next((s for s in sentences.SHAPES if any(f.severity == s for f in outcome.findings)), "")
    page = _environment().get_template("page.html.j2")
    return page.render(
        facts=sentences.facts_rows(outcome),
        title=sentences.facts_rows(outcome)[0][1],
        verdict=outcome.verdict,
        worst=worst,
        shapes=sentences.SHAPES,
        tally=sentences.tally(outcome.findings),
        findings=sentences.finding_lines(outcome.findings),
        suspects=outcome.suspects,
        blind=sentences.blind_lines(outcome),
        unwitnessed=sentences.unwitnessed(outcome),
        lanes=lanes,
        lanes_svg=Markup(lane_map_svg(lanes, width=880)),
        groups=[(heading, drawings) for heading, drawings in groups if drawings],
        no_redundancy="" if outcome.terms is None else redundancy_words(outcome.terms),
        inputs=sentences.input_lines(outcome),
        cautions=sentences.CAUTIONS,
        versions=sentences.version_rows(),
    )


def _environment() -> Environment:
    return Environment(
        loader=PackageLoader("deembed.report", "."),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
