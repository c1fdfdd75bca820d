"""Who is who: observed lines against predicted nuclei, with solvent, impurities, offset and leftovers."""

from shiftpred.assignment.prepared_peaks import PreparedPeaks, prepare_peaks
from shiftpred.assignment.structure_fit import StructureFit, assign_structure

__all__ = ["PreparedPeaks", "StructureFit", "assign_structure", "prepare_peaks"]
