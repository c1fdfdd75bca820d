"""Edits of a molecular graph that several moves share."""

from __future__ import annotations

from rdkit import Chem

from shiftpred.structures.rivals.workspace import Workspace

_OPPOSITE = {
    Chem.ChiralType.CHI_TETRAHEDRAL_CW: Chem.ChiralType.CHI_TETRAHEDRAL_CCW,
    Chem.ChiralType.CHI_TETRAHEDRAL_CCW: Chem.ChiralType.CHI_TETRAHEDRAL_CW,
}


def invert_centre(atom: Chem.Atom) -> None:
    """Turn a tetrahedral stereocentre over; other atoms stay as they are."""
    atom.SetChiralTag(_OPPOSITE.get(atom.GetChiralTag(), atom.GetChiralTag()))


def is_centre(atom: Chem.Atom) -> bool:
    """Tell whether the atom is a specified tetrahedral stereocentre."""
    return atom.GetChiralTag() in _OPPOSITE


def forget_centre(editable: Chem.RWMol, *indices: int) -> None:
    """Leave these atoms without stated configuration."""
    for index in indices:
        editable.GetAtomWithIdx(index).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)


def move_bond(editable: Chem.RWMol, kept: int, old: int, new: int) -> None:
    """Replace the bond kept-old by kept-new of the same type.

    The configuration at `kept` stays: its tag refers to the order of its bonds, and the new bond comes last in that
    order. Double bonds whose geometry refers to `old` refer to `new` afterwards.
    """
    atom = editable.GetAtomWithIdx(kept)
    partners = [bond.GetOtherAtomIdx(kept) for bond in atom.GetBonds()]
    geometry = remember_geometry(atom)
    bond_type = editable.GetBondBetweenAtoms(kept, old).GetBondType()
    if is_centre(atom) and (len(partners) - 1 - partners.index(old)) % 2:
        invert_centre(atom)
    editable.RemoveBond(kept, old)
    editable.AddBond(kept, new, bond_type)
    if bond_type == Chem.BondType.AROMATIC:
        editable.GetBondBetweenAtoms(kept, new).SetIsAromatic(True)
    restore_geometry(editable, geometry, {old: new})


def remember_geometry(*atoms: Chem.Atom) -> list[tuple]:
    """Return the double bonds of these atoms whose geometry is stated, with the neighbours it refers to."""
    return [
        (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx(), bond.GetStereo(), tuple(bond.GetStereoAtoms()))
        for atom in atoms
        for bond in atom.GetBonds()
        if bond.GetStereo() in (Chem.BondStereo.STEREOCIS, Chem.BondStereo.STEREOTRANS)
    ]


def restore_geometry(editable: Chem.RWMol, geometry: list[tuple], replaced: dict[int, int]) -> None:
    """State the geometry again where removing a bond erased it; replaced neighbours hand their place on."""
    for begin, end, stereo, anchors in geometry:
        anchors = [replaced.get(anchor, anchor) for anchor in anchors]
        bond = editable.GetBondBetweenAtoms(begin, end)
        if bond is None or bond.GetBondType() != Chem.BondType.DOUBLE or {begin, end} & set(anchors):
            continue
        if all(editable.GetBondBetweenAtoms(*pair) for pair in zip((begin, end), anchors, strict=True)):
            bond.SetStereoAtoms(*anchors)
            bond.SetStereo(stereo)


def set_bond(editable: Chem.RWMol, first: int, second: int, bond_type: Chem.BondType) -> None:
    """Give an existing bond another, non-aromatic type and no geometry."""
    bond = editable.GetBondBetweenAtoms(first, second)
    bond.SetStereo(Chem.BondStereo.STEREONONE)
    bond.SetBondType(bond_type)
    bond.SetIsAromatic(False)


def hand_over_hydrogen(editable: Chem.RWMol, gains: int, loses: int) -> None:
    """Keep count of the hydrogens that RDKit does not count by itself: those on aromatic nitrogen."""
    for index, hydrogens in ((gains, 1), (loses, 0)):
        atom = editable.GetAtomWithIdx(index)
        if atom.GetIsAromatic() and atom.GetAtomicNum() in (7, 15):
            atom.SetNumExplicitHs(hydrogens)


def move_group(editable: Chem.RWMol, group: int, old: int, new: int) -> None:
    """Take the group that starts with atom `group` from atom `old` to atom `new`; a hydrogen goes the other way."""
    move_bond(editable, group, old, new)
    forget_centre(editable, old, new)
    hand_over_hydrogen(editable, old, new)


def swap_ring_atoms(workspace: Workspace, editable: Chem.RWMol, first: int, second: int) -> None:
    """Let two ring atoms, each with two ring bonds, change places with all that hangs on them."""
    around_first = set(workspace.ring_neighbours[first])
    around_second = set(workspace.ring_neighbours[second])
    for around, other, old, new in (
        (around_first, around_second, first, second),
        (around_second, around_first, second, first),
    ):
        for kept in sorted(around - other - {first, second}):
            move_bond(editable, kept, old, new)
    for shared in sorted(around_first & around_second):
        types = workspace.bond_type(shared, first), workspace.bond_type(shared, second)
        if types[0] != types[1]:
            set_bond(editable, shared, first, types[1])
            set_bond(editable, shared, second, types[0])
    forget_centre(editable, first, second)


def mirror(mol: Chem.Mol) -> Chem.Mol:
    """Return the mirror image: every stereocentre turned over."""
    image = Chem.Mol(mol)
    for atom in image.GetAtoms():
        invert_centre(atom)
    return image
