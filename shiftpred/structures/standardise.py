"""One drawing for each molecule: hydrogens folded in, labels removed, charge-separated groups brought to one form."""

from __future__ import annotations

from rdkit import Chem

__all__ = ["charge_dative_bonds", "standardise_mol"]

_SINGLE, _DOUBLE, _TRIPLE = Chem.BondType.SINGLE, Chem.BondType.DOUBLE, Chem.BondType.TRIPLE
# Elements that are drawn X=Y rather than X(+)-Y(-): sulfoxides, phosphine oxides, ylides, iodoso compounds.
_EXPANDING = frozenset((15, 16, 33, 34, 52, 53))
_PARTNERS = frozenset((6, 7, 8, 16, 34))
_METALS = frozenset([3, 4, 11, 12, 13, *range(19, 32), *range(37, 51), *range(55, 85), *range(87, 104)])

# RDKit renamed this call in 2024.09 and prints a warning at every use of the old name.
if hasattr(Chem, "ValenceType"):

    def _compute_explicit_valence(atom):
        return atom.GetValence(Chem.ValenceType.EXPLICIT)
else:

    def _compute_explicit_valence(atom):
        return atom.GetExplicitValence()


def standardise_mol(mol: Chem.Mol) -> tuple[Chem.Mol, tuple[int, ...], tuple[int, ...], tuple[str, ...]]:
    """Bring a sanitised molecule to the form that predictions see.

    Parameters
    ----------
    mol : rdkit Mol
        Sanitised, stereo assigned; may carry explicit hydrogens, isotopes and atom maps.

    Returns
    -------
    mol : rdkit Mol
        Hydrogens implicit, isotopes and atom maps cleared, X(+)-Y(-) drawn as X=Y where X is P, S, As, Se, Te or I, diazo and
        azide groups as Y=N(+)=N(-), dative bonds between non-metals as charges, stereo assigned. The order of the atoms is
        kept. The molecule itself where nothing had to be done, a copy otherwise.
    kept : tuple of int
        (n_atoms,) index of each atom in the molecule as given.
    deuterium : tuple of int
        (n_atoms,) deuterium or tritium atoms folded into each atom's hydrogens; () if there are none.
    notes : tuple of str
        What a reader of the prediction should know.

    Examples
    --------
    >>> from rdkit import Chem
    >>> found, kept, deuterium, notes = standardise_mol(Chem.MolFromSmiles("[2H]C([2H])([2H])[S+]([O-])C"))
    >>> Chem.MolToSmiles(found), kept, deuterium
    ('CS(C)=O', (1, 4, 5, 6), (3, 0, 0, 0))
    """
    atoms = [mol.GetAtomWithIdx(i) for i in range(mol.GetNumAtoms())]
    elements = {a.GetAtomicNum() for a in atoms}
    charges = any(a.GetFormalCharge() for a in atoms)
    labels = any(a.GetIsotope() or a.GetAtomMapNum() for a in atoms)
    radicals = any(a.GetNumRadicalElectrons() for a in atoms)
    metals = not _METALS.isdisjoint(elements)
    dative = 5 in elements or metals or any(_compute_explicit_valence(a) < a.GetDegree() for a in atoms)
    kept: tuple[int, ...] = tuple(range(len(atoms)))
    if not (charges or labels or radicals or dative or 1 in elements):
        return mol, kept, (), ()
    notes: list[str] = []
    deuterium: tuple[int, ...] = ()
    mol = Chem.RWMol(mol)
    if labels:
        notes.extend(_name_isotopes(mol))
    if 1 in elements:
        mol, kept, deuterium = _fold_hydrogens(mol)
        if deuterium:
            notes.append(
                "deuterium: no 1H line; the 13C line of a carbon that bears it is a multiplet, shifted by about -0.3 ppm each"
            )
    if labels:
        for atom in mol.GetAtoms():
            atom.SetIsotope(0)
            atom.SetAtomMapNum(0)
    if dative:
        charges |= charge_dative_bonds(mol)
    if charges:
        _join_charges(mol)
    if metals:
        notes.append("contains a metal: little training data, wide intervals")
    mol = mol.GetMol()
    Chem.SanitizeMol(mol)
    Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
    if radicals and any(a.GetNumRadicalElectrons() for a in mol.GetAtoms()):
        notes.append("radical: shifts of paramagnetic compounds are not predictable")
    return mol, kept, deuterium, tuple(notes)


def _name_isotopes(mol):
    labelled = sorted({f"{a.GetIsotope()}{a.GetSymbol()}" for a in mol.GetAtoms() if a.GetIsotope() and a.GetAtomicNum() != 1})
    if labelled:
        yield f"isotope label {', '.join(labelled)}: predicted as natural abundance"


def _fold_hydrogens(mol):
    """Remove explicit hydrogens that sit on one heavy atom; count the heavy isotopes among them."""
    count = [0] * mol.GetNumAtoms()
    for atom in mol.GetAtoms():
        atom.SetIntProp("_place", atom.GetIdx())
        if atom.GetAtomicNum() == 1:
            bearers = [x for x in atom.GetNeighbors() if x.GetAtomicNum() != 1]
            if len(bearers) == 1:
                if atom.GetIsotope() in (2, 3):
                    count[bearers[0].GetIdx()] += 1
                atom.SetIsotope(0)
                atom.SetAtomMapNum(0)
    parameters = Chem.RemoveHsParameters()
    parameters.removeMapped = True
    parameters.removeIsotopes = True
    parameters.removeDefiningBondStereo = True
    parameters.removeWithWedgedBond = True
    parameters.removeNonimplicit = True
    parameters.removeInSGroups = True
    parameters.showWarnings = False
    bare = Chem.RemoveHs(mol, parameters)
    kept = tuple(a.GetIntProp("_place") for a in bare.GetAtoms())
    for atom in bare.GetAtoms():
        atom.ClearProp("_place")
    deuterium = tuple(count[i] for i in kept)
    return Chem.RWMol(bare), kept, deuterium if any(deuterium) else ()


def charge_dative_bonds(mol) -> bool:
    """Draw dative bonds between non-metals as single bonds with charges (N->O as N(+)-O(-)); those to metals stay.

    Hydrogens that the drawing leaves out follow from the charged form: N->B is ammonia borane.
    """
    changed = False
    for bond in mol.GetBonds():
        if bond.GetBondType() != Chem.BondType.DATIVE:
            continue
        donor, acceptor = bond.GetBeginAtom(), bond.GetEndAtom()
        if donor.GetAtomicNum() in _METALS or acceptor.GetAtomicNum() in _METALS:
            continue
        bond.SetBondType(_SINGLE)
        donor.SetFormalCharge(donor.GetFormalCharge() + 1)
        acceptor.SetFormalCharge(acceptor.GetFormalCharge() - 1)
        changed = True
    return changed


def _join_charges(mol) -> None:
    """Draw neighbouring opposite charges as a double bond where the element allows it."""
    kekule = False
    # A sulfone drawn S(2+) takes two rounds, one for each oxygen.
    for _ in range(4):
        pairs = [pair for pair in map(_find_opposite, mol.GetBonds()) if pair]
        if not pairs:
            return
        if not kekule and any(atom.GetIsAromatic() for _, plus, minus in pairs for atom in (plus, minus)):
            Chem.Kekulize(mol, clearAromaticFlags=True)
            kekule = True
        for bond, plus, minus in pairs:
            if plus.GetFormalCharge() <= 0 or minus.GetFormalCharge() >= 0 or bond.GetBondType() != _SINGLE:
                continue
            end = _find_terminal_nitrogen(plus) if plus.GetAtomicNum() == 7 else None
            bond.SetBondType(_DOUBLE)
            minus.SetFormalCharge(minus.GetFormalCharge() + 1)
            if end is None:
                plus.SetFormalCharge(plus.GetFormalCharge() - 1)
            else:
                end.SetBondType(_DOUBLE)
                end.GetOtherAtom(plus).SetFormalCharge(-1)


def _find_opposite(bond):
    """Return (bond, plus, minus) if the bond is one that is drawn without its charges, or N(-)-N(+)#N; otherwise None."""
    plus, minus = bond.GetBeginAtom(), bond.GetEndAtom()
    if plus.GetFormalCharge() < 0:
        plus, minus = minus, plus
    if plus.GetFormalCharge() <= 0 or minus.GetFormalCharge() >= 0 or bond.GetBondType() != _SINGLE:
        return None
    if plus.GetAtomicNum() in _EXPANDING and minus.GetAtomicNum() in _PARTNERS:
        return bond, plus, minus
    if plus.GetAtomicNum() == 7 and minus.GetAtomicNum() in (6, 7) and _find_terminal_nitrogen(plus) is not None:
        return bond, plus, minus
    return None


def _find_terminal_nitrogen(atom):
    return next((b for b in atom.GetBonds() if b.GetBondType() == _TRIPLE and b.GetOtherAtom(atom).GetAtomicNum() == 7), None)
