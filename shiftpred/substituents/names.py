"""Plain names of groups: from a table of trade names, else composed from the names of the parts, else the SMILES."""

from __future__ import annotations

import csv
import re
from functools import lru_cache
from importlib.resources import files

from rdkit import Chem, rdBase

from shiftpred.substituents.group_smiles import build_canonical_group

__all__ = ["load_group_names", "name_group", "name_ring_atom"]

_ALKYL = (
    "",
    *("methyl ethyl propyl butyl pentyl hexyl heptyl octyl nonyl decyl undecyl dodecyl tridecyl tetradecyl").split(),
    *("pentadecyl hexadecyl heptadecyl octadecyl nonadecyl icosyl").split(),
)
_ACYL = ("", "formyl", "acetyl", "propanoyl", "butanoyl", "pentanoyl", "hexanoyl", "heptanoyl", "octanoyl", "nonanoyl")
_ACYL += ("decanoyl", "undecanoyl", "lauroyl", "tridecanoyl", "myristoyl", "pentadecanoyl", "palmitoyl")
_ACYL += ("heptadecanoyl", "stearoyl")
_SHORT_ALKOXY = ("methyl", "ethyl", "propyl", "isopropyl", "butyl", "isobutyl", "sec-butyl", "tert-butyl", "phenyl")
_TIMES = ("", "", "di", "tri", "tetra", "penta")
_ON_ARYL = {("O", 1, ()): "phenoxy", ("C", 1, ()): "benzyl"}
_MOST_ATOMS = 22
"""Groups of more heavy atoms are shown as SMILES: a composed name would be longer than the structure."""
_LONGEST = 60


@lru_cache(maxsize=1)
def load_group_names() -> dict[str, str]:
    """Load the table of trade names.

    Returns
    -------
    dict of str to str
        Canonical group SMILES to name. Names are common practice; the table says so row by row.
    """
    text = files("shiftpred.substituents").joinpath("tables/group_names.csv").read_text(encoding="utf-8")
    return {row["smiles"]: row["name"] for row in csv.DictReader(text.splitlines())}


@lru_cache(maxsize=100_000)
def name_group(canonical_smiles: str) -> str:
    """Name a group in plain words.

    Parameters
    ----------
    canonical_smiles : str
        Canonical SMILES of the group, '*' being the atom it hangs on (`*OC(C)=O`, `*=O`).

    Returns
    -------
    str
        A trade name ('acetoxy'), a name composed of such names ('4-fluorophenyl', '2-phenoxyethyl'), or the SMILES.

    Examples
    --------
    >>> name_group("*OC(C)=O"), name_group("*Nc1ccc(F)cc1"), name_group("*=O")
    ('acetoxy', '(4-fluorophenyl)amino', 'oxo')
    """
    known = load_group_names().get(canonical_smiles)
    if known:
        return known
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(canonical_smiles)
    if mol is None or mol.GetNumAtoms() > _MOST_ATOMS + 1:
        return canonical_smiles
    dummies = [a for a in mol.GetAtoms() if a.GetAtomicNum() == 0]
    if len(dummies) != 1 or dummies[0].GetDegree() != 1:
        return canonical_smiles
    name = _compose(mol, dummies[0])
    return name if name and len(name) <= _LONGEST else canonical_smiles


def name_ring_atom(symbol: str, hydrogens: int) -> str:
    """Name the attached atom of a group that was cut out of a ring: 'ring CH2', 'aromatic N'.

    Parameters
    ----------
    symbol : str
        Symbol with charge, lower case if aromatic.
    hydrogens : int
        Hydrogens on the atom.
    """
    hydrogen = "" if not hydrogens else "H" if hydrogens == 1 else f"H{hydrogens}"
    element, charge = re.fullmatch(r"([A-Za-z]+)([+-]*)", symbol).groups()
    kind = "aromatic" if symbol[0].islower() else "ring"
    return f"{kind} {element.capitalize()}{hydrogen}{charge}"


def _compose(mol: Chem.Mol, dummy: Chem.Atom) -> str:
    """Return a composed name, '' if no rule fits."""
    root = dummy.GetNeighbors()[0]
    first = mol.GetBondBetweenAtoms(dummy.GetIdx(), root.GetIdx())
    behind = [b for b in root.GetBonds() if b.GetIdx() != first.GetIdx()]
    if first.GetBondType() != Chem.BondType.SINGLE or root.GetFormalCharge():
        return ""
    if root.GetIsAromatic():
        return _name_aryl(mol, dummy, root)
    if root.IsInRing() or any(b.GetBondType() == Chem.BondType.AROMATIC for b in behind):
        return ""
    parts = [(b.GetBondType(), _cut(mol, root, b)) for b in behind]
    single = sorted(p for kind, p in parts if kind == Chem.BondType.SINGLE)
    double = sorted(p for kind, p in parts if kind == Chem.BondType.DOUBLE)
    if len(single) + len(double) != len(parts):
        return ""
    names = [name_group(p) for p in single]
    if any(n == p for n, p in zip(names, single, strict=True)):
        return ""
    names = [re.sub(r" \([^)]*\)$", "", n) for n in names]
    rule = (root.GetSymbol(), len(names), tuple(double))
    aryl = names[0][:-6] if len(names) == 1 and re.search(r"\d-.*[^n]phenyl$", names[0]) else ""
    if aryl and (joined := _ON_ARYL.get(rule)) and root.GetTotalNumHs() == (2 if root.GetSymbol() == "C" else 0):
        return aryl + joined
    if rule == ("O", 1, ()):
        if names[0] in _SHORT_ALKOXY:
            return names[0].removesuffix("yl") + "oxy"
        return _bracket(names[0]) + "oxy"
    if rule == ("S", 1, ()):
        return _bracket(names[0]) + "thio"
    if rule == ("N", 1, ()):
        return _bracket(names[0]) + "amino"
    if rule == ("N", 2, ()):
        if names[0] == names[1]:
            return "di" + _bracket(names[0]) + "amino"
        a, b = sorted(names)
        return f"{_bracket(a)}({b})amino"
    if rule == ("C", 1, ("*=O",)):
        if aryl:
            return aryl + "benzoyl"
        chain = _alkyl_length(single[0])
        if chain and chain + 1 < len(_ACYL):
            return _ACYL[chain + 1]
        return _bracket(names[0]) + "carbonyl"
    if rule == ("S", 1, ("*=O",)):
        return _bracket(names[0]) + "sulfinyl"
    if rule == ("S", 1, ("*=O", "*=O")):
        return _bracket(names[0]) + "sulfonyl"
    if rule == ("C", 1, ()):
        return _name_chain(mol, dummy, root, names[0])
    if root.GetSymbol() == "C" and not double and root.GetTotalNumHs() == 3 - len(names):
        return _list_parts(names) + "methyl"
    return ""


def _name_chain(mol: Chem.Mol, dummy: Chem.Atom, root: Chem.Atom, inner: str) -> str:
    """Name an unbranched chain of CH2 with one group at its end."""
    before, atom, length = dummy, root, 0
    while atom.GetSymbol() == "C" and not atom.IsInRing() and atom.GetTotalNumHs() == 2 and atom.GetDegree() == 2:
        length += 1
        before, atom = atom, next(a for a in atom.GetNeighbors() if a.GetIdx() != before.GetIdx())
        if mol.GetBondBetweenAtoms(before.GetIdx(), atom.GetIdx()).GetBondType() != Chem.BondType.SINGLE:
            return ""
    if atom.GetSymbol() == "C" and atom.GetTotalNumHs() == 3:
        return _ALKYL[length + 1] if length + 1 < len(_ALKYL) else ""
    if not length or length >= len(_ALKYL):
        return ""
    end = _cut(mol, before, mol.GetBondBetweenAtoms(before.GetIdx(), atom.GetIdx()))
    name = re.sub(r" \([^)]*\)$", "", name_group(end))
    if name == end:
        return ""
    place = f"{length}-" if length > 1 else ""
    return f"{place}{_bracket(name)}{_ALKYL[length]}"


def _name_aryl(mol: Chem.Mol, dummy: Chem.Atom, root: Chem.Atom) -> str:
    """Name a substituted phenyl with the lowest set of numbers."""
    rings = [r for r in mol.GetRingInfo().AtomRings() if root.GetIdx() in r]
    if len(rings) != 1 or len(rings[0]) != 6:
        return ""
    ring = set(rings[0])
    atoms = [mol.GetAtomWithIdx(i) for i in ring]
    if any(a.GetSymbol() != "C" or not a.GetIsAromatic() or a.GetFormalCharge() for a in atoms):
        return ""
    if any(mol.GetRingInfo().NumAtomRings(i) > 1 for i in ring):
        return ""
    choices = []
    for start in [a for a in root.GetNeighbors() if a.GetIdx() in ring]:
        order, last = [root, start], root
        while len(order) < 6:
            last = order[-2]
            order.append(next(a for a in order[-1].GetNeighbors() if a.GetIdx() in ring and a.GetIdx() != last.GetIdx()))
        found = []
        for number, atom in enumerate(order[1:], start=2):
            for bond in atom.GetBonds():
                if bond.GetOtherAtomIdx(atom.GetIdx()) not in ring:
                    if bond.GetBondType() != Chem.BondType.SINGLE:
                        return ""
                    part = _cut(mol, atom, bond)
                    name = re.sub(r" \([^)]*\)$", "", name_group(part))
                    if name == part:
                        return ""
                    found.append((number, name))
        choices.append(sorted(found))
    best = min(choices, key=lambda found: ([number for number, _ in found], [name for _, name in found]))
    if not best:
        return ""
    pieces = []
    for name in sorted({name for _, name in best}):
        numbers = [str(number) for number, other in best if other == name]
        pieces.append(f"{','.join(numbers)}-{_TIMES[len(numbers)]}{_bracket(name)}")
    return "-".join(pieces) + "phenyl"


def _list_parts(names: list[str]) -> str:
    pieces = []
    for name in sorted(set(names)):
        pieces.append(_TIMES[names.count(name)] + _bracket(name))
    return "".join(pieces)


def _bracket(name: str) -> str:
    """Put a name with numbers or several parts in parentheses."""
    return f"({name})" if re.search(r"[\d(,]", name) or len(name) > 18 else name


def _alkyl_length(smiles: str) -> int:
    """Return the carbons of an unbranched alkyl group, 0 for anything else."""
    return len(smiles) - 1 if re.fullmatch(r"\*C+", smiles) else 0


def _cut(mol: Chem.Mol, atom: Chem.Atom, bond: Chem.Bond) -> str:
    """Return the group behind `bond` as seen from `atom`."""
    pieces = Chem.FragmentOnBonds(mol, [bond.GetIdx()], dummyLabels=[(0, 0)])
    start = bond.GetOtherAtomIdx(atom.GetIdx())
    fragments = Chem.GetMolFrags(pieces)
    members = next(f for f in fragments if start in f)
    return build_canonical_group(Chem.MolFragmentToSmiles(pieces, atomsToUse=list(members)))
