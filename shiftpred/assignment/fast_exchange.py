"""Azoles whose N-H hops quickly between two nitrogens: carbons that the hop makes alike share one averaged shift."""

from __future__ import annotations

from rdkit import Chem

__all__ = ["find_exchanging_atoms"]


def find_exchanging_atoms(mol: Chem.Mol) -> tuple[tuple[int, ...], ...]:
    """Return sets of atoms that fast N-H exchange in an azole makes equivalent although the drawing does not.

    The drawing with a hydrogen on both nitrogens (the azolium ion) has the symmetry that the exchange averages to.

    Parameters
    ----------
    mol : rdkit.Chem.Mol

    Returns
    -------
    tuple of tuple of int
        0-based indices of heavy atoms; only sets that the exchange joins.

    Examples
    --------
    >>> from rdkit import Chem
    >>> find_exchanging_atoms(Chem.MolFromSmiles("c1c[nH]cn1"))
    ((0, 1),)
    """
    before = list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False))
    for ring in mol.GetRingInfo().AtomRings():
        if len(ring) != 5:
            continue
        nitrogens = [a for a in map(mol.GetAtomWithIdx, ring) if a.GetAtomicNum() == 7 and a.GetIsAromatic()]
        bearing = [a.GetIdx() for a in nitrogens if a.GetTotalNumHs() == 1 and a.GetDegree() == 2]
        free = [a.GetIdx() for a in nitrogens if a.GetTotalNumHs() == 0 and a.GetDegree() == 2]
        if len(bearing) != 1:
            continue
        for target in free:
            found = _compare(mol, before, bearing[0], target)
            if found:
                return found
    return ()


def _compare(mol, before, bearing, target):
    both = Chem.RWMol(mol)
    for index in (bearing, target):
        both.GetAtomWithIdx(index).SetFormalCharge(1)
    both.GetAtomWithIdx(target).SetNumExplicitHs(1)
    both.UpdatePropertyCache(strict=False)
    sets: dict[int, list[int]] = {}
    for index, rank in enumerate(Chem.CanonicalRankAtoms(both, breakTies=False, includeChirality=False)):
        if mol.GetAtomWithIdx(index).GetAtomicNum() == 6:
            sets.setdefault(rank, []).append(index)
    return tuple(tuple(s) for s in sets.values() if len({before[i] for i in s}) > 1)
