"""Names of solvents in all spellings, their lines against the published table, impurities only as coherent sets."""

import csv
import hashlib
import runpy
from pathlib import Path

import pytest

import shiftpred.peaks
from shiftpred.bundles.locations import find_datasets
from shiftpred.errors import SettingError
from shiftpred.peaks import (
    find_known_set,
    impurity_sets,
    is_deuterated_exchange,
    name_leftovers,
    normalise_solvent,
    reference_line,
    solvent_lines,
    water_line,
)
from shiftpred.peaks.solvents import load_table

WITH_COLUMN = ("CDCl3", "DMSO-d6", "CD3OD", "D2O", "acetone-d6", "C6D6", "CD3CN")
OWN = {
    *(f"{s} (solvent)" for s in WITH_COLUMN),
    *("CHCl3 in CDCl3 (residual)", "DMSO-d5 (residual)", "CHD2OD (residual)", "acetone-d5 (residual)", "C6D5H (residual)"),
    *("CHD2CN (residual)", "HDO (residual)", "water"),
}
"""Rows of the measured table that are lines of the solvent itself."""
ETHYL_ACETATE = {"13C": [171.36, 60.49, 21.04, 14.19], "1H": [4.12, 2.05, 1.26]}
"""In CDCl3 (Gottlieb 1997, Fulmer 2010)."""


@pytest.mark.parametrize(
    "text, name",
    [
        ("CDCl3", "CDCl3"),
        ("CDCl₃", "CDCl3"),
        ("chloroform-d", "CDCl3"),
        ("Deuterochloroform", "CDCl3"),
        ("CDCl3 + TMS", "CDCl3"),
        ("CDCl3/TMS (0.03 % v/v)", "CDCl3"),
        ("[D6]DMSO", "DMSO-d6"),
        ("[2H6]DMSO", "DMSO-d6"),
        ("DMSO-d₆", "DMSO-d6"),
        ("d6-DMSO", "DMSO-d6"),
        ("(CD3)2SO", "DMSO-d6"),
        ("MeOD", "CD3OD"),
        ("methanol-d4", "CD3OD"),
        ("CD3OD", "CD3OD"),
        ("[D4]methanol", "CD3OD"),
        ("(CD3)2CO", "acetone-d6"),
        ("acetone-d₆", "acetone-d6"),
        ("benzene-d6", "C6D6"),
        ("MeCN-d3", "CD3CN"),
        ("cd2cl2", "CD2Cl2"),
        ("THF-d8", "THF-d8"),
        ("D₂O", "D2O"),
        ("H2O/D2O 9:1", "D2O"),
        ("Pyridine-d5", "pyridine-d5"),
        ("toluene-d8", "toluene-d8"),
        ("trifluoroacetic acid-d", "TFA-d"),
        ("DMF-d7", "DMF-d7"),
        ("1,1,2,2-tetrachloroethane-d2", "C2D2Cl4"),
        ("CDCl3/CD3OD 1:1", "mixture"),
        ("CDCl3 and DMSO-d6", "mixture"),
        (None, None),
        ("  ", None),
    ],
)
def test_spellings(text, name):
    assert normalise_solvent(text) == name


@pytest.mark.parametrize("text", ["brine", "CDCl3/brine", "7", "/"])
def test_unknown_solvent_lists_the_names(text):
    with pytest.raises(SettingError, match="CDCl3.*DMSO-d6"):
        normalise_solvent(text)


def test_a_name_is_its_own_spelling():
    names = {line.solvent for n in ("13C", "1H") for s in WITH_COLUMN for line in solvent_lines(s, n)}
    assert {normalise_solvent(name) for name in names} == names == set(WITH_COLUMN)


def read_measured():
    with open(find_datasets() / "measured_shifts" / "assigned_shifts.csv", encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def test_lines_against_the_published_table():
    """Gottlieb 1997, Fulmer 2010 (transcribed): solvent, residual and water lines."""
    seen = set()
    for row in read_measured():
        shift, solvent = float(row["shift_ppm"]), row["solvent"]
        if "(solvent)" in row["name"] and "Babij" not in row["source"]:
            assert shift in [x.shift_ppm for x in solvent_lines(solvent, "13C")]
            seen.add(solvent)
        if "(residual)" in row["name"]:
            assert shift in [x.shift_ppm for x in solvent_lines(solvent, "1H")]
        if row["name"] == "water":
            assert water_line(solvent).shift_ppm == shift
    assert seen == set(WITH_COLUMN) - {"D2O"}
    assert reference_line("CDCl3", "13C") == 77.16 and reference_line(None, "13C") is None


def test_every_row_has_a_source_and_says_whether_it_was_seen():
    for solvent in (*WITH_COLUMN, None):
        for entry in impurity_sets(solvent):
            assert entry.source and entry.verified in ("transcription", "memory")
    with pytest.raises(ValueError, match="columns"):
        load_table("solvents.csv", ("solvent",))


def test_table_is_what_the_rules_make_of_the_measured_shifts():
    build = runpy.run_path(str(find_datasets() / "solvents_and_impurities" / "build_tables.py"))
    assert build["TARGET"].read_text(encoding="utf-8") == build["build_text"]()


def test_card_states_the_check_sums():
    folder = find_datasets() / "solvents_and_impurities"
    card = (folder / "README.md").read_text(encoding="utf-8")
    tables = Path(shiftpred.peaks.__file__).parent / "tables"
    for path in (tables / "impurities.csv", tables / "solvents.csv", tables / "sources.csv", folder / "additions.csv"):
        assert hashlib.sha256(path.read_bytes()).hexdigest() in card, path.name


def test_every_line_that_was_seen_is_in_the_measured_table():
    measured = {(r["name"], r["solvent"], r["nucleus"], float(r["shift_ppm"])) for r in read_measured()}
    seen = [
        (s.name, s.solvent, x.nucleus, x.shift_ppm)
        for solvent in WITH_COLUMN
        for s in impurity_sets(solvent)
        for x in s.all_lines
        if x.verified == "transcription"
    ]
    assert len(seen) > 1500 and set(seen) <= measured
    own = [
        line
        for s in WITH_COLUMN
        for n in ("13C", "1H")
        for line in (*solvent_lines(s, n), *([water_line(s)] if n == "1H" else ()))
    ]
    verified = {(r["solvent"], r["nucleus"], float(r["shift_ppm"])): r["verified"] for r in read_measured() if r["name"] in OWN}
    for line in own:
        assert line.verified == verified[line.solvent, line.nucleus, line.shift_ppm], line


def test_suspected_misprints_are_not_in_the_table():
    for row in read_measured():
        if "suspect" in row["note"] and row["name"] != "BHT":
            for entry in impurity_sets(row["solvent"]):
                assert entry.name != row["name"] or float(row["shift_ppm"]) not in entry.lines.get(row["nucleus"], ())
    pyridine = next(s for s in impurity_sets("CD3CN") if s.name == "pyridine")
    assert 124.77 in pyridine.lines["13C"] and 127.76 not in pyridine.lines["13C"]


def test_sets_are_whole():
    sets = {s.name: s for s in impurity_sets("CDCl3")}
    assert len(sets) >= 85
    assert len(sets["N,N-dimethylformamide"].lines["13C"]) == 3 and len(sets["toluene"].lines["13C"]) == 5
    assert not sets["ethyl acetate"].incomplete and sets["triphenylphosphine oxide"].incomplete == ("13C",)
    assert 1.32 not in sets["ethanol"].lines["1H"] and any(x.labile for x in sets["ethanol"].all_lines)
    assert not any(x.labile for s in impurity_sets("CD3OD") for x in s.all_lines)


def test_the_solvent_is_no_impurity_in_itself():
    assert "chloroform" not in {s.name for s in impurity_sets("CDCl3")}
    assert "chloroform" in {s.name for s in impurity_sets("DMSO-d6")}


def test_values_are_borrowed_where_the_solvent_has_no_column():
    sets = {s.name: s for s in impurity_sets("toluene-d8")}
    assert sets["ethyl acetate"].borrowed and sets["ethyl acetate"].solvent == "C6D6"
    assert {s.name: s for s in impurity_sets("CD2Cl2")}["ethyl acetate"].solvent == "CDCl3"
    own = {s.name: s for s in impurity_sets("CDCl3")}["ethyl acetate"]
    assert not own.borrowed and own.all_lines[0].tolerance_ppm < sets["ethyl acetate"].all_lines[0].tolerance_ppm
    assert "n-hexane" not in {s.name for s in impurity_sets("D2O")}


# Naming.


def test_ethyl_acetate_only_as_a_whole():
    lines = ETHYL_ACETATE["13C"]
    assert set(name_leftovers({"13C": lines}, "CDCl3").values()) == {"ethyl acetate"}
    for k in range(4):
        left_out = [x for i, x in enumerate(lines) if i != k]
        assert "ethyl acetate" not in name_leftovers({"13C": left_out}, "CDCl3").values()
    hidden = name_leftovers({"13C": lines[:3]}, "CDCl3", {"13C": [14.3]})
    assert list(hidden.values()) == ["ethyl acetate"] * 3


def test_ethyl_benzoate_wet_with_ethyl_acetate():
    """Bench case 1; the assigned lines are of ethyl benzoate, from memory."""
    own = [166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3]
    labels = name_leftovers({"13C": ETHYL_ACETATE["13C"]}, "CDCl3", {"13C": own})
    assert labels == {("13C", k): "ethyl acetate" for k in range(4)}


def test_both_nuclei_must_be_there_when_both_were_measured():
    assert not name_leftovers({"13C": ETHYL_ACETATE["13C"], "1H": []}, "CDCl3")
    both = name_leftovers(ETHYL_ACETATE, "CDCl3")
    assert len(both) == 7 and set(both.values()) == {"ethyl acetate"}


def test_a_trace_that_only_the_1h_spectrum_shows_is_called_possible():
    labels = name_leftovers({"13C": [], "1H": ETHYL_ACETATE["1H"]}, "CDCl3")
    assert set(labels.values()) == {"possibly ethyl acetate"} and len(labels) == 3


def test_acetone_needs_both_carbons_and_one_proton_line_is_only_possible():
    assert set(name_leftovers({"13C": [207.07, 30.92]}, "CDCl3").values()) == {"acetone"}
    assert not name_leftovers({"13C": [207.07]}, "CDCl3")
    assert name_leftovers({"1H": [2.17]}, "CDCl3") == {("1H", 0): "possibly acetone"}


def test_solvent_and_water():
    """Paracetamol's leftovers in DMSO-d6, bench case 3."""
    labels = name_leftovers({"13C": [39.5], "1H": [2.50, 3.33]}, "DMSO-d6")
    assert labels == {("13C", 0): "solvent DMSO-d6", ("1H", 0): "solvent DMSO-d6", ("1H", 1): "water"}


@pytest.mark.parametrize("solvent", [s for s in WITH_COLUMN if s != "D2O"])
def test_water_at_its_place_in_each_solvent(solvent):
    assert name_leftovers({"1H": [water_line(solvent).shift_ppm + 0.04]}, solvent) == {("1H", 0): "water"}


def test_every_line_of_the_solvents_multiplet():
    """The triplet of CDCl3 at 101 MHz: 77.16 and 0.32 ppm to both sides."""
    labels = name_leftovers({"13C": [77.48, 77.16, 76.84, 78.5]}, "CDCl3", frequency_mhz=101)
    assert labels == {("13C", k): "solvent CDCl3" for k in range(3)}


def test_offset_is_taken_off_first():
    lines = [x + 1.0 for x in ETHYL_ACETATE["13C"]]
    assert not name_leftovers({"13C": lines}, "CDCl3")
    assert set(name_leftovers({"13C": lines}, "CDCl3", offset={"13C": 1.0}).values()) == {"ethyl acetate"}


def test_grease_reference_and_counter_ions():
    assert set(name_leftovers({"1H": [1.26, 0.86], "13C": [29.76]}, "CDCl3").values()) == {"hydrocarbon grease"}
    assert name_leftovers({"1H": [0.0]}, "CDCl3") == {("1H", 0): "possibly tetramethylsilane"}
    assert set(name_leftovers({"13C": [158.2, 116.9]}, "DMSO-d6").values()) == {"trifluoroacetate"}
    assert set(name_leftovers({"13C": [171.2], "1H": [8.40]}, "D2O").values()) == {"formate"}
    amine = name_leftovers({"13C": [46.1, 8.5], "1H": [3.05, 1.30]}, "CDCl3")
    assert set(amine.values()) == {"triethylammonium"} and len(amine) == 4


def test_labile_hydrogens_are_not_asked_for():
    """Ethanol in CDCl3 without its O-H (1.32): 3.72, 1.25; 58.28, 18.41 (Gottlieb 1997)."""
    labels = name_leftovers({"13C": [58.28, 18.41], "1H": [3.72, 1.25]}, "CDCl3")
    assert set(labels.values()) == {"ethanol"} and len(labels) == 4


@pytest.mark.parametrize("solvent", WITH_COLUMN)
def test_every_set_is_named_when_all_its_lines_are_there(solvent):
    """Each impurity alone, its own published lines as leftovers: it, or one that cannot be told from it, gets the name."""
    for entry in impurity_sets(solvent):
        if len([x for v in entry.lines.values() for x in v]) < 2:
            continue
        labels = name_leftovers({n: list(v) for n, v in entry.lines.items()}, solvent)
        assert all((n, k) in labels for n, v in entry.lines.items() for k in range(len(v))), entry.name
        ways = {entry.name, "water", f"solvent {solvent}"}
        if not set(labels.values()) & ways:
            twin = next(s for s in impurity_sets(solvent) if any(s.name in label for label in labels.values()))
            assert all(any(abs(x - y) <= 2 * 1.5 for y in twin.lines.get(n, ())) for n, v in entry.lines.items() for x in v), (
                entry.name
            )


def test_unknown_line_stays_unnamed():
    assert name_leftovers({"13C": [99.0], "1H": [6.15]}, "CDCl3") == {}


def test_exchange_and_known_sets():
    assert is_deuterated_exchange("CD3OD") and is_deuterated_exchange("D2O") and not is_deuterated_exchange("DMSO-d6")
    assert find_known_set("O(CC)C(C)=O", "CDCl3").name == "ethyl acetate"
    assert find_known_set("OC(=O)C(F)(F)F", "DMSO-d6").name == "trifluoroacetate"
    assert find_known_set("CC(=O)[O-]", "D2O").name == "acetate" and find_known_set("CC(=O)O", "D2O").name == "acetic acid"
    assert find_known_set(r"OC(=O)/C=C\C(O)=O", "DMSO-d6").name == "maleate"
    assert find_known_set("no structure", "CDCl3") is None and find_known_set("CCCCCCCCCCCCCCCCO", "CDCl3") is None
