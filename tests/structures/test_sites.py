"""Equivalence by the substitution test, on textbook cases."""

import time

import numpy as np
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


@pytest.mark.parametrize(
    "name, smiles, equal, differ",
    [
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
        ("(E)-1-bromo-2-chloroethene", "Br/C=C/Cl", [], []),
        ("trans-1,4-dimethylcyclohexane", "C[C@H]1CC[C@H](C)CC1", [[0, 5], [1, 4], [2, 3, 6, 7]], [2, 3, 6, 7]),
        ("cis-1,2-dimethylcyclohexane", "C[C@H]1CCCC[C@H]1C", [[0, 7], [1, 6], [2, 5], [3, 4]], [2, 3, 4, 5]),
        ("cis,cis-1,3,5-trimethylcyclohexane", "C[C@H]1C[C@@H](C)C[C@@H](C)C1", [[0, 4, 7], [1, 3, 6], [2, 5, 8]], [2, 5, 8]),
        ("cis,trans-1,3,5-trimethylcyclohexane", "C[C@H]1C[C@@H](C)C[C@H](C)C1", [[0, 4], [1, 3], [5, 8]], [2, 5, 8]),
        ("xylitol", "OC[C@H](O)[C@@H](O)[C@H](O)CO", [[0, 9], [1, 8], [2, 6], [3, 7]], [1, 8]),
        ("arabitol: no symmetry", "OC[C@H](O)[C@@H](O)[C@@H](O)CO", [], [1, 8]),
        ("norbornane: exo and endo, bridge alike", "C1CC2CCC1C2", [[0, 1, 3, 4], [2, 5]], [0, 1, 3, 4]),
        ("7-methylnorbornadiene: syn and anti", "CC1C2C=CC1C=C2", [[2, 5], [3, 4], [6, 7]], []),
        (
            "bicyclo[2.2.1]heptane-2,5-dione: bridge hydrogens alike by rotation",
            "O=C1CC2CC1CC2=O",
            [[0, 8], [1, 7], [2, 6], [3, 5]],
            [2, 6],
        ),
        ("adamantane", "C1C2CC3CC1CC(C2)C3", [[0, 2, 4, 6, 8, 9], [1, 3, 5, 7]], []),
        ("phenyl in a chiral molecule", "C[C@H](N)c1ccccc1", [[4, 8], [5, 7]], []),
        ("pinene: bridge methyls apart", "CC1=CCC2CC1C2(C)C", [], [3, 5]),
        ("menthone: isopropyl", "CC1CCC(C(C)C)C(=O)C1", [], [2, 3, 10]),
        ("diethylamine on a chiral acyl: ethyls apart, all CH2 differ", "CCN(CC)C(=O)C(C)O", [], [1, 3]),
        ("triethylamine", "CCN(CC)CC", [[0, 4, 6], [1, 3, 5]], []),
        ("diethylacetamide: ethyls apart", "CCN(CC)C(C)=O", [], []),
        ("N-acetylmorpholine: arms apart", "CC(=O)N1CCOCC1", [], []),
        ("N-Boc-piperidine: arms exchange", "CC(C)(C)OC(=O)N1CCCCC1", [[0, 2, 3], [8, 12], [9, 11]], []),
        ("N-benzylpiperidine", "C(c1ccccc1)N1CCCCC1", [[2, 6], [3, 5], [8, 12], [9, 11]], []),
        ("tetramethylurea", "CN(C)C(=O)N(C)C", [[0, 2, 6, 7], [1, 5]], []),
        ("N-nitrosodimethylamine", "CN(C)N=O", [], []),
        ("dimethylthioacetamide", "CN(C)C(C)=S", [], []),
        ("dimethylmethanesulfonamide", "CN(C)S(C)(=O)=O", [[0, 2], [5, 6]], []),
        ("urea: NH2 turn", "NC(N)=O", [[0, 2]], []),
        ("diethyl sulfite: OCH2", "CCOS(=O)OCC", [[0, 7], [1, 6], [2, 5]], [1, 6]),
        ("diethyl phosphite: OCH2", "CCOP(=O)OCC", [[0, 7], [1, 6], [2, 5]], [1, 6]),
        ("triethyl phosphate: OCH2 alike", "CCOP(=O)(OCC)OCC", [[0, 7, 10], [1, 6, 9], [2, 5, 8]], []),
        ("monoethyl phosphate: P-OH exchange", "CCOP(=O)(O)OC", [], []),
        ("methyl ethyl sulfoxide", "CCS(C)=O", [], [1]),
        ("diethyl sulfoxide: alike by a mirror, each CH2 with two hydrogens", "CCS(=O)CC", [[0, 5], [1, 4]], [1, 4]),
        ("diisopropyl sulfoxide: methyls apart", "CC(C)S(=O)C(C)C", [[0, 6], [1, 5], [2, 7]], []),
        ("1,3-dimethylimidazolium: resonance", "Cn1cc[n+](C)c1", [[0, 5], [1, 4], [2, 3]], []),
        ("acetate: resonance", "CC(=O)[O-]", [[2, 3]], []),
        ("nitrobenzene: resonance", "O=[N+]([O-])c1ccccc1", [[0, 2], [4, 8], [5, 7]], []),
        ("penta-2,3-diene: chiral axis", "CC=C=CC", [[0, 4], [1, 3]], []),
        ("ethyl on a chiral axis", "CC=C=CCC", [], [4]),
        ("1,2-butadiene: terminal hydrogens mirror images", "CC=C=C", [], []),
        ("methylenecyclohexane", "C=C1CCCCC1", [[2, 6], [3, 5]], []),
        ("4-methylmethylenecyclohexane: =CH2 mirror images", "C=C1CCC(C)CC1", [[2, 7], [3, 6]], [2, 3, 6, 7]),
        ("formaldehyde oxime", "C=NO", [], [0]),
        ("two components, alike", "CCO.CCO", [[0, 3], [1, 4], [2, 5]], []),
        ("a chiral ion does not split its partner", "CC[NH3+].C[C@H](O)C(=O)[O-]", [[7, 8]], []),
    ],
)
def test_textbook_cases(name, smiles, equal, differ):
    found = groups(smiles)
    assert found[0] == equal, name
    assert found[1] == differ, name


@pytest.mark.parametrize("spin", [False, True])
def test_stereo_is_read_in_any_atom_order(spin):
    """cis,trans-1,3,5-trimethylcyclohexane has one methyl of its own, whichever way it is written."""
    mol = Chem.MolFromSmiles("C[C@H]1C[C@@H](C)C[C@H](C)C1")
    order = np.random.default_rng(3).permutation(mol.GetNumAtoms()).tolist() if spin else list(range(mol.GetNumAtoms()))
    found = compute_equivalence(Chem.RenumberAtoms(mol, order))
    assert sorted(np.unique(found.group, return_counts=True)[1].tolist()) == [1, 1, 1, 2, 2, 2]


@pytest.mark.parametrize(
    "smiles, most_seconds",
    [
        ("C" + "C(C)(C)C" * 240 + "C", 2),
        ("F" + "C(F)(F)" * 330 + "F", 2),
        ("C" + "CC(C)" * 320, 2),
        ("C1" + "C(C)(C)" * 200 + "1", 5),
        ("C(C(C(C(C)C)C(C)C)C(C(C)C)C(C)C)(C(C(C(C)C)C(C)C)C(C(C)C)C(C)C)C(C(C(C)C)C(C)C)C(C(C)C)C(C)C", 2),
        (
            "c12c3c4c5c1c1c6c7c2c2c8c3c3c9c4c4c%10c5c5c1c1c6c6c%11c7c2c2c7c8c3c3c8c9c4c4c9c%10c5c5c1c1c6c6c%11c2c2c7c3c3c8c4c4c9c5c1c1c6c2c3c41",
            2,
        ),
        ("[Fe+2].c1cc[cH-]c1.c1cc[cH-]c1", 2),
    ],
)
def test_hard_symmetric_molecules_take_bounded_time(smiles, most_seconds):
    mol = parse_structure(smiles).mol
    start = time.process_time()
    compute_equivalence(mol)
    assert time.process_time() - start < most_seconds


def test_site_records():
    sites = compute_sites(parse_structure("CC(C)[C@H](N)C(=O)O"))
    assert sites[0].diastereotopic == (2,) and sites[0].equivalent == (0,)
    assert sites[4].labile and not sites[0].labile and sites[7].environment == "O-H, acid"


def test_deuterium_is_not_counted_as_hydrogen():
    structure = parse_structure("[2H]C([2H])([2H])O")
    site = compute_sites(structure)[0]
    assert (site.attached_h, site.deuterium) == (0, 3)


def test_deuterium_tells_atoms_apart():
    sites = compute_sites(parse_structure("CS(=O)C([2H])([2H])[2H]"))
    assert [s.equivalent for s in sites if s.element == "C"] == [(0,), (3,)]
    assert [s.attached_h for s in sites if s.element == "C"] == [3, 0]


def test_labile_hydrogens():
    sites = compute_sites(parse_structure("OCC(S)C(N)C(=O)C=O"))
    assert [s.atom for s in sites if s.labile] == [1, 4, 6]
