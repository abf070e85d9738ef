"""The reflection chart (Smith chart): a grid of normalized resistance and reactance, and curves on it."""

from __future__ import annotations

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.patches import Circle

from deembed import words
from deembed.plots_style import DASHES, MARKERS, Theme
from deembed.views.model import Picture
from deembed.views.thin import thin

__all__ = ["chart_grid", "draw_chart"]

_LEVELS = (0.2, 0.5, 1.0, 2.0, 5.0)


def chart_grid(*, points: int = 181) -> tuple[np.ndarray, ...]:
    """Curves of constant normalized resistance (0.2 to 5) and reactance (+-0.2 to 5) in the reflection plane.

    Parameters
    ----------
    points : int
        Points along each curve.

    Returns
    -------
    tuple of complex arrays of shape (points,)
        Reflections (z - 1) / (z + 1); all lie inside the unit circle. Textbook conformal map.
    """
    turn = np.tan(
        np.linspace(-0.5, 0.5, points)[1:-1] * np.pi
    )  # every reactance, evenly spread over the circle
    curves = [r + 1j * turn for r in _LEVELS]
    real = np.tan(np.linspace(0, 0.5, points)[:-1] * np.pi)
    curves += [real + 1j * x * sign for x in _LEVELS for sign in (1, -1)]
    return tuple((z - 1) / (z + 1) for z in curves)


def _grid(ax: Axes, style: Theme, *, admittance: bool) -> list[Artist]:
    rim = Circle((0, 0), 1.0, fill=False, edgecolor=style.ink, linewidth=1.3)
    ax.add_patch(rim)
    segments = [np.column_stack([g.real, g.imag]) for g in chart_grid()]
    segments.append(np.array([[-1.0, 0.0], [1.0, 0.0]]))
    out: list[Artist] = [rim]
    lines = LineCollection(segments, colors=style.faint, linewidths=0.7, zorder=0.5)
    out.append(ax.add_collection(lines))
    if admittance:
        turned = LineCollection(
            [-s for s in segments], colors=style.faint, linewidths=0.7, linestyles="dotted"
        )
        out.append(ax.add_collection(turned))
    for level in _LEVELS:
        at = (level - 1) / (level + 1)
        out.append(
            ax.text(at, 0.015, f"{level:g}", color=style.ink, fontsize=style.text_pt, ha="left", va="bottom")
        )
        edge = (1j * level - 1) / (1j * level + 1)
        for sign in (1, -1):
            place = edge.real + 1j * sign * edge.imag
            out.append(
                ax.text(
                    1.09 * place.real, 1.09 * place.imag, f"{'+' if sign > 0 else '−'}j{level:g}",
                    color=style.ink, fontsize=style.text_pt, ha="center", va="center",
                )
            )  # fmt: skip
    return out


def draw_chart(
    ax: Axes,
    picture: Picture,
    style: Theme,
    *,
    band: tuple[float, float] | None,
    cursor: float | None,
    admittance: bool = False,
) -> list[Artist]:
    """Draw reflections in the complex plane; see `deembed.plots.draw`.

    A large open mark stands at the lowest frequency of each curve, its name at the highest.
    """
    low, high = band if band else picture.span
    reach = 1.0
    curves: list[Artist] = []
    more = _grid(ax, style, admittance=admittance)
    ends_at: list[complex] = []
    for t in picture.traces:
        inside = (t.frequency >= low) & (t.frequency <= high)
        f, x, y = t.frequency[inside], t.x[inside], t.y[inside]
        keep = thin(f, x, y) if f.size else np.arange(0)
        x, y = x[keep], y[keep]
        curves += ax.plot(
            x, y, color=style.hue(t.hue), linestyle=DASHES[t.hue % len(DASHES)], linewidth=1.8, label=t.name
        )
        good = np.flatnonzero(np.isfinite(x) & np.isfinite(y))
        if not good.size:
            continue
        reach = max(reach, float(np.nanmax(np.hypot(x, y))))
        mark = MARKERS[t.hue % len(MARKERS)]
        more += ax.plot(
            x[good[:1]], y[good[:1]], marker=mark, markersize=9, markerfacecolor="none",
            markeredgewidth=1.8, color=style.hue(t.hue),
        )  # fmt: skip
        more += ax.plot(x[good[-1:]], y[good[-1:]], marker=mark, markersize=6, color=style.hue(t.hue))
        end = complex(x[good[-1]], y[good[-1]])
        # Names of curves that end together stand under each other.
        below = 16 * sum(abs(end - other) < 0.15 for other in ends_at)
        ends_at.append(end)
        more.append(
            ax.annotate(
                t.name, (end.real, end.imag), xytext=(7, 5 - below), textcoords="offset points",
                color=style.ink, fontsize=style.text_pt, fontweight="bold",
            )
        )  # fmt: skip
    if cursor is not None:
        more += _cursor(ax, picture, cursor, style)
    reach = max(1.16, 1.06 * reach)
    ax.set_xlim(-reach, reach)
    ax.set_ylim(-reach, reach)
    ax.set_aspect("equal")
    ax.set_xticks([])
    ax.set_yticks([])
    for spine in ax.spines.values():
        spine.set_visible(False)
    ends = f"open mark {words.frequency(low)}, name at {words.frequency(high)}"
    ax.set_xlabel(ends, color=style.ink, fontsize=style.text_pt)
    return [*curves, *more]


def _cursor(ax: Axes, picture: Picture, cursor: float, style: Theme) -> list[Artist]:
    out: list[Artist] = []
    for t, r in zip(picture.traces, picture.at(cursor), strict=True):
        value = complex(r.value)
        out += ax.plot(
            [value.real], [value.imag], linestyle="none", marker="o", markersize=11, markerfacecolor="none",
            markeredgecolor=style.hue(t.hue), markeredgewidth=2.4,
        )  # fmt: skip
    return out
