"""Names of groups: the table, names put together from parts, and the fallback."""

import csv
import doctest
from importlib import import_module
from importlib.resources import files

import pytest
from rdkit import Chem

from shiftpred.substituents.group_smiles import build_canonical_group
from shiftpred.substituents.names import load_group_names, name_group, name_ring_atom


def test_the_table_is_canonical_unique_and_says_where_names_come_from():
    text = files("shiftpred.substituents").joinpath("tables/group_names.csv").read_text(encoding="utf-8")
    rows = list(csv.DictReader(text.splitlines()))
    assert len(rows) >= 120
    assert len({r["smiles"] for r in rows}) == len({r["name"] for r in rows}) == len(rows)
    for row in rows:
        mol = Chem.MolFromSmiles(row["smiles"])
        assert mol is not None and Chem.MolToSmiles(mol) == row["smiles"] == build_canonical_group(row["smiles"])
        (dummy,) = [a for a in mol.GetAtoms() if a.GetAtomicNum() == 0]
        assert dummy.GetDegree() == 1 and row["source"].strip()
    assert load_group_names()["*OC(C)=O"] == "acetoxy"


@pytest.mark.parametrize(
    ("smiles", "name"),
    [
        ("*OC(C)=O", "acetoxy"),
        ("*[N+](=O)[O-]", "nitro"),
        ("*C(C)(C)C", "tert-butyl"),
        ("*c1ccccc1", "phenyl"),
        ("*c1ccc(C)cc1", "4-tolyl"),
        ("*Cc1ccccc1", "benzyl"),
        ("*OCc1ccccc1", "benzyloxy"),
        ("*C(=O)OC", "methoxycarbonyl"),
        ("*C(F)(F)F", "trifluoromethyl"),
        ("*N(C)C", "dimethylamino"),
        ("*C#N", "cyano"),
        ("*NC(=O)OC(C)(C)C", "Boc-amino"),
        ("*=O", "oxo"),
        ("*=C", "methylidene"),
    ],
)
def test_common_groups_have_their_plain_name(smiles, name):
    assert name_group(build_canonical_group(smiles)) == name


@pytest.mark.parametrize(
    ("smiles", "name"),
    [
        ("*CCCCCCCCCCCC", "dodecyl"),
        ("*C(=O)CCCCCC", "heptanoyl"),
        ("*OC(=O)CCCCCCCCCCCCCCC", "palmitoyloxy"),
        ("*CCOc1ccccc1", "2-phenoxyethyl"),
        ("*Oc1ccc(F)cc1", "4-fluorophenoxy"),
        ("*Cc1ccc(Cl)cc1", "4-chlorobenzyl"),
        ("*C(=O)c1ccc(Br)cc1", "4-bromobenzoyl"),
        ("*c1cc(OC)c(OC)c(OC)c1", "3,4,5-trimethoxyphenyl"),
        ("*c1ccc([N+](=O)[O-])cc1C", "2-methyl-4-nitrophenyl"),
        ("*S(=O)(=O)c1ccc(Br)cc1", "(4-bromophenyl)sulfonyl"),
        ("*N(C)CC", "ethyl(methyl)amino"),
        ("*C(F)(F)Cl", "chlorodifluoromethyl"),
        ("*CCCC(=O)OC", "3-methoxycarbonylpropyl"),
    ],
)
def test_other_groups_are_named_from_their_parts(smiles, name):
    assert name_group(build_canonical_group(smiles)) == name


@pytest.mark.parametrize("smiles", ["*C1C2CC1C2", "*:cc:[1*]", "*n1nnnc1CC", "*" + "C(C)" * 15 + "C", "nonsense"])
def test_a_group_without_a_name_keeps_its_smiles(smiles):
    assert name_group(smiles) == smiles


def test_a_name_says_neither_more_nor_less_than_the_group():
    """Groups that differ get different names."""
    smiles = "*OC *OCC *O *C=O *CC=O *CCO *C(C)O *C(=O)OC *OC(C)=O *NC *N(C)C *NCC *C(C)C *CCC *SC *S(C)=O *S(C)(=O)=O"
    smiles += " *c1ccccc1C *c1cccc(C)c1 *c1ccc(C)cc1 *Cc1ccccc1 *OCCCl *CCOC *C(C)OC *CC(C)O *CCCO *C(O)CC *C(=O)NC *NC(C)=O"
    smiles += " *C=C *C=CC *CC=C *C(C)=C *=C *=CC *#C *C#C"
    groups = [build_canonical_group(s) for s in smiles.split()]
    assert len({name_group(g) for g in groups}) == len(groups)


@pytest.mark.parametrize(
    ("symbol", "hydrogens", "name"),
    [("C", 2, "ring CH2"), ("c", 1, "aromatic CH"), ("n", 0, "aromatic N"), ("N+", 1, "ring NH+"), ("Si", 0, "ring Si")],
)
def test_ring_atoms_are_named_by_what_they_are(symbol, hydrogens, name):
    assert name_ring_atom(symbol, hydrogens) == name


@pytest.mark.parametrize("module", ["group_codes", "group_smiles", "model_groups", "names", "split"])
def test_the_examples_in_the_documentation_run(module):
    result = doctest.testmod(import_module(f"shiftpred.substituents.{module}"))
    assert result.attempted and not result.failed
