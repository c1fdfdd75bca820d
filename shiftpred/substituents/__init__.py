"""Cut a molecule at a site into substituents; positions alpha, beta, gamma; canonical names of groups."""

from shiftpred.substituents.names import name_group
from shiftpred.substituents.split import Substituent, split_molecule, split_substituents

__all__ = ["Substituent", "name_group", "split_molecule", "split_substituents"]
