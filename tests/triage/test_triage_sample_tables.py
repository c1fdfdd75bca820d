"""Tables of samples that are damaged, hostile or merely unusual."""

import gzip
import io
import zipfile

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from shiftpred.errors import InputError
from shiftpred.triage import samples
from shiftpred.triage.samples import parse_samples

openpyxl = pytest.importorskip("openpyxl")
HEADER = "sample,smiles,c13,h1,solvent\n"
QUIET = settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))


def read(path):
    """Return the samples or the refusal; anything else is a fault."""
    try:
        return list(parse_samples(path))
    except InputError as error:
        return error


@QUIET
@given(content=st.one_of(st.binary(max_size=300), st.text(max_size=300).map(lambda t: (HEADER + t).encode("utf-8", "replace"))))
@pytest.mark.parametrize("name", ["t.csv", "t.tsv", "t.csv.gz", "t.xlsx"])
def test_any_bytes(tmp_path, name, content):
    path = tmp_path / name
    path.write_bytes(gzip.compress(content) if name.endswith(".gz") else content)
    read(path)


@QUIET
@given(
    rows=st.lists(st.lists(st.text(max_size=20), max_size=6), max_size=5),
    order=st.permutations(["sample", "smiles", "c13", "h1"]),
)
def test_any_cells_come_back_in_any_order_of_columns(tmp_path, rows, order):
    legal = openpyxl.cell.cell.ILLEGAL_CHARACTERS_RE
    book = openpyxl.Workbook()
    book.active.append(order)
    for row in rows:
        book.active.append([legal.sub("", cell) for cell in row])
    book.save(tmp_path / "t.xlsx")
    found = read(tmp_path / "t.xlsx")
    assert isinstance(found, InputError) or [s.number for s in found] == list(range(1, len(found) + 1))


@QUIET
@given(place=st.integers(0, 6000), byte=st.integers(0, 255))
def test_workbook_with_an_altered_byte(tmp_path, place, byte):
    buffer = io.BytesIO()
    book = openpyxl.Workbook()
    book.active.append(["sample", "smiles", "c13"])
    book.active.append(["a", "CCO", "58.0, 18.2"])
    book.save(buffer)
    content = bytearray(buffer.getvalue())
    content[place % len(content)] = byte
    (tmp_path / "t.xlsx").write_bytes(bytes(content))
    read(tmp_path / "t.xlsx")


@pytest.mark.parametrize("text", ["\ufeff" + HEADER + 'ä,CCO,"58.0, 18.2",,\r\n', HEADER + 'ä,CCO,"58.0, 18.2",,\n'])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-16", "latin-1"])
def test_encodings_and_line_ends(tmp_path, text, encoding):
    path = tmp_path / "t.csv"
    path.write_bytes(text.lstrip("\ufeff" if encoding != "utf-8" else "").encode(encoding))
    (found,) = parse_samples(path)
    assert (found.name, found.structure, found.c13) == ("ä", "CCO", "58.0, 18.2")


def test_torn_gzip(tmp_path):
    (tmp_path / "t.csv.gz").write_bytes(gzip.compress((HEADER + "a,CCO,58.0,,\n" * 500).encode())[:-20])
    with pytest.raises(InputError, match="cannot be read"):
        list(parse_samples(tmp_path / "t.csv.gz"))


def test_cell_beyond_all_measure(tmp_path):
    (tmp_path / "t.csv").write_text(HEADER + 'a,CCO,"' + "1" * 1_100_000 + '",,\n', encoding="utf-8")
    with pytest.raises(InputError, match="line 2.*cannot be read"):
        list(parse_samples(tmp_path / "t.csv"))


@pytest.mark.parametrize("name", ["t.csv", "t.csv.gz", "t.xlsx"])
def test_more_than_fits_is_refused_before_it_is_unpacked(tmp_path, monkeypatch, name):
    monkeypatch.setattr(samples, "_LARGEST_TABLE", 100_000)
    path = tmp_path / name
    if name == "t.csv":
        path.write_bytes(bytes(200_000))
    elif name == "t.csv.gz":
        path.write_bytes(gzip.compress(bytes(200_000)))
    else:
        with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
            archive.writestr("xl/workbook.xml", bytes(200_000))
    with pytest.raises(InputError, match="at most 100,000 bytes"):
        list(parse_samples(path))


def test_sheet_that_formatting_made_endless(tmp_path, monkeypatch):
    monkeypatch.setattr(samples, "_MOST_ROWS", 10)
    book = openpyxl.Workbook()
    book.active.append(["sample", "smiles", "c13"])
    book.active.cell(50, 1, "x")
    book.save(tmp_path / "t.xlsx")
    with pytest.raises(InputError, match="more than 10 rows"):
        list(parse_samples(tmp_path / "t.xlsx"))
