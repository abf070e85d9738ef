"""Palette, line styles and themes all drawings share."""

from __future__ import annotations

from dataclasses import dataclass

from deembed.errors import DeembedError

__all__ = ["DASHES", "MARKERS", "THEMES", "Theme", "theme_of"]

# Okabe & Ito (2008): black, orange, sky blue, bluish green, yellow, blue, vermillion, reddish purple.
_BLUE, _VERMILLION, _PURPLE, _ORANGE, _SKY, _GREEN = "#0072B2", "#D55E00", "#CC79A7", "#E69F00", "#56B4E9", "#009E73"
_YELLOW = "#F0E442"

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
    """Inks of one theme."""

    name: str
    paper: str
    ink: str
    faint: str
    shade: str
    shade_strong: str
    hues: tuple[str, ...]
    text_pt: float = 11.0

    def hue(self, number: int) -> str:
        """Colour of a place in the palette; beyond the palette it starts again (line style and marker differ)."""
        return self.hues[number % len(self.hues)]


THEMES = {
    "light": Theme(
        "light", "#ffffff", "#1b1b1b", "#c9c9c9", "#e9e6df", "#f6dcc3",
        (_BLUE, _VERMILLION, "#000000", _PURPLE, _ORANGE, _SKY, _GREEN),
    ),
    "dark": Theme(
        "dark", "#1e1e1e", "#ececec", "#5a5a5a", "#3a3833", "#54402c",
        (_SKY, _ORANGE, "#ffffff", _PURPLE, _YELLOW, _VERMILLION, _GREEN),
    ),
}  # fmt: skip


def theme_of(name: str) -> Theme:
    """The theme of a name.

    Raises
    ------
    DeembedError
        A name that is not a theme.
    """
    if name not in THEMES:
        raise DeembedError(f"theme {name!r} is not one of {', '.join(THEMES)}", where="picture")
    return THEMES[name]
