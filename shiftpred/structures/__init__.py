"""Read structures and files; sites, equivalence, numbering; rivals."""

from shiftpred.structures.building import LARGEST_STRUCTURE
from shiftpred.structures.environments import coarser_environment, compute_environments, compute_site_environments
from shiftpred.structures.equivalence import Equivalence, compute_equivalence
from shiftpred.structures.reading import parse_listed_structures, parse_structure, parse_structures
from shiftpred.structures.sites import compute_sites
from shiftpred.structures.standardise import standardise_mol

__all__ = [
    "LARGEST_STRUCTURE",
    "Equivalence",
    "coarser_environment",
    "compute_environments",
    "compute_equivalence",
    "compute_site_environments",
    "compute_sites",
    "parse_listed_structures",
    "parse_structure",
    "parse_structures",
    "standardise_mol",
]
