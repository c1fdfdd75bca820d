"""Relative stereo of a molecule as relations between pairs of atoms: E/Z, and cis/trans on a ring.

A relation does not change in the mirror, so enantiomers give the same. A ring atom with four neighbours has an upper and a
lower face; two substituents on one ring are cis if they lie on the same face. Fused rings are covered as well, since the
atoms of the second ring are substituents of the first.
"""

from __future__ import annotations

from rdkit import Chem

__all__ = ["STEREO_RELATIONS", "compute_stereo_edges"]

STEREO_RELATIONS = (
    "double_bond_cis",
    "double_bond_trans",
    "ring_12_cis",
    "ring_12_trans",
    "ring_13_cis",
    "ring_13_trans",
    "ring_14_cis",
    "ring_14_trans",
)
"""Kinds of relation, in the order of their columns."""

_CIS = {Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS}
_TRANS = {Chem.BondStereo.STEREOE, Chem.BondStereo.STEREOTRANS}
_LARGEST_RING = 8


def compute_stereo_edges(mol: Chem.Mol, any_centre: bool, rings) -> tuple[list[int], list[int], list[int], dict[int, int]]:
    """Find all stereo relations of a molecule.

    Parameters
    ----------
    mol : rdkit Mol
        Stereo assigned.
    any_centre : bool
        Whether any atom carries a tetrahedral tag (saves the search where none does).
    rings : sequence of tuples
        Atoms of each ring, in order around it.

    Returns
    -------
    begin, end, kind : lists of equal length
        Pairs of atoms (each pair once) and the index of the relation in `STEREO_RELATIONS`.
    like : dict
        Bond index → +1 for two neighbouring centres of like descriptor (R,R or S,S), -1 for unlike.
    """
    begin, end, kind = [], [], []
    for k in range(mol.GetNumBonds()):
        bond = mol.GetBondWithIdx(k)
        if bond.GetBondType() == Chem.BondType.DOUBLE:
            stereo = bond.GetStereo()
            if stereo in _CIS or stereo in _TRANS:
                _add_double_bond(bond, stereo in _CIS, begin, end, kind)
    like = {}
    if any_centre:
        for ring in rings:
            if len(ring) <= _LARGEST_RING:
                _add_ring(mol, ring, begin, end, kind)
        like = _compare_neighbouring_centres(mol)
    return begin, end, kind, like


def _add_double_bond(bond, reference_cis, begin, end, kind):
    left, right = bond.GetBeginAtom(), bond.GetEndAtom()
    reference = list(bond.GetStereoAtoms())
    if len(reference) != 2:
        return
    for a in left.GetNeighbors():
        if a.GetIdx() == right.GetIdx():
            continue
        for b in right.GetNeighbors():
            if b.GetIdx() == left.GetIdx():
                continue
            swapped = (a.GetIdx() != reference[0]) + (b.GetIdx() != reference[1])
            cis = reference_cis == (swapped % 2 == 0)
            begin.append(a.GetIdx())
            end.append(b.GetIdx())
            kind.append(0 if cis else 1)


def _add_ring(mol, ring, begin, end, kind):
    """Add the cis/trans relations between the substituents of one ring."""
    size = len(ring)
    substituents = []
    for place, i in enumerate(ring):
        atom = mol.GetAtomWithIdx(i)
        tag = atom.GetChiralTag()
        if tag != Chem.ChiralType.CHI_TETRAHEDRAL_CW and tag != Chem.ChiralType.CHI_TETRAHEDRAL_CCW:
            continue
        before, after = ring[place - 1], ring[(place + 1) % size]
        neighbours = [b.GetOtherAtomIdx(i) for b in atom.GetBonds()]
        outside = [j for j in neighbours if j != before and j != after]
        if len(neighbours) == 3 and len(outside) == 1:
            # The missing fourth neighbour is a hydrogen or a lone pair; RDKit's tag is counted with it in the last place
            # when it is written behind the others, which keeps one convention for three and four neighbours.
            order = (before, after, outside[0])
            sign = _parity(order, neighbours)
        elif len(neighbours) == 4 and len(outside) == 2:
            order = (before, after, outside[0], outside[1])
            sign = _parity(order, neighbours)
        else:
            continue
        if tag == Chem.ChiralType.CHI_TETRAHEDRAL_CW:
            sign = -sign
        substituents.append((place, outside[0], sign))
        if len(outside) == 2:
            substituents.append((place, outside[1], -sign))
    for p, (place, a, face) in enumerate(substituents):
        for other, b, other_face in substituents[p + 1 :]:
            apart = abs(other - place)
            apart = min(apart, size - apart)
            if apart == 0 or apart > 3 or a == b:
                continue
            begin.append(a)
            end.append(b)
            kind.append(2 * apart + (0 if face == other_face else 1))


def _parity(order, reference):
    """Return +1 if `order` is an even permutation of `reference`, else -1."""
    places = [reference.index(x) for x in order]
    odd = sum(places[i] > places[j] for i in range(len(places)) for j in range(i + 1, len(places))) % 2
    return -1 if odd else 1


def _compare_neighbouring_centres(mol):
    like = {}
    for bond in mol.GetBonds():
        a, b = bond.GetBeginAtom(), bond.GetEndAtom()
        if a.HasProp("_CIPCode") and b.HasProp("_CIPCode"):
            like[bond.GetIdx()] = 1 if a.GetProp("_CIPCode") == b.GetProp("_CIPCode") else -1
    return like
