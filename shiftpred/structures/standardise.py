"""One drawing for each molecule: hydrogens folded in, labels removed, charge-separated groups brought to one form."""

from __future__ import annotations

from rdkit import Chem

__all__ = ["standardise_mol"]

_DOUBLE, _SINGLE, _TRIPLE = Chem.BondType.DOUBLE, Chem.BondType.SINGLE, Chem.BondType.TRIPLE
# Elements that expand their octet: X+-Y- is drawn X=Y (sulfoxides, phosphine oxides, ylides).
_EXPANDING = frozenset((15, 16, 33, 34, 52))
_METALS = frozenset(
    [3, 4, 11, 12, 13, *range(19, 32), *range(37, 51), *range(55, 84), *range(87, 104)]
)


def standardise_mol(mol: Chem.Mol) -> tuple[Chem.Mol, tuple[int, ...], tuple[int, ...], tuple[str, ...]]:
    """Bring a sanitised molecule to the form that predictions see.

    Parameters
    ----------
    mol : rdkit Mol
        Sanitised; may carry explicit hydrogens, isotopes and atom maps.

    Returns
    -------
    mol : rdkit Mol
        A copy: hydrogens implicit, isotopes and atom maps cleared, X(+)-Y(-) drawn as X=Y where X is P, S, As, Se or Te,
        diazo and azide groups as C=N(+)=N(-), stereo assigned.
    kept : tuple of int
        (n_atoms,) index of each atom in the molecule as given.
    deuterium : tuple of int
        (n_atoms,) deuterium (or tritium) atoms folded into each atom's hydrogens; () if there are none.
    notes : tuple of str
    """
    notes: list[str] = []
    explicit = isotopes = charges = maps = metals = radicals = False
    for i in range(mol.GetNumAtoms()):
        atom = mol.GetAtomWithIdx(i)
        z = atom.GetAtomicNum()
        explicit |= z == 1
        isotopes |= atom.GetIsotope() != 0
        charges |= atom.GetFormalCharge() != 0
        maps |= atom.GetAtomMapNum() != 0
        metals |= z in _METALS
        radicals |= atom.GetNumRadicalElectrons() != 0
    kept = tuple(range(mol.GetNumAtoms()))
    deuterium: tuple[int, ...] = ()
    if not (explicit or isotopes or charges or maps or radicals or metals):
        return mol, kept, deuterium, ()
    mol = Chem.RWMol(mol)
    if isotopes:
        heavy = sorted({a.GetSymbol() for a in mol.GetAtoms() if a.GetIsotope() and a.GetAtomicNum() != 1})
        if heavy:
            notes.append(f"isotope label on {', '.join(heavy)}: predicted as natural abundance")
    if explicit:
        mol, kept, deuterium = _fold_hydrogens(mol)
        if any(deuterium):
            notes.append("deuterium: no 1H line; the 13C line of a carbon that bears it is a multiplet, shifted by about -0.3 ppm each")
    for atom in mol.GetAtoms():
        atom.SetIsotope(0)
        atom.SetAtomMapNum(0)
    if charges:
        _join_charges(mol)
    if metals:
        notes.append("contains a metal: little training data, wide intervals")
    if radicals and any(a.GetNumRadicalElectrons() for a in mol.GetAtoms()):
        notes.append("radical: shifts of paramagnetic compounds are not predictable")
    mol = mol.GetMol()
    Chem.SanitizeMol(mol)
    Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
    return mol, kept, deuterium, tuple(notes)


def _fold_hydrogens(mol):
    """Remove explicit hydrogens that sit on one heavy atom; count the heavy isotopes among them."""
    for atom in mol.GetAtoms():
        atom.SetIntProp("_place", atom.GetIdx())
    count = [0] * mol.GetNumAtoms()
    for atom in mol.GetAtoms():
        if atom.GetAtomicNum() == 1:
            bearer = [n for n in atom.GetNeighbors() if n.GetAtomicNum() != 1]
            if len(bearer) == 1:
                if atom.GetIsotope() in (2, 3):
                    count[bearer[0].GetIdx()] += 1
                atom.SetIsotope(0)
    parameters = Chem.RemoveHsParameters()
    parameters.removeMapped = True
    parameters.removeIsotopes = True
    parameters.removeDefiningBondStereo = True
    parameters.removeWithWedgedBond = True
    parameters.showWarnings = False
    bare = Chem.RemoveHs(mol, parameters)
    kept = tuple(a.GetIntProp("_place") for a in bare.GetAtoms())
    deuterium = tuple(count[i] for i in kept)
    return Chem.RWMol(bare), kept, deuterium if any(deuterium) else ()


def _join_charges(mol):
    """Draw neighbouring opposite charges as a double bond where the element allows it."""
    for _ in range(4):
        changed = False
        for bond in mol.GetBonds():
            plus, minus = bond.GetBeginAtom(), bond.GetEndAtom()
            if plus.GetFormalCharge() < 0:
                plus, minus = minus, plus
            if plus.GetFormalCharge() <= 0 or minus.GetFormalCharge() >= 0 or bond.GetBondType() != _SINGLE:
                continue
            if plus.GetAtomicNum() in _EXPANDING and minus.GetAtomicNum() in (6, 7, 8, 16, 34):
                bond.SetBondType(_DOUBLE)
                plus.SetFormalCharge(plus.GetFormalCharge() - 1)
                minus.SetFormalCharge(minus.GetFormalCharge() + 1)
                changed = True
            elif plus.GetAtomicNum() == 7 and minus.GetAtomicNum() in (6, 7):
                end = [b for b in plus.GetBonds() if b.GetBondType() == _TRIPLE and b.GetOtherAtom(plus).GetAtomicNum() == 7]
                if end:
                    bond.SetBondType(_DOUBLE)
                    end[0].SetBondType(_DOUBLE)
                    end[0].GetOtherAtom(plus).SetFormalCharge(-1)
                    minus.SetFormalCharge(0)
                    changed = True
        if not changed:
            return
