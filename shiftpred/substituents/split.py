"""Cut a molecule at a site into its substituents and follow each to the beta and gamma positions."""

from __future__ import annotations

from dataclasses import dataclass

from rdkit import Chem

from shiftpred.errors import StructureError
from shiftpred.substituents.group_codes import GroupCodes, compute_group_codes
from shiftpred.substituents.group_smiles import build_bare_molecule, build_group_smiles
from shiftpred.substituents.names import name_group, name_ring_atom
from shiftpred.substituents.positions import Place, compute_places

__all__ = ["MOST_ATOMS", "Substituent", "compute_ranks_from", "split_molecule", "split_substituents"]

MOST_ATOMS = 300
"""Heavy atoms of the largest molecule that is taken."""


_LEVEL = {1: "alpha", 2: "beta", 3: "gamma"}


@dataclass(frozen=True)
class Substituent:
    """One group as seen from a site."""

    position: str
    """'alpha', 'beta' or 'gamma': the attached atom is one, two or three bonds from the site. 'delta' only for a
    substituent in para position, which is four bonds away."""
    group: str
    """Canonical SMILES without stereo; '*' is the atom it hangs on, '[1*]' the far end of a ring bond that was cut."""
    name: str
    """Plain name ('acetoxy', 'tert-butyl'); of a ring part the attached atom ('ring CH2'); else the SMILES."""
    atoms: tuple[int, ...]
    """0-based indices of all its heavy atoms, ascending. The alpha groups of a site share no atom and together hold
    every other atom of its component; so do the beta groups of an alpha group, its attached atom aside."""
    attached_atom: int
    """0-based index of the atom that is bonded towards the site."""
    bond_order: float
    """Order of that bond: 1, 2, 3 or 1.5 (aromatic); 0 for a dative or other bond."""
    path: tuple[int, ...]
    """0-based indices of the atoms from the site (first) to the attached atom (last)."""
    ring_position: str = ""
    """'ortho', 'meta' or 'para' for a substituent of the six-membered aromatic ring that the site belongs to, 'ipso'
    for one on the site itself; otherwise ''."""
    ring_cuts: tuple[tuple[int, int], ...] = ()
    """Ring bonds that were cut: (atom inside the group, atom outside), 0-based. Empty: nothing was cut."""


def split_substituents(mol: Chem.Mol, atom_index: int, codes: GroupCodes | None = None) -> tuple[Substituent, ...]:
    """Cut the bonds at a site and list the groups at alpha, beta and gamma (and para).

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised molecule of up to 300 heavy atoms, hydrogens implicit; other components are not touched.
    atom_index : int
        0-based index of the site.
    codes : GroupCodes or None, default None
        From `compute_group_codes(mol)`, if at hand.

    Returns
    -------
    tuple of Substituent
        All alpha groups, then beta, gamma and para ones; within a position in the order of group and attached atom.

    Raises
    ------
    StructureError
        If the molecule is too large or has no such atom.

    Notes
    -----
    Rings: each atom belongs to the neighbour over which it is nearest; see `shiftpred.substituents.positions` for how
    ties are settled. One bond of each ring is cut by this and listed in `ring_cuts` of both groups.

    Examples
    --------
    >>> from rdkit import Chem
    >>> [(s.position, s.name) for s in split_substituents(Chem.MolFromSmiles("CCOC(C)=O"), 1)]
    [('alpha', 'methyl'), ('alpha', 'acetoxy'), ('beta', 'acetyl'), ('gamma', 'oxo'), ('gamma', 'methyl')]
    """
    _require_site(mol, atom_index)
    return _split(build_bare_molecule(mol), codes or compute_group_codes(mol), atom_index, {})


def split_molecule(mol: Chem.Mol) -> list[tuple[Substituent, ...]]:
    """Split at every atom of a molecule in turn; see `split_substituents`.

    Returns
    -------
    list of tuple of Substituent
        (n_atoms,) in the order of the atoms.

    Raises
    ------
    StructureError
        If the molecule is too large.
    """
    if not mol.GetNumAtoms():
        return []
    _require_site(mol, 0)
    bare, codes = build_bare_molecule(mol), compute_group_codes(mol)
    # One group is seen from many sites: its SMILES is written once.
    written: dict[tuple, str] = {}
    return [_split(bare, codes, i, written) for i in range(mol.GetNumAtoms())]


def compute_ranks_from(bare: Chem.Mol, atom_index: int) -> list[int]:
    """Rank all atoms canonically as seen from one of them, which is marked for it.

    Ranks of the unmarked molecule would break ties between equivalent atoms once for all sites, and so differently
    for two equivalent sites.
    """
    atom = bare.GetAtomWithIdx(atom_index)
    atom.SetIsotope(1)
    ranks = list(Chem.CanonicalRankAtoms(bare))
    atom.SetIsotope(0)
    return ranks


def _split(bare: Chem.Mol, codes: GroupCodes, atom_index: int, written: dict[tuple, str]) -> tuple[Substituent, ...]:
    ranks = compute_ranks_from(bare, atom_index)
    places = compute_places(codes, atom_index, ranks=ranks)
    owner = {place.atom: place for place in places}
    # Farther atoms come later, so one walk backwards collects every subtree.
    below: dict[int, list[int]] = {place.atom: [place.atom] for place in places}
    for place in reversed(places):
        if place.distance > 1:
            below[place.parent].extend(below[place.atom])
    out = []
    for place in places:
        if place.distance > 3 and place.position != "para":
            continue
        out.append(_build_substituent(bare, codes, atom_index, place, owner, sorted(below[place.atom]), written))
    out.sort(key=lambda s: (len(s.path), s.group, ranks[s.attached_atom]))
    return tuple(out)


def _build_substituent(bare, codes, site, place: Place, owner, atoms, written) -> Substituent:
    inside = set(atoms)
    path = [place.atom]
    while path[-1] != site:
        path.append(owner[path[-1]].parent)
    cuts = tuple((a, b) for a in atoms for b in codes.neighbours[a] if b not in inside and (a, b) != (place.atom, place.parent))
    key = (place.parent, place.atom, *atoms)
    group = written.get(key)
    if group is None:
        group = written[key] = build_group_smiles(bare, place.parent, place.atom, atoms, cuts)
    on_ring = place.position if place.position in ("ortho", "meta", "para") else ""
    if place.distance == 1 and codes.six_rings[site] and not codes.six_rings[site] & codes.six_rings[place.atom]:
        on_ring = "ipso"
    if cuts:
        name = name_ring_atom(codes.atoms[place.atom], codes.hydrogens[place.atom])
    else:
        name = name_group(group)
    bond = bare.GetBondBetweenAtoms(place.parent, place.atom)
    order = bond.GetBondTypeAsDouble() if bond.GetBondType() in _ORDERED else 0.0
    return Substituent(
        position=_LEVEL.get(place.distance, "delta"),
        group=group,
        name=name,
        atoms=tuple(atoms),
        attached_atom=place.atom,
        bond_order=order,
        path=tuple(reversed(path)),
        ring_position=on_ring,
        ring_cuts=cuts,
    )


_ORDERED = frozenset((Chem.BondType.SINGLE, Chem.BondType.DOUBLE, Chem.BondType.TRIPLE, Chem.BondType.AROMATIC))


def _require_site(mol: Chem.Mol, atom_index: int) -> None:
    n_atoms = mol.GetNumAtoms()
    if n_atoms > MOST_ATOMS:
        raise StructureError(
            "structure",
            f"{n_atoms} heavy atoms",
            f"at most {MOST_ATOMS} heavy atoms",
            "cut the molecule into the part of interest",
        )
    if not 0 <= atom_index < n_atoms:
        raise StructureError(
            "argument 'atom_index'",
            str(atom_index),
            f"a 0-based index from 0 to {n_atoms - 1}",
            "atom_index=0 for the first atom",
        )
