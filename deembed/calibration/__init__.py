"""Calibrations: readings of standards in, one set of error terms out."""

from deembed.calibration.error_terms import correct, predict_raw
from deembed.calibration.reading import Reading
from deembed.calibration.self_check import check_terms
from deembed.calibration.sol import solve_sol
from deembed.calibration.solt import solve_solt
from deembed.calibration.trl import solve_trl

__all__ = ["Reading", "check_terms", "correct", "predict_raw", "solve_sol", "solve_solt", "solve_trl"]
