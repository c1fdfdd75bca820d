"""Model folders: complete, unaltered, of a known format, or refused with the fix named."""

import json
import shutil

import pytest

from shiftpred.bundles import load_bundle, save_judgement
from shiftpred.errors import BundleError


@pytest.fixture
def copy(tmp_path, shipped_model):
    return shutil.copytree(shipped_model.folder, tmp_path / "model")


def test_round_trip(copy, shipped_model):
    again = load_bundle(copy)
    assert again.edition == shipped_model.edition
    assert set(again.environment_model.arrays) == set(shipped_model.environment_model.arrays)


@pytest.mark.parametrize("file", ["arrays.npz", "calibration.json", "substituent_model.npz"])
def test_altered_file_is_refused(copy, file):
    content = bytearray((copy / file).read_bytes())
    content[len(content) // 2] ^= 1
    (copy / file).write_bytes(bytes(content))
    with pytest.raises(BundleError, match="SHA-256.*Try: copy the model folder again"):
        load_bundle(copy)


@pytest.mark.parametrize("file", ["manifest.json", "arrays.npz"])
def test_missing_file_is_refused(copy, file):
    (copy / file).unlink()
    with pytest.raises(BundleError, match="complete model folder"):
        load_bundle(copy)


@pytest.mark.parametrize(
    "number, fix", [(99, "install the version"), (0, "train the model anew"), ("x", "train the model anew")]
)
def test_other_format_is_refused(copy, number, fix):
    manifest = json.loads((copy / "manifest.json").read_text())
    manifest["format"] = number
    (copy / "manifest.json").write_text(json.dumps(manifest))
    with pytest.raises(BundleError, match=fix):
        load_bundle(copy)


@pytest.mark.parametrize("text", ["", "{", "[]", "{}", '{"format": 1}'])
def test_damaged_manifest_is_refused(copy, text):
    (copy / "manifest.json").write_text(text)
    with pytest.raises(BundleError, match="damaged manifest"):
        load_bundle(copy)


def test_shipped_model_is_small_and_states_its_origin(shipped_model):
    size = sum(p.stat().st_size for p in shipped_model.folder.iterdir())
    assert size < 15_000_000
    origin = shipped_model.manifest["origin"]
    assert all(len(v) == 64 for v in origin["tables"].values()) and origin["settings"]["random_seed"] is not None


def test_a_new_judgement_is_stored_and_the_rest_stays(tmp_path, shipped_model):
    folder = tmp_path / "model"
    shutil.copytree(shipped_model.folder, folder)
    save_judgement({"prior": 0.25}, folder)
    again = load_bundle(folder)
    assert again.judgement == {"prior": 0.25}
    assert again.intervals.tables == shipped_model.intervals.tables
    assert {p.name for p in folder.iterdir()} == {p.name for p in shipped_model.folder.iterdir()}
