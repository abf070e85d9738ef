"""Looks shared by all panels: plain ink on paper, real focus rings, sizes that survive a projector."""

from __future__ import annotations

import re
from html import escape

from deembed.plots_style import theme_of

__all__ = ["MARK", "css", "para", "safe"]

MARK = "▸"
"""Stands before what belongs to the chosen segment."""


_UNIT = re.compile(r"(?<=\d) (?=%|[kMGT]?Hz\b|ps\b|ns\b|dB\b|ohm\b)")


def css(theme: str) -> str:
    """The style sheet of one theme, as an HTML element scoped to our own class."""
    look = theme_of(theme, lanes=True)
    ink, paper, faint = look.ink, look.paper, look.faint
    return f"""<style>
.deembed-lanes {{ color: {ink}; background: {paper}; font-size: 15px; padding: 8px 12px; color-scheme: {theme}; }}
.deembed-lanes .widget-html-content, .deembed-lanes .widget-html {{ color: {ink}; font-size: 15px; line-height: 1.4; }}
.deembed-lanes .widget-html-content p {{ margin: 2px 0; max-width: 62em; white-space: normal; }}
.deembed-lanes .deembed-verdict p {{ font-size: 18px; font-weight: 600; border-left: 5px solid {ink};
  padding-left: 10px; }}
.deembed-lanes h4 {{ margin: 6px 0 2px 0; font-size: 15px; }}
.deembed-lanes button.deembed-segment {{ background: transparent; border: 0; box-shadow: none;
  padding: 0; min-width: 0; overflow: hidden; text-overflow: clip; white-space: nowrap; text-indent: 200%; }}
.deembed-lanes button.deembed-thin {{ z-index: 1; }}
.deembed-lanes button.deembed-segment:hover {{ outline: 2px dashed {ink}; }}
.deembed-lanes button.jupyter-button:enabled:focus {{ outline: none; box-shadow: none; }}
.deembed-lanes button.jupyter-button:enabled:focus-visible {{ outline: 3px solid {ink}; outline-offset: 2px; }}
.deembed-lanes button.deembed-show {{ background: none; color: {ink}; border: 0; box-shadow: none; padding: 0;
  font-size: 15px; text-align: left; text-decoration: underline; text-underline-offset: 3px; }}
.deembed-lanes button.deembed-show:hover {{ text-decoration-thickness: 2px; }}
.deembed-lanes button.deembed-show.deembed-shown {{ font-weight: 600; text-decoration: none; }}
.deembed-lanes .deembed-finding {{ padding-left: 9px; border-left: 3px solid transparent; }}
.deembed-lanes .deembed-finding.deembed-here {{ border-left-color: {ink}; }}
.deembed-lanes dl.deembed-holds {{ display: grid; grid-template-columns: repeat(auto-fill, minmax(29em, 1fr));
  column-gap: 32px; margin: 2px 0 8px 0; }}
.deembed-lanes dl.deembed-holds div {{ display: flex; border-bottom: 1px solid {faint}; padding: 1px 0; }}
.deembed-lanes dl.deembed-holds dt {{ flex: 0 0 14em; padding-right: 10px; box-sizing: border-box;
  color: {ink}; font-weight: 400; }}
.deembed-lanes dl.deembed-holds dd {{ margin: 0; overflow-wrap: anywhere; color: {ink}; }}
.deembed-lanes .widget-label {{ color: {ink}; font-size: 15px; }}
.deembed-lanes select {{ color: {ink}; background: {paper}; font-size: 15px; appearance: auto; }}
.deembed-lanes .deembed-map svg {{ display: block; }}
.deembed-lanes .deembed-status span {{ font-size: 13px; }}
.deembed-lanes details summary {{ cursor: pointer; }}
</style>"""


def safe(text: str) -> str:
    """Text the user or the job may have written, escaped; a number stays on one line with its unit."""
    return _UNIT.sub("\N{NO-BREAK SPACE}", escape(text))


def para(*texts: str) -> str:
    """Paragraphs of such text."""
    return "".join(f"<p>{safe(t)}</p>" for t in texts)
