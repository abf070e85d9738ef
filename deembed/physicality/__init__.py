"""physicality."""
