"""Splitting of carbon lines by fluorine and phosphorus, which decoupling from hydrogen leaves in the spectrum."""

from __future__ import annotations

import math
from dataclasses import dataclass

from rdkit import Chem

__all__ = ["ExpectedCoupling", "compute_coupling_density", "compute_expected_couplings"]

FARTHEST_BONDS = 4

# (element, bonds, kind of carrier): typical |J| in Hz, spread in Hz, chance that the splitting is resolved.
# All from memory (textbook ranges); the spreads are wide enough to hold the common cases.
_TYPICAL = {
    ("F", 1, "sp2"): (248.0, 9.0, 0.95),
    ("F", 1, "sp3"): (168.0, 10.0, 0.95),
    ("F", 1, "CF2"): (242.0, 12.0, 0.95),
    ("F", 1, "CF3"): (275.0, 10.0, 0.90),
    ("F", 2, "sp2"): (21.5, 4.0, 0.95),
    ("F", 2, "sp3"): (20.0, 5.0, 0.90),
    ("F", 2, "CF2"): (25.0, 6.0, 0.85),
    ("F", 2, "CF3"): (33.0, 5.0, 0.85),
    ("F", 3, "sp2"): (8.0, 3.0, 0.85),
    ("F", 3, "sp3"): (6.0, 3.0, 0.70),
    ("F", 3, "CF2"): (5.0, 3.0, 0.60),
    ("F", 3, "CF3"): (3.6, 1.5, 0.60),
    ("F", 4, "sp2"): (3.0, 1.2, 0.50),
    ("F", 4, "sp3"): (1.5, 1.0, 0.10),
    ("F", 4, "CF2"): (1.5, 1.0, 0.10),
    ("F", 4, "CF3"): (1.5, 1.0, 0.10),
    ("P", 1, "P=O"): (140.0, 35.0, 0.95),
    ("P", 1, "P"): (15.0, 10.0, 0.80),
    ("P", 1, "P+"): (60.0, 25.0, 0.95),
    ("P", 2, "P=O"): (6.5, 3.0, 0.85),
    ("P", 2, "P"): (18.0, 6.0, 0.75),
    ("P", 2, "P+"): (8.0, 5.0, 0.80),
    ("P", 3, "P=O"): (7.0, 4.0, 0.75),
    ("P", 3, "P"): (7.0, 3.0, 0.70),
    ("P", 3, "P+"): (13.0, 5.0, 0.80),
    ("P", 4, "P=O"): (3.0, 1.2, 0.40),
    ("P", 4, "P"): (1.5, 1.0, 0.20),
    ("P", 4, "P+"): (3.0, 1.2, 0.50),
}
_ODD_CASE = 0.08
"""Share of couplings that lie anywhere up to 1.5 times the typical value or 300 Hz (common practice, no source)."""


@dataclass(frozen=True)
class ExpectedCoupling:
    """Coupling of one carbon with one set of equal fluorine or phosphorus nuclei."""

    element: str
    bonds: int
    nuclei: int
    """Number of equal nuclei: one splits into 2 lines, three into 4."""
    typical_hz: float
    spread_hz: float
    resolved: float
    """Chance that the splitting is seen."""


def compute_coupling_density(coupling: ExpectedCoupling, hertz: float) -> float:
    """Return the density per Hz of a splitting by `hertz`: a normal distribution and a low, broad remainder."""
    z = (hertz - coupling.typical_hz) / coupling.spread_hz
    narrow = math.exp(-0.5 * z * z) / (coupling.spread_hz * math.sqrt(2 * math.pi))
    widest = 1.5 * coupling.typical_hz + 10.0
    return (1 - _ODD_CASE) * narrow + (_ODD_CASE / widest if 0 < hertz < widest else 1e-9)


def compute_expected_couplings(mol: Chem.Mol) -> dict[int, tuple[ExpectedCoupling, ...]]:
    """Find the carbons up to four bonds from fluorine or phosphorus.

    Parameters
    ----------
    mol : rdkit.Chem.Mol

    Returns
    -------
    dict
        Atom index of a carbon → its couplings, the largest first; carbons without any are left out.
    """
    splitting = [a for a in mol.GetAtoms() if a.GetAtomicNum() in (9, 15)]
    if not splitting:
        return {}
    rank = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
    found: dict[int, dict[tuple, int]] = {}
    for atom in splitting:
        kind = _describe_carrier(atom)
        if kind is None:
            continue
        for index, bonds in _walk(atom).items():
            if mol.GetAtomWithIdx(index).GetAtomicNum() == 6:
                groups = found.setdefault(index, {})
                key = (atom.GetSymbol(), bonds, kind, rank[atom.GetIdx()])
                groups[key] = groups.get(key, 0) + 1
    out = {}
    for index, groups in found.items():
        couplings = [
            ExpectedCoupling(element, bonds, count, *_TYPICAL[element, bonds, kind])
            for (element, bonds, kind, _), count in groups.items()
        ]
        out[index] = tuple(sorted(couplings, key=lambda c: (-c.typical_hz, c.bonds, c.nuclei)))
    return out


def _walk(atom: Chem.Atom) -> dict[int, int]:
    """Return every atom up to `FARTHEST_BONDS` bonds away with the number of bonds."""
    reached, frontier = {atom.GetIdx(): 0}, [atom]
    for bonds in range(1, FARTHEST_BONDS + 1):
        following = []
        for each in frontier:
            for neighbour in each.GetNeighbors():
                if neighbour.GetIdx() not in reached:
                    reached[neighbour.GetIdx()] = bonds
                    following.append(neighbour)
        frontier = following
    del reached[atom.GetIdx()]
    return reached


def _describe_carrier(atom: Chem.Atom) -> str | None:
    if atom.GetAtomicNum() == 15:
        if atom.GetFormalCharge() > 0:
            return "P+"
        return "P=O" if atom.GetTotalValence() > 3 else "P"
    if atom.GetDegree() != 1:
        return None  # fluoride, or fluorine in an inorganic counter-ion's centre
    carrier = atom.GetNeighbors()[0]
    if carrier.GetAtomicNum() != 6:
        return None
    fluorines = sum(n.GetAtomicNum() == 9 for n in carrier.GetNeighbors())
    if fluorines >= 2:
        return "CF3" if fluorines >= 3 else "CF2"
    return "sp3" if carrier.GetHybridization() == Chem.HybridizationType.SP3 else "sp2"
