"""Elements, hydrogens and neighbours of a molecule as plain lists: read from RDKit once, used by sites and environments."""

from __future__ import annotations

import numpy as np
from rdkit import Chem, rdBase

__all__ = ["AtomTable", "build_atom_table", "find_rings"]


class AtomTable:
    """What sites and environments ask of the atoms of one molecule.

    Attributes
    ----------
    atoms : list of rdkit Atom
        (n_atoms,)
    elements, hydrogens, degrees : list of int
        (n_atoms,) atomic number; attached hydrogens of any kind; heavy neighbours and hydrogens together.
    aromatic : list of bool
        (n_atoms,)
    neighbours : list of list of int
        (n_atoms,) indices of the bonded atoms.
    orders : list of list of float
        (n_atoms,) order of the bond to each of `neighbours` (1.5: aromatic; 0: none stated).
    """

    __slots__ = ("aromatic", "atoms", "degrees", "elements", "hydrogens", "mol", "neighbours", "orders")

    def __init__(self, mol: Chem.Mol):
        # Atoms by index and bonds by matrix: RDKit's iterators and enumerations cost several times as much.
        self.mol = mol
        n = mol.GetNumAtoms()
        self.atoms = atoms = [mol.GetAtomWithIdx(i) for i in range(n)]
        self.elements = [a.GetAtomicNum() for a in atoms]
        self.hydrogens = [a.GetTotalNumHs() for a in atoms]
        self.aromatic = [a.GetIsAromatic() for a in atoms]
        self.neighbours: list[list[int]] = [[] for _ in range(n)]
        self.orders: list[list[float]] = [[] for _ in range(n)]
        if mol.GetNumBonds():
            bonded = Chem.GetAdjacencyMatrix(mol)
            order = Chem.GetAdjacencyMatrix(mol, useBO=True)
            begin, end = np.nonzero(bonded)
            for i, j, k in zip(begin.tolist(), end.tolist(), order[begin, end].tolist()):
                self.neighbours[i].append(j)
                self.orders[i].append(k)
        self.degrees = [len(near) + h for near, h in zip(self.neighbours, self.hydrogens)]

    def find_double_bond_partner(self, i: int) -> int:
        """Return the atom at the other end of a double bond of atom `i`, -1 without one."""
        orders = self.orders[i]
        return self.neighbours[i][orders.index(2.0)] if 2.0 in orders else -1


def build_atom_table(mol: Chem.Mol) -> AtomTable:
    """Read the table of a sanitised molecule."""
    find_rings(mol)
    return AtomTable(mol)


def find_rings(mol: Chem.Mol) -> None:
    """Look for rings where RDKit has dropped them, as renumbering and ranking atoms sometimes does."""
    with rdBase.BlockLogs():
        try:
            mol.GetRingInfo().NumRings()
        except RuntimeError:
            Chem.GetSymmSSSR(mol)
