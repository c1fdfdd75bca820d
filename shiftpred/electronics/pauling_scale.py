"""Pauling's scale of the elements, computed from a table of bond energies."""

from __future__ import annotations

from functools import cache
from math import sqrt

import numpy as np

from shiftpred.electronics.sourced_tables import load_element_values, load_rows
from shiftpred.errors import NotApplicable, SettingError, quote

__all__ = ["compute_pauling_difference", "compute_pauling_differences", "compute_pauling_scale"]

_KJ_PER_EV = 96.485
_HYDROGEN = 2.20


def compute_pauling_difference(d_ab: float, d_aa: float, d_bb: float, mean: str = "arithmetic") -> float:
    """Return |χ_A − χ_B| on Pauling's scale from three bond energies.

    Parameters
    ----------
    d_ab, d_aa, d_bb : float
        Dissociation energies of A-B, A-A and B-B in eV.
    mean : {'arithmetic', 'geometric'}, default 'arithmetic'
        'arithmetic': √(D_AB − ½(D_AA + D_BB)); 'geometric': from D_AB = √(D_AA D_BB) + 1.3 Δχ².

    Returns
    -------
    float
        In Pauling units.

    Raises
    ------
    SettingError
        If an energy is not positive, or `mean` is another word.
    NotApplicable
        If the A-B bond is weaker than the mean, so that Pauling's extra ionic energy is negative.

    References
    ----------
    Pauling, J. Am. Chem. Soc. 1932, 54, 3570, doi 10.1021/ja01348a011.

    Examples
    --------
    >>> round(compute_pauling_difference(3.79, 4.52, 2.00), 2)
    0.73
    """
    for name, energy in (("d_ab", d_ab), ("d_aa", d_aa), ("d_bb", d_bb)):
        if not energy > 0:
            raise SettingError(f"argument '{name}'", quote(energy), "a bond energy above 0 in eV", "energies in eV, not kJ/mol")
    if mean not in ("arithmetic", "geometric"):
        raise SettingError("argument 'mean'", quote(mean), "'arithmetic' or 'geometric'", "mean='arithmetic'")
    extra = d_ab - (d_aa + d_bb) / 2 if mean == "arithmetic" else (d_ab - sqrt(d_aa * d_bb)) / 1.3
    if extra < 0:
        raise NotApplicable(
            "Pauling's difference",
            f"an A-B bond weaker than the {mean} mean of A-A and B-B",
            "an extra ionic energy of 0 or more",
            "the geometric mean, as for alkali hydrides" if mean == "arithmetic" else "another scale for this pair",
        )
    return sqrt(extra)


@cache
def _bond_energies() -> dict[tuple[str, str], float]:
    """(A, B) and (B, A) → eV."""
    energies = {}
    for row in load_rows("bond_energies"):
        a, b = row["element_a"], row["element_b"]
        energies[a, b] = energies[b, a] = float(row["value"]) / _KJ_PER_EV
    return energies


@cache
def compute_pauling_differences(mean: str = "arithmetic") -> dict[tuple[str, str], float]:
    """Return χ_B − χ_A of every bond in `tables/bond_energies.csv`.

    Parameters
    ----------
    mean : {'arithmetic', 'geometric'}, default 'arithmetic'
        See `compute_pauling_difference`.

    Returns
    -------
    dict of (str, str) to float
        (A, B) → difference in Pauling units, 0 or more. A bond energy cannot tell which end is the more electronegative;
        B is the one with the higher configuration energy (Allen). Bonds weaker than the mean (C-I, C-S, …) are absent.
    """
    if mean not in ("arithmetic", "geometric"):
        raise SettingError("argument 'mean'", quote(mean), "'arithmetic' or 'geometric'", "mean='arithmetic'")
    energies = _bond_energies()
    order = load_element_values("configuration_energy", "Allen")
    differences = {}
    for (a, b), energy in energies.items():
        if order[a] < order[b]:
            try:
                differences[a, b] = compute_pauling_difference(energy, energies[a, a], energies[b, b], mean)
            except NotApplicable:
                continue
    return differences


@cache
def compute_pauling_scale(mean: str = "arithmetic") -> dict[str, float]:
    """Return the electronegativities that meet all bond energies best, hydrogen being 2.20.

    Each bond gives one difference; the values are their least-squares solution, as Pauling's and Allred's are averages
    over the bonds of an element.

    Parameters
    ----------
    mean : {'arithmetic', 'geometric'}, default 'arithmetic'
        Mean of the A-A and B-B energies.

    Returns
    -------
    dict of str to float
        Symbol → value in Pauling units, for the elements of the table.

    Raises
    ------
    SettingError
        If `mean` is another word.

    References
    ----------
    Pauling, J. Am. Chem. Soc. 1932, 54, 3570, doi 10.1021/ja01348a011; Allred, J. Inorg. Nucl. Chem. 1961, 17, 215.

    Examples
    --------
    >>> scale = compute_pauling_scale()
    >>> scale["H"], round(scale["O"], 2), round(scale["F"], 2)
    (2.2, 3.53, 3.92)
    """
    differences = compute_pauling_differences(mean)
    symbols = sorted({symbol for bond in differences for symbol in bond} - {"H"})
    column = {symbol: k for k, symbol in enumerate(symbols)}
    sides, target = np.zeros((len(differences), len(symbols))), np.zeros(len(differences))
    for row, ((low, high), difference) in enumerate(differences.items()):
        target[row] = difference
        for symbol, sign in ((high, 1.0), (low, -1.0)):
            if symbol == "H":
                target[row] -= sign * _HYDROGEN
            else:
                sides[row, column[symbol]] = sign
    values = np.linalg.lstsq(sides, target, rcond=None)[0]
    return {"H": _HYDROGEN, **dict(zip(symbols, values.tolist(), strict=True))}
