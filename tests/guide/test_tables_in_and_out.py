"""Tables as other programs write them: any column order, tabs, semicolons and decimal commas, Excel in and out."""

import csv

import pytest
from click.testing import CliRunner

from shiftpred.cli import command
from shiftpred.errors import PeakError
from shiftpred.peaks import parse_peaks
from shiftpred.structures import parse_structures
from shiftpred.triage.samples import parse_samples

HEAD = ["Solvent", "H1", "SMILES", "Sample", "C13"]
ROWS = [
    ["CDCl3", "", "CCOC(=O)c1ccccc1", "A-1", "166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3"],
    ["CDCl3", "", "COc1ccccn1", "=A-2", "162.5, 139.6, 138.5, 120.2, 105.9, 37.4"],
]


def write_text(path, delimiter, encoding="utf-8"):
    with open(path, "w", encoding=encoding, newline="") as handle:
        csv.writer(handle, delimiter=delimiter, lineterminator="\r\n").writerows([HEAD, *ROWS])
    return path


def write_workbook(path):
    openpyxl = pytest.importorskip("openpyxl")
    book = openpyxl.Workbook()
    for i, row in enumerate([HEAD, *ROWS], 1):
        for k, value in enumerate(row, 1):
            cell = book.active.cell(i, k)
            cell.value = value
            cell.data_type = "s"
    book.save(path)
    return path


@pytest.mark.parametrize("ending, delimiter", [(".csv", ","), (".csv", ";"), (".tsv", "\t")])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig"])
def test_samples_from_text_tables_in_any_order(tmp_path, ending, delimiter, encoding):
    samples = list(parse_samples(write_text(tmp_path / f"queue{ending}", delimiter, encoding)))
    assert [(s.name, s.structure, s.c13, s.h1, s.solvent) for s in samples] == [(r[3], r[2], r[4], "", r[0]) for r in ROWS]


def test_samples_from_a_workbook(tmp_path):
    samples = list(parse_samples(write_workbook(tmp_path / "queue.xlsx")))
    assert [(s.name, s.structure, s.c13, s.solvent) for s in samples] == [(r[3], r[2], r[4], r[0]) for r in ROWS]


@pytest.mark.parametrize("delimiter", [",", ";", "\t"])
def test_structures_from_tables_in_any_order_and_case(tmp_path, delimiter):
    read = list(parse_structures(write_text(tmp_path / "structures.csv", delimiter)))
    assert [r.mol.GetNumAtoms() for r in read] == [11, 8]


def test_workbook_in_and_out(tmp_path):
    openpyxl = pytest.importorskip("openpyxl")
    queue, night = write_workbook(tmp_path / "queue.xlsx"), tmp_path / "night"
    words = ["triage", str(queue), "--output", str(night), "--processes", "1", "--rivals", "2", "--format", "xlsx"]
    result = CliRunner().invoke(command, words)
    assert result.exit_code == 0, result.output
    with open(night / "summary.csv", encoding="utf-8", newline="") as handle:
        table = list(csv.reader(handle))
    sheet = openpyxl.load_workbook(night / "summary.xlsx").active
    rows = [[cell.value for cell in row] for row in sheet.iter_rows()]
    assert rows[0] == table[0] and len(rows) == len(table) == 3
    at = {name: k for k, name in enumerate(rows[0])}
    assert [row[at["judgement"]] for row in rows[1:]] == ["supported", "contradicted"]
    assert all(isinstance(row[at["probability"]], (int, float)) for row in rows[1:])
    assert [float(r[at["probability"]]) for r in table[1:]] == [row[at["probability"]] for row in rows[1:]]
    assert sheet.cell(3, 1).value == "=A-2" and sheet.cell(3, 1).data_type == "s"
    assert not [p.name for p in night.iterdir() if p.name.endswith(".part")]


@pytest.mark.parametrize("delimiter", [";", "\t"])
def test_decimal_commas_of_a_german_excel_are_read_and_said(delimiter):
    lines = [["Multiplicity", "J (Hz)", "Shift (ppm)", "Integral"], ["q", "7,1", "4,38", "2"], ["t", "7,1; 7,2", "1,39", "3,0"]]
    text = "\r\n".join(delimiter.join(f'"{c}"' if delimiter in c else c for c in row) for row in lines)
    read = parse_peaks(text, "1H")
    assert [p.shift_ppm for p in read.peaks] == [4.38, 1.39] and [p.hydrogens for p in read.peaks] == [2, 3]
    assert [p.couplings_hz for p in read.peaks] == [(7.1,), (7.1, 7.2)]
    assert "decimal commas read as decimal points" in read.notes


@pytest.mark.parametrize(
    "text",
    [
        "shift_ppm;multiplicity\n166,6;s\n132.8;d\n",  # points and commas: nobody can tell
        "shift_ppm,multiplicity\n166,6,s\n132,8,d\n",  # the comma is the delimiter
        "166,6; 132,8; 60,9",  # no table
    ],
)
def test_decimal_commas_elsewhere_are_refused_with_a_hint(text):
    with pytest.raises(PeakError) as caught:
        parse_peaks(text, "13C")
    assert "comma" in str(caught.value)


def test_assignments_in_a_decimal_comma_table_stay_lists():
    read = parse_peaks("shift_ppm;assignment\n129,5;7,11\n60,9;2\n", "13C")
    assert [p.assignment for p in read.peaks] == [(7, 11), (2,)]


def test_semicolon_table_with_decimal_commas_one_row_judged_one_refused(tmp_path):
    queue, night = tmp_path / "queue.csv", tmp_path / "night"
    queue.write_text(
        "sample;smiles;c13;frequency\r\nright;CCO;58.0, 18.2;400,13\r\nwrong;CCO;58,0;400,13\r\n", encoding="utf-8"
    )
    words = ["triage", str(queue), "--output", str(night), "--processes", "1", "--rivals", "1"]
    assert CliRunner().invoke(command, words).exit_code == 3
    with open(night / "summary.csv", encoding="utf-8", newline="") as handle:
        rows = {row["sample"]: row for row in csv.DictReader(handle)}
    assert rows["right"]["judgement"] and not rows["right"]["note"]
    assert not rows["wrong"]["judgement"] and "decimal comma" in rows["wrong"]["note"]


def test_unicode_text_of_excel(tmp_path):
    samples = list(parse_samples(write_text(tmp_path / "queue.txt", "\t", "utf-16")))
    assert [s.name for s in samples] == ["A-1", "=A-2"]


def test_table_without_openpyxl_is_refused_before_the_work(tmp_path, monkeypatch):
    import sys

    monkeypatch.setitem(sys.modules, "openpyxl", None)
    queue, night = write_text(tmp_path / "queue.csv", ","), tmp_path / "night"
    result = CliRunner().invoke(command, ["triage", str(queue), "--output", str(night), "--format", "xlsx"])
    assert result.exit_code == 2 and "shiftpred[tables]" in result.stderr and not night.exists()
