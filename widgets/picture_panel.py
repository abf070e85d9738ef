"""One picture at a time, on the band that all pictures share."""

from __future__ import annotations

from collections.abc import Mapping

import ipywidgets as w
import traitlets as t

from deembed import words
from deembed.plots import svg
from deembed.views.model import Picture

__all__ = ["PicturePanel"]


class PicturePanel(w.VBox):
    """Shows one of an outcome's pictures; `band` is None for the whole sweep, else (from, to) in Hz.

    Parameters
    ----------
    pictures : mapping name -> Picture
    offered : sequence of str
        Names in the list, in order; others can be shown by setting `name`.
    theme : str
    """

    name = t.Unicode()
    band = t.Tuple(allow_none=True, default_value=None)
    drawn = t.Int(0)

    def __init__(
        self, pictures: Mapping[str, Picture], *, offered: tuple[str, ...], theme: str = "light"
    ) -> None:
        self._pictures, self._theme, self._offered = pictures, theme, offered
        self.choice = w.Dropdown(options=self._options(offered[0]), description="Picture")
        self.choice.add_class("deembed-choice")
        self.whole = w.Button(description="Whole sweep", layout=w.Layout(width="auto"), disabled=True)
        self.whole.add_class("deembed-show")
        self.shown = w.HTML()
        self.picture = w.HTML()
        self.picture.add_class("deembed-picture")
        super().__init__([w.HBox([self.choice, self.whole, self.shown]), self.picture])
        self.name = offered[0]
        self._draw()
        self.observe(lambda _: self._draw(), ["name", "band"])
        self.choice.observe(self._chosen, "value")
        self.whole.on_click(lambda _: self.set_trait("band", None))

    def _options(self, name: str) -> list[tuple[str, str]]:
        names = self._offered if name in self._offered else (name, *self._offered)
        return [(self._pictures[n].title, n) for n in names]

    def _chosen(self, change: dict) -> None:
        if change["new"]:
            self.name = change["new"]

    def _draw(self) -> None:
        if self.choice.value != self.name:
            self.choice.unobserve(self._chosen, "value")
            self.choice.options = self._options(self.name)
            self.choice.value = self.name
            self.choice.observe(self._chosen, "value")
        self.whole.disabled = self.band is None
        self.shown.value = "" if self.band is None else f"<p>shown: {words.band(*self.band)}</p>"
        self.picture.value = svg(self._pictures[self.name], band=self.band, theme=self._theme)
        self.drawn += 1
