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
    "compute_distances",
    "compute_inverse_square_sums",
    "compute_topological",
    "find_sigma_i",
    "find_sigma_star",
]

_TURN = {"sp3": pi - radians(109.5), "sp2": pi - radians(120.0), "sp": 0.0, "s": 0.0}
_HYDROGEN = 2.20


def compute_distances(group: GroupGraph) -> tuple[float, ...]:
    """Return each atom's distance in Å from the site's carbon, its path of bonds drawn as a planar zigzag.

    Parameters
    ----------
    group : GroupGraph

    Returns
    -------
    tuple of float
        (n_atoms,); nan behind an element without covalent radius.
    """
    radii = load_element_values("covalent_radius", "Pyykko 2009 (single bond)")
    # Where the pen stands on each atom, where it points, which way it turns next: shared by all paths that go on from there.
    start = (0.0, 0.0, 0.0, 1.0, radii["C"])
    pens: dict[int, tuple[float, float, float, float, float]] = {}
    depths, paths = group.depths, group.paths
    for atom in sorted(range(len(depths)), key=depths.__getitem__):
        x, y, heading, side, before = pens[paths[atom][-2]] if depths[atom] else start
        here = radii.get(group.symbols[atom], nan)
        length = (before + here) / 100
        x += length * cos(heading)
        y += length * sin(heading)
        pens[atom] = x, y, heading + side * _TURN[group.hybrids[atom]], -side, here
    return tuple((pens[atom][0] ** 2 + pens[atom][1] ** 2) ** 0.5 for atom in range(len(depths)))


@lru_cache(maxsize=16)  # The constants of one group are asked for one after the other.
def compute_inverse_square_sums(group: GroupGraph) -> dict[tuple[str, str], float]:
    """Return (kind of atom, element) → Σ 1/r² in Å⁻², over all atoms of the group."""
    sums: dict[tuple[str, str], float] = {}
    for atom, distance in enumerate(compute_distances(group)):
        key = compute_atom_type(group, atom), group.symbols[atom]
        sums[key] = sums.get(key, 0.0) + 1 / distance**2
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
