"""Trade names of common groups, for the sentence that says how a rival differs."""

from __future__ import annotations

from functools import lru_cache

from rdkit import Chem

_NAMES = {
    "*C": "methyl",
    "*CC": "ethyl",
    "*CCC": "propyl",
    "*C(C)C": "isopropyl",
    "*CCCC": "butyl",
    "*CC(C)C": "isobutyl",
    "*C(C)CC": "sec-butyl",
    "*C(C)(C)C": "tert-butyl",
    "*C1CC1": "cyclopropyl",
    "*C1CCCC1": "cyclopentyl",
    "*C1CCCCC1": "cyclohexyl",
    "*C=C": "vinyl",
    "*CC=C": "allyl",
    "*C#C": "ethynyl",
    "*CC#C": "propargyl",
    "*c1ccccc1": "phenyl",
    "*Cc1ccccc1": "benzyl",
    "*c1ccc(C)cc1": "p-tolyl",
    "*c1ccc(OC)cc1": "4-methoxyphenyl",
    "*c1ccc(F)cc1": "4-fluorophenyl",
    "*c1ccc(Cl)cc1": "4-chlorophenyl",
    "*c1ccncc1": "pyridin-4-yl",
    "*c1cccnc1": "pyridin-3-yl",
    "*c1ccccn1": "pyridin-2-yl",
    "*c1cccs1": "2-thienyl",
    "*c1ccsc1": "3-thienyl",
    "*c1ccco1": "2-furyl",
    "*F": "fluoro",
    "*Cl": "chloro",
    "*Br": "bromo",
    "*I": "iodo",
    "*O": "hydroxy",
    "*OC": "methoxy",
    "*OCC": "ethoxy",
    "*OCCC": "propoxy",
    "*OC(C)C": "isopropoxy",
    "*OCc1ccccc1": "benzyloxy",
    "*Oc1ccccc1": "phenoxy",
    "*OC(C)=O": "acetoxy",
    "*OC(=O)c1ccccc1": "benzoyloxy",
    "*OC(F)(F)F": "trifluoromethoxy",
    "*=O": "oxo",
    "*[O-]": "oxide",
    "*S": "sulfanyl",
    "*SC": "methylsulfanyl",
    "*S(C)=O": "methylsulfinyl",
    "*S(C)(=O)=O": "methylsulfonyl",
    "*S(N)(=O)=O": "sulfamoyl",
    "*S(=O)(=O)O": "sulfo",
    "*S(=O)(=O)c1ccc(C)cc1": "tosyl",
    "*N": "amino",
    "*NC": "methylamino",
    "*N(C)C": "dimethylamino",
    "*N(CC)CC": "diethylamino",
    "*NC(C)=O": "acetamido",
    "*NC(=O)OC(C)(C)C": "Boc-amino",
    "*Nc1ccccc1": "anilino",
    "*N1CCOCC1": "morpholino",
    "*N1CCCCC1": "piperidino",
    "*N1CCNCC1": "piperazinyl",
    "*N1CCN(C)CC1": "4-methylpiperazinyl",
    "*N1CCCC1": "pyrrolidino",
    "*[N+](=O)[O-]": "nitro",
    "*C#N": "cyano",
    "*N=C=O": "isocyanato",
    "*N=[N+]=[N-]": "azido",
    "*C=O": "formyl",
    "*C(C)=O": "acetyl",
    "*C(=O)CC": "propanoyl",
    "*C(=O)c1ccccc1": "benzoyl",
    "*C(=O)O": "carboxy",
    "*C(=O)OC": "methoxycarbonyl",
    "*C(=O)OCC": "ethoxycarbonyl",
    "*C(=O)OC(C)(C)C": "tert-butoxycarbonyl",
    "*C(N)=O": "carbamoyl",
    "*C(=O)NC": "methylcarbamoyl",
    "*C(=O)N(C)C": "dimethylcarbamoyl",
    "*C(F)(F)F": "trifluoromethyl",
    "*C(F)F": "difluoromethyl",
    "*C(Cl)(Cl)Cl": "trichloromethyl",
    "*CF": "fluoromethyl",
    "*CCl": "chloromethyl",
    "*CBr": "bromomethyl",
    "*CO": "hydroxymethyl",
    "*COC": "methoxymethyl",
    "*CN": "aminomethyl",
    "*CC#N": "cyanomethyl",
    "*CC(=O)O": "carboxymethyl",
    "*CC(=O)OC": "methoxycarbonylmethyl",
    "*COC(C)=O": "acetoxymethyl",
    "*CCO": "2-hydroxyethyl",
    "*C=Cc1ccccc1": "styryl",
    "*B(O)O": "borono",
    "*[Si](C)(C)C": "trimethylsilyl",
    "*O[Si](C)(C)C(C)(C)C": "TBS-oxy",
}

_LONGEST_SHOWN = 10
"""Heavy atoms; an unnamed group up to this size is written as SMILES."""


@lru_cache(maxsize=1)
def _names_by_smiles() -> dict[str, str]:
    return {Chem.CanonSmiles(smiles): name for smiles, name in _NAMES.items()}


def compute_group_name(mol: Chem.Mol, cut: int, first: int) -> str:
    """Return the trade name of the group that hangs on atom `cut` and starts with atom `first`.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        The whole molecule.
    cut, first : int
        0-based indices of two atoms joined by a bond outside all rings.

    Returns
    -------
    str
        'methyl', 'methoxycarbonyl', …; an unnamed small group as 'group *CCN' in SMILES with the open bond as '*'; an
        unnamed large one as 'acylamino group of 14 heavy atoms'.

    Examples
    --------
    >>> compute_group_name(Chem.MolFromSmiles("COc1ccccc1"), 2, 1)
    'methoxy'
    """
    bond = mol.GetBondBetweenAtoms(cut, first)
    pieces = Chem.FragmentOnBonds(mol, [bond.GetIdx()], addDummies=True, dummyLabels=[(0, 0)])
    atoms = next(group for group in Chem.GetMolFrags(pieces) if first in group)
    smiles = Chem.MolFragmentToSmiles(pieces, list(atoms), isomericSmiles=False)
    smiles = Chem.CanonSmiles(smiles) if Chem.MolFromSmiles(smiles) is not None else smiles
    name = _names_by_smiles().get(smiles)
    if name is not None:
        return name
    n_heavy = len(atoms) - 1
    if n_heavy <= _LONGEST_SHOWN:
        return f"group {smiles}"
    return f"{_head_word(mol, cut, first)} group of {n_heavy} heavy atoms"


def _head_word(mol: Chem.Mol, cut: int, first: int) -> str:
    """Say how a large group begins: 'acylamino', 'aryl', …"""
    atom = mol.GetAtomWithIdx(first)
    symbol = atom.GetSymbol()
    others = [other for other in atom.GetNeighbors() if other.GetIdx() != cut]
    if atom.GetIsAromatic():
        return "heteroaryl" if symbol != "C" or _ring_has_heteroatom(mol, first) else "aryl"
    if symbol == "C" and _has_oxo(atom):
        elements = {other.GetSymbol() for other in others if other.GetTotalDegree() > 1}
        return "carboxamide" if "N" in elements else "ester" if "O" in elements else "acyl"
    if symbol == "S" and _has_oxo(atom):
        return "sulfonyl"
    words = {"N": ("amino", "acylamino"), "O": ("oxy", "acyloxy"), "S": ("sulfanyl", "acylsulfanyl")}
    return words.get(symbol, ("alkyl", "alkyl"))[any(_has_oxo(other) for other in others)]


def _has_oxo(atom: Chem.Atom) -> bool:
    return any(
        bond.GetBondType() == Chem.BondType.DOUBLE and bond.GetOtherAtom(atom).GetSymbol() in ("O", "S")
        for bond in atom.GetBonds()
    )


def _ring_has_heteroatom(mol: Chem.Mol, index: int) -> bool:
    rings = (ring for ring in mol.GetRingInfo().AtomRings() if index in ring)
    return any(mol.GetAtomWithIdx(other).GetAtomicNum() != 6 for ring in rings for other in ring)
