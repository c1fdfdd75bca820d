"""A file's own assignment: two exchanged labels are found and named, a right one is left alone."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest

import shiftpred
from shiftpred.assignment.check_given_assignment import check_given_assignment, find_exchanged_labels
from shiftpred.peaks.nmredata import parse_nmredata
from shiftpred.pipeline import predict_structures

FILES = Path(__file__).resolve().parents[1] / "peaks" / "nmredata_files"
BENZOATE = (FILES / "ethyl_4-fluorobenzoate_1_1.nmredata.sdf").read_text(encoding="utf-8")
MENTHOL = (FILES / "menthol_1_0.nmredata.sdf").read_text(encoding="utf-8")


def exchange(text, first, second):
    """Exchange the shifts of two labels in the assignment."""
    rows = {label: re.search(rf"^{re.escape(label)}, (\S+?),", text, re.MULTILINE) for label in (first, second)}
    a, b = rows[first], rows[second]
    text = text.replace(a[0], f"{first}, {b[1]},", 1)
    return text.replace(b[0], f"{second}, {a[1]},", 1)


def check(text):
    (record,) = parse_nmredata(text)
    (prediction,) = predict_structures([record.structure], solvent=record.solvent)
    return find_exchanged_labels(prediction, record), check_given_assignment(prediction, record)


@pytest.mark.parametrize("text", [BENZOATE, MENTHOL], ids=["ethyl 4-fluorobenzoate", "menthol"])
def test_a_right_assignment_is_left_alone(text):
    assert check(text) == ((), ())


@pytest.mark.parametrize(
    ("text", "first", "second"),
    [(BENZOATE, "C1", "C2"), (BENZOATE, "Ci", "Cm"), (BENZOATE, "Ho", "Hm"), (MENTHOL, "C1", "C2"), (MENTHOL, "C6", "C8")],
)
def test_two_exchanged_labels_are_named_with_atoms_and_shifts(text, first, second):
    pairs, (sentence,) = check(exchange(text, first, second))
    assert [{p.first.label, p.second.label} for p in pairs] == [{first, second}]
    assert f"'{first}'" in sentence and f"'{second}'" in sentence and "exchanged" in sentence


def test_labels_that_the_file_calls_interchangeable_are_passed_over():
    exchanged = exchange(MENTHOL, "C1", "C2")
    assert len(check(exchanged)[0]) == 1
    assert check(exchanged.replace("Interchangeable=C7, C9", "Interchangeable=C1, C2"))[0] == ()


def test_compare_takes_peaks_from_the_file_and_names_the_exchanged_pair(tmp_path):
    path = tmp_path / "swapped.nmredata.sdf"
    path.write_text(exchange(BENZOATE, "C1", "C2").replace("298.0 K\\\n", "298.0 K\\\n\nlost\n"), encoding="utf-8")
    found = shiftpred.compare(str(path), rivals=2)
    assert [len(found.peaks[n].peaks) for n in ("13C", "1H")] == [7, 5]
    assert found.peaks["13C"].solvent == "CDCl3"
    assert sum("'C1' (atom 1)" in reason and "'C2' (atom 2)" in reason for reason in found.reasons) == 1
    assert any("'lost' behind a blank line" in caution and "line " in caution for caution in found.cautions)
    right = shiftpred.compare(BENZOATE, rivals=2)
    assert not any("exchanged" in reason for reason in right.reasons)


def test_the_command_line_takes_the_file_alone_or_other_peaks(tmp_path):
    from click.testing import CliRunner

    from shiftpred.cli import command

    path = tmp_path / "one.nmredata.sdf"
    path.write_text(BENZOATE, encoding="utf-8")
    alone = CliRunner().invoke(command, ["compare", str(path), "--rivals", "1", "--format", "json"])
    assert alone.exit_code == 0, alone.output
    document = json.loads(alone.stdout)
    assert [len(document["peaks"][n]["lines"]) for n in ("13C", "1H")] == [7, 5]
    assert len(document["assignments"]) == 11
    other = CliRunner().invoke(command, ["compare", str(path), "--rivals", "1", "--format", "json", "--c13", "61.1, 14.3"])
    assert [line["shift_ppm"] for line in json.loads(other.stdout)["peaks"]["13C"]["lines"]] == [61.1, 14.3]
    assert "1H" not in json.loads(other.stdout)["peaks"]
    bare = tmp_path / "bare.sdf"
    bare.write_text(BENZOATE.split(">  <")[0] + ">  <NMREDATA_VERSION>\n1.1\n\n$$$$\n", encoding="utf-8")
    assert CliRunner().invoke(command, ["compare", str(bare)]).exit_code == 2
