"""Structures from text and files, in every form that people have them; clear words for what cannot be read."""

import gzip

import pytest
from rdkit import Chem
from rdkit.Chem import AllChem

from shiftpred.errors import InputError, StructureError
from shiftpred.records import RecordFailure, Structure
from shiftpred.structures import parse_structure, parse_structures

PATTERN = r": got .+; expected .+\. Try: .+"


def read(source):
    return list(parse_structures(source))


def test_smiles_with_a_name():
    assert parse_structure("CCO ethanol").name == "ethanol" and parse_structure("CCO").name == "1"


def test_extended_smiles_does_no_harm():
    assert parse_structure("CCO |$a;b;c$| ethanol").smiles == "CCO"


def test_inchi():
    assert parse_structure("InChI=1S/C2H6O/c1-2-3/h3H,2H2,1H3").smiles == "CCO"


@pytest.mark.parametrize("ending", ["\n", "\r\n"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "latin-1"])
def test_smiles_file(tmp_path, ending, encoding):
    path = tmp_path / "some.smi"
    path.write_bytes(ending.join(["CCO ethanöl", "", "CC(C)=O", "C(C)(C)(C)(C)C bad", "c1ccccc1 benzene"]).encode(encoding))
    records = read(str(path))
    assert [getattr(r, "name", None) for r in records] == ["ethanöl", "2", "bad", "benzene"]
    assert isinstance(records[2], RecordFailure) and "line 4" in str(records[2].error)


def test_compressed_file(tmp_path):
    path = tmp_path / "some.smi.gz"
    path.write_bytes(gzip.compress(b"CCO a\nCCC b\n"))
    assert [r.name for r in read(path)] == ["a", "b"]


def test_table_with_any_column_order(tmp_path):
    path = tmp_path / "some.csv"
    path.write_text('note;SMILES;Name\n"x";CCO;ethanol\n;;\ny;;empty\nz;C1CC;bad\n')
    records = read(path)
    assert [r.name for r in records] == ["ethanol", "empty", "bad"]
    assert isinstance(records[1], RecordFailure) and "no structure" in str(records[1].error)


def test_table_without_the_column(tmp_path):
    path = tmp_path / "some.csv"
    path.write_text("a,b\n1,2\n")
    with pytest.raises(InputError, match="column `smiles`"):
        read(path)


@pytest.mark.parametrize("v3000", [False, True])
@pytest.mark.parametrize("ending", ["\n", "\r\n"])
def test_molfile_keeps_the_order_of_atoms(tmp_path, v3000, ending):
    mol = Chem.AddHs(Chem.MolFromSmiles("OCC"))
    AllChem.Compute2DCoords(mol)
    path = tmp_path / "some.mol"
    path.write_bytes(Chem.MolToMolBlock(mol, forceV3000=v3000).replace("\n", ending).encode())
    structure = parse_structure(path)
    assert (
        structure.smiles == "CCO" and structure.atom_numbers == (1, 2, 3) and structure.mol.GetAtomWithIdx(0).GetSymbol() == "O"
    )


def test_molfile_wedges_are_read(tmp_path):
    mol = Chem.MolFromSmiles("C[C@H](N)C(=O)O")
    AllChem.Compute2DCoords(mol)
    path = tmp_path / "some.mol"
    path.write_text(Chem.MolToMolBlock(mol))
    assert parse_structure(path).smiles == "C[C@H](N)C(=O)O"
    double = Chem.MolFromSmiles("C/C=C\\C")
    AllChem.Compute2DCoords(double)
    path.write_text(Chem.MolToMolBlock(double))
    assert parse_structure(path).smiles == "C/C=C\\C"


def test_sdf_with_a_bad_record(tmp_path):
    path = tmp_path / "some.sdf"
    block = Chem.MolToMolBlock(Chem.MolFromSmiles("CCO"))
    path.write_text(f"first{block}$$$$\nbroken\n\n\n nonsense\nM  END\n$$$$\nlast{block}> <x>\n1\n\n$$$$\n")
    records = read(path)
    assert [type(r) for r in records] == [Structure, RecordFailure, Structure]
    assert [r.name for r in records] == ["first", "broken", "last"]


def test_molfile_without_coordinates_is_read_and_noted(tmp_path):
    path = tmp_path / "some.mol"
    mol = Chem.MolFromSmiles("CCO")
    mol.AddConformer(Chem.Conformer(3))
    path.write_text(Chem.MolToMolBlock(mol))
    assert "no coordinates" in parse_structure(path).notes[0]


@pytest.mark.parametrize(
    "text, message",
    [
        ("C(C)(C)(C)(C)C", "atom 1 \\(C\\) with 5 bonds"),
        ("c1cccc1", "Kekulé.*\\[nH\\]"),
        ("xyz", "not a SMILES"),
        ("", "no structure"),
        ("*CC", "placeholder \\(atom 1"),
        ("[H][H]", "no heavy atom"),
        ("no_such_file.sdf", "no such file"),
        ("InChI=1S/x", "InChI"),
        ("C" * 1001, "1,001 heavy atoms"),
        ("[R1]CC", "not a SMILES|placeholder"),
        ("C1CC", "not a SMILES"),
        ("CC(", "not a SMILES"),
    ],
)
def test_what_cannot_be_read_is_said(text, message):
    with pytest.raises(StructureError, match=message) as caught:
        parse_structure(text)
    assert __import__("re").search(PATTERN, str(caught.value))


def test_empty_files(tmp_path):
    for name in ("a.smi", "a.csv", "a.sdf", "a.mol"):
        path = tmp_path / name
        path.write_text("")
        with pytest.raises(InputError, match="empty file"):
            read(path)


def test_molfile_without_atoms(tmp_path):
    path = tmp_path / "some.mol"
    path.write_text(Chem.MolToMolBlock(Chem.Mol()))
    with pytest.raises(StructureError, match="without atoms"):
        parse_structure(path)


@pytest.mark.parametrize(
    "smiles, note",
    [
        ("CC(=O)[O-].[Na+]", "2 components"),
        ("C[Sn](C)(C)C", "metal"),
        ("[2H]C(Cl)(Cl)Cl", "deuterium"),
        ("[13CH4]", "isotope"),
        ("C[CH2]", "radical"),
    ],
)
def test_notes(smiles, note):
    assert note in " ".join(parse_structure(smiles).notes)


def test_iterable_goes_on_after_a_bad_one():
    records = read(["CCO", "bad one", 5, Chem.MolFromSmiles("CCC")])
    assert [type(r) for r in records] == [Structure, RecordFailure, RecordFailure, Structure]


def test_records_read_before_are_handed_on():
    records = read(["CCO", "bad one"])
    assert [type(r) for r in read(records)] == [Structure, RecordFailure] and read(records)[1] is records[1]


def test_several_records_where_one_is_wanted(tmp_path):
    path = tmp_path / "some.smi"
    path.write_text("CCO\nCCC\n")
    with pytest.raises(StructureError, match="several records"):
        parse_structure(path)
