"""Files as other programs leave them: encodings, line ends, headers, damage; standard input; flat memory."""

import gzip
import io
import re
import tracemalloc
from pathlib import Path

import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem
from rdkit.Chem import AllChem

from shiftpred.errors import InputError, ShiftpredError, StructureError
from shiftpred.records import RecordFailure, Structure
from shiftpred.structures import parse_listed_structures, parse_structure, parse_structures

PATTERN = re.compile(r".+: got .+; expected .+\. Try: .+", re.DOTALL)


def write(folder, name, content):
    path = folder / name
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return path


def names_of(source):
    return [r.name for r in parse_structures(source)]


def block(smiles, title=""):
    mol = Chem.MolFromSmiles(smiles)
    AllChem.Compute2DCoords(mol)
    mol.SetProp("_Name", title)
    return Chem.MolToMolBlock(mol)


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "latin-1", "utf-16"])
@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("suffix", ["smi", "csv", "tsv", "txt"])
def test_encodings_and_line_ends(tmp_path, encoding, ending, suffix):
    mark = {"csv": ",", "tsv": "\t"}.get(suffix, " ")
    lines = [f"smiles{mark}name", f"CCO{mark}äthanol", f"CCC{mark}propan"]
    path = write(tmp_path, f"x.{suffix}", ending.join(lines).encode(encoding))
    assert names_of(path) == ["äthanol", "propan"]


def test_a_stray_byte_far_into_the_file_costs_nothing(tmp_path):
    content = b"CCO first\n" * 20_000 + b"CCO m\xfcde\n"
    *_, last = parse_structures(write(tmp_path, "x.smi", content))
    assert last.name == "müde"


@pytest.mark.parametrize("name", ["x.smi.gz", "x.csv.gz", "x.sdf.gz", "x.smi"])
def test_gzip_is_known_by_its_content(tmp_path, name):
    content = {"csv": "smiles\nCCO\n", "sdf": block("CCO") + "$$$$\n"}.get(name.split(".")[1], "CCO\n")
    assert [r.smiles for r in parse_structures(write(tmp_path, name, gzip.compress(content.encode())))] == ["CCO"]


def test_gzip_that_ends_too_soon(tmp_path):
    path = write(tmp_path, "x.smi.gz", gzip.compress(b"".join(b"CCO %d\n" % i for i in range(5000)))[:-500])
    records = parse_structures(path)
    with pytest.raises(InputError, match="ends too soon|ended before"):
        for _ in records:
            pass


@pytest.mark.parametrize(
    "content, expected",
    [
        ("sep=;\nname;smiles\nx;CCO\n", ["x"]),
        ("\n\nID,SMILES\n7,CCO\n", ["7"]),
        ("sample,smiles,name\ns,CCO,n\n", ["n"]),
        ('smiles,name\nCCO,"a, b"\n', ["a, b"]),
        ('smiles,name\nCCO,"two\nlines"\n', ["two\nlines"]),
        ("smiles;molecule\nCCO;\nCCC;p\n", ["1", "p"]),
        ("smiles,name\nCCO |$a$|,x\n", ["x"]),
        ("smiles\nCCO\nCCC\n", ["1", "2"]),
    ],
)
def test_tables(tmp_path, content, expected):
    assert names_of(write(tmp_path, "x.csv", content)) == expected


def test_a_quotation_mark_that_is_never_closed_is_said(tmp_path):
    records = list(parse_structures(write(tmp_path, "x.csv", 'smiles,name\nCCO,a\n"CCC,b\nCCN,c\n')))
    assert isinstance(records[0], Structure) and isinstance(records[1], RecordFailure)
    assert "row 2" in str(records[1].error) and "quotation" in str(records[1].error)


@pytest.mark.parametrize(
    "name, content, words",
    [
        ("x.smi", b"", "empty file"),
        ("x.smi", b"\n \n", "no structure"),
        ("x.csv", b"smiles\n", "without rows"),
        ("x.csv", b"a,b\n1,2\n", "column `smiles`"),
        ("x.sdf", b"\n\n", "no record"),
        ("x.xlsx", b"PK\x03\x04\x00\x00", "workbook"),
        ("x.bin", b"VjCD0100\x00\x00", "binary"),
        ("x.xml", b"<?xml version='1.0'?>", "XML"),
        ("x.gz", b"\x1f\x8b\x08\x00broken", "cannot be read|damaged"),
    ],
)
def test_files_that_hold_nothing_to_read(tmp_path, name, content, words):
    with pytest.raises(InputError, match=words) as caught:
        list(parse_structures(write(tmp_path, name, content)))
    assert PATTERN.match(str(caught.value))


def test_folder_and_missing_file(tmp_path):
    for source in (tmp_path, str(tmp_path)):
        with pytest.raises(InputError, match="a folder"):
            list(parse_structures(source))
    with pytest.raises(StructureError, match="no such file"):
        list(parse_structures(str(tmp_path / "none")))
    with pytest.raises(InputError, match="No such file"):
        list(parse_structures(tmp_path / "none.smi"))
    assert "none of this name" in str(next(parse_structures("data/mine")).error)


def test_an_existing_file_wins_over_a_smiles(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    write(tmp_path, "CCO", "CCC propane\n")
    assert parse_structure("CCO").smiles == "CCC"


@pytest.mark.parametrize("lines_before", [0, 2, 5])
def test_molfile_header_of_the_wrong_length(tmp_path, lines_before):
    text = "\n" * lines_before + block("CCO").split("\n", 3)[3]
    structure = parse_structure(write(tmp_path, "x.mol", text))
    assert structure.smiles == "CCO" and f"header has {lines_before} lines" in structure.notes[0] and structure.name == "1"


def test_molfile_that_lost_its_end_or_version(tmp_path):
    assert parse_structure(write(tmp_path, "x.mol", block("CCO").split("M  END")[0])).smiles == "CCO"
    assert parse_structure(write(tmp_path, "x.mol", block("CCO").replace(" V2000", ""))).smiles == "CCO"


@pytest.mark.parametrize(
    "change, words",
    [
        ((" O ", " R# "), "placeholder \\(atom 3"),
        ((" O ", " A  "), "placeholder \\(atom 3"),
        ((" O ", " Zz "), "cannot be read|placeholder"),
        (("  2  3  1", "  2  3  8"), "no definite order between atoms 2 and 3"),
        (("  2  3  1", "  2  9  1"), "cannot be read"),
        (("V2000", "V3000"), "cannot be read"),
    ],
)
def test_molfiles_that_are_refused(tmp_path, change, words):
    mol = Chem.MolFromSmiles("CCO")
    text = Chem.MolToMolBlock(mol)
    assert change[0] in text
    with pytest.raises(StructureError, match=words) as caught:
        parse_structure(write(tmp_path, "x.mol", text.replace(*change)))
    assert "record 1" in str(caught.value)


def test_reaction_file(tmp_path):
    record = next(parse_structures(write(tmp_path, "x.rxn", "$RXN\n\n\n\n  1  1\n$MOL\n" + block("CCO"))))
    assert "reaction" in str(record.error)


def test_molfile_text_and_files_without_a_known_ending(tmp_path):
    text = block("CCO", "e")
    assert parse_structure(text).name == "e"
    assert parse_structure(write(tmp_path, "structure", text)).name == "e"
    assert [r.smiles for r in parse_structures(text + "$$$$\n" + block("CCN"))] == ["CCO", "CCN"]
    assert [r.smiles for r in parse_structures("CCO a\nCCN b\n")] == ["CCO", "CCN"]


def test_molfile_in_three_dimensions(tmp_path):
    mol = Chem.AddHs(Chem.MolFromSmiles("C[C@H](N)C(=O)O"))
    AllChem.EmbedMolecule(mol, randomSeed=1)
    structure = parse_structure(write(tmp_path, "x.mol", Chem.MolToMolBlock(mol)))
    assert structure.smiles == "C[C@H](N)C(=O)O" and structure.atom_numbers == (1, 2, 3, 4, 5, 6)


def test_repeating_unit_is_noted(tmp_path):
    text = block("CCO").replace(
        "M  END",
        "M  STY  1   1 SRU\nM  SAL   1  1   2\nM  SBL   1  2   1   2\nM  SMT   1 n\nM  SDI   1  4   -0.5000   -0.5000   -0.5000    0.5000\n"
        "M  SDI   1  4    0.5000    0.5000    0.5000   -0.5000\nM  END",
    )
    assert "repeating unit" in " ".join(parse_structure(write(tmp_path, "x.mol", text)).notes)


class Pipe(io.BytesIO):
    """Standard input that has only bytes, as a pipe has."""


@pytest.mark.parametrize(
    "content, expected",
    [("CCO a\nCCN b\n", ["a", "b"]), ("smiles,name\nCCO,x\n", ["x"]), (block("CCO", "m"), ["m"]), ("\ufeffCCO\n", ["1"])],
)
def test_standard_input(monkeypatch, content, expected):
    class Stand:
        buffer = io.BufferedReader(Pipe(content.encode()))

    monkeypatch.setattr("sys.stdin", Stand())
    assert names_of("-") == expected


def test_empty_standard_input(monkeypatch):
    monkeypatch.setattr("sys.stdin", io.TextIOWrapper(io.BytesIO(b"")))
    with pytest.raises(InputError, match="standard input"):
        list(parse_structures("-"))


def test_tables_of_pandas():
    records = list(parse_structures(pd.DataFrame({"Smiles": ["CCO", "C(", None]})))
    assert [type(r) for r in records] == [Structure, RecordFailure, RecordFailure]
    assert [r.smiles for r in parse_structures(pd.Series(["CCO"]))] == ["CCO"]
    with pytest.raises(InputError, match="column `smiles`"):
        list(parse_structures(pd.DataFrame({"x": ["CCO"]})))


def test_list_of_files_molecules_and_texts(tmp_path):
    path = write(tmp_path, "x.smi", "CCO a\nCCC b\n")
    records = list(
        parse_structures([path, str(path), "CCN", Chem.MolFromSmiles("CCF"), tmp_path / "none.smi", None, float("nan")])
    )
    assert [r.name for r in records] == ["a", "b", "2", "3", "4", "5", "6", "7"]
    assert [isinstance(r, RecordFailure) for r in records] == [False, False, True, False, False, True, True, True]
    assert "never opened" in str(records[2].error)


def test_a_text_in_a_list_is_never_opened(tmp_path, monkeypatch):
    write(tmp_path, "CCO", "CCCCCC hexane\n")
    monkeypatch.chdir(tmp_path)
    assert [r.smiles for r in parse_structures(["CCO", Path("CCO")])] == ["CCO", "CCCCCC"]
    assert [s.smiles for s in parse_listed_structures(["CCO"])] == ["CCO"]
    assert parse_structure("CCO").smiles == "CCCCCC"
    with pytest.raises(StructureError, match="structure 2: got"):
        parse_listed_structures(["CCO", "-"])


@pytest.mark.parametrize("source", [None, 5, b"CCO"])
def test_what_is_no_source(source):
    with pytest.raises(StructureError, match="structure: got"):
        list(parse_structures(source))


def test_memory_stays_flat(tmp_path):
    path = write(tmp_path, "x.smi", "CCOC(=O)c1ccccc1 name\n" * 4000)
    tracemalloc.start()
    peaks = []
    for number, _ in enumerate(parse_structures(path)):
        if number in (500, 3900):
            peaks.append(tracemalloc.get_traced_memory()[1])
    tracemalloc.stop()
    assert peaks[1] < peaks[0] + 100_000


def test_nothing_is_printed(tmp_path, capfd):
    list(parse_structures(["C(", "c1cccc1", "CN(C)(C)(C)(C)C", "InChI=1S/x", "[H][H]", "[2H]C", "CC->[Pt]"]))
    list(parse_structures(write(tmp_path, "x.sdf", "\n\n\n  9  9  0  0  0  0  0  0  0  0999 V2000\n$$$$\n")))
    captured = capfd.readouterr()
    assert captured.out == "" and captured.err == ""


@pytest.mark.parametrize(
    "text, words",
    [
        ("CC(C", "parenthesis \\( at character 3 is not closed"),
        ("CC)C", "parenthesis \\) at character 3 was not opened"),
        ("C1CC", "ring 1 at character 2"),
        ("C%12CC", "ring 12 at character 2"),
        ("[C", "bracket \\[ at character 1"),
        ("C[Xx]", "'\\[Xx\\]' at character 2 names no element"),
        ("C[R1]", "names no element"),
        ("CCO.", "'.' at its end"),
        ("aspirin", "'a' at character 1"),
        ("CCO\x00", "null character"),
        ("BSYNRYMUTXBXSQ-UHFFFAOYSA-N", "InChIKey"),
        ("[NH4]C", "atom 1 \\(N\\) with 1 bond and 4 H"),
        ("C[O+](C)(C)C", "atom 2 \\(O, charge \\+1\\) with 4 bonds"),
    ],
)
def test_the_fault_is_named_with_its_place(text, words):
    with pytest.raises(StructureError, match=words) as caught:
        parse_structure(text)
    assert PATTERN.match(str(caught.value))


@pytest.mark.parametrize(
    "text", ["C" * 30_000, "(" * 9000 + "C" + ")" * 9000, "C(" * 3000 + "C" + ")" * 3000, "c1ccccc1" * 900, "[" * 5000]
)
def test_hostile_text_is_refused_soon(text):
    with pytest.raises(StructureError):
        parse_structure(text)


@settings(max_examples=150, deadline=None)
@given(st.text(max_size=40))
def test_any_text_gives_a_structure_or_a_documented_error(text):
    try:
        for record in parse_structures(text):
            if isinstance(record, RecordFailure):
                assert isinstance(record.error, ShiftpredError) and PATTERN.match(str(record.error))
    except ShiftpredError as error:
        assert PATTERN.match(str(error))


@settings(max_examples=150, deadline=None)
@given(st.lists(st.sampled_from(list("CNOScn()[]123=#+-@HF.*/\\%")), max_size=14).map("".join))
def test_anything_like_a_smiles_gives_a_structure_or_a_documented_error(text):
    try:
        record = next(parse_structures(f"{text} name"), None)
    except ShiftpredError as error:  # what begins like a path
        assert text[:1] in "/." and PATTERN.match(str(error))
        return
    if isinstance(record, RecordFailure):
        assert isinstance(record.error, ShiftpredError) and PATTERN.match(str(record.error))
    elif record is not None:
        assert Chem.MolFromSmiles(record.smiles) is not None


@settings(max_examples=100, deadline=None)
@given(st.integers(0, 400), st.integers(0, 255))
def test_a_changed_byte_in_a_molfile(tmp_path_factory, place, value):
    content = bytearray(block("C[C@H](N)C(=O)O").encode())
    content[place % len(content)] = value
    path = tmp_path_factory.mktemp("bytes") / "x.mol"
    path.write_bytes(bytes(content))
    try:
        for record in parse_structures(path):
            assert isinstance(record, Structure) or PATTERN.match(str(record.error))
    except ShiftpredError as error:
        assert PATTERN.match(str(error))
