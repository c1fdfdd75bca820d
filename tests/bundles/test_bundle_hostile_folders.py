"""Model folders made to harm, and saves that are interrupted: refused with the fix named, or the old model, or the new one."""

import errno
import hashlib
import io
import json
import os
import shutil
import tracemalloc
import zipfile

import numpy as np
import pytest

from shiftpred.bundles import load_bundle, model_bundle, save_judgement
from shiftpred.errors import BundleError

FIX = "Try: (copy the model folder again|train the model anew|install )"


@pytest.fixture
def copy(tmp_path, shipped_model):
    return shutil.copytree(shipped_model.folder, tmp_path / "model")


def put(folder, file, content):
    """Replace a file and its check sum, as somebody would who knows the format."""
    (folder / file).write_bytes(content)
    manifest = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    manifest["files"][file] = dict(sha256=hashlib.sha256(content).hexdigest(), bytes=len(content))
    (folder / "manifest.json").write_text(json.dumps(manifest), encoding="utf-8")


def pack(**members):
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in members.items():
            archive.writestr(name.replace("_npy", ".npy"), content)
    return buffer.getvalue()


def header(shape, descr="<f4"):
    buffer = io.BytesIO()
    np.lib.format.write_array_header_1_0(buffer, dict(shape=shape, fortran_order=False, descr=descr))
    return buffer.getvalue()


def test_zip_bomb_is_refused_before_it_is_unpacked(copy):
    size = 600 * 2**20
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        with archive.open("network/embed.weight.npy", "w", force_zip64=True) as stream:
            stream.write(header((size // 4,)))
            for _ in range(size // 2**22):
                stream.write(bytes(2**22))
    assert len(buffer.getvalue()) < 1_000_000
    put(copy, "arrays.npz", buffer.getvalue())
    tracemalloc.start()
    try:
        with pytest.raises(BundleError, match=f"more than .*{FIX}"):
            load_bundle(copy)
        assert tracemalloc.get_traced_memory()[1] < 50_000_000
    finally:
        tracemalloc.stop()


@pytest.mark.parametrize(
    "content",
    [
        pack(a_npy=header((10**12,)) + bytes(40)),
        pack(a_npy=header((-5, -2)) + bytes(40)),
        pack(a_npy=header((10,), "|O") + b"cos\nsystem\n(S'true'\ntR."),
        pack(a_npy=header((10,), "<U4") + bytes(160)),
        pack(a_npy=b"no array"),
        pack(readme=b"no array"),
        pack(),
        b"PK\x03\x04 no archive",
        b"",
    ],
    ids=["huge-shape", "negative-shape", "objects", "texts", "no-header", "no-array", "no-members", "torn", "empty"],
)
def test_odd_arrays_are_refused_even_with_a_fitting_check_sum(copy, content):
    put(copy, "arrays.npz", content)
    with pytest.raises(BundleError, match=FIX):
        load_bundle(copy)


@pytest.mark.parametrize("content", [pack(a_npy=header((10**12,)) + bytes(40)), pack()], ids=["huge-shape", "no-members"])
def test_odd_substituent_model_is_refused_even_with_a_fitting_check_sum(copy, content):
    put(copy, "substituent_model.npz", content)
    with pytest.raises(BundleError, match=FIX):
        load_bundle(copy).substituent_model  # noqa: B018


@pytest.mark.parametrize("text", ["", "[]", "{", '{"intervals": 3, "error_size": []}', "[" * 100_000], ids=lambda t: t[:9])
def test_odd_calibration_is_refused(copy, text):
    put(copy, "calibration.json", text.encode())
    with pytest.raises(BundleError, match=FIX):
        load_bundle(copy)


@pytest.mark.parametrize(
    "change",
    [{"files": {}}, {"files": []}, {"files": dict.fromkeys(("arrays.npz", "calibration.json", "substituent_model.npz"), "x")},
     {"name": None}, {"edition": 3}, {"format": None}, {"format": 3e99}],
    ids=str,
)  # fmt: skip
def test_odd_manifest_is_refused(copy, change):
    manifest = json.loads((copy / "manifest.json").read_text(encoding="utf-8"))
    (copy / "manifest.json").write_text(json.dumps(manifest | change), encoding="utf-8")
    with pytest.raises(BundleError):
        load_bundle(copy)


def test_substituent_model_that_was_altered_after_loading_is_refused(copy):
    bundle = load_bundle(copy)
    (copy / "substituent_model.npz").write_bytes(b"other")
    with pytest.raises(BundleError, match="SHA-256"):
        bundle.substituent_model  # noqa: B018


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no named pipes on this system")
def test_pipe_instead_of_a_file_does_not_hang(copy):
    (copy / "calibration.json").unlink()
    os.mkfifo(copy / "calibration.json")
    with pytest.raises(BundleError, match="no ordinary file"):
        load_bundle(copy)


def test_folder_name_that_cannot_be_one():
    with pytest.raises(BundleError, match="no readable file"):
        load_bundle("a\0b")


def interrupt(monkeypatch, name, at):
    """Let the `at`-th call of os.replace or os.fsync be the last thing that happens."""
    real, calls = getattr(os, name), []

    def stop(*words):
        calls.append(words)
        if len(calls) > at:
            raise KeyboardInterrupt
        return real(*words)

    monkeypatch.setattr(model_bundle.os, name, stop)


@pytest.mark.parametrize("name, at", [*(("fsync", k) for k in range(4)), *(("replace", k) for k in range(3))])
def test_interrupted_save_leaves_the_old_or_the_new_model_and_the_next_one_goes_through(copy, monkeypatch, name, at):
    old = load_bundle(copy).judgement
    with monkeypatch.context() as patch:
        interrupt(patch, name, at)
        try:
            save_judgement({"prior": 0.25}, copy)
        except KeyboardInterrupt:
            pass
    assert load_bundle(copy).judgement in (old, {"prior": 0.25})
    with monkeypatch.context() as patch:
        interrupt(patch, name, at)
        try:
            save_judgement({"prior": 0.125}, copy)
        except KeyboardInterrupt:
            pass
    assert load_bundle(copy).judgement in (old, {"prior": 0.25}, {"prior": 0.125})
    save_judgement({"prior": 0.75}, copy)
    assert load_bundle(copy).judgement == {"prior": 0.75}
    assert not list(copy.glob("*.tmp"))


@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EROFS, errno.EACCES])
def test_full_or_read_only_disk_is_said_and_the_old_model_stays(copy, monkeypatch, number):
    old = load_bundle(copy).judgement

    def refuse(handle):
        raise OSError(number, os.strerror(number))

    monkeypatch.setattr(model_bundle.os, "fsync", refuse)
    with pytest.raises(BundleError, match="cannot be written to.*Try: another folder"):
        save_judgement({"prior": 0.25}, copy)
    assert load_bundle(copy).judgement == old


def test_file_in_the_place_of_the_folder_is_said(copy):
    (copy.parent / "file").write_text("x", encoding="utf-8")
    with pytest.raises(BundleError, match="cannot be written to"):
        model_bundle._store(copy.parent / "file" / "model", {}, {})
