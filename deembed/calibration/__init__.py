"""calibration."""
