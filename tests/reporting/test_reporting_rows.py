"""The CSV of `predict`: columns, quoting, failures, notes."""

from __future__ import annotations

import csv
import doctest
import importlib
import io
from dataclasses import replace

import pytest
import report_builders as build

from shiftpred.errors import StructureError
from shiftpred.records import RecordFailure
from shiftpred.reporting import (
    PREDICTION_COLUMNS,
    build_prediction_frame,
    build_prediction_rows,
    iterate_prediction_csv,
    render_prediction_csv,
)

CONTRACT = "molecule,atom,nucleus,hydrogen,attached_h,equivalent_atoms,shift_ppm,lower_ppm,upper_ppm,coverage,environment,note"


def _failure(name="3"):
    return RecordFailure(name, StructureError("structure 3", "'C(('", "a SMILES", "check\nthe brackets"))


def _read(text):
    return list(csv.DictReader(io.StringIO(text)))


def test_columns_are_the_contract_s():
    assert render_prediction_csv([]) == CONTRACT + "\n"
    assert ",".join(PREDICTION_COLUMNS) == CONTRACT


def test_one_row_a_site_and_nucleus():
    rows = _read(render_prediction_csv([build.build_prediction()]))
    assert len(rows) == 9 + 7  # nine carbons, seven atoms that bear hydrogen
    ortho = next(r for r in rows if r["atom"] == "11" and r["nucleus"] == "13C")
    assert ortho["equivalent_atoms"] == "7;11" and ortho["attached_h"] == "1" and ortho["hydrogen"] == ""
    assert float(ortho["lower_ppm"]) < float(ortho["shift_ppm"]) < float(ortho["upper_ppm"])
    assert ortho["environment"] == "aromatic CH"


def test_commas_quotes_and_line_ends_in_names_survive():
    name = 'a "crude", batch 2\nsecond line'
    rows = _read(render_prediction_csv([build.build_prediction(build.build_structure(name=name))]))
    assert {r["molecule"] for r in rows} == {name}


def test_a_failed_record_is_one_row_with_only_name_and_note():
    rows = _read(render_prediction_csv([build.build_prediction(), _failure("bad one"), build.build_prediction()]))
    row = rows[16]
    assert row["molecule"] == "bad one" and "check the brackets" in row["note"]
    assert [key for key, value in row.items() if value] == ["molecule", "note"]
    assert len(rows) == 16 + 1 + 16


def test_a_molecule_without_a_nucleus_is_not_dropped():
    structure = build.build_structure("[Na+].[Cl-]", "salt", ("2 components",))
    rows = _read(render_prediction_csv([build.build_prediction(structure, nuclei=())]))
    assert len(rows) == 1 and rows[0]["molecule"] == "salt"
    assert rows[0]["note"].startswith("2 components; nothing to predict")


def test_notes_on_the_molecule_reach_every_row_once():
    structure = build.build_structure(notes=("2 components",))
    prediction = build.build_prediction(structure, notes=("2 components", "no coordinates"))
    prediction = replace(prediction, nuclei=(replace(prediction.nuclei[0], note="labile"), *prediction.nuclei[1:]))
    rows = build_prediction_rows(prediction)
    assert rows[0]["note"] == "labile; 2 components; no coordinates"
    assert {r["note"] for r in rows[1:]} == {"2 components; no coordinates"}


def test_the_two_hydrogens_of_a_methylene_are_two_rows():
    prediction = build.build_prediction()
    methylene = next(n for n in prediction.nuclei if n.nucleus == "1H" and n.atom == 2)
    pair = tuple(replace(methylene, hydrogen=h) for h in "ab")
    rows = build_prediction_rows(replace(prediction, nuclei=pair))
    assert [(r["atom"], r["hydrogen"], r["attached_h"]) for r in rows] == [(2, "a", 2), (2, "b", 2)]


def test_the_stream_is_written_record_by_record():
    def records():
        yield build.build_prediction()
        raise RuntimeError("the second record was asked for")

    pieces = iterate_prediction_csv(records())
    assert next(pieces) == CONTRACT + "\n"
    assert next(pieces).count("\n") == 16
    with pytest.raises(RuntimeError):
        next(pieces)


def test_the_frame_has_the_same_rows_as_the_file():
    records = [build.build_prediction(), _failure()]
    frame = build_prediction_frame(records)
    rows = _read(render_prediction_csv(records))
    assert list(frame.columns) == list(PREDICTION_COLUMNS) and len(frame) == len(rows)
    assert frame.shift_ppm.iloc[0] == float(rows[0]["shift_ppm"])
    assert frame.atom.isna().iloc[-1] and frame.note.iloc[-1] == rows[-1]["note"]


@pytest.mark.parametrize(
    "module",
    [
        "wording",
        "saving",
        "summaries.common",
        "text.layout",
        "pictures.axis",
        "pictures.svg_elements",
    ],
)
def test_examples_in_docstrings_run(module):
    result = doctest.testmod(importlib.import_module(f"shiftpred.reporting.{module}"))
    assert result.failed == 0 and result.attempted > 0
