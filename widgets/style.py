"""Looks shared by all panels: plain ink on paper, real focus rings, sizes that survive a projector."""

from __future__ import annotations

from html import escape

from deembed.plots_style import theme_of

__all__ = ["css", "para"]


def css(theme: str) -> str:
    """The style sheet of one theme, as an HTML element scoped to our own class."""
    ink, paper = theme_of(theme, lanes=True).ink, theme_of(theme, lanes=True).paper
    faint = theme_of(theme, lanes=True).faint
    return f"""<style>
.deembed-lanes {{ color: {ink}; background: {paper}; font-size: 15px; padding: 8px 12px; }}
.deembed-lanes .widget-html-content, .deembed-lanes .widget-html {{ color: {ink}; font-size: 15px; line-height: 1.4; }}
.deembed-lanes .widget-html-content p {{ margin: 2px 0; max-width: 62em; white-space: normal; }}
.deembed-lanes .deembed-verdict p {{ font-size: 18px; font-weight: 600; border-left: 5px solid {ink};
  padding-left: 10px; }}
.deembed-lanes h4 {{ margin: 10px 0 2px 0; font-size: 15px; }}
.deembed-lanes button.deembed-segment {{ background: transparent; border: 0; box-shadow: none;
  padding: 0; min-width: 0; }}
.deembed-lanes button.deembed-segment:hover {{ outline: 2px dashed {ink}; }}
.deembed-lanes button:focus-visible {{ outline: 3px solid {ink}; outline-offset: 2px; }}
.deembed-lanes button.deembed-show {{ background: {paper}; color: {ink}; border: 1px solid {ink}; border-radius: 2px;
  font-size: 14px; }}
.deembed-lanes button.deembed-show.deembed-shown {{ border-width: 3px; font-weight: 600; }}
.deembed-lanes table.deembed-holds td {{ padding: 1px 14px 1px 0; text-align: left; vertical-align: top;
  white-space: normal; color: {ink}; }}
.deembed-lanes table.deembed-holds {{ border-collapse: collapse; }}
.deembed-lanes table.deembed-holds tr + tr td {{ border-top: 1px solid {faint}; }}
.deembed-lanes .widget-label {{ color: {ink}; font-size: 15px; }}
.deembed-lanes select {{ color: {ink}; background: {paper}; font-size: 15px; }}
.deembed-lanes .deembed-status span {{ font-size: 13px; }}
.deembed-lanes details summary {{ cursor: pointer; }}
</style>"""


def para(*texts: str) -> str:
    """Paragraphs of text the user or the job may have written, escaped."""
    return "".join(f"<p>{escape(t)}</p>" for t in texts)
