"""No peroxides from nowhere: known neighbourhoods and groups that survive."""

import gzip

import pytest
from rdkit import Chem

from shiftpred.errors import BundleError, StructureError
from shiftpred.structures.rivals import build_rivals, neighbourhoods
from shiftpred.structures.rivals.neighbourhoods import (
    TABLE_NAME,
    build_neighbourhood_table,
    compute_check_sum,
    compute_neighbourhoods,
    load_neighbourhood_table,
    load_wide_sums,
    save_neighbourhood_tables,
)
from shiftpred.structures.rivals.plausibility import FEWEST_COMPOUNDS, UNLIKELY_GROUPS, PlausibilityFilter


def _mol(smiles):
    return Chem.MolFromSmiles(smiles)


def test_neighbourhood_notation():
    words = compute_neighbourhoods(_mol("CC(=O)[O-]"))
    assert words == [
        "CD1H3(-CD3H0)",
        "CD3H0(-CD1H3 -O-D1H0 =OD1H0)",
        "OD1H0(=CD3H0)",
        "O-D1H0(-CD3H0)",
    ]
    assert compute_neighbourhoods(_mol("c1ccncc1"))[3] == "nD2H0(:cD2H1 :cD2H1)"
    assert compute_neighbourhoods(_mol("C1CC1"), radius=0) == ["CD2H2R"] * 3
    assert compute_neighbourhoods(_mol("CO"), radius=2) == [
        "CD1H3(-OD1H1)(-OD1H1(-CD1H3))",
        "OD1H1(-CD1H3)(-CD1H3(-OD1H1))",
    ]


def test_a_token_with_brackets_is_smarts():
    # every token of ethyl benzoate, read as SMARTS, finds its own atom
    mol = _mol("CCOC(=O)c1ccccc1")
    for index, token in enumerate(compute_neighbourhoods(mol, radius=0)):
        matches = mol.GetSubstructMatches(Chem.MolFromSmarts(f"[{token}]"))
        assert (index,) in matches


def test_the_order_of_atoms_does_not_matter():
    mol = _mol("CCOC(=O)c1ccccc1")
    turned = Chem.RenumberAtoms(mol, list(range(mol.GetNumAtoms()))[::-1])
    assert sorted(compute_neighbourhoods(mol, 2)) == sorted(compute_neighbourhoods(turned, 2))


def test_table_is_written_and_read_back(tmp_path, monkeypatch):
    counts, wide_sums, n_compounds = build_neighbourhood_table(["CCO", "CCO", "CO"])
    assert n_compounds == 3
    assert counts["CD2H2(-CD1H3 -OD1H1)"] == 2
    assert counts["CD1H3(-OD1H1)"] == 1
    assert compute_check_sum(compute_neighbourhoods(_mol("CO"), 2)[0]) in wide_sums
    (tmp_path / "tables").mkdir()
    save_neighbourhood_tables(tmp_path / "tables", counts, wide_sums, n_compounds)
    monkeypatch.setattr(neighbourhoods, "files", lambda package: tmp_path)
    load_neighbourhood_table.cache_clear()
    load_wide_sums.cache_clear()
    try:
        assert load_neighbourhood_table() == counts
        assert load_wide_sums() == wide_sums
        (tmp_path / "tables" / TABLE_NAME).write_bytes(b"not a table")
        load_neighbourhood_table.cache_clear()
        with pytest.raises(BundleError, match="install shiftpred again"):
            load_neighbourhood_table()
    finally:
        load_neighbourhood_table.cache_clear()
        load_wide_sums.cache_clear()


def test_a_bad_compound_is_named_by_its_row():
    with pytest.raises(StructureError, match="^compound 2: "):
        build_neighbourhood_table(["CCO", "c1cc"])


def test_shipped_table_states_its_origin_and_is_compact():
    from importlib.resources import files

    folder = files("shiftpred.structures.rivals") / "tables"
    text = gzip.decompress((folder / TABLE_NAME).read_bytes()).decode()
    assert "nmrshiftdb2" in text.splitlines()[1]
    assert sum(len((folder / name).read_bytes()) for name in (TABLE_NAME, "wide_neighbourhoods.bin.gz")) < 300_000
    # a common and an impossible environment
    assert load_neighbourhood_table()["CD1H3(-CD2H2)"] > 1000
    assert "OD2H0(-OD2H0 -OD2H0)" not in load_neighbourhood_table()


@pytest.mark.parametrize(
    ("group", "smiles"),
    [
        ("peroxide", "CCOOC(C)C"),
        ("hemiacetal", "CCOC(C)O"),
        ("hemiaminal", "CC(O)NC"),
        ("enol", "C=C(O)CCC"),
        ("carbamic acid", "CCNC(=O)O"),
        ("hypochlorite", "CCCOCl"),
        ("chloramine", "CCNCl"),
        ("allene", "CC=C=CC"),
        ("N-H imine", "CCC(C)=N"),
        ("geminal dichloride", "CCC(Cl)Cl"),
        ("alpha-chloro ether", "CCOCCl"),
        ("isobenzofuran", "c1ccc2cocc2c1"),
        ("cyclobutene", "C1=CCC1CC"),
    ],
)
def test_what_does_not_survive_is_refused(group, smiles):
    assert PlausibilityFilter(_mol("CCCCCC")).has_unlikely_group(_mol(smiles)), group
    # but a proposal that has it may keep it
    assert not PlausibilityFilter(_mol(smiles)).has_unlikely_group(_mol(smiles)), group


@pytest.mark.parametrize(
    "smiles",
    ["CC(=O)Nc1ccc(O)cc1", "Cn1c(=O)c2c(ncn2C)n(C)c1=O", "CC(=O)Oc1ccccc1C(=O)O", "NS(=O)(=O)c1ccccc1"],
)
def test_ordinary_compounds_pass(smiles):
    judge = PlausibilityFilter(_mol("CCCCCC"))
    assert not judge.has_unlikely_group(_mol(smiles))
    assert judge.compute_unknown_share(_mol(smiles)) == 0.0


def test_unlikely_groups_are_readable_smarts():
    names = [name for name, _ in UNLIKELY_GROUPS]
    assert len(set(names)) == len(names)
    assert all(Chem.MolFromSmarts(smarts) is not None for _, smarts in UNLIKELY_GROUPS)


def test_every_new_environment_of_every_rival_is_in_the_table():
    table = load_neighbourhood_table()
    for smiles in ("CC(=O)Nc1ccc(O)cc1", "CN[C@H]1CC[C@@H](c2ccc(Cl)c(Cl)c2)c2ccccc12", "CC(O)CC(N)C(=O)OC"):
        own = set(compute_neighbourhoods(_mol(smiles)))
        for rival in build_rivals(_mol(smiles), 60):
            for word in compute_neighbourhoods(_mol(rival.smiles)):
                assert word in own or table[word] >= FEWEST_COMPOUNDS, rival
