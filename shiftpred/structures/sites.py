"""Sites of a structure: which atoms are equivalent, which hydrogens differ, which may exchange.

The criterion is the substitution test (Mislow & Raban, Top. Stereochem. 1967, 1, 1): put a label on one atom or the other; the
products are the same (homotopic), mirror images (enantiotopic) or diastereomers (diastereotopic). Homotopic and enantiotopic
atoms share one shift.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from rdkit import Chem

from shiftpred.records import Site, Structure
from shiftpred.structures.environments import compute_site_environments

__all__ = ["Equivalence", "compute_equivalence", "compute_sites"]

_SP2, _SP3 = Chem.HybridizationType.SP2, Chem.HybridizationType.SP3
_LABILE = frozenset((7, 8, 15, 16, 34))
_DOUBLE = Chem.BondType.DOUBLE


@dataclass(frozen=True)
class Equivalence:
    """Which atoms of a molecule share a shift."""

    group: np.ndarray
    """(n_atoms,) number of the set of homotopic and enantiotopic atoms."""
    constitutional: np.ndarray
    """(n_atoms,) canonical rank without stereo."""
    geminal_differ: np.ndarray
    """(n_atoms,) bool: the atom's two hydrogens are diastereotopic."""


def compute_sites(structure: Structure) -> tuple[Site, ...]:
    """Return the site of every atom, in the order of `structure.mol`."""
    mol = structure.mol
    equivalence = compute_equivalence(mol)
    environments = compute_site_environments(mol)
    members: dict[int, list[int]] = {}
    alike: dict[int, list[int]] = {}
    for i, (g, c) in enumerate(zip(equivalence.group.tolist(), equivalence.constitutional.tolist())):
        members.setdefault(g, []).append(i)
        alike.setdefault(c, []).append(i)
    sites = []
    groups, ranks, differ = equivalence.group.tolist(), equivalence.constitutional.tolist(), equivalence.geminal_differ.tolist()
    for i in range(len(groups)):
        atom = mol.GetAtomWithIdx(i)
        own = tuple(members[groups[i]])
        total = atom.GetTotalNumHs()
        heavy = structure.deuterium[i] if structure.deuterium else 0
        same = alike[ranks[i]]
        others = tuple(j for j in same if j not in own) if len(same) > len(own) else ()
        sites.append(
            Site(
                i, structure.atom_numbers[i], atom.GetSymbol(), total - heavy, heavy, own, others,
                differ[i] and total - heavy == 2,
                atom.GetAtomicNum() in _LABILE and total > heavy, environments[i],
            )
        )
    return tuple(sites)


def compute_equivalence(mol: Chem.Mol) -> Equivalence:
    """Apply the substitution test to all atoms and to the hydrogens of all CH2.

    Stereocentres are found by their ligands' canonical ranks, so that a centre drawn without configuration counts as well; a
    molecule with drawn configuration is compared by canonical SMILES with its mirror image. Approximate: axial chirality and
    helices are not seen.
    """
    n = mol.GetNumAtoms()
    rank = np.array(list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False, includeIsotopes=False)), dtype=np.int64)
    group, differ = rank.copy(), np.zeros(n, dtype=bool)
    atoms = [mol.GetAtomWithIdx(i) for i in range(n)]
    neighbours: list[list[int]] = [[] for _ in range(n)]
    for k in range(mol.GetNumBonds()):
        bond = mol.GetBondWithIdx(k)
        a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        neighbours[a].append(b)
        neighbours[b].append(a)
    hydrogens = [a.GetTotalNumHs() for a in atoms]
    test = _LabelTest(mol, atoms, rank, neighbours, hydrogens)
    for i, atom in enumerate(atoms):
        if hydrogens[i] == 2:
            differ[i] = _hydrogens_differ(atom, i, atoms, neighbours, rank, test)
    if len(np.unique(rank)) < n:
        _split_groups(mol, atoms, neighbours, rank, group, test)
    return Equivalence(group, rank, differ)


class _LabelTest:
    """Finds the stereocentres that a molecule has, or gets once one of its atoms is labelled."""

    def __init__(self, mol, atoms, rank, neighbours, hydrogens):
        self.mol, self.rank, self.neighbours, self.hydrogens = mol, rank, neighbours, hydrogens
        self.candidates = [
            i for i, a in enumerate(atoms)
            if len(neighbours[i]) + hydrogens[i] == 4 and hydrogens[i] < 2 and a.GetHybridization() == _SP3
            or (a.GetAtomicNum() in (15, 16) and len(neighbours[i]) == 3 and hydrogens[i] == 0 and a.GetHybridization() == _SP3
                and not a.GetIsAromatic())
        ]
        self.centres = {i for i in self.candidates if len({rank[j] for j in neighbours[i]}) == len(neighbours[i])}
        # Atoms with exactly one pair of equal ligands become centres when a label tells the pair apart.
        self.latent = [i for i in self.candidates if len({rank[j] for j in neighbours[i]}) == len(neighbours[i]) - 1]

    def has_other_centre(self, labelled: int, besides: int, arms=None, distance=None) -> bool:
        """Say whether there is a stereocentre other than `besides` once the atom `labelled` carries a label.

        With `arms` (two ligands of `besides`), centres that owe their being to the label and lie between the arms do not
        count: the mirror that exchanges the arms leaves them as they are (C-4 for the arms of C-1 in a cyclohexane).
        """
        if self.centres - {besides}:
            return True
        latent = [i for i in self.latent if i != besides and not (arms and self._lies_between(i, arms, distance))]
        if not latent:
            return False
        atom = self.mol.GetAtomWithIdx(labelled)
        atom.SetIsotope(200)
        new = list(Chem.CanonicalRankAtoms(self.mol, breakTies=False, includeChirality=False))
        atom.SetIsotope(0)
        return any(len({new[j] for j in self.neighbours[i]}) == len(self.neighbours[i]) for i in latent)

    def _lies_between(self, centre, arms, distance):
        ranks = [self.rank[j] for j in self.neighbours[centre]]
        x, y = (j for j in self.neighbours[centre] if ranks.count(self.rank[j]) == 2)
        nearer = [distance[k, arms[0]] - distance[k, arms[1]] for k in (x, y)]
        return nearer[0] * nearer[1] < 0


def _hydrogens_differ(atom, i, atoms, neighbours, rank, test):
    if atom.GetAtomicNum() == 7:
        return len(neighbours[i]) == 1 and _is_acyl(atoms[neighbours[i][0]])
    if atom.GetAtomicNum() != 6:
        return False
    if atom.GetHybridization() == _SP2:
        other = next((b.GetOtherAtom(atom) for b in atom.GetBonds() if b.GetBondType() == _DOUBLE), None)
        return other is not None and _ends_differ(other, i, rank)
    if atom.GetHybridization() != _SP3 or len(neighbours[i]) != 2:
        return False
    a, b = neighbours[i]
    if rank[a] != rank[b]:
        return test.has_other_centre(i, i)
    # Equal neighbours: the hydrogens differ only where a ring has an upper and a lower face (C-4 of methylcyclohexane), or
    # where the neighbours carry configurations of their own (left to those: meso and racemic are not told apart here).
    if test.centres:
        return True
    ring = atom.GetOwningMol().GetRingInfo()
    for members in ring.AtomRings():
        if i in members and any(
            j != i and j in test.candidates and len({rank[k] for k in neighbours[j] if k not in members}) + test.hydrogens[j] == 2
            for j in members
        ):
            return True
    return False


def _ends_differ(atom, besides, rank):
    """Say whether the two substituents at the other end of a double bond differ (a lone pair counts as one)."""
    others = [x.GetIdx() for x in atom.GetNeighbors() if x.GetIdx() != besides]
    if atom.GetHybridization() != _SP2 or atom.GetIsAromatic():
        return False
    ligands = [rank[j] for j in others] + [-1] * atom.GetTotalNumHs()
    if atom.GetAtomicNum() == 7 and len(ligands) == 1:
        ligands.append(-2)
    return len(ligands) == 2 and ligands[0] != ligands[1]


def _is_acyl(atom):
    """Say whether an atom holds its nitrogen planar: C=O, C=S, N=O."""
    return atom.GetAtomicNum() in (6, 7) and any(
        b.GetBondType() == _DOUBLE and b.GetOtherAtom(atom).GetAtomicNum() in (8, 16) for b in atom.GetBonds()
    )


def _split_groups(mol, atoms, neighbours, rank, group, test):
    """Give diastereotopic atoms groups of their own."""
    sets: dict[int, list[int]] = {}
    for i, r in enumerate(rank.tolist()):
        sets.setdefault(r, []).append(i)
    sets = {r: m for r, m in sets.items() if len(m) > 1}
    bonds = (mol.GetBondWithIdx(k) for k in range(mol.GetNumBonds()))
    drawn = any(a.GetChiralTag() for a in atoms) or any(b.GetStereo() > Chem.BondStereo.STEREOANY for b in bonds)
    fresh = len(atoms)
    distance = Chem.GetDistanceMatrix(mol)
    for members in sets.values():
        labels = _compute_labels(mol, members) if drawn else None
        classes: list[list[int]] = []
        for i in members:
            for c in classes:
                j = c[0]
                same = labels is None or labels[i] == labels[j]
                if same and not _parted(i, j, atoms, neighbours, rank, distance, test):
                    c.append(i)
                    break
            else:
                classes.append([i])
        for c in classes[1:]:
            group[c] = fresh
            fresh += 1


def _compute_labels(mol, members):
    """Return for each atom the canonical SMILES of the molecule with a label on it, the lesser of itself and its mirror image."""
    work = Chem.RWMol(mol)
    mirror = Chem.RWMol(mol)
    for atom in mirror.GetAtoms():
        atom.InvertChirality()
    out = {}
    for i in members:
        texts = []
        for m in (work, mirror):
            m.GetAtomWithIdx(i).SetIsotope(200)
            texts.append(Chem.MolToSmiles(m))
            m.GetAtomWithIdx(i).SetIsotope(0)
        out[i] = min(texts)
    return out


def _parted(i, j, atoms, neighbours, rank, distance, test):
    """Say whether two constitutionally equal atoms sit on arms that part at one atom where the arms are diastereotopic."""
    d = distance[i, j]
    if d % 2 or d > 60:
        return False
    middle = [p for p in np.flatnonzero((distance[i] == d / 2) & (distance[j] == d / 2))]
    if len(middle) != 1:
        return False
    p = int(middle[0])
    atom = atoms[p]
    arms = [k for k in neighbours[p] if distance[i, k] == d / 2 - 1 or distance[j, k] == d / 2 - 1]
    if len(arms) != 2 or rank[arms[0]] != rank[arms[1]]:
        return False
    if atom.GetAtomicNum() == 7 and len(neighbours[p]) == 3:
        holder = [atoms[k] for k in neighbours[p] if k not in arms]
        return bool(holder) and _is_acyl(holder[0]) and not atom.IsInRing()
    if atom.GetHybridization() == _SP2 and not atom.GetIsAromatic():
        other = next((b.GetOtherAtom(atom) for b in atom.GetBonds() if b.GetBondType() == _DOUBLE), None)
        return other is not None and other.GetIdx() not in arms and _ends_differ(other, p, rank)
    rest = [rank[k] for k in neighbours[p] if k not in arms]
    if rank[arms[0]] in rest:
        return False  # three equal arms (tert-butyl): rotation makes them one
    hydrogens = test.hydrogens[p]
    if atom.GetHybridization() != _SP3 or len(rest) + hydrogens != 2 or hydrogens == 2:
        return False
    if hydrogens == 0 and rest[0] == rest[1]:
        return False
    return test.has_other_centre(i, p, arms, distance)
