"""Panels for notebooks: they show and edit, and compute nothing."""
