"""Evaluation: figures of merit with known answers, a made-up archive with known errors, agreement with the agreed scoring."""

import importlib.util
import json

import numpy as np
import pandas as pd
import pytest
from rdkit import Chem

from shiftpred.errors import InputError, SettingError
from shiftpred.pipeline import predict_structures
from shiftpred.structures.reading import parse_structure
from shiftpred.training.assign_open_peaks import PeakPlacer
from shiftpred.training.evaluate import compute_width_ratio, evaluate_model
from shiftpred.training.evaluation_sites import collect_sites, count_pair_agreement, predict_compounds
from shiftpred.training.evaluation_statistics import (
    compute_cluster_error,
    compute_coverage_figures,
    compute_error_figures,
    compute_shortfall,
    correct_for_many,
)
from shiftpred.training.evaluation_text import render_evaluation
from shiftpred.training.measured_shifts import load_measured_connectivities, load_measured_shifts
from shiftpred.training.open_tables import compute_split, connectivity, load_open_tables

SMILES = (
    "CCOC(=O)c1ccccc1",
    "CC(C)Cc1ccc(C)cc1",
    "COc1ccc(C=O)cc1",
    "O=C1CCCCC1C",
    "CC(=O)NCCc1ccccc1",
    "CCCCC#N",
    "C=CCCO",
    "Clc1ccc(Br)cc1",
    "CN1CCOCC1",
    "CC(C)(C)OC(=O)N",
    "OC1CCCC1",
    "c1ccc2[nH]ccc2c1",
    "CCSCC",
    "FC(F)(F)c1ccccc1",
    "CCCCCCBr",
    "C[C@H](O)C(=O)OC",
    "CCN(CC)C(C)=O",
    "N#Cc1ccccc1",
    "CC1=CCCCC1",
    "O=Cc1ccco1",
)


@pytest.fixture(scope="module")
def archive(tmp_path_factory, shipped_model):
    """Peaks made from the model's own predictions with a known offset: +1.0 ppm 13C, -0.1 ppm 1H on carbon."""
    folder = tmp_path_factory.mktemp("archive")
    compounds, peaks = [], []
    predictions = predict_structures([parse_structure(s) for s in SMILES], "both", None, 0.9, shipped_model)
    for key, (smiles, prediction) in enumerate(zip(SMILES, predictions), 1):
        compounds.append((key, smiles))
        mol = Chem.MolFromSmiles(smiles)
        for row in prediction.nuclei:
            if row.nucleus == "1H" and row.labile:
                continue
            offset = 1.0 if row.nucleus == "13C" else -0.1
            count = mol.GetAtomWithIdx(row.atom - 1).GetTotalNumHs() if row.nucleus == "13C" else ""
            # The two hydrogens of a CH2 as two peaks of one site.
            peaks.append((key, 0, row.nucleus, "CDCl3", round(row.shift_ppm + offset, 3), count, 100 - row.atom))
    pd.DataFrame(compounds, columns=["compound", "smiles"]).to_csv(folder / "compounds.csv", index=False)
    columns = "compound spectrum nucleus solvent shift_ppm attached_h site".split()
    pd.DataFrame(peaks, columns=columns).to_csv(folder / "peaks.csv", index=False)
    return folder


@pytest.fixture(scope="module")
def result(archive, shipped_model):
    return evaluate_model(shipped_model, archive, "all")


# ── Figures of merit ────────────────────────────────────────────────────────────────────────────────────────────────────


def test_errors():
    assert compute_error_figures(np.array([1.0, -2.0, 3.0])) == dict(
        sites=3, mean=2.0, median=2.0, root_mean_square=2.1602, percentile_95=2.9
    )
    assert compute_error_figures(np.array([]))["mean"] is None


def test_coverage_counts_sites_and_molecules_apart():
    error, half = np.array([0.5, 0.5, 0.5, 2.0]), np.ones(4)
    figures = compute_coverage_figures(error, half, np.array([1, 1, 1, 2]), 0.9)
    assert figures["coverage"] == 0.75 and figures["coverage_by_molecule"] == 0.5
    assert figures["interval_score"] == pytest.approx((3 * 2 + 22) / 4)


def test_an_interval_without_end_covers_and_is_counted():
    figures = compute_coverage_figures(np.array([5.0, 0.1, 0.1]), np.array([np.inf, 1.0, 1.0]), np.array([1, 2, 3]), 0.9)
    assert figures["coverage"] == 1.0 and figures["unbounded"] == 1 and figures["interval_score"] == 2.0


def test_clusters_widen_the_standard_error():
    values = np.repeat([0.0, 1.0] * 50, 4)
    alone = compute_cluster_error(values, np.arange(400))
    together = compute_cluster_error(values, np.repeat(np.arange(100), 4))
    assert alone == pytest.approx(0.5 / np.sqrt(399), rel=1e-3)
    assert together == pytest.approx(2 * alone, rel=0.02)
    assert compute_cluster_error(values, np.zeros(400)) == np.inf


def test_a_shortfall_is_found_only_where_molecules_bear_it_out():
    inside = np.ones(1000, dtype=bool)
    inside[:170] = False  # 83 %
    assert compute_shortfall(inside, np.arange(1000), 0.88) < 1e-3
    # The same misses, all in two large molecules: no evidence about the class.
    assert compute_shortfall(inside, np.concatenate([np.repeat([0, 1], 85), np.arange(2, 832)]), 0.88) > 0.05
    assert compute_shortfall(np.ones(10, dtype=bool), np.arange(10), 0.88) == 1.0
    assert compute_shortfall(np.zeros(10, dtype=bool), np.arange(10), 0.88) < 1e-6


def test_holm_never_lowers_a_p_value_and_keeps_the_order():
    p = np.array([0.04, 0.001, 0.03, 0.9])
    corrected = correct_for_many(p)
    assert (corrected >= p).all() and corrected.max() <= 1
    np.testing.assert_allclose(corrected, [0.09, 0.004, 0.09, 0.9])


# ── A whole evaluation with known errors ────────────────────────────────────────────────────────────────────────────────


def test_known_offsets_come_back_as_errors(result):
    assert result["compounds"] == len(SMILES)
    carbon, hydrogen = result["overall"]["13C"], result["overall"]["1H on carbon"]
    assert carbon["mean"] == pytest.approx(1.0, abs=0.05) and carbon["median"] == pytest.approx(1.0, abs=0.02)
    assert hydrogen["mean"] == pytest.approx(0.1, abs=0.02)
    assert result["certain"]["13C"]["sites"] > 10
    assert result["without_hydrogen_counts"]["13C"]["mean"] == pytest.approx(1.0, abs=0.15)


def test_classes_hold_every_site_once(result):
    for nucleus, kinds in (("13C", ("13C",)), ("1H", ("1H on carbon", "1H on others"))):
        rows = [r for r in result["by_class"] if r["nucleus"] == nucleus]
        assert sum(r["sites"] for r in rows) == sum(result["overall"].get(k, {"sites": 0})["sites"] for k in kinds)
        assert len({r["environment"] for r in rows}) == len(rows)


def test_baselines_are_judged_on_the_same_sites(result):
    rules = result["baselines"]["rules"]["13C"]
    assert 0 < rules["sites"] < result["overall"]["13C"]["sites"]
    assert rules["mean"] > rules["model_mean"] == pytest.approx(1.0, abs=0.1)
    assert result["rules"]["13C"]["benzene"]["sites"] > 5
    # A look-up is not asked about compounds that it was made of.
    held_out = [s for s in SMILES if compute_split(connectivity(Chem.MolFromSmiles(s))) != "train"]
    lookup = result["baselines"].get("lookup", {}).get("13C", {"sites": 0})
    assert lookup["sites"] <= sum(Chem.MolFromSmiles(s).GetNumAtoms() for s in held_out)


def test_wider_promises_cover_more(result):
    for levels in result["coverage"].values():
        covered = [figures["coverage"] for figures in levels.values()]
        assert covered == sorted(covered)


def test_interval_of_another_coverage_is_what_predict_gives(archive, shipped_model):
    compounds = load_open_tables(archive)[:6]
    at_90, at_99 = (predict_compounds(compounds, shipped_model, c) for c in (0.9, 0.99))
    compared = 0
    for narrow, wide in zip(at_90, at_99):
        for k, nucleus in enumerate(("13C", "1H")):
            for i in np.flatnonzero(np.isfinite(narrow.half[:, k]) & np.isfinite(wide.half[:, k])):
                ratio = compute_width_ratio(shipped_model, nucleus, narrow.environment[k][i], 0.99)
                assert wide.half[i, k] == pytest.approx(narrow.half[i, k] * ratio, abs=0.002 * (1 + ratio))
                compared += 1
    assert compared > 40


def test_true_assignments_use_every_published_row(result):
    measured = result["measured"]
    assert measured["rows"] == len(load_measured_shifts()) == 2355 and measured["compounds"] == 89
    assert sum(f["sites"] for f in measured["nuclei"].values()) == 2355
    assert all(len(w) <= 10 for w in measured["worst"].values()) and len(measured["worst"]["13C"]) == 10
    difference = measured["solvent_differences"]["13C"]["by_solvent"]["DMSO-d6"]
    assert difference["sites"] > 150 and difference["error_without_effect"] > 0.2


def test_result_is_plain_json_and_renders(result):
    again = json.loads(json.dumps(result, allow_nan=False))
    page = render_evaluation(again)
    for word in ("ALL SITES", "BASELINES", "BY ENVIRONMENT CLASS, 13C", "COVERAGE", "TRUE ASSIGNMENTS", "SOLVENT EFFECT"):
        assert word in page
    assert "nan" not in page and "None" not in page


def test_measured_compounds_are_held_back():
    assert connectivity(Chem.MolFromSmiles("CCOC(C)=O")) in load_measured_connectivities()
    assert len(load_measured_connectivities()) == 89


def test_hidden_pairs_meet_when_predictions_are_exact(archive, shipped_model):
    compounds = load_open_tables(archive)
    tables = predict_compounds(compounds, shipped_model, 0.9)
    agreement = count_pair_agreement(compounds, tables)
    assert agreement["pairs"] > 60 and agreement["same_atom"] > 0.8
    assert agreement["by_chance"] < 0.8
    for table in tables:
        table.shift[:, 1] = np.random.default_rng(1).permutation(table.shift[:, 1])
    assert count_pair_agreement(compounds, tables)["same_atom"] < agreement["same_atom"]


def test_another_split_is_refused(archive, shipped_model):
    with pytest.raises(SettingError, match="'tomorrow'.*test, calibration, ours, all"):
        evaluate_model(shipped_model, archive, "tomorrow")


def test_an_empty_part_says_so(tmp_path, shipped_model):
    smiles = next(s for s in SMILES if compute_split(connectivity(Chem.MolFromSmiles(s))) == "train")
    pd.DataFrame([(1, smiles)], columns=["compound", "smiles"]).to_csv(tmp_path / "compounds.csv", index=False)
    pd.DataFrame([(1, "13C", 20.0, 1)], columns=["compound", "nucleus", "shift_ppm", "site"]).to_csv(
        tmp_path / "peaks.csv", index=False
    )
    with pytest.raises(InputError, match="no compounds of the part 'test'"):
        evaluate_model(shipped_model, tmp_path)


# ── Beside the agreed scoring ───────────────────────────────────────────────────────────────────────────────────────────


@pytest.mark.shared
@pytest.mark.parametrize("counts", [True, False])
def test_same_figures_as_the_agreed_scoring(shared, tmp_path, shipped_model, counts):
    spec = importlib.util.spec_from_file_location("agreed_scoring", shared / "scoring" / "scoring.py")
    scoring = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(scoring)
    table = pd.read_csv(shared / "data" / "compounds.csv.gz").iloc[::977].head(60)
    peaks = pd.read_csv(shared / "data" / "peaks.csv.gz")
    peaks = peaks[peaks["compound"].isin(table["compound"])]
    table.to_csv(tmp_path / "compounds.csv.gz", index=False)
    peaks.to_csv(tmp_path / "peaks.csv.gz", index=False)
    compounds = [c for c in load_open_tables(tmp_path) if c.mol.GetNumAtoms() <= 70]
    tables = predict_compounds(compounds, shipped_model, 0.9)
    assert len(compounds) > 40
    predictions, intervals = {}, {}
    for compound, t in zip(compounds, tables):
        predictions[compound.key] = t.shift[:, 0], t.shift[:, 1]
        intervals[compound.key] = {
            nucleus: {
                i: (t.shift[i, k] - t.half[i, k], t.shift[i, k] + t.half[i, k], t.environment[k][i])
                for i in np.flatnonzero(~np.isnan(t.shift[:, k]))
            }
            for k, nucleus in enumerate(("13C", "1H"))
        }
    agreed = scoring.summary(scoring.score(tmp_path, predictions, intervals, hydrogen_counts=counts))
    sites, _ = collect_sites(compounds, tables, {}, hydrogen_counts=counts)
    for nucleus in ("13C", "1H"):
        rows = sites[(sites.nucleus == nucleus) & ((nucleus == "13C") | (sites.element == "C"))]
        error = (rows.observed - rows.predicted).to_numpy()
        ours = compute_error_figures(error)
        assert ours["sites"] == agreed[nucleus]["n"]
        assert ours["mean"] == pytest.approx(agreed[nucleus]["mae"], abs=2e-4)
        assert ours["median"] == pytest.approx(agreed[nucleus]["median"], abs=2e-4)
        inside = np.abs(error) <= rows.half.to_numpy() + 1e-9
        assert inside.mean() == pytest.approx(agreed[nucleus]["coverage"], abs=2e-3)


def test_certain_sites_need_no_prediction(archive):
    for compound in load_open_tables(archive):
        placer = PeakPlacer(compound)
        assigned = placer.assign_unambiguous()
        for k in np.flatnonzero(assigned >= 0):
            places = np.flatnonzero(placer.base[k] == 0)
            assert len(set(placer.group[places])) == 1


def test_command_writes_json_by_the_ending(archive, shipped_model, tmp_path):
    from click.testing import CliRunner

    from shiftpred.cli import command

    target = tmp_path / "figures.json"
    words = ["evaluate", str(shipped_model.folder), str(archive), "--split", "all", "--no-baselines", "--output", str(target)]
    outcome = CliRunner().invoke(command, words)
    assert outcome.exit_code == 0, outcome.output
    written = json.loads(target.read_text(encoding="utf-8"))
    assert written["schema_version"] == 1 and written["compounds"] == len(SMILES) and written["baselines"] == {}
