"""Names of solvents in all spellings, their lines against the published table, impurities only as coherent sets."""

import csv

import pytest

from shiftpred.bundles.locations import find_datasets
from shiftpred.errors import SettingError
from shiftpred.peaks import impurity_sets, name_leftovers, normalise_solvent, reference_line, solvent_lines, water_line


@pytest.mark.parametrize(
    "text, name",
    [
        ("CDCl3", "CDCl3"),
        ("CDCl₃", "CDCl3"),
        ("chloroform-d", "CDCl3"),
        ("[D6]DMSO", "DMSO-d6"),
        ("DMSO-d₆", "DMSO-d6"),
        ("d6-DMSO", "DMSO-d6"),
        ("(CD3)2SO", "DMSO-d6"),
        ("MeOD", "CD3OD"),
        ("methanol-d4", "CD3OD"),
        ("CD3OD", "CD3OD"),
        ("(CD3)2CO", "acetone-d6"),
        ("benzene-d6", "C6D6"),
        ("MeCN-d3", "CD3CN"),
        ("cd2cl2", "CD2Cl2"),
        ("THF-d8", "THF-d8"),
        ("D₂O", "D2O"),
        ("Pyridine-d5", "pyridine-d5"),
        ("toluene-d8", "toluene-d8"),
    ],
)
def test_spellings(text, name):
    assert normalise_solvent(text) == name


def test_unknown_solvent_lists_the_names():
    with pytest.raises(SettingError, match="CDCl3.*DMSO-d6"):
        normalise_solvent("brine")


def test_lines_against_the_published_table():
    """Gottlieb 1997, Fulmer 2010 (transcribed): solvent, residual and water lines."""
    names = {
        "CDCl3 (solvent)": 77.16,
        "DMSO-d6 (solvent)": 39.52,
        "CD3OD (solvent)": 49.00,
        "C6D6 (solvent)": 128.06,
        "acetone-d6 (solvent)": 29.84,
    }
    seen = set()
    with open(find_datasets() / "measured_shifts" / "assigned_shifts.csv", encoding="utf-8") as handle:
        for row in csv.DictReader(handle):
            if row["name"] in names and row["nucleus"] == "13C" and float(row["shift_ppm"]) == names[row["name"]]:
                assert float(row["shift_ppm"]) in [x.shift_ppm for x in solvent_lines(row["solvent"], "13C")]
                seen.add(row["name"])
            if "(residual)" in row["name"]:
                assert float(row["shift_ppm"]) in [x.shift_ppm for x in solvent_lines(row["solvent"], "1H")]
            if row["name"] == "water":
                assert water_line(row["solvent"]).shift_ppm == float(row["shift_ppm"])
    assert seen == set(names)
    assert reference_line("CDCl3", "13C") == 77.16 and reference_line(None, "13C") is None


def test_every_row_has_a_source():
    sets = impurity_sets("CDCl3")
    assert len(sets) >= 60 and all(s.source for s in sets)


def test_ethyl_acetate_only_as_a_whole():
    """Its four 13C lines in CDCl3: 171.36, 60.49, 21.04, 14.19 (Gottlieb 1997, Fulmer 2010)."""
    lines = [171.36, 60.49, 21.04, 14.19]
    assert set(name_leftovers({"13C": lines}, "CDCl3").values()) == {"ethyl acetate"}
    assert "ethyl acetate" not in name_leftovers({"13C": lines[:2]}, "CDCl3").values()
    hidden = name_leftovers({"13C": lines[:3]}, "CDCl3", {"13C": [14.3]})
    assert list(hidden.values()) == ["ethyl acetate"] * 3


def test_both_nuclei_must_be_there_when_both_were_measured():
    carbon = [171.36, 60.49, 21.04, 14.19]
    assert not name_leftovers({"13C": carbon, "1H": []}, "CDCl3")
    both = name_leftovers({"13C": carbon, "1H": [4.12, 2.05, 1.26]}, "CDCl3")
    assert len(both) == 7 and set(both.values()) == {"ethyl acetate"}


def test_solvent_and_water():
    labels = name_leftovers({"13C": [39.5], "1H": [2.50, 3.34]}, "DMSO-d6")
    assert labels[("13C", 0)] == labels[("1H", 0)] == "solvent DMSO-d6" and "water" in labels[("1H", 1)]


def test_offset_is_taken_off_first():
    lines = [x + 1.0 for x in (171.36, 60.49, 21.04, 14.19)]
    assert not name_leftovers({"13C": lines}, "CDCl3")
    assert set(name_leftovers({"13C": lines}, "CDCl3", offset={"13C": 1.0}).values()) == {"ethyl acetate"}


def test_single_line_is_only_possible():
    assert name_leftovers({"1H": [2.17]}, "CDCl3")[("1H", 0)].startswith("possibly")


def test_unknown_line_stays_unnamed():
    assert name_leftovers({"13C": [99.0]}, "CDCl3") == {}


def test_the_solvent_is_no_impurity_in_itself():
    assert "chloroform" not in {s.name for s in impurity_sets("CDCl3")} and "chloroform" in {
        s.name for s in impurity_sets("DMSO-d6")
    }
    labels = name_leftovers({"13C": [77.16], "1H": [7.26]}, "CDCl3")
    assert set(labels.values()) == {"solvent CDCl3"}
