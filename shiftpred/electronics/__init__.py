"""Electronegativities of elements, hybrids and groups; inductive and resonance constants, each with its source."""

from shiftpred.lazy_names import build_lazy_names

_HOME = {
    "SourcedConstant": "shiftpred.electronics.constants",
    "compute_allen": "shiftpred.electronics.elements",
    "compute_allred_rochow": "shiftpred.electronics.elements",
    "compute_mulliken_absolute": "shiftpred.electronics.elements",
    "compute_mulliken_pauling_units": "shiftpred.electronics.elements",
    "compute_pauling_difference": "shiftpred.electronics.pauling_scale",
    "compute_pauling_differences": "shiftpred.electronics.pauling_scale",
    "compute_pauling_scale": "shiftpred.electronics.pauling_scale",
    "compute_sanderson_ratio": "shiftpred.electronics.elements",
    "compute_slater_effective_charge": "shiftpred.electronics.elements",
    "element_scales": "shiftpred.electronics.elements",
    "compute_charged_electronegativity": "shiftpred.electronics.orbital_electronegativity",
    "compute_hinze_jaffe": "shiftpred.electronics.orbital_electronegativity",
    "compute_mullay": "shiftpred.electronics.orbital_electronegativity",
    "SubstituentConstants": "shiftpred.electronics.substituent_constants",
    "UndefinedConstant": "shiftpred.electronics.substituent_constants",
    "render_substituent_text": "shiftpred.electronics.substituent_constants",
    "substituent": "shiftpred.electronics.substituent_constants",
    "GroupVector": "shiftpred.electronics.vector",
    "group_vector": "shiftpred.electronics.vector",
}

__all__, __getattr__, __dir__ = build_lazy_names(globals(), _HOME)
