"""Equivalence by the substitution test, on textbook cases."""

import pytest
from rdkit import Chem

from shiftpred.structures import compute_equivalence, compute_sites, parse_structure


def groups(smiles):
    """Return the sets of equivalent atoms (0-based, only those with several) and the atoms whose hydrogens differ."""
    e = compute_equivalence(Chem.MolFromSmiles(smiles))
    members = {}
    for i, g in enumerate(e.group.tolist()):
        members.setdefault(g, set()).add(i)
    return sorted(map(sorted, (m for m in members.values() if len(m) > 1))), [i for i, d in enumerate(e.geminal_differ) if d]


@pytest.mark.parametrize("name, smiles, equal, differ", [
    ("valine: methyls diastereotopic", "CC(C)[C@H](N)C(=O)O", [], []),
    ("valine without drawn configuration", "CC(C)C(N)C(=O)O", [], []),
    ("isopropanol: methyls enantiotopic", "CC(C)O", [[0, 2]], []),
    ("acetone: homotopic", "CC(C)=O", [[0, 2]], []),
    ("dimethylformamide: slow rotation", "CN(C)C=O", [], []),
    ("trimethylamine", "CN(C)C", [[0, 2, 3]], []),
    ("glycerol: CH2 equal, their hydrogens not", "OCC(O)CO", [[0, 5], [1, 4]], [1, 4]),
    ("acetal: ethyls equal, OCH2 hydrogens not", "CCOC(C)OCC", [[0, 7], [1, 6], [2, 5]], [1, 6]),
    ("meso-tartaric acid", "OC(=O)[C@H](O)[C@@H](O)C(=O)O", [[0, 9], [1, 7], [2, 8], [3, 5], [4, 6]], []),
    ("tartaric acid", "OC(=O)[C@H](O)[C@H](O)C(=O)O", [[0, 9], [1, 7], [2, 8], [3, 5], [4, 6]], []),
    ("styrene: =CH2", "C=Cc1ccccc1", [[3, 7], [4, 6]], [0]),
    ("isobutene: methyls equal", "CC(C)=C", [[0, 2]], []),
    ("2-methyl-2-butene: methyls E and Z", "CC(C)=CC", [], []),
    ("acetone oxime: methyls E and Z", "CC(C)=NO", [], []),
    ("ethyl lactate: OCH2 hydrogens differ", "CCOC(=O)C(C)O", [], [1]),
    ("ethanol", "CCO", [], []),
    ("butane", "CCCC", [[0, 3], [1, 2]], []),
    ("cyclohexane", "C1CCCCC1", [[0, 1, 2, 3, 4, 5]], []),
    ("methylcyclohexane: every CH2, C-4 too", "CC1CCCCC1", [[2, 6], [3, 5]], [2, 3, 4, 5, 6]),
    ("cis-1,4-dimethylcyclohexane", "C[C@H]1CC[C@@H](C)CC1", [[0, 5], [1, 4], [2, 3, 6, 7]], [2, 3, 6, 7]),
    ("neopentane", "CC(C)(C)C", [[0, 2, 3, 4]], []),
    ("tert-butyl in a chiral molecule", "CC(C)(C)OC(=O)C(C)N", [[0, 2, 3]], []),
    ("ethylene", "C=C", [[0, 1]], []),
    ("formaldehyde", "C=O", [], []),
    ("p-xylene", "Cc1ccc(C)cc1", [[0, 5], [1, 4], [2, 3, 6, 7]], []),
    ("acetamide: NH2", "CC(N)=O", [], [2]),
    ("diethyl ether", "CCOCC", [[0, 4], [1, 3]], []),
    ("diisopropyl ether", "CC(C)OC(C)C", [[0, 2, 5, 6], [1, 4]], []),
    ("caffeine", "Cn1c(=O)c2c(ncn2C)n(C)c1=O", [], []),
    ("fumaric acid", "O=C(O)/C=C/C(=O)O", [[0, 6], [1, 5], [2, 7], [3, 4]], []),
])
def test_textbook_cases(name, smiles, equal, differ):
    found = groups(smiles)
    assert found[0] == equal, name
    assert found[1] == differ, name


def test_site_records():
    sites = compute_sites(parse_structure("CC(C)[C@H](N)C(=O)O"))
    assert sites[0].diastereotopic == (2,) and sites[0].equivalent == (0,)
    assert sites[4].labile and not sites[0].labile and sites[7].environment == "O-H, acid"


def test_deuterium_is_not_counted_as_hydrogen():
    structure = parse_structure("[2H]C([2H])([2H])O")
    site = compute_sites(structure)[0]
    assert (site.attached_h, site.deuterium) == (0, 3)
