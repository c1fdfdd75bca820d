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
    terms = {_attached_kind(group): 1.0}

    def count(term: str, n: float = 1.0) -> None:
        terms[term] = terms.get(term, 0.0) + n

    gives = group.symbols[here] in _LONE_PAIRS and group.hybrids[here] == "sp3" and not group.oxos[here]
    for j, order in group.neighbours[here]:
        kind, symbol = compute_atom_type(group, j), group.symbols[j]
        if gives:
            if kind in ("C=X", "C#N", "Nsp2+") or group.oxos[j]:
                count("acceptor behind a lone pair")
            elif kind == "Car":
                count("aryl behind a lone pair")
            elif symbol == "C":
                count("carbon behind a lone pair")
                count("halogen on carbon behind a lone pair", _count_halogens(group, j))
        elif order == 1 and symbol in _HALOGENS:
            count(f"halogen on {'sp2' if group.hybrids[here] == 'sp2' else 'sp3'} atom")
        elif order == 1 and symbol in ("O", "N", "S"):
            count(f"lone pair behind {'sp2' if group.hybrids[here] == 'sp2' else 'sp3'} atom")
        elif kind == "Car" and not group.aromatic[here]:
            count("aryl behind")
        elif order == 1 and symbol == "C":
            count("carbon behind")
            count("halogen on carbon behind", _count_halogens(group, j))
    if group.aromatic[here]:
        depths = group.depths
        for j, symbol in enumerate(group.symbols):
            if group.aromatic[j] and symbol == "N" and group.charges[j] == 0 and len(group.neighbours[j]) == 2:
                count("aza nitrogen conjugated" if depths[j] % 2 else "aza nitrogen")
    return {term: n for term, n in terms.items() if n}


def _attached_kind(group: GroupGraph) -> str:
    here = group.attached
    kind = compute_atom_type(group, here)
    if kind == "Nsp2":
        double = [(group.symbols[j], group.hybrids[j]) for j, n in group.neighbours[here] if n == 2]
        cumulated = any(hybrid == "sp" for _, hybrid in double)
        nitroso = any(symbol == "O" for symbol, _ in double)
        return "N cumulated" if cumulated else "N=O" if nitroso else "N=X" if double else kind
    return "Osp3" if kind == "OH" else kind


def _count_halogens(group: GroupGraph, atom: int) -> int:
    return sum(group.symbols[k] in _HALOGENS for k, _ in group.neighbours[atom])


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
    kind = _attached_kind(group)
    if group.charge or group.radicals or group.attached_order != 1 or kind not in parameters:
        return nan
    return parameters["constant"] + sum(n * parameters.get(term, 0.0) for term, n in terms.items())


def find_sigma_r(group: GroupGraph) -> float:
    """Return R: the median of what is published, else by the additive model; nan where not defined."""
    published = find_published_median(group.smiles, "R")
    return compute_resonance(group) if published is None else published
