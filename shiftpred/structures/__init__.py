"""Read structures and files; sites, equivalence, numbering; rivals."""

from shiftpred.structures.environments import coarser_environment, compute_environments
from shiftpred.structures.reading import parse_structure, parse_structures
from shiftpred.structures.sites import compute_equivalence, compute_sites
from shiftpred.structures.standardise import standardise_mol

__all__ = [
    "coarser_environment",
    "compute_environments",
    "compute_equivalence",
    "compute_sites",
    "parse_structure",
    "parse_structures",
    "standardise_mol",
]
