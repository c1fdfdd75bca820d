"""How likely a nucleus is to be missing from the list although it is in the tube, and why.

All chances are common practice, no source, except the base rate of 13C, which follows the open shift data (four lists in five
are complete).
"""

from __future__ import annotations

from rdkit import Chem

from shiftpred.records import Site

__all__ = ["EXCHANGING_SOLVENTS", "compute_carbon_chance", "compute_hydrogen_chance"]

EXCHANGING_SOLVENTS = frozenset({"CD3OD", "D2O"})
"""Their deuterium replaces labile hydrogens."""
_METALS = frozenset([3, 4, 11, 12, 13, 19, 20, *range(21, 33), *range(37, 51), *range(55, 84), *range(87, 104)])


def compute_carbon_chance(mol: Chem.Mol, site: Site) -> tuple[float, str]:
    """Return the chance that a carbon's line is missing, and why ('' for no special reason)."""
    atom = mol.GetAtomWithIdx(site.atom_index)
    neighbours = atom.GetNeighbors()
    numbers = [n.GetAtomicNum() for n in neighbours]
    if 5 in numbers:
        return 0.5, "on boron: broad, often not seen"
    fluorines = numbers.count(9)
    if fluorines >= 2:
        return (0.4 if fluorines == 3 else 0.2), "split by fluorine into a weak multiplet"
    if site.deuterium:
        return 0.35, "C-D carbon: a weak multiplet"
    if any(n in _METALS for n in numbers):
        return 0.2, "on a metal"
    if fluorines:
        return 0.10, "split by fluorine"
    if atom.GetIsAromatic() and _is_free_azole(mol, site.atom_index):
        return (0.10 if site.attached_h else 0.15), "azole with exchanging N-H: may be broad"
    if site.attached_h == 0:
        isolated = all(n.GetTotalNumHs() == 0 for n in neighbours)
        return (0.08, "quaternary, no hydrogen near: weak") if isolated else (0.05, "quaternary: weak")
    return 0.025, ""


def compute_hydrogen_chance(mol: Chem.Mol, site: Site, solvent: str | None) -> tuple[float, str]:
    """Return the chance that a hydrogen's line is missing, and why ('' for no special reason)."""
    if site.labile:
        if solvent in EXCHANGING_SOLVENTS:
            return 0.97, f"exchanges with {solvent}"
        return 0.5, "labile: broad, anywhere or absent"
    if solvent in EXCHANGING_SOLVENTS and site.element == "C" and _is_acidic(mol, site.atom_index):
        return 0.35, f"acidic C-H: may exchange with {solvent}"
    return 0.04, ""


def _is_free_azole(mol: Chem.Mol, index: int) -> bool:
    """True for a carbon in a five-membered aromatic ring with N-H and a second nitrogen."""
    for ring in mol.GetRingInfo().AtomRings():
        if len(ring) == 5 and index in ring:
            nitrogens = [a for a in map(mol.GetAtomWithIdx, ring) if a.GetAtomicNum() == 7]
            if len(nitrogens) >= 2 and any(n.GetTotalNumHs() for n in nitrogens):
                return True
    return False


def _is_acidic(mol: Chem.Mol, index: int) -> bool:
    """True for a C-H beside a ketone or aldehyde, or between two acceptors (C=O, C#N, NO2)."""
    atom = mol.GetAtomWithIdx(index)
    if atom.GetIsAromatic() or atom.GetHybridization() != Chem.HybridizationType.SP3:
        return False
    acceptors = 0
    for neighbour in atom.GetNeighbors():
        multiple = [b for b in neighbour.GetBonds() if b.GetBondTypeAsDouble() >= 2]
        if any(b.GetOtherAtom(neighbour).GetAtomicNum() in (7, 8) for b in multiple):
            others = [n.GetAtomicNum() for n in neighbour.GetNeighbors() if n.GetIdx() != index]
            ketone = neighbour.GetAtomicNum() == 6 and others.count(8) == 1 and 7 not in others
            acceptors += 2 if ketone else 1
    return acceptors >= 2
