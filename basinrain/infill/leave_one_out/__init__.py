"""Leave-one-out: which infill method estimates the gauges of this network best from their neighbours."""

from basinrain.infill.leave_one_out.candidates import candidates_of
from basinrain.infill.leave_one_out.compare import compare_infill
from basinrain.infill.leave_one_out.comparison import Candidate, Comparison, Difference, Score
from basinrain.infill.leave_one_out.errors_at_gauges import ErrorSums, leave_one_out_errors
from basinrain.infill.leave_one_out.estimator import Estimator

__all__ = [
    "Candidate",
    "Comparison",
    "Difference",
    "ErrorSums",
    "Estimator",
    "Score",
    "candidates_of",
    "compare_infill",
    "leave_one_out_errors",
]
