"""The few constants of a group that the substituent model works with, fast and never failing."""

from __future__ import annotations

from functools import lru_cache
from math import nan
from typing import NamedTuple

from shiftpred.electronics.group_electronegativity import compute_attached_weighted, compute_partial_charges, find_pauling
from shiftpred.electronics.group_graph import parse_group
from shiftpred.electronics.inductive import find_sigma_i, find_sigma_star
from shiftpred.electronics.orbital_electronegativity import compute_hinze_jaffe
from shiftpred.electronics.resonance import find_sigma_r

__all__ = ["GroupVector", "group_vector"]


class GroupVector(NamedTuple):
    """Constants of one group; nan where one is not defined."""

    chi_attached: float
    """Pauling's value of the attached atom."""
    chi_hybrid: float
    """Orbital value of the attached atom by its hybridisation (Hinze and Jaffé), Pauling units."""
    chi_group: float
    """Attached-atom-weighted valence value of the group, Pauling units."""
    charge_attached: float
    """Charge of the attached atom on a methyl carbon (partial equalisation), units of the elementary charge."""
    sigma_i: float
    """Inductive constant sigma_I: median of the published values, or by the topological model."""
    sigma_star: float
    """Taft's sigma*: median of the published values, or by the topological model."""
    sigma_r: float
    """Resonance constant R: published, or by the additive model."""
    size: float
    """Heavy atoms."""


@lru_cache(maxsize=200_000)
def group_vector(canonical_group_smiles: str) -> GroupVector:
    """Return the constants of a group as the substituent model uses them.

    Parameters
    ----------
    canonical_group_smiles : str
        SMILES with one '*'; any way of writing it will do, but the canonical one is found fastest in the cache.

    Returns
    -------
    GroupVector
        Of '*=O' and its like sigma is the topological sum carried over, which no table can check. Charged groups have no
        sigma beyond the published ones, elements outside the tables no electronegativity: nan.

    Raises
    ------
    StructureError, NotApplicable
        If the text is no group with one '*' (see `parse_group`); never for a group that is.
    """
    group = parse_group(canonical_group_smiles)
    here = group.attached
    symbol, hybrid, oxo = group.symbols[here], group.hybrids[here], group.oxos[here]
    return GroupVector(
        find_pauling(symbol),
        compute_hinze_jaffe(symbol, hybrid, oxo),
        compute_attached_weighted(group),
        compute_partial_charges(group, on_carbon=True)[here],
        find_sigma_i(group),
        find_sigma_star(group),
        find_sigma_r(group) if group.attached_order == 1 else nan,
        float(group.n_heavy),
    )
