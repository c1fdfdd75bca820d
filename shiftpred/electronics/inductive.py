"""Inductive constants by the topological model: each atom acts by its kind, and falls off with the distance squared.

σ = σ0 + Σ σ_A / r², over all atoms of the group, hydrogens included. r is the distance from the site's carbon to the atom
in Å, along a planar zigzag of covalent radii and the angles of the hybridisation. σ_A, one number for each kind of atom,
is fitted to published constants (see `fitting`); a kind outside the fit takes Cherkasov and Galkin's form, a Δχ R².
"""

from __future__ import annotations

from functools import lru_cache
from math import cos, nan, pi, radians, sin

from shiftpred.electronics.atom_types import compute_atom_type
from shiftpred.electronics.group_graph import GroupGraph
from shiftpred.electronics.published import find_published_median
from shiftpred.electronics.sourced_tables import load_element_values, load_rows

__all__ = [
    "compute_atom_prior",
    "compute_distance",
    "compute_inverse_square_sums",
    "compute_topological",
    "find_sigma_i",
    "find_sigma_star",
]

_TURN = {"sp3": pi - radians(109.5), "sp2": pi - radians(120.0), "sp": 0.0, "s": 0.0}
_HYDROGEN = 2.20


def compute_distance(group: GroupGraph, path: tuple[int, ...]) -> float:
    """Return the distance in Å from the site's carbon to the last atom of a path of bonds, drawn as a planar zigzag."""
    radii = load_element_values("covalent_radius", "Pyykko 2009 (single bond)")
    x = y = heading = 0.0
    side, before = 1.0, radii["C"]
    for atom in path:
        here = radii.get(group.symbols[atom], nan)
        length = (before + here) / 100
        x += length * cos(heading)
        y += length * sin(heading)
        heading += side * _TURN[group.hybrids[atom]]
        side, before = -side, here
    return (x * x + y * y) ** 0.5


def compute_inverse_square_sums(group: GroupGraph) -> dict[tuple[str, str], float]:
    """Return (kind of atom, element) → Σ 1/r² in Å⁻², over all atoms of the group."""
    sums: dict[tuple[str, str], float] = {}
    for atom, path in enumerate(group.paths):
        key = compute_atom_type(group, atom), group.symbols[atom]
        sums[key] = sums.get(key, 0.0) + 1 / compute_distance(group, path) ** 2
    return sums


def compute_atom_prior(symbol: str) -> float:
    """Return Δχ R² against hydrogen (Pauling units · Å²); nan where a table lacks the element.

    References
    ----------
    Cherkasov, Galkin & Cherkasov, Russ. Chem. Rev. 1996, 65, 641, doi 10.1070/RC1996v065n08ABEH000227.
    """
    chi = load_element_values("electronegativity", "Pauling (Allred 1961)").get(symbol, nan)
    radius = load_element_values("covalent_radius", "Pyykko 2009 (single bond)").get(symbol, nan)
    return (chi - _HYDROGEN) * (radius / 100) ** 2


@lru_cache(maxsize=4)
def _parameters(quantity: str) -> dict[str, float]:
    return {r["kind"]: float(r["value"]) for r in load_rows("inductive_parameters") if r["quantity"] == quantity}


def compute_topological(group: GroupGraph, quantity: str) -> float:
    """Return an inductive constant by the topological model.

    Parameters
    ----------
    group : GroupGraph
        Uncharged, as a whole.
    quantity : {'sigma_I', 'sigma_star'}

    Returns
    -------
    float
        Dimensionless; nan for a charged group, a radical, a metal outside the fit, and for elements without radius or
        electronegativity.
    """
    parameters = _parameters(quantity)
    if group.charge or group.radicals or any(metal not in parameters for metal in group.metals):
        return nan
    total = parameters["constant"]
    for (kind, symbol), inverse in compute_inverse_square_sums(group).items():
        own = parameters.get(kind)
        total += inverse * (parameters["prior"] * compute_atom_prior(symbol) if own is None else own)
    return total


def _find(group: GroupGraph, quantity: str) -> float:
    published = find_published_median(group.smiles, quantity)
    if published is not None:
        return published
    return compute_topological(group, quantity)


def find_sigma_i(group: GroupGraph) -> float:
    """Return sigma_I: the median of what is published, else by the topological model; nan where not defined."""
    return _find(group, "sigma_I")


def find_sigma_star(group: GroupGraph) -> float:
    """Return Taft's sigma*: the median of what is published, else by the topological model; nan where not defined."""
    return _find(group, "sigma_star")
