"""Matplotlib drawings of pictures: axes, figures without pyplot, and inline SVG.

Colours are the colour-blind safe palette of Okabe & Ito (2008, "Color Universal Design"), always with line
styles, markers and direct labels beside them.
"""

from __future__ import annotations

import io
import re
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

from matplotlib import rcParams
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from deembed.plots_chart import draw_chart
from deembed.plots_lanes import lanes_svg
from deembed.plots_lanes_layout import segment_boxes
from deembed.plots_lines import draw_lines, limit_words
from deembed.plots_style import Theme, theme_of
from deembed.views.lane_map import LaneMap
from deembed.views.model import Picture

__all__ = ["draw", "figure", "lane_map_svg", "segment_boxes", "svg"]

_DPI = 96.0  # one pixel of a page


def draw(
    picture: Picture,
    ax: Axes | None = None,
    *,
    band: tuple[float, float] | None = None,
    cursor: float | None = None,
    theme: str = "light",
    admittance: bool = False,
) -> list[Artist]:
    """Draw a picture into axes.

    Parameters
    ----------
    picture : Picture
    ax : matplotlib Axes, optional
        Made on a figure of its own when not given; ``draw(...)[0].figure`` is that figure.
    band : (float, float), optional
        Only these frequencies [Hz].
    cursor : float, optional
        A frequency to mark [Hz].
    theme : str
        ``light`` or ``dark``.
    admittance : bool
        A reflection chart also gets the grid of normalized admittance.

    Returns
    -------
    list of Artist
        The curves first, in the order of the picture's traces; then limits, bands, labels and the cursor.

    Raises
    ------
    DeembedError
        An unknown theme.
    """
    style = theme_of(theme)
    if ax is None:
        ax = Figure(figsize=(7.5, 4.2), layout="constrained").add_subplot()
    _dress(ax, picture, style)
    if not picture.traces:
        return [_nothing(ax, picture, style)]
    if picture.kind == "reflection":
        return draw_chart(ax, picture, style, band=band, cursor=cursor, admittance=admittance)
    return draw_lines(ax, picture, style, band=band, cursor=cursor)


def _nothing(ax: Axes, picture: Picture, style: Theme) -> Artist:
    ax.set_xticks([])
    ax.set_yticks([])
    text = f"nothing to show: {', '.join(picture.missing) or 'no curve'} without values"
    return ax.text(0.5, 0.5, text, transform=ax.transAxes, ha="center", va="center", color=style.ink)


def _dress(ax: Axes, picture: Picture, style: Theme) -> None:
    ax.set_facecolor("none")
    for side in ("top", "right"):
        ax.spines[side].set_visible(False)
    for side in ("left", "bottom"):
        ax.spines[side].set_color(style.ink)
    ax.tick_params(colors=style.ink, labelsize=style.text_pt)
    ax.set_title(
        picture.title,
        loc="left",
        color=style.ink,
        fontsize=style.text_pt + 1,
        pad=19 if picture.kind == "lines" else 6,
    )


def figure(
    picture: Picture,
    *,
    width: float = 720,
    height: float = 400,
    band: tuple[float, float] | None = None,
    cursor: float | None = None,
    theme: str = "light",
    admittance: bool = False,
) -> Figure:
    """A figure of one picture, made without pyplot, so nothing stays behind.

    Parameters
    ----------
    picture : Picture
    width, height : float
        [px], 96 to the inch.
    band, cursor, theme, admittance
        As in `draw`.

    Returns
    -------
    Figure
    """
    fig = Figure(figsize=(width / _DPI, height / _DPI), dpi=_DPI)
    fig.patch.set_facecolor(theme_of(theme).sheet)
    ax = fig.add_axes(_frame(picture, width, height))
    draw(picture, ax, band=band, cursor=cursor, theme=theme, admittance=admittance)
    return fig


def _frame(picture: Picture, width: float, height: float) -> tuple[float, float, float, float]:
    """Room for the axes: fixed margins, so that pictures below one another line up, and the longest label."""
    left, top, bottom = 88.0, 54.0, 54.0
    names = [t.name for t in picture.traces] + [limit_words(m) for m in picture.limits]
    longest = max(map(len, names), default=0)
    right = max(34 + 8.8 * longest, 96.0)
    if picture.kind == "reflection":
        left, right, top, bottom = 8.0, 8.0, 36.0, 34.0
    wide, tall = max(width - left - right, 80.0), max(height - top - bottom, 80.0)
    return left / width, bottom / height, wide / width, tall / height


_ONE_WRITER = threading.Lock()


@contextmanager
def _settings(wanted: dict[str, Any]) -> Iterator[None]:
    """Settings of matplotlib for one drawing; only these are put back.

    They belong to the whole process: while two threads draw, each would put back what the other one set.
    """
    with _ONE_WRITER:
        settings: Any = rcParams
        before = {key: settings[key] for key in wanted}
        settings.update(wanted)
        try:
            yield
        finally:
            settings.update(before)


_ESCAPES = {"&": "&amp;", "<": "&lt;", ">": "&gt;", '"': "&quot;"}


def _escaped(text: str) -> str:
    return re.sub(r'[&<>"]', lambda m: _ESCAPES[m[0]], text)


def svg(
    picture: Picture,
    *,
    width: float = 720,
    height: float = 400,
    band: tuple[float, float] | None = None,
    cursor: float | None = None,
    theme: str = "light",
    admittance: bool = False,
) -> str:
    """A picture as inline SVG, readable on a light or dark page, with the picture's words as label.

    Parameters
    ----------
    picture : Picture
    width, height : float
        [px]; the SVG shrinks with its container and never grows beyond.
    band, cursor, theme, admittance
        As in `draw`.

    Returns
    -------
    str
        The same text for the same picture, every time; ids are unique to the picture's name.
    """
    fig = figure(
        picture, width=width, height=height, band=band, cursor=cursor, theme=theme, admittance=admittance
    )
    sink = io.StringIO()
    quiet: Any = dict.fromkeys(("Date", "Creator", "Format", "Type"))
    with _settings({"svg.hashsalt": picture.name, "svg.fonttype": "none", "path.simplify": True}):
        fig.savefig(sink, format="svg", metadata=quiet)
    return _inline(sink.getvalue(), picture, width=width, height=height)


def _inline(text: str, picture: Picture, *, width: float, height: float) -> str:
    """Only the svg element, with role and label, ids made unique, places to a hundredth of a point."""
    body = text[text.index("<svg") :]
    view = re.search(r'viewBox="([^"]+)"', body)
    inner = body[body.index(">") + 1 :].replace("<defs>\n  <style", "<defs><style")
    slug = re.sub(r"[^a-z0-9]+", "-", picture.name.lower()).strip("-")
    inner = re.sub(r'\bid="([^"]+)"', rf'id="{slug}-\1"', inner)
    inner = re.sub(r"url\(#([^)]+)\)", rf"url(#{slug}-\1)", inner)
    inner = re.sub(r'xlink:href="#([^"]+)"', rf'xlink:href="#{slug}-\1"', inner)
    inner = re.sub(r"<[^>]+>", lambda tag: re.sub(r"(\d+\.\d\d)\d+", r"\1", tag[0]), inner)
    inner = re.sub(r"<style type=\"text/css\">.*?</style>", "", inner, flags=re.DOTALL)
    inner = re.sub(r"\s*\n\s*", " ", inner)
    box = view[1] if view else f"0 0 {width * 0.75:g} {height * 0.75:g}"
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" role="img" '
        f'aria-label="{_escaped(picture.alt)}" viewBox="{box}" width="{width:g}" height="{height:g}" '
        f'style="max-width:100%;height:auto" class="picture">{inner}'
    ).strip()


def lane_map_svg(
    lane_map: LaneMap, *, selected: str | None = None, width: float = 960, theme: str = "light"
) -> str:
    """The lane map as inline SVG; every segment is a group with ``data-segment`` and its id.

    Parameters
    ----------
    lane_map : LaneMap
    selected : str, optional
        Id of the chosen segment.
    width : float
        [px]
    theme : str
        ``light`` or ``dark``.

    Returns
    -------
    str

    Raises
    ------
    DeembedError
        An unknown theme.
    """
    return lanes_svg(lane_map, selected=selected, width=width, style=theme_of(theme, lanes=True))
