"""Resonance constant R by an additive model: the attached atom, and what it is conjugated with.

R = R0 + (kind of the attached atom) + Σ (what hangs on it): a lone pair gives, a multiple bond to a more electronegative
atom takes, and an acceptor behind a lone pair competes for it. The terms are fitted to the published R (see `fitting`).
"""

from __future__ import annotations

from functools import lru_cache
from math import nan

from shiftpred.electronics.atom_types import compute_atom_type
from shiftpred.electronics.group_graph import GroupGraph
from shiftpred.electronics.published import find_published_median
from shiftpred.electronics.sourced_tables import load_rows

__all__ = ["compute_resonance", "compute_resonance_terms", "find_sigma_r"]

_LONE_PAIRS = ("N", "O", "S", "Se", "P")
_HALOGENS = ("F", "Cl", "Br", "I")


def compute_resonance_terms(group: GroupGraph) -> dict[str, float]:
    """Return term → how often it occurs in the group."""
    here = group.attached
    terms = {compute_atom_type(group, here): 1.0}
    gives = group.symbols[here] in _LONE_PAIRS and group.hybrids[here] == "sp3" and not group.oxos[here]
    for j, order in group.neighbours[here]:
        symbol, kind = group.symbols[j], compute_atom_type(group, j)
        if gives:
            acceptor = kind in ("C=X", "C#N", "Nsp2+") or group.oxos[j]
            term = "acceptor behind a lone pair" if acceptor else "aryl behind a lone pair" if kind == "Car" else None
            term = term or ("carbon behind a lone pair" if symbol == "C" else None)
        elif order == 1 and group.hybrids[here] in ("sp2", "sp3") and symbol in _HALOGENS:
            term = f"halogen on {'pi' if group.hybrids[here] == 'sp2' else 'sigma'} atom"
        elif order == 1 and symbol in ("O", "N", "S") and not group.charges[here]:
            term = "lone pair behind"
        elif order == 2 and symbol in ("O", "N"):
            term = "double bond to O or N"
        else:
            term = "carbon behind" if symbol == "C" else None
        if term:
            terms[term] = terms.get(term, 0.0) + 1.0
    return terms


@lru_cache(maxsize=1)
def _parameters() -> dict[str, float]:
    return {row["term"]: float(row["value"]) for row in load_rows("resonance_parameters")}


def compute_resonance(group: GroupGraph) -> float:
    """Return R by the additive model.

    Returns
    -------
    float
        Dimensionless; nan for charged groups, several bonds to the site, and attached atoms outside the fit.
    """
    parameters, terms = _parameters(), compute_resonance_terms(group)
    kind = compute_atom_type(group, group.attached)
    if group.charge or group.radicals or group.attached_order != 1 or kind not in parameters:
        return nan
    return parameters["constant"] + sum(n * parameters.get(term, 0.0) for term, n in terms.items())


def find_sigma_r(group: GroupGraph) -> float:
    """Return R: the median of what is published, else by the additive model; nan where not defined."""
    published = find_published_median(group.smiles, "R")
    return compute_resonance(group) if published is None else published
