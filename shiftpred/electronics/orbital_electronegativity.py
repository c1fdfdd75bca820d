"""How an atom's electronegativity changes with hybridisation and with charge."""

from __future__ import annotations

from functools import cache
from math import nan

from shiftpred.electronics.sourced_tables import load_element_values, load_gasteiger_marsili

__all__ = [
    "compute_charged_electronegativity",
    "compute_hinze_jaffe",
    "compute_mullay",
    "find_orbital_parameters",
]

_NEIGHBOUR = {"Se": "S", "Te": "S", "As": "P", "Sb": "P", "Ge": "Si", "Sn": "Si", "Pb": "Si", "Al": "B"}
"""Heavier element → the element of its group that has parameters of its own."""

_SCALE, _OFFSET = 0.336, 0.615
"""Hinze & Jaffé's line from eV to Pauling units: 0.336 (χ − 0.615)."""


@cache
def find_orbital_parameters(symbol: str, hybrid: str, oxo: int = 0) -> tuple[float, float, float] | None:
    """Return a, b, c of χ(Q) = a + bQ + cQ² for an orbital.

    An element without published parameters takes those of its lighter relative, times the ratio of their Mulliken
    electronegativities; an element without a relative has none.

    Parameters
    ----------
    symbol : str
    hybrid : {'s', 'sp3', 'sp2', 'sp'}
    oxo : int, default 0
        Doubly bonded oxygens on the atom (tells sulfides, sulfoxides and sulfones apart).

    Returns
    -------
    (float, float, float) or None
        In eV, eV/e and eV/e².

    References
    ----------
    Gasteiger & Marsili, Tetrahedron 1980, 36, 3219, doi 10.1016/0040-4020(80)80168-2.
    """
    table = load_gasteiger_marsili()
    for key in ((symbol, hybrid, min(oxo, 2)), (symbol, hybrid, 0), (symbol, "sp3", 0), (symbol, "s", 0)):
        if key in table:
            return table[key]
    lighter = _NEIGHBOUR.get(symbol)
    energies, affinities = load_element_values("ionisation_energy_1", "NIST ASD"), _affinities()
    if lighter is None or symbol not in energies or symbol not in affinities:
        return None
    ratio = (energies[symbol] + affinities[symbol]) / (energies[lighter] + affinities[lighter])
    a, b, c = find_orbital_parameters(lighter, hybrid, oxo)
    return a * ratio, b * ratio, c * ratio


def _affinities() -> dict[str, float]:
    return load_element_values("electron_affinity", "evaluated")


def compute_charged_electronegativity(symbol: str, hybrid: str, charge: float, oxo: int = 0) -> float:
    """Return χ(Q) = a + bQ + cQ² in eV; nan where the orbital has no parameters.

    Parameters
    ----------
    symbol, hybrid, oxo
        As in `find_orbital_parameters`.
    charge : float
        Partial charge in units of the elementary charge; the form holds from -1 to +1.

    Returns
    -------
    float
    """
    parameters = find_orbital_parameters(symbol, hybrid, oxo)
    if parameters is None:
        return nan
    a, b, c = parameters
    return a + b * charge + c * charge * charge


def compute_hinze_jaffe(symbol: str, hybrid: str, oxo: int = 0) -> float:
    """Return the orbital electronegativity of a neutral atom in Pauling units: sp > sp2 > sp3.

    Parameters
    ----------
    symbol, hybrid, oxo
        As in `find_orbital_parameters`.

    Returns
    -------
    float
        0.336 (a − 0.615) with a in eV; nan where the orbital has no parameters.

    References
    ----------
    Hinze & Jaffé, J. Am. Chem. Soc. 1962, 84, 540, doi 10.1021/ja00863a008.
    """
    parameters = find_orbital_parameters(symbol, hybrid, oxo)
    return nan if parameters is None else _SCALE * (parameters[0] - _OFFSET)


def compute_mullay(neutral: float, charge: float) -> float:
    """Return an electronegativity at a partial charge, χ(δ) = χ(0) (1 + 1.5 δ).

    Parameters
    ----------
    neutral : float
        Of the neutral atom or orbital, in any unit.
    charge : float
        In units of the elementary charge.

    Returns
    -------
    float
        In the unit of `neutral`.

    References
    ----------
    Mullay, J. Am. Chem. Soc. 1984, 106, 5842 and 1985, 107, 7271 (the factor 1.5 from memory).
    """
    return neutral * (1 + 1.5 * charge)
