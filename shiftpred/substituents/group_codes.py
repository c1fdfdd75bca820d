"""Read every bond of a molecule, in both directions, as a short text: the group that hangs on it.

A group code is what a walker sees who steps over a bond and looks around without memory: level 0 only the bond and the
atom behind it, level 1 that atom's hydrogens and ring and its neighbours, and so on. Rings are thereby unrolled, which
makes a code a pure function of the graph: it does not depend on the numbering of the atoms, and two codes can be
compared as texts. All codes of a molecule are made in one sweep, a few microseconds a bond.

Grammar of a code: a bond (`-` single, `_` single in a ring, `=`, `#`, `:` aromatic, `~` any other), an atom (SMILES
symbol, lower case if aromatic, with charge), from level 1 on the number of hydrogens, `r` and the size of the smallest
ring (`r` alone above six), and in parentheses the codes of the further neighbours one level lower, sorted.
"""

from __future__ import annotations

from dataclasses import dataclass

from rdkit import Chem

__all__ = ["LEVELS", "GroupCodes", "compute_group_codes"]

LEVELS = 4
"""Levels 0 to 3: the attached atom alone; with its neighbours; out to gamma; out to delta."""

_BOND_MARK = {
    Chem.BondType.SINGLE: "-",
    Chem.BondType.DOUBLE: "=",
    Chem.BondType.TRIPLE: "#",
    Chem.BondType.AROMATIC: ":",
}
_HYBRID = {
    Chem.HybridizationType.SP3: "sp3",
    Chem.HybridizationType.SP2: "sp2",
    Chem.HybridizationType.SP: "sp",
    Chem.HybridizationType.S: "s",
}
_NO_RING = frozenset()
_RING_MARK = {0: "", 3: "r3", 4: "r4", 5: "r5", 6: "r6"}


@dataclass(frozen=True)
class GroupCodes:
    """The graph of one molecule as plain lists, and the code of every directed bond."""

    neighbours: tuple[tuple[int, ...], ...]
    """(n_atoms,) 0-based indices of the heavy atoms bonded to each atom; a hydrogen that is an atom of the graph (as in
    `[H]/N=C/C`) has none and is nobody's neighbour, but counts among the hydrogens of its atom."""
    atoms: tuple[str, ...]
    """(n_atoms,) symbol with charge, lower case if aromatic."""
    hydrogens: tuple[int, ...]
    """(n_atoms,) hydrogens on each atom, those that are atoms of the graph included."""
    hybrids: tuple[str, ...]
    """(n_atoms,) 'sp3', 'sp2', 'sp', 's' or 'other'."""
    rings: tuple[int, ...]
    """(n_atoms,) size of the smallest ring, 0 for none."""
    aromatic_rings: tuple[int, ...]
    """(n_atoms,) number of aromatic rings the atom belongs to (1 in benzene, 2 at a fusion)."""
    six_rings: tuple[frozenset[int], ...]
    """(n_atoms,) numbers of the six-membered aromatic rings the atom belongs to."""
    levels: tuple[tuple[dict[int, str], ...], ...]
    """`levels[k][u][v]` is the level-k code of the group at atom v as seen from its neighbour u."""

    @property
    def n_atoms(self) -> int:
        return len(self.atoms)


def compute_group_codes(mol: Chem.Mol) -> GroupCodes:
    """Code the group behind every bond of a molecule, in both directions.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised molecule, one or several components, hydrogens implicit.

    Returns
    -------
    GroupCodes
        Graph and codes; see the module text for the grammar.

    Examples
    --------
    >>> from rdkit import Chem
    >>> codes = compute_group_codes(Chem.MolFromSmiles("CC(=O)O"))
    >>> codes.levels[1][0][1]
    '-C0(-O)(=O)'
    """
    n_atoms = mol.GetNumAtoms()
    atoms, hydrogens, hybrids, aromatic = [], [], [], []
    for atom in mol.GetAtoms():
        symbol, charge = atom.GetSymbol(), atom.GetFormalCharge()
        is_aromatic = atom.GetIsAromatic()
        if is_aromatic:
            symbol = symbol.lower()
        if charge:
            symbol += ("+" if charge > 0 else "-") * abs(charge)
        atoms.append(symbol)
        aromatic.append(is_aromatic)
        hydrogens.append(atom.GetTotalNumHs(includeNeighbors=True))
        hybrids.append(_HYBRID.get(atom.GetHybridization(), "other"))
    rings, aromatic_rings = [0] * n_atoms, [0] * n_atoms
    info = mol.GetRingInfo()
    in_ring = set()
    six_rings = [_NO_RING] * n_atoms
    for number, (members, bonds) in enumerate(zip(info.AtomRings(), info.BondRings(), strict=True)):
        size = len(members)
        whole = all([aromatic[a] for a in members])
        for a in members:
            if not rings[a] or size < rings[a]:
                rings[a] = size
            if whole:
                aromatic_rings[a] += 1
                if size == 6:
                    six_rings[a] |= {number}
        in_ring.update(bonds)
    neighbours = [[] for _ in range(n_atoms)]
    marks = [{} for _ in range(n_atoms)]
    for bond in mol.GetBonds():
        a, b = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        if (atoms[a] == "H" or atoms[b] == "H") and atoms[a] != atoms[b]:
            continue
        mark = _BOND_MARK.get(bond.GetBondType(), "~")
        if mark == "-" and bond.GetIdx() in in_ring:
            mark = "_"
        neighbours[a].append(b)
        neighbours[b].append(a)
        marks[a][b] = marks[b][a] = mark
    levels = [tuple({v: mark + atoms[v] for v, mark in marks[u].items()} for u in range(n_atoms))]
    described = [f"{atoms[v]}{hydrogens[v]}{_RING_MARK.get(rings[v], 'r')}" for v in range(n_atoms)]
    for _ in range(1, LEVELS):
        lower = levels[-1]
        level = tuple({} for _ in range(n_atoms))
        for v in range(n_atoms):
            behind = lower[v]
            if len(behind) == 1:
                (u,) = behind
                level[u][v] = marks[u][v] + described[v]
                continue
            ordered = sorted(behind.items(), key=_second)
            for u in behind:
                inner = ")(".join([code for w, code in ordered if w != u])
                level[u][v] = f"{marks[u][v]}{described[v]}({inner})"
        levels.append(level)
    return GroupCodes(
        neighbours=tuple(map(tuple, neighbours)),
        atoms=tuple(atoms),
        hydrogens=tuple(hydrogens),
        hybrids=tuple(hybrids),
        rings=tuple(rings),
        aromatic_rings=tuple(aromatic_rings),
        six_rings=tuple(six_rings),
        levels=tuple(levels),
    )


def _second(pair):
    return pair[1]
