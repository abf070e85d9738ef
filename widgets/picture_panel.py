"""One picture at a time, on the band that all pictures share."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import ipywidgets as w
import traitlets as t

from deembed import words
from deembed.errors import DeembedError
from deembed.plots import svg
from deembed.views.model import Picture
from deembed.widgets.style import para
from deembed.widgets.turns import in_turn

__all__ = ["PicturePanel"]

# Room for the tallest picture, so that nothing below moves when another one is chosen.
_TALL = "410px"


class PicturePanel(w.VBox):
    """Shows one of an outcome's pictures; `band` is None for the whole sweep, else (from, to) in Hz.

    Parameters
    ----------
    pictures : mapping name -> Picture
    offered : sequence of str
        Names in the list, in order; others can be shown by setting `name`.
    turns : Turns
        Shared with the panels that set `name` and `band`.
    theme : str
    """

    name = t.Unicode()
    band = t.Tuple(allow_none=True, default_value=None)
    drawn = t.Int(0)

    def __init__(
        self, pictures: Mapping[str, Picture], *, offered: tuple[str, ...], turns: Any, theme: str = "light"
    ) -> None:
        self._pictures, self._theme, self._offered = pictures, theme, offered
        self._last: tuple | None = None
        self._heard = in_turn(turns, self._chosen)
        self.choice = w.Dropdown(
            options=self._options(offered[0]),
            description="Picture",
            layout=w.Layout(width="100%", max_width="640px"),
        )
        self.choice.add_class("deembed-choice")
        self.whole = w.Button(description="Back to the whole sweep", layout=w.Layout(width="auto"))
        self.whole.add_class("deembed-show")
        self.shown = w.HTML()
        self.picture = w.HTML(layout=w.Layout(width="100%", min_height=_TALL))
        self.picture.add_class("deembed-picture")
        super().__init__(
            [
                self.choice,
                w.HBox(
                    [self.shown, self.whole], layout=w.Layout(margin="0 0 0 88px", align_items="baseline")
                ),
                self.picture,
            ],
            layout=w.Layout(flex="0 1 724px", min_width="320px", overflow="hidden"),
        )
        self.name = offered[0]
        self._draw()
        self.observe(lambda _: self._draw(), ["name", "band"])
        self.choice.observe(self._heard, "value")
        self.whole.on_click(in_turn(turns, lambda _: self.set_trait("band", None)))

    @property
    def said(self) -> str:
        """What is on show, in words."""
        return f"Picture: {self._title(self.name)}, {self._band_words()}."

    def offer(self, names: tuple[str, ...], *, show: str) -> None:
        """Change what the list holds and show one of its pictures; without a name, stay where that is possible."""
        self._offered = names
        self.name = show or (self.name if self.name in names else names[0])
        self._list()

    def _band_words(self) -> str:
        return "whole sweep" if self.band is None else words.band(*self.band)

    def _options(self, name: str) -> list[tuple[str, str]]:
        names = self._offered if name in self._offered else (name, *self._offered)
        return [(self._title(n), n) for n in names]

    def _title(self, name: str) -> str:
        try:
            return self._pictures[name].title
        except DeembedError:  # said in place when this picture is asked for
            return name

    def _chosen(self, change: dict) -> None:
        if change["new"]:
            self.name = change["new"]

    def _list(self) -> None:
        options = self._options(self.name)
        if (self.choice.value, tuple(options)) == (self.name, tuple(self.choice.options)):
            return
        self.choice.unobserve(self._heard, "value")
        self.choice.options = options
        self.choice.value = self.name
        self.choice.observe(self._heard, "value")

    def _draw(self) -> None:
        if self._last == (self.name, self.band):
            return  # name and band changed together, and are told one after the other
        self._last = (self.name, self.band)
        self._list()
        self.whole.layout.display = "none" if self.band is None else ""
        self.shown.value = para(f"Shown: {self._band_words()}")
        try:
            self.picture.value = svg(self._pictures[self.name], band=self.band, theme=self._theme)
        except DeembedError as error:
            self.picture.value = para(f"This picture cannot be drawn. {error}")
        self.drawn += 1
