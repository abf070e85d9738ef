"""Curves over frequency: thinned to the pixels, labelled at their ends, bands shaded and named."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.ticker import MultipleLocator
from numpy.typing import NDArray

from deembed import words
from deembed.plots_style import DASHES, MARKERS, Theme
from deembed.views.model import Band, Limit, Picture, Trace
from deembed.views.thin import thin

__all__ = ["draw_lines", "frequency_unit", "limit_words"]

_UNITS = ((1e9, "GHz"), (1e6, "MHz"), (1e3, "kHz"), (1.0, "Hz"))
_MARKS = 7  # markers along a curve
_ROW_PT, _WORD_PT = 14.0, 6.8  # height of a row of band words, width of a letter
_LIMIT_DASH = (0, (12, 4))


def frequency_unit(highest: float) -> tuple[float, str]:
    """Scale [Hz] and unit for an axis that ends at a frequency [Hz]; GHz from 0.1 GHz up."""
    return next(((scale, unit) for scale, unit in _UNITS if highest >= 0.1 * scale), _UNITS[-1])


def draw_lines(
    ax: Axes, picture: Picture, style: Theme, *, band: tuple[float, float] | None, cursor: float | None
) -> list[Artist]:
    """Draw curves over frequency; see `deembed.plots.draw`."""
    low, high = band if band else picture.span
    if high <= low:
        low, high = low - max(0.01 * low, 0.5), high + max(0.01 * high, 0.5)
    scale, unit = frequency_unit(high)
    pixels = max(int(_points(ax)[0] * 96 / 72), 200)
    curves, shown = [], []
    for k, t in enumerate(picture.traces):
        x, y = _seen(t, low, high, pixels)
        curves.append(_curve(ax, t, k, x / scale, y, style))
        inside = (x >= low) & (x <= high)
        shown.append(y[inside])
    ax.set_xlim(low / scale, high / scale)
    across, height = _points(ax)
    placed = _placed(picture.bands, low, high, across)
    rows = max((p.row + 1 for p in placed if p.row is not None), default=0)
    bottom, top = _y_range(picture, shown, words=min(rows * _ROW_PT / height, 0.4))
    ax.set_ylim(bottom, top)
    ax.set_xlabel(f"{picture.x_label} ({unit})", color=style.ink, fontsize=style.text_pt)
    ax.set_ylabel(picture.y_label, color=style.ink, fontsize=style.text_pt)
    ax.ticklabel_format(useOffset=False)
    ax.grid(True, color=style.faint, linewidth=0.6, alpha=0.6)
    ax.set_axisbelow(True)
    if picture.unit == "degrees" and top - bottom > 180:
        ax.yaxis.set_major_locator(MultipleLocator(90))
    more = _limits(ax, picture, style) + _bands(ax, placed, style, scale)
    more += _labels(ax, picture, curves, style)
    if cursor is not None:
        more += _cursor(ax, picture, cursor, scale, style)
    return [*curves, *more]


def _points(ax: Axes) -> tuple[float, float]:
    """Width and height of the axes [pt]."""
    return max(ax.bbox.width * 72 / ax.figure.dpi, 60.0), max(ax.bbox.height * 72 / ax.figure.dpi, 60.0)


def _seen(t: Trace, low: float, high: float, pixels: int) -> tuple[NDArray, NDArray]:
    """Points in the band and one beyond on each side, thinned; gaps where a cyclic value jumps."""
    start = max(int(np.searchsorted(t.x, low)) - 1, 0)
    stop = min(int(np.searchsorted(t.x, high, side="right")) + 1, t.x.size)
    x, y = t.x[start:stop], t.y[start:stop]
    keep = thin(x, y, pixels=pixels)
    x, y = x[keep], y[keep]
    if t.wraps and y.size > 1:
        jump = np.flatnonzero(np.abs(np.diff(y)) > 180) + 1
        x, y = np.insert(x, jump, x[jump]), np.insert(y, jump, np.nan)
    return x, y


def _curve(ax: Axes, t: Trace, number: int, x: NDArray, y: NDArray, style: Theme) -> Artist:
    step = max(x.size // _MARKS, 1)
    (line,) = ax.plot(
        x,
        y,
        color=style.hue(t.hue),
        linestyle=DASHES[t.dash % len(DASHES)],
        linewidth=1.7,
        marker=MARKERS[t.hue % len(MARKERS)],
        markersize=5.5,
        markerfacecolor="none" if t.dash else style.hue(t.hue),
        markevery=(min(number * step // 5, x.size - 1), step) if x.size > _MARKS else 1,
        label=t.name,
    )
    return line


def _y_range(picture: Picture, shown: Sequence[NDArray], *, words: float) -> tuple[float, float]:
    """Values in view and limits, with room, and on top a share of the height for band words."""
    values = np.concatenate([np.empty(0), *shown])
    values = values[np.isfinite(values)]
    values = np.concatenate([values, [m.value for m in picture.limits]])
    if not values.size:
        return 0.0, 1.0
    bottom, top = float(values.min()), float(values.max())
    if picture.y_floor is not None:
        bottom = min(bottom, picture.y_floor)
    least = {"dB": 0.5, "degrees": 5.0, "ps": 5.0}.get(picture.unit, 1e-3)  # rounding noise is no curve
    if top - bottom < least:
        bottom = (bottom + top - least) / 2 if picture.y_floor is None else bottom
        top = bottom + least
    room = 0.06 * (top - bottom)
    bottom = bottom if bottom == picture.y_floor else bottom - room
    return bottom, top + room + (top + room - bottom) * words / (1 - words)


def _limits(ax: Axes, picture: Picture, style: Theme) -> list[Artist]:
    return [
        ax.axhline(m.value, color=style.ink, linewidth=1.4, linestyle=_LIMIT_DASH) for m in picture.limits
    ]


@dataclass(frozen=True)
class _Place:
    """A band in view [Hz], where its word starts, and in which row; None where the word already stands."""

    band: Band
    left: float
    right: float
    start: float
    row: int | None


def _placed(bands: Sequence[Band], low: float, high: float, across: float) -> list[_Place]:
    """Bands that reach into view, at least wide enough to be seen; words that would meet are put in rows."""
    out: list[_Place] = []
    rows: list[float] = []
    ends: dict[str, float] = {}
    least = 0.004 * (high - low)
    for b in sorted(bands, key=lambda b: (b.from_hz, -b.to_hz)):
        if b.to_hz < low or b.from_hz > high:
            continue
        left, right = max(b.from_hz, low), min(b.to_hz, high)
        if right - left < least:
            middle = (left + right) / 2
            left, right = middle - least / 2, middle + least / 2
        wide = _WORD_PT * len(b.word) / across * (high - low)
        start, before = min(left, high - wide), ends.get(b.word, -np.inf)
        if start < before and before + wide <= right:
            start = before  # the same word ends inside this band: go on behind it
        if start < before:
            out.append(_Place(b, left, right, start, None))
            continue
        row = next((i for i, end in enumerate(rows) if end <= start), len(rows))
        ends[b.word] = start + wide
        rows[row : row + 1] = [start + wide]
        out.append(_Place(b, left, right, start, row))
    return out


def _bands(ax: Axes, placed: Sequence[_Place], style: Theme, scale: float) -> list[Artist]:
    """Shade the bands and write their words in the room kept for them at the top."""
    out: list[Artist] = []
    for p in placed:
        shade = style.shade_strong if p.band.severity == "contradiction" else style.shade
        out.append(ax.axvspan(p.left / scale, p.right / scale, color=shade, zorder=0.3))
        if p.row is None:
            continue
        out.append(
            ax.annotate(
                p.band.word, (p.start / scale, 1.0), xycoords=("data", "axes fraction"),
                xytext=(3, -3 - _ROW_PT * p.row), textcoords="offset points", va="top", ha="left",
                color=style.ink, fontsize=style.text_pt, style="italic",
            )
        )  # fmt: skip
    return out


@dataclass(frozen=True)
class _Name:
    """Words at the end of a line, in its colour and dash."""

    words: str
    colour: str
    dash: object


def _name(t: Trace, style: Theme) -> _Name:
    return _Name(t.name, style.hue(t.hue), DASHES[t.dash % len(DASHES)])


def limit_words(limit: Limit) -> str:
    """What stands at the end of a limit's line, e.g. ``passive limit 1``."""
    return f"{limit.words} {limit.value:g}"


def _labels(ax: Axes, picture: Picture, curves: Sequence[Artist], style: Theme) -> list[Artist]:
    """Names at the right ends of curves and limits, spread so that none covers another, each tied to its end."""
    low, high = ax.get_ylim()
    across, height = _points(ax)
    unit = (high - low) / height
    left, right = ax.get_xlim()
    ends = []
    for m in picture.limits:
        if low <= m.value <= high:
            ends.append((m.value, right, _Name(limit_words(m), style.ink, _LIMIT_DASH)))
    for t, line in zip(picture.traces, curves, strict=True):
        x, y = (np.asarray(v) for v in line.get_data())  # type: ignore[attr-defined]
        good = np.isfinite(y)
        x, y = x[good], y[good]
        if x.size and x[0] <= right:
            end = min(float(x[-1]), right)
            ends.append((float(np.clip(np.interp(end, x, y), low, high)), end, _name(t, style)))
    ends = sorted(reversed(ends), key=lambda e: round((e[0] - low) / unit))  # first of equals on top
    gap = (style.text_pt + 3) * unit
    spots = _spread([e[0] for e in ends], gap, low, high)
    out: list[Artist] = []
    for (value, end, n), spot in zip(ends, spots, strict=True):
        far = end < right - 0.02 * (right - left)  # a line this long would pass for a curve
        out.append(
            ax.annotate(
                n.words, (end, value), xytext=(1 + 17 / across, (spot - low) / (high - low)),
                textcoords="axes fraction", va="center", ha="left", color=style.ink, fontsize=style.text_pt,
                annotation_clip=False,
                arrowprops={
                    "arrowstyle": "-", "color": style.faint if far else n.colour,
                    "linewidth": 1.0 if far else 1.7,
                    "linestyle": "dotted" if far else n.dash,
                    "shrinkA": 0, "shrinkB": 0, "relpos": (0, 0.5),
                },
            )
        )  # fmt: skip
    return out


def _spread(wanted: Sequence[float], gap: float, low: float, high: float) -> list[float]:
    """Places for labels wanted at rising values: at least a gap apart, each group centred on what it names.

    Notes
    -----
    Pool adjacent violators: groups that would overlap become one, placed at its mean.
    """
    groups: list[tuple[float, int]] = []  # mean of (wanted - index * gap), members
    for i, value in enumerate(wanted):
        mean, size = value - i * gap, 1
        while groups and groups[-1][0] > mean:
            other, more = groups.pop()
            mean, size = (mean * size + other * more) / (size + more), size + more
        groups.append((mean, size))
    top = high - (len(wanted) - 1) * gap
    spots: list[float] = []
    for mean, size in groups:
        start = min(max(mean, low), max(top, low)) if top > low else top
        spots += [start + (len(spots) + k) * gap for k in range(size)]
    return spots


def _cursor(ax: Axes, picture: Picture, cursor: float, scale: float, style: Theme) -> list[Artist]:
    out: list[Artist] = [ax.axvline(cursor / scale, color=style.ink, linewidth=1.2)]
    for t, r in zip(picture.traces, picture.at(cursor), strict=True):
        out += ax.plot(
            [r.frequency / scale], [r.value], linestyle="none", marker="o", markersize=9,
            markerfacecolor="none", markeredgecolor=style.hue(t.hue), markeredgewidth=2,
        )  # fmt: skip
    out.append(
        ax.annotate(
            words.frequency(cursor), (cursor / scale, 1.0), xycoords=("data", "axes fraction"), va="bottom",
            xytext=(0, 3), textcoords="offset points", ha="center", color=style.ink,
            fontsize=style.text_pt, fontweight="bold",
        )
    )  # fmt: skip
    return out
