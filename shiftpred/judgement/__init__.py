"""Probability, supported / open / contradicted, reasons, ranking."""

from shiftpred.judgement.ionised_forms import build_ionised_forms
from shiftpred.judgement.judge import build_comparison
from shiftpred.judgement.probability import build_judgement_map
from shiftpred.judgement.ranking import build_ranking

__all__ = ["build_comparison", "build_ionised_forms", "build_judgement_map", "build_ranking"]
