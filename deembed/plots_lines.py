"""Curves over frequency: thinned to the pixels, labelled at their ends, bands shaded and named."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.ticker import MultipleLocator
from numpy.typing import NDArray

from deembed import words
from deembed.plots_style import DASHES, MARKERS, Theme
from deembed.views.model import Band, Picture, Trace
from deembed.views.thin import thin

__all__ = ["draw_lines", "frequency_unit"]

_UNITS = ((1e9, "GHz"), (1e6, "MHz"), (1e3, "kHz"), (1.0, "Hz"))
_MARKS = 7  # markers along a curve


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
    bottom, top = _y_range(picture, shown)
    ax.set_ylim(bottom, top)
    ax.set_xlabel(f"{picture.x_label} ({unit})", color=style.ink, fontsize=style.text_pt)
    ax.set_ylabel(picture.y_label, color=style.ink, fontsize=style.text_pt)
    ax.grid(True, color=style.faint, linewidth=0.6, alpha=0.6)
    ax.set_axisbelow(True)
    if picture.unit == "degrees" and top - bottom > 180:
        ax.yaxis.set_major_locator(MultipleLocator(90))
    more = _limits(ax, picture, style) + _bands(ax, picture.bands, style, low, high, scale)
    more += _labels(ax, picture.traces, curves, style)
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


def _y_range(picture: Picture, shown: Sequence[NDArray]) -> tuple[float, float]:
    values = np.concatenate([np.empty(0), *shown])
    values = values[np.isfinite(values)]
    values = np.concatenate([values, [m.value for m in picture.limits]])
    if not values.size:
        return 0.0, 1.0
    bottom, top = float(values.min()), float(values.max())
    if picture.y_floor is not None:
        bottom = min(bottom, picture.y_floor)
    least = {"dB": 0.5, "degrees": 5.0, "ps": 5.0}.get(picture.unit, 1e-9)  # rounding noise is no curve
    if top - bottom < least:
        middle = (top + bottom) / 2
        bottom, top = middle - least / 2, middle + least / 2
    room = 0.06 * (top - bottom)
    return (bottom if bottom == picture.y_floor else bottom - room), top + room * (
        1 + 1.4 * bool(picture.bands)
    )


def _limits(ax: Axes, picture: Picture, style: Theme) -> list[Artist]:
    out: list[Artist] = []
    for limit in picture.limits:
        out.append(ax.axhline(limit.value, color=style.ink, linewidth=1.4, linestyle=(0, (12, 4))))
        out.append(
            ax.annotate(
                f"{limit.words} {limit.value:g}", (0.0, limit.value), xycoords=("axes fraction", "data"),
                xytext=(6, 4), textcoords="offset points", color=style.ink, fontsize=style.text_pt,
                bbox=_backing(style),
            )
        )  # fmt: skip
    return out


def _bands(
    ax: Axes, bands: Sequence[Band], style: Theme, low: float, high: float, scale: float
) -> list[Artist]:
    """Shade the bands that reach into view; the words of overlapping ones stand below one another."""
    out: list[Artist] = []
    rows: list[float] = []
    least = 0.004 * (high - low)
    for b in sorted(bands, key=lambda b: (b.from_hz, -b.to_hz)):
        if b.to_hz < low or b.from_hz > high:
            continue
        left, right = max(b.from_hz, low), min(b.to_hz, high)
        if right - left < least:
            middle = (left + right) / 2
            left, right = middle - least / 2, middle + least / 2
        strong = b.severity == "contradiction"
        out.append(
            ax.axvspan(
                left / scale, right / scale, color=style.shade_strong if strong else style.shade, zorder=0.3
            )
        )
        row = next((i for i, end in enumerate(rows) if end <= left), len(rows))
        rows[row:row + 1] = [max(right, left + 0.022 * len(b.word) * (high - low))]  # fmt: skip
        if row < 4:
            near_end = (left - low) / (high - low) > 0.75
            out.append(
                ax.annotate(
                    b.word, ((right if near_end else left) / scale, 1.0), xycoords=("data", "axes fraction"),
                    xytext=(-4 if near_end else 4, -4 - 13 * row), textcoords="offset points", va="top",
                    ha="right" if near_end else "left", color=style.ink, fontsize=style.text_pt,
                    style="italic",
                )
            )  # fmt: skip
    return out


def _labels(ax: Axes, traces: Sequence[Trace], curves: Sequence[Artist], style: Theme) -> list[Artist]:
    """Names at the right ends of the curves, spread so that none covers another, each tied to its end."""
    low, high = ax.get_ylim()
    across, height = _points(ax)
    unit = (high - low) / height
    left, right = ax.get_xlim()
    ends = []
    for t, line in zip(traces, curves, strict=True):
        x, y = (np.asarray(v) for v in line.get_data())  # type: ignore[attr-defined]
        good = np.isfinite(y)
        x, y = x[good], y[good]
        if x.size and x[0] <= right:
            end = min(float(x[-1]), right)
            ends.append((float(np.clip(np.interp(end, x, y), low, high)), end, t))
    ends = sorted(reversed(ends), key=lambda e: round((e[0] - low) / unit))  # first of equals on top
    gap = (style.text_pt + 3) * unit
    spots = _spread([e[0] for e in ends], gap, low, high)
    out: list[Artist] = []
    for (value, end, t), spot in zip(ends, spots, strict=True):
        far = end < right - 0.02 * (right - left)  # a line this long would pass for a curve
        out.append(
            ax.annotate(
                t.name, (end, value), xytext=(1 + 17 / across, (spot - low) / (high - low)),
                textcoords="axes fraction", va="center", ha="left", color=style.ink, fontsize=style.text_pt,
                annotation_clip=False,
                arrowprops={
                    "arrowstyle": "-", "color": style.faint if far else style.hue(t.hue),
                    "linewidth": 1.0 if far else 1.7,
                    "linestyle": "dotted" if far else DASHES[t.dash % len(DASHES)],
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


def _backing(style: Theme) -> dict:
    """A sheet behind words that may lie over a curve."""
    return {"boxstyle": "square,pad=0.1", "facecolor": style.paper, "edgecolor": "none", "alpha": 0.85}
