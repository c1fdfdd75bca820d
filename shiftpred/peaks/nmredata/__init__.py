"""NMReDATA 1.0 and 1.1: SDF records that carry peak lists, labels, assignments and couplings.

References
----------
Pupier et al., Magn. Reson. Chem. 2018, 56, 703, doi:10.1002/mrc.4737; tags as the NMReDATA initiative publishes them.
"""

from shiftpred.peaks.nmredata.contents import (
    UNKNOWN_SHIFT_PPM,
    Coupling,
    NmredataError,
    NmredataRecord,
    Signal,
    Spectrum,
    SpectrumLine,
)
from shiftpred.peaks.nmredata.reading import find_nmredata, parse_nmredata
from shiftpred.peaks.nmredata.training_compounds import AssignedCompound, load_nmredata_compounds

__all__ = [
    "UNKNOWN_SHIFT_PPM",
    "AssignedCompound",
    "Coupling",
    "NmredataError",
    "NmredataRecord",
    "Signal",
    "Spectrum",
    "SpectrumLine",
    "find_nmredata",
    "load_nmredata_compounds",
    "parse_nmredata",
]
