"""Results → one plain dictionary each, with a numbered schema. Everything that is shown is made from these."""

from shiftpred.reporting.summaries.comparison import compute_comparison_dict
from shiftpred.reporting.summaries.explanation import compute_explanation_dict
from shiftpred.reporting.summaries.prediction import (
    build_failure_entry,
    build_prediction_entry,
    compute_prediction_dict,
    compute_prediction_heading,
)
from shiftpred.reporting.summaries.ranking import compute_ranking_dict

__all__ = [
    "build_failure_entry",
    "build_prediction_entry",
    "compute_comparison_dict",
    "compute_explanation_dict",
    "compute_prediction_dict",
    "compute_prediction_heading",
    "compute_ranking_dict",
]
