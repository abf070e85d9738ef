"""Panels for notebooks: they show and edit, and compute nothing."""

from deembed.widgets.lanes import Lanes

__all__ = ["Lanes"]
