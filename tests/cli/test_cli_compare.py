"""`shiftpred compare`, `rank`, `explain`, `substituent`: options, formats, exit codes."""

from __future__ import annotations

import json
from dataclasses import dataclass

import jsonschema
import pytest
import report_builders as build

from shiftpred.errors import NotApplicable, StructureError
from shiftpred.reporting import load_schema

C13 = "166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 14.3"


def test_defaults_are_the_settings_of_the_contract(run, made_up_comparison):
    assert run("compare", "CCOC(=O)c1ccccc1", "--c13", C13).exit_code == 0
    call = made_up_comparison.called[0]
    assert (call.solvent, call.coverage, call.frequency_mhz, call.rivals, call.mass_confirmed, call.prior, call.expected) == (
        None, 0.9, None, 9, False, 0.5, (),
    )  # fmt: skip
    assert call.h1 is None and [p.shift_ppm for p in call.c13.peaks][:2] == [166.6, 132.8]


def test_every_option_reaches_the_comparison(run, made_up_comparison):
    words = "--solvent CDCl3 --rivals 3 --mass-confirmed --frequency 400 --prior 0.2 --coverage 0.8 --expect CCO O=CO --model m"
    assert run("compare", "CCO", "--c13", "58.2, 18.1", "--h1", "3.7 (q, 2H), 1.2 (t, 3H)", *words.split()).exit_code == 0
    call = made_up_comparison.called[0]
    assert (call.solvent, call.rivals, call.mass_confirmed, call.frequency_mhz) == ("CDCl3", 3, True, 400.0)
    assert (call.prior, call.coverage, call.expected, call.model) == (0.2, 0.8, ("CCO", "O=CO"), "m")
    assert [p.hydrogens for p in call.h1.peaks] == [2, 3]


def test_expect_may_be_repeated_or_take_several_words(run, made_up_comparison):
    run("compare", "CCO", "--c13", "58.2, 18.1", "--expect", "CCO", "O", "--rivals", "2")
    run("compare", "CCO", "--expect", "CCO", "--expect", "O", "--c13", "58.2, 18.1")
    assert [call.expected for call in made_up_comparison.called] == [("CCO", "O"), ("CCO", "O")]


def test_peaks_are_a_file_or_a_text(run, made_up_comparison, tmp_path):
    path = tmp_path / "c13.txt"
    path.write_text(f"13C NMR (101 MHz, CDCl3) δ {C13}\n", encoding="utf-8")
    run("compare", "CCO", "--c13", str(path))
    run("compare", "CCO", "--c13", path.read_text(encoding="utf-8"))
    first, second = ([p.shift_ppm for p in call.c13.peaks] for call in made_up_comparison.called)
    assert first == second and len(first) == 7


@pytest.mark.parametrize(
    ("judgement", "fail_on", "code"),
    [
        ("supported", None, 0), ("open", None, 0), ("contradicted", None, 0),
        ("supported", "open", 0), ("open", "open", 4), ("contradicted", "open", 4),
        ("supported", "contradicted", 0), ("open", "contradicted", 0), ("contradicted", "contradicted", 4),
    ],
)  # fmt: skip
def test_fail_on_means_this_judgement_or_worse(run, made_up_comparison, judgement, fail_on, code):
    made_up_comparison.comparison = {
        "supported": build.build_supported, "open": build.build_open, "contradicted": build.build_contradicted,
    }[judgement]()  # fmt: skip
    words = ["--fail-on", fail_on] if fail_on else []
    result = run("compare", "CCO", "--c13", C13, *words)
    assert result.exit_code == code and judgement in result.stdout


def test_json_on_standard_output_is_the_contract_s(run, made_up_comparison):
    result = run("compare", "CCO", "--c13", C13, "--format", "json", "--date", "2025-03-31", "--sample", "EB-1")
    document = json.loads(result.stdout)
    jsonschema.validate(document, load_schema("comparison-1"))
    assert (document["sample"], document["date"], document["judgement"]) == ("EB-1", "2025-03-31", "supported")


def test_the_report_goes_to_the_file_and_the_finding_to_standard_error(run, made_up_comparison, tmp_path):
    path = tmp_path / "report.html"
    result = run("compare", "CCO", "--c13", C13, "--output", str(path), "--reviewer", "A. Name")
    assert result.exit_code == 0 and result.stdout == ""
    assert "supported" in result.stderr and str(path) in result.stderr and result.stderr.count("\n") == 1
    page = path.read_text(encoding="utf-8")
    assert page.startswith("<!DOCTYPE html>") and "A. Name" in page


@pytest.mark.parametrize("date", ["none", ""])
def test_the_date_can_be_left_out_for_reproducible_output(run, made_up_comparison, date):
    assert json.loads(run("compare", "CCO", "--c13", C13, "--format", "json", "--date", date).stdout)["date"] == ""


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (["compare", "CCO"], "No peaks: give --c13 or --h1, or both. Try: shiftpred compare --help"),
        (["compare", "--c13", C13], "Missing argument 'STRUCTURE'. Try: shiftpred compare --help"),
        (["compare", "C((", "--c13", C13], "not a SMILES"),
        (["compare", "CCO", "--c13", "166,6"], "Try:"),
        (["compare", "CCO", "--c13", ""], "an empty list"),
        (["compare", "CCO", "--c13", "nowhere.txt"], "no such file"),
        (["compare", "CCO", "--h1", "166.6, 132.8, 128.1"], "13C"),
        (["compare", "CCO", "--c13", C13, "--date", "31.3.2025"], "not a date"),
        (["compare", "CCO", "--c13", C13, "--rivals", "-1"], "--rivals"),
        (["compare", "CCO", "--c13", C13, "--rivals", "many"], "--rivals"),
        (["compare", "CCO", "--c13", C13, "--fail-on", "supported"], "--fail-on"),
        (["compare", "CCO", "--c13", C13, "--format", "pdf"], "--format"),
        (["compare", "CCO", "--c13", C13, "--output", "/no/such/folder/x.html"], "folder that does not exist"),
        (["rank", "CCO"], "No peaks"),
    ],
)
def test_bad_input_is_one_clear_line_and_code_2(run, made_up_comparison, made_up_ranking, words, message):
    result = run(*words)
    assert result.exit_code == 2, result.output
    assert result.stdout == "" and result.stderr.startswith("shiftpred: ") and result.stderr.count("\n") == 1
    assert message in result.stderr


def test_a_file_of_several_structures_is_refused_by_compare(run, made_up_comparison, tmp_path):
    path = tmp_path / "two.smi"
    path.write_text("CCO a\nCC b\n")
    result = run("compare", str(path), "--c13", C13)
    assert result.exit_code == 2 and "several records" in result.stderr


@pytest.fixture
def made_up_ranking(monkeypatch):
    import shiftpred.pipeline

    called = []

    def rank_structures(records, c13=None, h1=None, **settings):
        called.append((records, settings))
        return build.build_ranking()

    monkeypatch.setattr(shiftpred.pipeline, "rank_structures", rank_structures, raising=False)
    return called


def test_rank_reads_one_candidate_a_line(run, made_up_ranking, tmp_path):
    path = tmp_path / "candidates.smi"
    path.write_text("CCC(=O)Oc1ccccc1 phenyl propanoate\nCCOC(=O)c1ccccc1 ethyl benzoate\n")
    result = run("rank", str(path), "--c13", C13, "--format", "json", "--date", "none")
    assert result.exit_code == 0
    document = json.loads(result.stdout)
    jsonschema.validate(document, load_schema("ranking-1"))
    assert [c["candidate"] for c in document["candidates"]] == [1, 0]
    assert [r.name for r in made_up_ranking[0][0]] == ["phenyl propanoate", "ethyl benzoate"]
    assert "ethyl benzoate" in run("rank", str(path), "--c13", C13).stdout
    assert "<!DOCTYPE" in run("rank", str(path), "--c13", C13, "--format", "html").stdout


@pytest.fixture
def made_up_explanation(monkeypatch):
    import shiftpred.pipeline

    called = []

    def explain(structure, atom_index, nucleus="13C", **settings):
        called.append((atom_index, nucleus, settings))
        return build.build_explanation(nucleus)

    monkeypatch.setattr(shiftpred.pipeline, "explain", explain)
    return called


def test_explain_counts_atoms_from_one(run, made_up_explanation):
    result = run("explain", "CCOC(=O)c1ccccc1", "--atom", "2")
    assert result.exit_code == 0 and "alpha benzoyloxy" in result.stdout
    assert made_up_explanation[0][:2] == (1, "13C")


def test_explain_takes_the_nucleus_that_the_atom_offers(run, made_up_explanation):
    run("explain", "CCO", "--atom", "3")
    run("explain", "CCO", "--atom", "1", "--nucleus", "both", "--solvent", "CDCl3")
    assert [(i, n) for i, n, _ in made_up_explanation] == [(2, "1H"), (0, "13C"), (0, "1H")]
    document = json.loads(run("explain", "CCO", "--atom", "1", "--nucleus", "both", "--format", "json").stdout)
    jsonschema.validate(document, load_schema("explanation-1"))
    assert [e["nucleus"] for e in document["explanations"]] == ["13C", "1H"]


@pytest.mark.parametrize("atom", ["0", "4", "two"])
def test_explain_refuses_an_atom_that_is_not_there(run, made_up_explanation, atom):
    result = run("explain", "CCO", "--atom", atom)
    assert result.exit_code == 2 and "--atom" in result.stderr and result.stderr.count("\n") == 1


@dataclass
class _Constants:
    group: str
    sigma_i: float


@pytest.fixture
def made_up_constants(monkeypatch):
    import shiftpred.electronics

    def substituent(text):
        if "-" in text:
            raise NotApplicable("group", "a charged group", "a neutral one", "'*O'")
        if "*" not in text:
            raise StructureError("group", f"{text!r}, without *", "a SMILES with *", "'*OC'")
        return _Constants(text, 0.27)

    monkeypatch.setattr(shiftpred.electronics, "substituent", substituent, raising=False)
    monkeypatch.setattr(
        shiftpred.electronics, "render_substituent_text", lambda c: f"{c.group} sigma_I {c.sigma_i}", raising=False
    )


def test_substituent_prints_every_group_and_says_what_is_not_defined(run, made_up_constants):
    result = run("substituent", "*OC", "*[O-]")
    assert result.exit_code == 0
    assert "*OC sigma_I 0.27" in result.stdout and "not defined here, because" in result.stdout


def test_substituent_with_unreadable_groups(run, made_up_constants):
    alone = run("substituent", "CO")
    assert alone.exit_code == 2 and alone.stdout == "" and "without *" in alone.stderr
    some = run("substituent", "*OC", "CO", "--format", "json")
    document = json.loads(some.stdout)
    jsonschema.validate(document, load_schema("substituent-1"))
    assert some.exit_code == 3 and [g["constants"] is None for g in document["groups"]] == [False, True]
