"""`shiftpred predict`: formats, streams, failed records, exit codes."""

from __future__ import annotations

import csv
import io
import json
import os

import jsonschema
import pytest

from shiftpred.cli.batches import BATCH, Tally, iterate_outcomes
from shiftpred.errors import StructureError
from shiftpred.records import RecordFailure
from shiftpred.reporting import PREDICTION_COLUMNS, load_schema

pytestmark = pytest.mark.usefixtures("made_up_model")


def _rows(text):
    return list(csv.DictReader(io.StringIO(text)))


def test_csv_has_the_contract_s_columns_and_rows(run):
    result = run("predict", "CCO", "--format", "csv")
    assert result.exit_code == 0 and result.stderr == ""
    assert result.stdout.splitlines()[0] == ",".join(PREDICTION_COLUMNS)
    assert [(r["atom"], r["shift_ppm"]) for r in _rows(result.stdout)] == [("1", "1.0"), ("2", "2.0")]


def test_the_table_is_the_default_and_names_the_model(run):
    result = run("predict", "CCO", "--solvent", "CDCl3", "--coverage", "0.5")
    assert result.exit_code == 0
    assert "made up 1" in result.stdout and "in CDCl3" in result.stdout and "interval 50 %" in result.stdout


def test_json_keeps_to_the_schema(run):
    document = json.loads(run("predict", "CCO", "--format", "json").stdout)
    jsonschema.validate(document, load_schema("prediction-1"))
    assert document["molecules"][0]["nuclei"][0]["shift_ppm"] == 1.0


def test_html_is_one_page(run):
    page = run("predict", "CCO", "--format", "html").stdout
    assert page.startswith("<!DOCTYPE html>") and page.rstrip().endswith("</html>")


@pytest.mark.parametrize("format_", ["csv", "table", "json", "html"])
def test_a_bad_record_costs_one_row_and_the_run_goes_on(run, tmp_path, format_):
    path = tmp_path / "many.smi"
    path.write_text("CCO good\nC(( bad\nCC last\n")
    result = run("predict", str(path), "--format", format_)
    assert result.exit_code == 3
    assert result.stderr == "shiftpred: 1 of 3 records failed; its row says why\n"
    if format_ == "csv":
        rows = _rows(result.stdout)
        assert [r["molecule"] for r in rows] == ["good", "good", "2", "last", "last"] or rows[2]["molecule"] == "bad"
        assert [key for key, value in rows[2].items() if value] == ["molecule", "note"]
    elif format_ == "json":
        molecules = json.loads(result.stdout)["molecules"]
        assert [m["structure"] is None for m in molecules] == [False, True, False]
    else:
        assert "last" in result.stdout and "not predicted" in result.stdout


def test_standard_input_and_files_are_read_alike(run, tmp_path):
    path = tmp_path / "two.smi"
    path.write_text("CCO a\nCC b\n")
    from_file = run("predict", str(path), "--format", "csv").stdout
    assert run("predict", "-", "--format", "csv", stdin="CCO a\nCC b\n").stdout == from_file


def test_output_goes_to_the_file_whose_ending_says_the_format(run, tmp_path):
    for ending, beginning in ((".csv", "molecule,"), (".json", "{"), (".html", "<!DOCTYPE"), (".dat", "1   CCO")):
        path = tmp_path / f"out{ending}"
        result = run("predict", "CCO", "--output", str(path))
        assert result.exit_code == 0 and result.stdout == ""
        assert path.read_text().startswith(beginning)
    assert sorted(os.listdir(tmp_path)) == ["out.csv", "out.dat", "out.html", "out.json"]


def test_an_explicit_format_wins_over_the_ending(run, tmp_path):
    run("predict", "CCO", "--format", "json", "--output", str(tmp_path / "out.csv"))
    assert (tmp_path / "out.csv").read_text().startswith("{")


def test_a_run_that_fails_leaves_the_old_file(run, tmp_path, monkeypatch):
    path = tmp_path / "out.csv"
    path.write_text("old")
    empty = tmp_path / "empty.smi"
    empty.write_text("")
    assert run("predict", str(empty), "--output", str(path)).exit_code == 2
    assert path.read_text() == "old" and sorted(os.listdir(tmp_path)) == ["empty.smi", "out.csv"]


def test_records_are_predicted_in_batches_and_written_as_they_come(made_up_model, run, tmp_path):
    path = tmp_path / "many.smi"
    path.write_text("".join(f"CC m{i}\n" for i in range(2 * BATCH + 5)))
    rows = _rows(run("predict", str(path), "--format", "csv").stdout)
    assert len(rows) == 2 * (2 * BATCH + 5) and rows[-1]["molecule"] == f"m{2 * BATCH + 4}"
    assert made_up_model.calls == [0, BATCH, BATCH, 5]


def test_only_one_batch_is_held_at_a_time(made_up_model):
    from shiftpred.structures import parse_structure

    structure = parse_structure("CC")
    asked = 0

    def endless():
        nonlocal asked
        while True:
            asked += 1
            yield structure

    outcomes = iterate_outcomes(endless(), made_up_model.predict_structures, Tally())
    for _ in range(BATCH + 1):
        next(outcomes)
    assert asked == 2 * BATCH


def test_one_structure_that_cannot_be_predicted_does_not_cost_its_batch():
    from shiftpred.structures import parse_structure

    records = [parse_structure(s, name=s) for s in ("CC", "CO", "CN")]
    records.insert(1, RecordFailure("unread", StructureError("x", "y", "z", "w")))

    def predict(structures):
        if any(s.name == "CO" for s in structures):
            raise StructureError("structure CO", "too much oxygen", "less", "CC")
        return [s.name for s in structures]

    tally = Tally()
    outcomes = list(iterate_outcomes(records, predict, tally))
    assert outcomes[0] == "CC" and outcomes[3] == "CN"
    assert outcomes[1].name == "unread" and outcomes[2].name == "CO" and "too much oxygen" in str(outcomes[2].error)
    assert (tally.records, tally.failed, tally.faults) == (4, 2, 0)


def test_a_fault_of_ours_is_counted_not_hidden(run, monkeypatch, made_up_model):
    import shiftpred.pipeline

    def predict(structures, *args):
        structures = list(structures)
        if any(s.n_atoms == 3 for s in structures):
            raise ZeroDivisionError("three")
        return made_up_model.predict_structures(structures, *args)

    monkeypatch.setattr(shiftpred.pipeline, "predict_structures", predict)
    result = run("predict", "-", "--format", "csv", stdin="CC a\nCCO b\nCC c\n")
    rows = _rows(result.stdout)
    assert [r["molecule"] for r in rows] == ["a", "a", "b", "c", "c"] and "ZeroDivisionError: three" in rows[2]["note"]
    assert result.exit_code == 1 and "--traceback" in result.stderr
    result = run("predict", "-", "--format", "csv", "--traceback", stdin="CC a\nCCO b\nCC c\n")
    assert result.exit_code == 1 and "Traceback (most recent call last)" in result.stderr


def test_a_wrong_setting_stops_the_run_before_the_first_record(run):
    from shiftpred.errors import SettingError

    def refuse(structures):
        raise SettingError("coverage", "2", "less than 1", "0.9")

    with pytest.raises(SettingError):
        list(iterate_outcomes([RecordFailure("a", ValueError()), *_structures()], refuse, Tally()))


def _structures():
    from shiftpred.structures import parse_structure

    return [parse_structure("CC")]


def test_a_molecule_without_carbon_is_reported(run):
    rows = _rows(run("predict", "[Na+].[Cl-]", "--format", "csv").stdout)
    assert len(rows) == 1 and "nothing to predict" in rows[0]["note"]
