"""Which atoms of a molecule share a shift, and which CH2 have two different hydrogens.

The criterion is the substitution test: put a label on one atom or on the other; the products are the same (homotopic), mirror
images (enantiotopic) or diastereomers (diastereotopic). It is the same to ask whether a rotation or a reflection of the molecule
carries the one onto the other, which `shiftpred.structures.symmetry` answers exactly for tetrahedral centres, double bonds,
cumulenes and slow C-N bonds. Not seen: hindered rotation about other single bonds (biaryls), helices, and the handedness of
metal complexes.

References
----------
Mislow, K.; Raban, M. Stereoisomeric relationships of groups in molecules. Topics in Stereochemistry 1967, 1, 1-38.
https://doi.org/10.1002/9780470147108.ch1
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from rdkit import Chem

from shiftpred.structures.atom_table import AtomTable, build_atom_table, find_rings
from shiftpred.structures.stereo_elements import StereoElements, find_stereo_elements, follow_cumulene, holds_nitrogen_planar
from shiftpred.structures.symmetry import SymmetrySearch

__all__ = ["Equivalence", "compute_equivalence"]

_SINGLE = Chem.BondType.SINGLE


@dataclass(frozen=True)
class Equivalence:
    """Which atoms of a molecule share a shift."""

    group: np.ndarray
    """(n_atoms,) int, number of the set of homotopic and enantiotopic atoms."""
    constitutional: np.ndarray
    """(n_atoms,) int, canonical rank without stereo: atoms that bonds alone do not tell apart."""
    geminal_differ: np.ndarray
    """(n_atoms,) bool: the atom's two hydrogens are diastereotopic."""


def compute_equivalence(mol: Chem.Mol, table: AtomTable | None = None, deuterium: tuple[int, ...] = ()) -> Equivalence:
    """Apply the substitution test to all atoms and to the hydrogens of all CH2.

    Parameters
    ----------
    mol : rdkit Mol
        Standardised; one or several components, each of which is turned and reflected on its own.
    table : AtomTable, optional
        Of the same molecule, where it is at hand.
    deuterium : tuple of int, optional
        (n_atoms,) deuterium atoms on each atom; they tell atoms apart (the two carbons of CH3-S(O)-CD3).

    Returns
    -------
    Equivalence

    Notes
    -----
    A centre without drawn configuration counts as a centre. Atoms that are exchanged with it are called equivalent if they are
    so in one of the stereoisomers; hydrogens of a CH2 are called different if they are so in one of them. Two stated choices
    on the time scale at room temperature: the two groups on nitrogen of an amide, thioamide, nitrosamine or open-chain carbamate
    differ, those of a urea, sulfonamide or Boc-piperidine do not (counted on measured spectra, see `stereo_elements`); the two
    hydrogens of a primary amide differ, those of a urea or carbamate do not.

    Examples
    --------
    >>> from rdkit import Chem
    >>> found = compute_equivalence(Chem.MolFromSmiles("CC(C)C(N)C(=O)O"))
    >>> bool(found.constitutional[0] == found.constitutional[2]), bool(found.group[0] == found.group[2])
    (True, False)
    """
    table = table or build_atom_table(mol)
    rank = _compute_constitutional_rank(mol, table, deuterium)
    find_rings(mol)
    elements = find_stereo_elements(table, rank)
    constitutional = np.array(rank, dtype=np.int64)
    if not _leaves_choices(elements, rank):
        found = _Groups(table, rank, elements)
        return Equivalence(np.array(found.group, dtype=np.int64), constitutional, np.array(found.differ, dtype=bool))
    # What is not drawn is settled on the way; in canonical order, so that the answer does not depend on that of the atoms.
    place = np.array(list(Chem.CanonicalRankAtoms(mol)))
    order = np.argsort(place)
    table, rank = build_atom_table(Chem.RenumberAtoms(mol, order.tolist())), constitutional[order].tolist()
    found = _Groups(table, rank, find_stereo_elements(table, rank))
    group, differ = np.array(found.group, dtype=np.int64), np.array(found.differ, dtype=bool)
    return Equivalence(group[place], constitutional, differ[place])


def _leaves_choices(elements: StereoElements, rank: list[int]) -> bool:
    """Say whether elements without drawn configuration could be exchanged with one another."""
    open_ranks = [rank[i] for i, drawn in elements.tetrahedral.items() if not drawn]
    open_ends = [frozenset(rank[k] for k in element.ends) for element in elements.planar if not element.drawn]
    return len(set(open_ranks)) < len(open_ranks) or len(set(open_ends)) < len(open_ends)


def _compute_constitutional_rank(mol, table, deuterium=()) -> list[int]:
    """Rank atoms without stereo; resonance forms (carboxylate, imidazolium, nitro) do not tell atoms apart.

    Two placements of the same double bonds and charges on one skeleton with the same hydrogens are resonance forms, so
    where there are charges the skeleton alone is ranked.
    """
    charged = any(a.GetFormalCharge() for a in table.atoms)
    if not charged and not any(deuterium):
        return list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False, includeIsotopes=False))
    work = Chem.RWMol(mol)
    # Isotope numbers carry what ranking would not look at otherwise: hydrogens of the bare skeleton, and deuterium.
    for atom, hydrogens, heavy in zip(work.GetAtoms(), table.hydrogens, deuterium or [0] * len(table.hydrogens)):
        atom.SetIsotope(1 + hydrogens + 10 * heavy)
        if charged:
            atom.SetIsAromatic(False)
            atom.SetFormalCharge(0)
            atom.SetNoImplicit(True)
            atom.SetNumExplicitHs(0)
    if charged:
        for bond in work.GetBonds():
            bond.SetBondType(_SINGLE)
            bond.SetIsAromatic(False)
        work.UpdatePropertyCache(strict=False)
    return list(Chem.CanonicalRankAtoms(work, breakTies=False, includeChirality=False, includeIsotopes=True))


class _Groups:
    """Works out the groups and the differing hydrogens of one molecule."""

    def __init__(self, table: AtomTable, rank: list[int], elements: StereoElements):
        self.table, self.rank, self.elements = table, rank, elements
        self.search = SymmetrySearch(table, rank, elements)
        self.group = list(rank)
        self.differ = [False] * len(rank)
        members: dict[int, list[int]] = {}
        for i, r in enumerate(rank):
            members.setdefault(r, []).append(i)
        self.classes = members
        self.several = [m for m in members.values() if len(m) > 1]
        self._find_components()
        self.reflection = {c: self._find_reflection(c) for c in self.handed}
        if self.several and self._stereo_matters():
            self._split_classes()
        self._compare_hydrogens()

    def _find_components(self):
        """Note for each component which of its atoms carry handedness."""
        self.component = [0] * len(self.rank)
        for c, atoms in enumerate(Chem.GetMolFrags(self.table.mol)):
            if c:
                for i in atoms:
                    self.component[i] = c
        self.handed: dict[int, list[int]] = {}
        for i in self.elements.tetrahedral:
            self.handed.setdefault(self.component[i], []).append(i)
        for element in self.elements.planar:
            if element.handed:
                self.handed.setdefault(self.component[element.ends[0]], []).append(element.ends[0])

    def _find_reflection(self, component):
        """Return a reflection of the component, or None if it is chiral."""
        handed = self.handed[component]
        root = min(handed, key=lambda i: len(self.classes[self.rank[i]]))
        for image in sorted(self.classes[self.rank[root]], key=lambda i: i != root):
            if self.component[image] == component:
                found = self.search.find(((root, image),), -1)
                if found is not None:
                    return found
        return None

    def _stereo_matters(self):
        """Say whether any operation that the ranks allow could break a stereo element."""
        rank, classes = self.rank, self.classes
        elements = self.elements
        for i in elements.tetrahedral:
            if i not in elements.true_centres or len(classes[rank[i]]) > 1:
                return True
        for element in elements.planar:
            if any(len(x) == 2 and rank[x[0]] == rank[x[1]] for x in element.ligands):
                return True
            if any(len(classes[rank[end]]) > 1 for end in element.ends):
                return True
        return False

    def _split_classes(self):
        """Give diastereotopic atoms of one rank groups of their own."""
        leader = list(range(len(self.rank)))

        def lead(i):
            while leader[i] != i:
                i = leader[i]
            return i

        def join(operation):
            for u, v in operation.items():
                a, b = lead(u), lead(v)
                if a != b:
                    leader[max(a, b)] = min(a, b)

        for reflection in self.reflection.values():
            if reflection:
                join(reflection)
        for members in self.several:
            leads: list[int] = []
            for i in members:
                if any(lead(i) == lead(j) for j in leads):
                    continue
                for j in leads:
                    operation = self._find_operation(j, i)
                    if operation is not None:
                        join(operation)
                        break
                else:
                    leads.append(i)
        for i in (i for members in self.several for i in members):
            # The least of each rank keeps the rank's number, so that numbers stay unique.
            first = lead(i)
            self.group[i] = self.rank[i] if first == self.classes[self.rank[i]][0] else len(self.rank) + first

    def _find_operation(self, i, j):
        component = self.component[i]
        operation = self.search.find(((i, j),), 1)
        if operation is None and component in self.handed and (self.reflection[component] or self.component[j] != component):
            operation = self.search.find(((i, j),), -1)
        return operation

    def _compare_hydrogens(self):
        table = self.table
        known: dict[int, bool] = {}
        for i, hydrogens in enumerate(table.hydrogens):
            if hydrogens != 2:
                continue
            group = self.group[i]
            if group not in known:
                known[group] = self._hydrogens_differ(i)
            self.differ[i] = known[group]

    def _hydrogens_differ(self, i):
        table, rank = self.table, self.rank
        near = table.neighbours[i]
        if table.elements[i] == 7:
            return len(near) == 1 and table.degrees[i] == 3 and holds_nitrogen_planar(table, near[0], carbamates=False)
        if table.elements[i] not in (6, 14):
            return False
        if table.degrees[i] == 3 and 2.0 in table.orders[i]:
            return self._ends_differ(i, near)
        if table.degrees[i] != 4 or len(near) != 2:
            return False
        reflection = self.reflection.get(self.component[i])
        a, b = near
        if self.component[i] in self.handed:
            if rank[a] != rank[b]:
                if reflection is None:
                    return True
                return not self._is_reflected_in_place(i, near, reflection)
            if self._is_reflected_in_place(i, near, reflection):
                return False
            return self.search.find(((i, i), (a, b), (b, a)), 1, strict=True) is None
        return False

    def _is_reflected_in_place(self, i, near, reflection):
        """Say whether a reflection exchanges the two hydrogens and leaves the atom and its two neighbours where they are."""
        if reflection is None:
            return False
        if all(reflection.get(k, k) == k for k in (i, *near)) and not any(
            u != v and u in self.elements.open_centres for u, v in reflection.items()
        ):
            return True
        return self.search.find(((i, i), *((k, k) for k in near)), -1, strict=True) is not None

    def _ends_differ(self, i, near):
        """Say whether the hydrogens of a terminal =CH2 differ."""
        table, rank = self.table, self.rank
        if len(near) != 1:
            return False
        *between, end = follow_cumulene(table, i, near[0])
        before = between[-1] if between else i
        if table.aromatic[end] or table.elements[end] not in (6, 7):
            return False
        ligands = [k for k in table.neighbours[end] if k != before]
        chiral = self.component[i] in self.handed and self.reflection[self.component[i]] is None
        if len(between) % 2 == 1:
            # Allene: the two hydrogens lie above and below the plane of the other end.
            if self.component[i] not in self.handed or len(ligands) == 0:
                return False
            if len(ligands) == 2 and rank[ligands[0]] == rank[ligands[1]]:
                x, y = ligands
                if self.search.find(((i, i), (x, y), (y, x)), 1, strict=True) is not None:
                    return False
            return chiral or self.search.find(((i, i), *((k, k) for k in ligands)), -1, strict=True) is None
        if len(ligands) + table.hydrogens[end] < 2:
            return table.elements[end] == 7 and len(ligands) == 1  # C=N-X: bent at nitrogen
        if not ligands:
            return False  # ethylene: two hydrogens at either end
        if len(ligands) == 1 or rank[ligands[0]] != rank[ligands[1]]:
            return len(ligands) > 0
        x, y = ligands
        return not any(
            self.search.find(((i, i), (x, y), (y, x)), sign, strict=True) is not None for sign in ((1,) if chiral else (1, -1))
        )
