"""The lane map as SVG: lanes to scale in picoseconds, planes as rules, states by shape and in words."""

from __future__ import annotations

import math
from xml.sax.saxutils import escape, quoteattr

from deembed.plots_lanes_layout import CAPTION, LEFT, ROW, SHAPES, TAB, TOP, Layout, caption, layout_of
from deembed.plots_style import Theme
from deembed.views.lane_map import Lane, LaneMap, Segment

__all__ = ["lanes_svg"]

TEXT = 15  # px, 11.25 pt


def _text(x: float, y: float, words: str, ink: str, *, anchor: str = "start", more: str = "") -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" fill="{ink}" {more}>{escape(words)}</text>'


def _line(x1: float, y1: float, x2: float, y2: float, ink: str, wide: float, *, dash: str = "") -> str:
    more = f' stroke-dasharray="{dash}"' if dash else ""
    ends = f'x1="{x1:.1f}" y1="{y1:.1f}" x2="{x2:.1f}" y2="{y2:.1f}"'
    return f'<line {ends} stroke="{ink}" stroke-width="{wide:g}"{more}/>'


def _rect(x: float, y: float, w: float, h: float, more: str) -> str:
    return f'<rect x="{x:.1f}" y="{y:.1f}" width="{w:.1f}" height="{h:.1f}" {more}/>'


def _outline(s: Segment, box: tuple[float, float, float, float]) -> str:
    """Path of a segment; a warning has a notch in its upper edge."""
    x, y, w, h = box
    notch = min(6.0, w / 3)
    middle = x + w - min(h / 2, w / 2) - notch - 2  # near the end, clear of the words
    dent = f"L{middle - notch:.1f},{y:.1f} L{middle:.1f},{y + notch:.1f} L{middle + notch:.1f},{y:.1f} "
    dent = dent if s.state == "warning" else ""
    if s.kind == "arm":
        r = min(h / 2, w / 2)
        left, right, low = x + r, x + w - r, y + h
        arc = f"A{r:.1f},{h / 2:.1f} 0 0 1"
        over = f"M{left:.1f},{y:.1f} {dent}L{right:.1f},{y:.1f} {arc} {right:.1f},{low:.1f}"
        return f"{over} L{left:.1f},{low:.1f} {arc} {left:.1f},{y:.1f} Z"
    if s.kind == "analyzer-port":
        return (
            f"M{x:.1f},{y:.1f} {dent}L{x + w - 10:.1f},{y:.1f} L{x + w:.1f},{y + h / 2:.1f} "
            f"L{x + w - 10:.1f},{y + h:.1f} L{x:.1f},{y + h:.1f} Z"
        )
    return f"M{x:.1f},{y:.1f} {dent}L{x + w:.1f},{y:.1f} L{x + w:.1f},{y + h:.1f} L{x:.1f},{y + h:.1f} Z"


def _short_words(s: Segment, room: float) -> str:
    """The longest name that fits."""
    number = s.where.rsplit(" ", 1)[-1]
    length = s.to_ps - s.from_ps
    size = f"{length:.0f} ps" if length < 9999 else f"{length / 1000:.1f} ns"
    told = {
        "analyzer-port": (f"port {number}", number),
        "error-box": (f"error box, {size}", "error box", "box"),
        "arm": (f"arm {number}, {size}", f"arm {number}", number),
        "part-port": (number,),
        "part": ("the part", "part"),
    }.get(s.kind, ("",))
    if s.kind == "error-box" and s.state == "absent":
        told = ("corrected before", "")
    if s.kind == "arm" and s.state == "absent":
        told = ("",)
    shape = f"{SHAPES[s.state]} " if SHAPES[s.state] else ""
    tries = [shape + t for t in told if t] + [t for t in told if t]
    return next((t for t in tries if 8.2 * len(t) + 8 <= room), "")


def _segment(
    s: Segment, box: tuple[float, float, float, float], style: Theme, *, selected: bool, uid: str
) -> str:
    x, y, w, h = box
    fill = {"contradiction": f"url(#{uid}-hatch)", "warning": style.shade_strong}.get(s.state, style.paper)
    fill = "none" if s.state == "absent" else fill
    dash = ' stroke-dasharray="5 4"' if s.state == "absent" else ""
    wide = 3.5 if selected else 1.5
    label = _short_words(s, w)
    body = []
    if s.kind == "cable-plane":
        stroke = 5 if s.state in ("warning", "contradiction") or selected else 3
        body.append(_line(x + w / 2, y, x + w / 2, y + h, style.ink, stroke))
    elif s.kind == "part-port":
        place = f'cx="{x + w / 2:.1f}" cy="{y + h / 2:.1f}" r="{h / 2:.1f}"'
        body.append(f'<circle {place} fill="{fill}" stroke="{style.ink}" stroke-width="{wide}"/>')
    elif w > 0:
        body.append(
            f'<path d="{_outline(s, box)}" fill="{fill}" stroke="{style.ink}" stroke-width="{wide}"{dash}/>'
        )
    if label and s.state == "contradiction":
        pill = 8.2 * len(label) + 6
        body.append(_rect(x + w / 2 - pill / 2, y + h / 2 - 10, pill, 20, f'fill="{style.paper}"'))
    if label:
        bold = 'font-weight="bold"' if selected else ""
        body.append(_text(x + w / 2, y + h / 2 + 5, label, style.ink, anchor="middle", more=bold))
    if selected:
        ring = f'rx="4" fill="none" stroke="{style.hues[0]}" stroke-width="2.5" stroke-dasharray="2 3"'
        body.append(_rect(x - 4, y - 4, w + 8, h + 8, ring))
    if SHAPES[s.state] and SHAPES[s.state] not in label:
        body.append(_text(x + w / 2, y - 3, SHAPES[s.state], style.ink, anchor="middle"))
    chosen = ' data-chosen="yes"' if selected else ""
    known = f'data-segment={quoteattr(s.id)} data-state="{s.state}"{chosen}'
    return f'<g class="segment" {known}>{"".join(body)}</g>'


def _ticks(total: float, room: float) -> list[float]:
    """Round distances [ps], about one per 90 px."""
    raw = total / max(room / 90, 1)
    size = 10 ** math.floor(math.log10(raw))
    step = next(m * size for m in (1, 2, 5, 10) if m * size >= raw)
    return [k * step for k in range(int(total / step + 1e-9) + 1)]


def _axis(lane_map: LaneMap, at: Layout, style: Theme) -> str:
    y = at.rows_end + 14
    if at.px_per_ps == 0:
        return _text(LEFT, y + 21, "no lengths: every plane falls on the part plane", style.ink)
    first = at.broken_at or LEFT + TAB
    reach = (at.part_x - first) / at.px_per_ps
    out = [_line(first, y, at.part_x, y, style.ink, 1.2)]
    for t in _ticks(reach, at.part_x - first):
        x = at.part_x - t * at.px_per_ps
        out.append(_line(x, y, x, y + 6, style.ink, 1))
        out.append(_text(x, y + 21, f"{t:g}", style.ink, anchor="middle"))
    words = "electrical distance from the part plane (ps)"
    if at.broken_at:
        out.append(
            _text(
                at.part_x, y + 60, "error boxes are cut short at the slanted strokes", style.ink, anchor="end"
            )
        )
    out.append(_text(at.part_x, y + 40, words, style.ink, anchor="end"))
    return "".join(out)


def _breaks(lane_map: LaneMap, at: Layout, style: Theme) -> str:
    """A gap with two slanted strokes across every error box that is drawn short."""
    if not at.broken_at:
        return ""
    out = []
    for lane in lane_map.lanes:
        for s in lane.of("error-box"):
            x, y, w, h = at.boxes[s.id]
            cut, top, low = x + w - 16, y - 3, y + h + 3
            corners = ((cut - 4, low), (cut + 2, top), (cut + 8, top), (cut + 2, low))
            points = " ".join(f"{px:.1f},{py:.1f}" for px, py in corners)
            out.append(f'<polygon points="{points}" fill="{style.paper}"/>')
            out += [_line(cut - 4 + dx, low, cut + 2 + dx, top, style.ink, 1.3) for dx in (0, 6)]
    return "".join(out)


def _wires(lane: Lane, at: Layout, style: Theme) -> str:
    """From arm over part port to part, and from the analyzer to error boxes that start further on."""
    middle = at.rows[lane.part_port][1]
    px = at.boxes["part"][0]
    out = []
    for s in lane.of("error-box"):
        x, y, _, h = at.boxes[s.id]
        if x > LEFT + TAB:
            out.append(_line(LEFT + TAB, y + h / 2, x, y + h / 2, style.ink, 1.5))
    return "".join(out) + _line(at.part_x, middle, px, middle, style.ink, 2)


def lanes_svg(lane_map: LaneMap, *, selected: str | None, width: float, style: Theme) -> str:
    """See `deembed.plots.lane_map_svg`."""
    at = layout_of(lane_map, width=width)
    uid = f"lanes-{style.name}"
    out = [
        f'<defs><pattern id="{uid}-hatch" width="7" height="7" patternUnits="userSpaceOnUse" '
        f'patternTransform="rotate(45)"><rect width="7" height="7" fill="{style.paper}"/>'
        f'<line x1="0" y1="0" x2="0" y2="7" stroke="{style.ink}" stroke-width="2.2"/></pattern></defs>',
        _rect(0, 0, at.width, at.height, f'fill="{style.sheet}"'),
    ]
    foot = at.rows_end + 14
    # The rule runs up between the two words it parts.
    out.append(_line(at.part_x, TOP - 38, at.part_x, foot, style.ink, 1.4, dash="10 3"))
    out.append(_text(at.part_x - 6, TOP - 24, "part plane", style.ink, anchor="end"))
    out.append(_text(at.part_x + 8, TOP - 24, "part port", style.ink))
    out.append(_text(LEFT, TOP - 24, "analyzer", style.ink))
    for n, lane in enumerate(lane_map.lanes):
        top, _, bottom = at.rows[lane.part_port]
        out.append(_wires(lane, at, style))
        for k, s in enumerate(lane.of("analyzer-port")):
            out.append(_text(8, top + k * ROW + ROW / 2 + 5, f"round {s.round_label}", style.ink))
        cable = at.boxes[lane.of("cable-plane")[0].id]
        if n == 0 and at.part_x - cable[0] > 130:
            out.append(_text(cable[0] + 5, TOP - 24, "cable plane", style.ink, anchor="middle"))
        for s in lane.segments:
            out.append(_segment(s, at.boxes[s.id], style, selected=s.id == selected, uid=uid))
        for k, line in enumerate(caption(lane, at.part_x + 60)):
            out.append(_text(LEFT, bottom + 17 + k * CAPTION, line, style.ink, more='font-style="italic"'))
    out.append(_breaks(lane_map, at, style))
    part = lane_map.part
    out.append(_segment(part, at.boxes["part"], style, selected=selected == "part", uid=uid))
    x, y, _, h = at.boxes["part"]
    if part.state not in ("plain", "absent"):
        shape = f"{SHAPES[part.state]} "
        for k, one in enumerate(part.state_words.split(", ")):
            out.append(_text(x, y + h + 18 + 18 * k, f"{'' if k else shape}{one}", style.ink))
    out.append(_axis(lane_map, at, style))
    size = f'viewBox="0 0 {at.width:g} {at.height:g}" width="{at.width:g}" height="{at.height:g}"'
    look = f'style="max-width:100%;height:auto" font-family="sans-serif" font-size="{TEXT}"'
    said = f'role="img" aria-label={quoteattr(lane_map.alt)}'
    return f'<svg xmlns="http://www.w3.org/2000/svg" {said} class="lanes" {size} {look}>{"".join(out)}</svg>'
