"""Tautomers: the same compound in the tube where they are fast, so never an isomer and listed only on request."""

from __future__ import annotations

from rdkit import Chem
from rdkit.Chem import rdMolHash

_MOST_TAUTOMERS = 40
_MOST_STEPS = 200


def compute_tautomer_key(mol: Chem.Mol) -> str:
    """Return a text that all fast tautomers of a compound share (azole N-H, lactam/lactim, amidine, keto/enol).

    Configuration is left out, so stereoisomers share it too.
    """
    flat = Chem.Mol(mol)
    Chem.RemoveStereochemistry(flat)
    return rdMolHash.MolHash(flat, rdMolHash.HashFunction.HetAtomTautomerv2)


def build_tautomers(mol: Chem.Mol) -> list[tuple[str, str]]:
    """Return the tautomers of a structure, the likeliest first.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised.

    Returns
    -------
    list of (str, str)
        Canonical SMILES and plain words; the structure itself is left out, and so are tautomers that give up an
        aromatic ring.
    """
    # imported here: it takes as long as all other imports of this room together, and few calls need it
    from rdkit.Chem.MolStandardize import rdMolStandardize

    enumerator = rdMolStandardize.TautomerEnumerator()
    enumerator.SetMaxTautomers(_MOST_TAUTOMERS)
    enumerator.SetMaxTransforms(_MOST_STEPS)
    enumerator.SetRemoveSp3Stereo(False)
    enumerator.SetRemoveBondStereo(False)
    own = Chem.MolToSmiles(mol)
    found = {}
    for tautomer in enumerator.Enumerate(mol).tautomers:
        smiles = Chem.MolToSmiles(tautomer)
        if smiles != own and _count_aromatic(tautomer) >= _count_aromatic(mol):
            found[smiles] = (-rdMolStandardize.TautomerEnumerator.ScoreTautomer(tautomer), _describe(mol, tautomer))
    return [(smiles, how) for smiles, (_, how) in sorted(found.items(), key=lambda item: (item[1][0], item[0]))]


def _count_aromatic(mol: Chem.Mol) -> int:
    return sum(atom.GetIsAromatic() for atom in mol.GetAtoms())


def _describe(mol: Chem.Mol, tautomer: Chem.Mol) -> str:
    """Say which hydrogens moved; the enumerator keeps the order of the atoms."""
    gained, lost = [], []
    for before, after in zip(mol.GetAtoms(), tautomer.GetAtoms(), strict=True):
        change = after.GetTotalNumHs() - before.GetTotalNumHs()
        if change:
            (gained if change > 0 else lost).append(before)
    elements = {atom.GetSymbol() for atom in gained}, {atom.GetSymbol() for atom in lost}
    if elements == ({"N"}, {"N"}):
        return "tautomer: N-H on another nitrogen"
    if elements == ({"O"}, {"N"}):
        return "tautomer: lactim (O-H) for lactam (N-H)"
    if elements == ({"N"}, {"O"}):
        return "tautomer: lactam (N-H) for lactim (O-H)"
    if elements == ({"O"}, {"C"}):
        return "tautomer: enol for ketone"
    if elements == ({"C"}, {"O"}):
        return "tautomer: ketone for enol"
    return "tautomer: hydrogens moved together with double bonds"
