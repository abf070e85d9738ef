"""Palette, line styles and themes all drawings share."""

from __future__ import annotations

from dataclasses import dataclass

from deembed.errors import DeembedError

__all__ = ["DASHES", "MARKERS", "THEMES", "Theme", "theme_of"]

# Okabe & Ito (2008), without its yellow, which no white paper shows.
_BLUE, _VERMILLION, _PURPLE, _ORANGE, _SKY, _GREEN = (
    "#0072B2",
    "#D55E00",
    "#CC79A7",
    "#E69F00",
    "#56B4E9",
    "#009E73",
)

DASHES: tuple[tuple[float, tuple[float, ...]] | str, ...] = (
    "solid",
    (0, (6, 3)),
    (0, (1.5, 2)),
    (0, (8, 2, 1.5, 2)),
    (0, (4, 1.5, 1.5, 1.5, 1.5, 1.5)),
)
MARKERS = ("o", "s", "^", "D", "v", "P", "X")


@dataclass(frozen=True)
class Theme:
    """Inks of one theme; `sheet` is what pictures stand on, so that they can be read on any page."""

    name: str
    paper: str
    ink: str
    faint: str
    shade: str
    shade_strong: str
    sheet: str
    hues: tuple[str, ...]
    text_pt: float = 11.0

    def hue(self, number: int) -> str:
        """Colour of a place in the palette; beyond the palette it starts again."""
        return self.hues[number % len(self.hues)]


_ON_PAPER = (_BLUE, _VERMILLION, "#000000", _PURPLE, _ORANGE, _SKY, _GREEN)

THEMES = {
    "light": Theme("light", "#ffffff", "#1b1b1b", "#c9c9c9", "#e9e6df", "#f6dcc3", "#ffffff", _ON_PAPER),
    # Pictures on a dark page stand on a dimmed sheet of their own: dark curves on paper, as everywhere else.
    "dark": Theme("dark", "#d6d2c8", "#151515", "#a9a59b", "#c3beb2", "#e3b98e", "#d6d2c8", _ON_PAPER),
}
LANE_THEMES = {
    "light": THEMES["light"],
    "dark": Theme("dark", "#242424", "#ececec", "#5a5a5a", "#3a3833", "#5c4025", "#242424", (_SKY,)),
}


def theme_of(name: str, *, lanes: bool = False) -> Theme:
    """The theme of a name, for pictures or for the lane map.

    Raises
    ------
    DeembedError
        A name that is not a theme.
    """
    if name not in THEMES:
        raise DeembedError(f"theme {name!r} is not one of {', '.join(THEMES)}", where="picture")
    return (LANE_THEMES if lanes else THEMES)[name]
