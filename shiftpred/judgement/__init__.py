"""Probability, supported / open / contradicted, reasons, ranking."""

from shiftpred.judgement.given_assignment import add_given_assignment, choose_lists
from shiftpred.judgement.ionised_forms import build_ionised_structures
from shiftpred.judgement.judge import build_comparison
from shiftpred.judgement.probability import build_judgement_map
from shiftpred.judgement.ranking import build_ranking
from shiftpred.judgement.sample import build_settings, choose_solvent, read_sample, require_candidates

__all__ = [
    "add_given_assignment",
    "build_comparison",
    "build_ionised_structures",
    "build_judgement_map",
    "build_ranking",
    "build_settings",
    "choose_lists",
    "choose_solvent",
    "read_sample",
    "require_candidates",
]
