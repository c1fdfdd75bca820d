"""No number without a source: what the table reader refuses; and the constants that are put together from others."""

import csv
import io

import numpy as np
import pytest

from shiftpred.electronics import render_substituent_text, substituent
from shiftpred.electronics.fitting import load_published_means
from shiftpred.electronics.sourced_tables import load_rows, parse_rows
from shiftpred.errors import InputError

HEADER = "term,value,unit,source,verified\n"


def test_reader_returns_the_rows_as_they_stand():
    assert parse_rows("resonance_parameters", io.StringIO(HEADER + "C,0.1,dimensionless,made up,memory\n")) == (
        {"term": "C", "value": "0.1", "unit": "dimensionless", "source": "made up", "verified": "memory"},
    )


@pytest.mark.parametrize(
    "text, message",
    [
        (HEADER + "C,0.1,dimensionless, ,memory\n", r"line 2: got a blank source"),
        (HEADER + "C,0.1,dimensionless,a,memory\nN,0.1,dimensionless,,memory\n", r"line 3: got a blank source"),
        (HEADER + "C,0.1,dimensionless,made up,guessed\n", "verified = 'guessed'"),
        (HEADER + "C,0.1,dimensionless,made up,memory,more\n", "other cells"),
        (HEADER + "C,0.1,dimensionless\n", "other cells"),
        ("term,value,unit,source,verified,colour\n", "header: got the columns .*colour"),
        ("term,value,unit,verified\n", "expected the columns .*source"),
        ("", "header"),
    ],
)
def test_reader_refuses_numbers_without_origin(text, message):
    with pytest.raises(InputError, match=message):
        parse_rows("resonance_parameters", io.StringIO(text))


@pytest.mark.parametrize(
    "name",
    [
        "bond_energies",
        "elements",
        "gasteiger_marsili",
        "group_electronegativity",
        "inductive_parameters",
        "resonance_parameters",
        "substituent_constants",
    ],
)
def test_every_shipped_table_passes(name):
    assert load_rows(name)


def test_run_time_constants_are_the_published_ones():
    from shiftpred.bundles.locations import find_datasets

    with (find_datasets() / "published_constants" / "substituent_constants.csv").open(encoding="utf-8") as file:
        assert tuple(csv.DictReader(file)) == load_rows("substituent_constants")


def test_sigma_r_is_the_difference_where_both_are_published():
    nitro = substituent("*[N+](=O)[O-]")
    found = nitro.get("sigma_R")
    assert found.value == pytest.approx(nitro.get("sigma_para").value - nitro.get("sigma_I").value)
    assert found.origin == "computed" and "0.78 − 0.76" in found.source


def test_r_stands_in_for_sigma_r_elsewhere_and_says_so():
    constants = substituent("*OC(=O)C1CC1")
    found = constants.get("sigma_R")
    assert found.value == constants.get("R").value and "stand-in" in found.scale
    assert any(u.name == "sigma_R" for u in substituent("*=O").undefined)
    assert substituent("*[N+](C)(C)C").get("sigma_R") is None


def test_the_line_that_lets_r_stand_in():
    r, para, inductive = (load_published_means(name) for name in ("R", "sigma_para", "sigma_I"))
    both = [smiles for smiles in r if smiles in para and smiles in inductive]
    difference = np.array([para[s][1] - inductive[s][1] for s in both])
    slope, intercept = np.polyfit([r[s][1] for s in both], difference, 1)
    assert len(both) > 50
    assert (round(slope, 2), round(intercept, 2)) == (1.00, -0.01)
    assert round(float(np.corrcoef([r[s][1] for s in both], difference)[0, 1]), 2) == 0.98


def test_text_of_the_constants():
    constants = substituent("*OC(C)=O")
    assert str(constants) == render_substituent_text(constants).rstrip("\n")
    assert "sigma_R" in str(constants)
