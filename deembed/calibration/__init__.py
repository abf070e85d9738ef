"""Calibrations: readings of standards in, one set of error terms out."""

from deembed.calibration.check_standards import check_findings, normalized_error
from deembed.calibration.drift import drift, drift_findings
from deembed.calibration.error_terms import correct, predict_raw
from deembed.calibration.reading import Reading
from deembed.calibration.residuals import residual_findings, standard_residuals
from deembed.calibration.self_check import check_terms
from deembed.calibration.sol import solve_sol
from deembed.calibration.solt import solve_solt
from deembed.calibration.trl import solve_trl
from deembed.calibration.witness import implied_switch_terms, switch_term_findings

__all__ = [
    "Reading",
    "check_findings",
    "check_terms",
    "correct",
    "drift",
    "drift_findings",
    "implied_switch_terms",
    "normalized_error",
    "predict_raw",
    "residual_findings",
    "solve_sol",
    "solve_solt",
    "solve_trl",
    "standard_residuals",
    "switch_term_findings",
]
