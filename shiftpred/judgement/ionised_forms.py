"""The protonated or deprotonated form of an amine, azine or acid: what the tube holds may be its salt or its zwitterion."""

from __future__ import annotations

from rdkit import Chem

from shiftpred.records import Structure

__all__ = ["build_ionised_forms", "build_ionised_structures"]

_MOST_SITES = 6
_BASES = (
    # aliphatic amines: no N on C=O, C=S, S(=O), aromatic C, N or O; amidines and guanidines at their imine nitrogen
    ("amine protonated", "[NX3;+0;!$(N[C,S,P]=[O,S,N]);!$(N[a]);!$(N~[N,O,S,P]);!$(NC#N);!$(N[C]=[C])]"),
    ("imine nitrogen of an amidine or guanidine protonated", "[NX2;+0;$(N=[CX3]([NX3]))]"),
    ("ring nitrogen protonated", "[n;+0;H0;X2;r6;!$(n:[n,o,s])]"),
    ("ring nitrogen protonated", "[n;+0;H0;X2;r5;$(n:c:[n;X3])]"),
)
_ACIDS = (
    ("carboxylic acid deprotonated", "[OX2;H1;$(O[CX3]=O)]"),
    ("sulfonic or phosphonic acid deprotonated", "[OX2;H1;$(O[S,P]=O)]"),
)
_BASE_PATTERNS = tuple((word, Chem.MolFromSmarts(s)) for word, s in _BASES)
_ACID_PATTERNS = tuple((word, Chem.MolFromSmarts(s)) for word, s in _ACIDS)


def build_ionised_forms(mol: Chem.Mol) -> tuple[tuple[Chem.Mol, str], ...]:
    """Return (molecule, what was done in words): protonated, deprotonated, both; empty where nothing ionises.

    Parameters
    ----------
    mol : rdkit.Chem.Mol

    Returns
    -------
    tuple of (rdkit.Chem.Mol, str)
        Same atoms in the same order, at most three forms.

    Examples
    --------
    >>> from rdkit import Chem
    >>> [(Chem.MolToSmiles(m), words) for m, words in build_ionised_forms(Chem.MolFromSmiles("CC(=O)O"))]
    [('CC(=O)[O-]', 'carboxylic acid deprotonated')]
    """
    bases, acids = _find(mol, _BASE_PATTERNS), _find(mol, _ACID_PATTERNS)
    forms = []
    for sites in (bases, acids, {**bases, **acids} if bases and acids else {}):
        if not sites or len(sites) > _MOST_SITES:
            continue
        changed = Chem.RWMol(mol)
        for index in sites:
            atom = changed.GetAtomWithIdx(index)
            step = 1 if index in bases else -1
            hydrogens = atom.GetTotalNumHs()
            atom.SetFormalCharge(atom.GetFormalCharge() + step)
            atom.SetNoImplicit(True)
            atom.SetNumExplicitHs(hydrogens + step)
        out = changed.GetMol()
        if Chem.SanitizeMol(out, catchErrors=True) == Chem.SanitizeFlags.SANITIZE_NONE:
            forms.append((out, ", ".join(sorted(set(sites.values())))))
    return tuple(forms)


def build_ionised_structures(structure: Structure) -> tuple[tuple[Structure, str], ...]:
    """Return the ionised forms of a structure as structures with the same atom numbers, each with what was done in words."""
    return tuple(
        (Structure(structure.name, mol, structure.atom_numbers, structure.text, structure.deuterium, structure.notes), words)
        for mol, words in build_ionised_forms(structure.mol)
    )


def _find(mol, patterns) -> dict[int, str]:
    return {match[0]: word for word, pattern in patterns for match in mol.GetSubstructMatches(pattern)}
