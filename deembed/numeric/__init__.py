"""numeric."""
