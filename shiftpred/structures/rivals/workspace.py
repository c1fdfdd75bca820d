"""The proposal as the moves see it: canonical atom order, look-up lists, and candidates that are not built yet."""

from __future__ import annotations

from collections.abc import Callable, Hashable
from dataclasses import dataclass
from functools import cached_property

from rdkit import Chem
from rdkit.Chem import rdmolops

from shiftpred.structures.rivals.group_names import compute_group_name


@dataclass(frozen=True)
class Candidate:
    """A rival that a move proposes; nothing is built before it is known to be wanted."""

    edit: Callable[[Chem.RWMol], Chem.Mol | None]
    """Edits the copy in place (and returns None) or returns another molecule; not sanitised."""
    how: Callable[[], str]
    """Plain words, made only for those that are kept."""
    key: Hashable = None
    """Candidates of one move with the same key are the same by symmetry. None: no such knowledge."""
    penalty: float = 0.0
    """Added to the weight of the move."""


class Workspace:
    """Look-up lists over one connected molecule.

    Parameters
    ----------
    smiles : str
        Canonical SMILES; its atom order is the order of every list here, so that the order of the user's atoms is gone.

    Attributes
    ----------
    mol : rdkit.Chem.Mol
        Hydrogens implicit also where the SMILES had brackets, so that an edit may change their number.
    element, degree, hydrogens, charge, ring_degree : list of int
        Atomic number, heavy neighbours, hydrogens, formal charge, ring bonds; one entry an atom.
    aromatic : list of bool
    neighbours : list of tuple of int
    ring_neighbours : list of tuple of int
        Neighbours through ring bonds.
    """

    def __init__(self, smiles: str):
        mol = Chem.MolFromSmiles(smiles)
        _release_hydrogens(mol)
        _anchor_double_bonds(mol)
        self.mol = mol
        atoms = list(mol.GetAtoms())
        self.element = [atom.GetAtomicNum() for atom in atoms]
        self.degree = [atom.GetDegree() for atom in atoms]
        self.hydrogens = [atom.GetTotalNumHs() for atom in atoms]
        self.charge = [atom.GetFormalCharge() for atom in atoms]
        self.aromatic = [atom.GetIsAromatic() for atom in atoms]
        self.has_stereo = any(atom.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED for atom in atoms) or any(
            bond.GetStereo() != Chem.BondStereo.STEREONONE for bond in mol.GetBonds()
        )
        near: list[list[int]] = [[] for _ in atoms]
        ring_near: list[list[int]] = [[] for _ in atoms]
        self._bond_type: dict[tuple[int, int], Chem.BondType] = {}
        for bond in mol.GetBonds():
            begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
            self._bond_type[begin, end] = self._bond_type[end, begin] = bond.GetBondType()
            near[begin].append(end)
            near[end].append(begin)
            if bond.IsInRing():
                ring_near[begin].append(end)
                ring_near[end].append(begin)
        self.neighbours = [tuple(sorted(group)) for group in near]
        self.ring_neighbours = [tuple(sorted(group)) for group in ring_near]
        self.ring_degree = [len(group) for group in ring_near]
        self._sides: dict[tuple[int, int], frozenset[int]] = {}

    @property
    def n_atoms(self) -> int:
        return len(self.element)

    @cached_property
    def ranks(self) -> list[int]:
        """Symmetry class of each atom."""
        return list(Chem.CanonicalRankAtoms(self.mol, breakTies=False))

    @cached_property
    def distance(self) -> list[list[int]]:
        """Bonds between each two atoms."""
        return [[int(value) for value in row] for row in rdmolops.GetDistanceMatrix(self.mol)]

    @cached_property
    def rings(self) -> list[tuple[int, ...]]:
        """Smallest rings, in order of their atoms."""
        return sorted(tuple(ring) for ring in self.mol.GetRingInfo().AtomRings())

    @cached_property
    def aromatic_systems(self) -> list[tuple[int, ...]]:
        """Aromatic rings, those that share a bond joined."""
        systems: list[set[int]] = []
        for ring in self.rings:
            if all(self.aromatic[index] for index in ring):
                atoms = set(ring)
                apart = []
                for system in systems:
                    if len(system & atoms) >= 2:
                        atoms |= system
                    else:
                        apart.append(system)
                systems = [*apart, atoms]
        return sorted(tuple(sorted(system)) for system in systems)

    def bond_type(self, first: int, second: int) -> Chem.BondType | None:
        """Return the type of a bond; None where there is none."""
        return self._bond_type.get((first, second))

    def is_bridge(self, first: int, second: int) -> bool:
        """Tell whether the two atoms are joined by a single bond outside all rings."""
        return self._bond_type.get((first, second)) == Chem.BondType.SINGLE and second not in self.ring_neighbours[first]

    def exocyclic(self, index: int) -> list[int]:
        """Return the neighbours that are not reached through a ring bond."""
        ring = self.ring_neighbours[index]
        return [other for other in self.neighbours[index] if other not in ring]

    def is_sp3_carbon(self, index: int) -> bool:
        """Tell whether the atom is a neutral carbon with four single bonds."""
        return (
            self.element[index] == 6
            and not self.aromatic[index]
            and self.charge[index] == 0
            and self.degree[index] + self.hydrogens[index] == 4
        )

    def side(self, cut: int, first: int) -> frozenset[int]:
        """Return all atoms on the side of `first` once its bond with `cut` is gone."""
        known = self._sides.get((cut, first))
        if known is None:
            seen, waiting = {cut, first}, [first]
            while waiting:
                for other in self.neighbours[waiting.pop()]:
                    if other not in seen:
                        seen.add(other)
                        waiting.append(other)
            seen.discard(cut)
            known = self._sides[cut, first] = frozenset(seen)
        return known

    def same_ring(self, first: int, second: int) -> bool:
        """Tell whether two atoms share one of the smallest rings."""
        return any(first in ring and second in ring for ring in self.rings)

    def group_name(self, cut: int, first: int) -> str:
        """Name the group that starts with atom `first` and hangs on atom `cut`."""
        return compute_group_name(self.mol, cut, first)

    def element_word(self, index: int) -> str:
        """'nitrogen', 'oxygen', … for a sentence."""
        number = self.element[index]
        return {6: "carbon", 7: "nitrogen", 8: "oxygen", 16: "sulfur", 15: "phosphorus", 34: "selenium"}.get(
            number, Chem.GetPeriodicTable().GetElementSymbol(number)
        )


def _release_hydrogens(mol: Chem.Mol) -> None:
    """Make bracket hydrogens implicit where valence alone gives the same number; aromatic N-H keeps its own."""
    for atom in mol.GetAtoms():
        if atom.GetNoImplicit() and not atom.GetIsAromatic() and atom.GetNumRadicalElectrons() == 0:
            hydrogens = atom.GetNumExplicitHs()
            atom.SetNoImplicit(False)
            atom.SetNumExplicitHs(0)
            atom.UpdatePropertyCache(False)
            if atom.GetTotalNumHs() != hydrogens:
                atom.SetNumExplicitHs(hydrogens)
                atom.SetNoImplicit(True)
                atom.UpdatePropertyCache(False)


def _anchor_double_bonds(mol: Chem.Mol) -> None:
    """Write E/Z as cis/trans of stated neighbours, which an edit elsewhere cannot turn over."""
    for bond in mol.GetBonds():
        if bond.GetStereo() in (Chem.BondStereo.STEREOE, Chem.BondStereo.STEREOZ):
            trans = bond.GetStereo() == Chem.BondStereo.STEREOE
            bond.SetStereo(Chem.BondStereo.STEREOTRANS if trans else Chem.BondStereo.STEREOCIS)
        bond.SetBondDir(Chem.BondDir.NONE)
