"""Write a group as canonical SMILES: the real one for people, and the model's short form of it from a group code."""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache

from rdkit import Chem, rdBase

__all__ = ["build_bare_molecule", "build_canonical_group", "build_group_smiles"]

_CACHE = 200_000


def build_bare_molecule(mol: Chem.Mol) -> Chem.Mol:
    """Return a copy without stereo, isotopes and atom numbers, which group SMILES leave out."""
    bare = Chem.Mol(mol)
    Chem.RemoveStereochemistry(bare)
    for atom in bare.GetAtoms():
        atom.SetIsotope(0)
        atom.SetAtomMapNum(0)
    return bare


def build_group_smiles(
    bare: Chem.Mol, parent: int, attached: int, atoms: Iterable[int], cuts: Iterable[tuple[int, int]] = ()
) -> str:
    """Write a group of a molecule as canonical SMILES.

    Parameters
    ----------
    bare : rdkit.Chem.Mol
        From `build_bare_molecule`.
    parent : int
        0-based index of the atom that the group hangs on; written as '*'.
    attached : int
        0-based index of the group's atom that is bonded to `parent`.
    atoms : iterable of int
        0-based indices of the group's atoms.
    cuts : iterable of (int, int), default ()
        Ring bonds that were cut: (atom inside, atom outside); the outer atom is written as '[1*]'.

    Returns
    -------
    str
        Without stereo. A group cut out of an aromatic ring keeps its lower-case atoms and cannot be sanitised.

    Examples
    --------
    >>> from rdkit import Chem
    >>> build_group_smiles(Chem.MolFromSmiles("CC(=O)OCC"), 4, 3, [0, 1, 2, 3])
    '*OC(C)=O'
    """
    inside = set(atoms)
    copy = Chem.RWMol(bare)
    _make_dummy(copy.GetAtomWithIdx(parent), 0)
    bonds = [copy.GetBondBetweenAtoms(parent, attached).GetIdx()]
    for a, b in cuts:
        _make_dummy(copy.GetAtomWithIdx(b), 1)
        bonds.append(copy.GetBondBetweenAtoms(a, b).GetIdx())
    for a in inside:
        for bond in copy.GetAtomWithIdx(a).GetBonds():
            b = bond.GetOtherAtomIdx(a)
            if a < b and b in inside:
                bonds.append(bond.GetIdx())
    whole = [*inside, parent, *{b for _, b in cuts}]
    return build_canonical_group(Chem.MolFragmentToSmiles(copy, atomsToUse=whole, bondsToUse=bonds))


def _make_dummy(atom: Chem.Atom, isotope: int) -> None:
    atom.SetAtomicNum(0)
    atom.SetIsotope(isotope)
    atom.SetFormalCharge(0)
    atom.SetNumRadicalElectrons(0)
    atom.SetNumExplicitHs(0)
    atom.SetNoImplicit(True)
    atom.SetIsAromatic(False)


@lru_cache(maxsize=_CACHE)
def build_canonical_group(smiles: str) -> str:
    """Bring a group SMILES into canonical form; one that cannot be sanitised keeps its aromatic atoms as they are."""
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        mol = Chem.MolFromSmiles(smiles, sanitize=False)
        mol.UpdatePropertyCache(strict=False)
        Chem.FastFindRings(mol)
    return Chem.MolToSmiles(mol)
