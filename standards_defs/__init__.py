"""Calibration kits shipped with the package, as TOML."""
