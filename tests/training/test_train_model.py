"""`train` from tables to a model folder, on a table of our own: resumable, on its own and on top of the shipped model."""

import csv
import json

import numpy as np
import pytest

from shiftpred.bundles import load_bundle
from shiftpred.errors import InputError
from shiftpred.training.open_tables import load_open_tables

pytestmark = pytest.mark.training


@pytest.fixture(scope="module")
def archive(tmp_path_factory, shipped_model):
    """A small archive: real structures, peaks as the shipped model predicts them, without atom numbers."""
    from shiftpred.pipeline import predict_structures
    from shiftpred.structures import parse_structure

    tails = ["C", "CC", "CCC", "C(C)C", "CCCC", "CC(C)C", "C(C)(C)C", "c1ccccc1", "CO", "CCO", "CN", "CCl", "CBr", "CF", "C#N"]
    heads = [
        "CC(=O)O{}",
        "CC(=O)N{}",
        "c1ccccc1{}",
        "OC{}",
        "NC{}",
        "Cc1ccc({})cc1",
        "O=C(O)C{}",
        "ClCC{}",
        "COC(=O)CC{}",
        "C1CCCCC1{}",
    ]
    smiles = [h.format(t) for h in heads for t in tails]
    folder = tmp_path_factory.mktemp("archive")
    predictions = predict_structures([parse_structure(s) for s in smiles], model=shipped_model)
    with open(folder / "compounds.csv", "w", newline="") as c, open(folder / "peaks.csv", "w", newline="") as p:
        compounds, peaks = csv.writer(c), csv.writer(p)
        compounds.writerow(["compound", "smiles"])
        peaks.writerow(["compound", "spectrum", "nucleus", "solvent", "shift_ppm", "attached_h", "site"])
        for key, (text, prediction) in enumerate(zip(smiles, predictions)):
            compounds.writerow([key, text])
            for row in prediction.nuclei:
                count = row.attached_h if row.nucleus == "13C" else ""
                peaks.writerow([key, 0, row.nucleus, "CDCl3", round(row.shift_ppm, 2), count, row.atom_index])
    return folder


def settings(**changes):
    from shiftpred.training.train_environment_model import NetworkSettings

    small = dict(width=32, layers=2, message=16, hidden=32, passes=3, first_passes=1, batch=32, low_precision=False)
    return NetworkSettings(**small | changes)


def test_alone(archive, tmp_path):
    from shiftpred.training.train_model import train_model

    said = []
    result = train_model(
        archive, tmp_path / "mine", settings=settings(), processes=2, substituent_compounds=60, report=said.append
    )
    model = load_bundle(tmp_path / "mine")
    assert model.manifest["origin"]["compounds"]["train"] > 50 and result["after"]["13C_mean"] > 0
    rounds = [json.loads(line) for line in (tmp_path / "mine" / "rounds.jsonl").read_text().splitlines()]
    assert [r["number"] for r in rounds] == [1, 2, 3] and all(r["placed"] > 100 for r in rounds)
    assert any(line.startswith("substituent model, round") for line in said)


def test_stopped_run_goes_on(archive, tmp_path):
    from shiftpred.training.train_environment_model import train_environment_model

    compounds = load_open_tables(archive)
    said = []
    short = settings(passes=2)
    train_environment_model(compounds, short, tmp_path, processes=1, report=said.append)
    again = []
    train_environment_model(compounds, short, tmp_path, processes=1, report=again.append)
    assert again == ["going on after pass 2"] and len(said) == 2


def test_same_seed_gives_the_same_weights(archive, tmp_path):
    import torch

    from shiftpred.training.train_environment_model import train_environment_model

    compounds = load_open_tables(archive)
    both = [
        train_environment_model(compounds, settings(passes=2), tmp_path / k, processes=1, report=lambda _: None) for k in "ab"
    ]
    for one, other in zip(both[0].parameters(), both[1].parameters()):
        assert torch.equal(one, other)


def test_on_top_of_the_shipped_model(archive, tmp_path, shipped_model):
    """Peaks that the shipped model predicts leave it nothing to learn: it starts nearly without error and stays there."""
    from shiftpred.training.train_environment_model import NetworkSettings
    from shiftpred.training.train_model import train_model

    own = NetworkSettings(passes=2, first_passes=0, learning_rate=1e-5, low_precision=False)
    result = train_model(
        archive,
        tmp_path / "mine",
        start_from=shipped_model.folder,
        settings=own,
        processes=1,
        substituent_compounds=60,
        report=lambda _: None,
    )
    assert result["before"]["13C_mean"] < 0.6 and result["after"]["13C_mean"] < 1.0
    assert np.isfinite(result["after"]["1H_mean"])


def test_too_small_an_archive_is_refused(tmp_path):
    from shiftpred.training.train_model import train_model

    (tmp_path / "compounds.csv").write_text("compound,smiles\n1,CCO\n")
    (tmp_path / "peaks.csv").write_text("compound,nucleus,shift_ppm,site\n1,13C,58.0,0\n")
    with pytest.raises(InputError, match="compounds to train on"):
        train_model(tmp_path, tmp_path / "mine", report=lambda _: None)


def test_the_card_states_what_was_measured(archive, tmp_path):
    from shiftpred.training.model_card import build_model_card
    from shiftpred.training.train_model import train_model

    train_model(archive, tmp_path / "mine", settings=settings(), processes=1, substituent_compounds=60, report=lambda _: None)
    origin = load_bundle(tmp_path / "mine").manifest["origin"]
    card = build_model_card(tmp_path / "mine", archive)
    held = origin["held_out"]
    assert f"{held['network_alone']['13C_mean']:.3f} ppm (13C)" in card and "edition" in card.splitlines()[0]
    assert f"{origin['compounds']['train']:,} to train on" in card and list(origin["tables"].values())[0] in card
    assert "ALL SITES" in card and str(tmp_path) not in card


def test_ablation_measures_every_variant_once(archive, tmp_path):
    from shiftpred.training.ablation import build_variants, compare_variants, render_ablation

    said = []
    small = settings(passes=2)
    result = compare_variants(archive, tmp_path, share=1.0, passes=2, processes=1, report=said.append, settings=small)
    names = [v.name for v in build_variants(small)]
    assert [r["name"] for r in result["rows"]] == names and len(set(names)) == len(names) > 5
    errors = {r["name"]: r["network"]["13C_mean"] for r in result["rows"]}
    assert errors["without electronic constants"] != errors["complete"] != errors["elements and bond types alone"]
    again = []
    assert compare_variants(archive, tmp_path, 1.0, 2, 1, again.append, small) == result and not again
    assert all(name in render_ablation(result) for name in names)


def test_removed_chemistry_is_removed(archive, tmp_path):
    import pandas as pd
    from rdkit import Chem

    from shiftpred.training.unseen_chemistry import REMOVED, split_tables

    with open(tmp_path / "compounds.csv", "w") as c, open(tmp_path / "peaks.csv", "w") as p:
        c.write("compound,smiles\n1,C[Si](C)(C)C\n2,c1ccc2[nH]ccc2c1\n3,CCO\n4,C1CC1CO\n5,c1ccncc1\n")
        p.write("compound,nucleus,shift_ppm,site\n" + "".join(f"{k},13C,{20 + k},0\n" for k in range(1, 6)))
    parts = split_tables(tmp_path, tmp_path / "parts", share=1.0)
    found = {name: pd.read_csv(folder / "compounds.csv").compound.tolist() for name, folder in parts.items()}
    assert found == {"rest": [3, 5], "silicon": [1], "selenium": [], "boron": [], "indoles": [2], "cyclopropanes": [4]}
    assert pd.read_csv(parts["rest"] / "peaks.csv").compound.tolist() == [3, 5]
    assert all(Chem.MolFromSmarts(s) is not None for s in REMOVED.values())


def test_the_learning_rate_falls_to_nothing_twice():
    from shiftpred.training.train_environment_model import NetworkSettings, _compute_share_of_rate

    full = NetworkSettings(passes=20, restart=14, first_passes=2)
    shares = [_compute_share_of_rate(done, full) for done in (2, 2.5, 8, 13.99, 14, 14.5, 17, 19.99)]
    assert shares == pytest.approx([0.05, 1.0, 0.5, 0.0, 0.025, 0.49, 0.25, 0.0], abs=0.02)
    short = NetworkSettings(passes=4, restart=14, first_passes=2)
    assert _compute_share_of_rate(3.99, short) == pytest.approx(0, abs=1e-3)
