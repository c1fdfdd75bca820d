"""There is the old file or the new one, never half of one; refusals are clear."""

from __future__ import annotations

import errno
import os
import stat
import sys

import pytest

from shiftpred.errors import SettingError
from shiftpred.reporting import open_for_saving, save_text
from shiftpred.reporting import saving as saving_module


def test_text_is_written_and_replaced(tmp_path):
    path = tmp_path / "report.html"
    save_text(path, "old\n")
    save_text(str(path), "new δ\n")
    assert path.read_bytes() == "new δ\n".encode()
    assert os.listdir(tmp_path) == ["report.html"]


def test_an_error_on_the_way_leaves_the_old_file(tmp_path):
    path = tmp_path / "table.csv"
    save_text(path, "old")
    with pytest.raises(RuntimeError), open_for_saving(path) as stream:
        stream.write("half of the ne")
        raise RuntimeError("stopped")
    assert path.read_text() == "old" and os.listdir(tmp_path) == ["table.csv"]


def test_until_the_end_the_old_file_is_in_place(tmp_path):
    path = tmp_path / "table.csv"
    save_text(path, "old")
    with open_for_saving(path) as stream:
        stream.write("new")
        stream.flush()
        assert path.read_text() == "old"
    assert path.read_text() == "new"


@pytest.mark.parametrize(
    ("number", "words"),
    [
        (errno.EACCES, "may not be written to"),
        (errno.EROFS, "may not be written to"),
        (errno.ENOSPC, "full disk"),
        (errno.EDQUOT, "full disk"),
        (errno.ENAMETOOLONG, "name that this file system refuses"),
    ],
)
@pytest.mark.parametrize("call", ["mkstemp", "fsync", "replace"])
def test_the_system_s_refusal_is_told_in_words(tmp_path, monkeypatch, number, words, call):
    path = tmp_path / "report.html"
    path.write_text("old")

    def refuse(*_args, **_keywords):
        raise OSError(number, os.strerror(number))

    monkeypatch.setattr(saving_module.tempfile if call == "mkstemp" else saving_module.os, call, refuse)
    with pytest.raises(SettingError, match=words) as caught:
        save_text(path, "new")
    assert "report.html" in str(caught.value)
    monkeypatch.undo()
    assert path.read_text() == "old" and os.listdir(tmp_path) == ["report.html"]


def test_missing_folder_and_folder_instead_of_file(tmp_path):
    with pytest.raises(SettingError, match="folder that does not exist"):
        save_text(tmp_path / "no" / "report.html", "x")
    with pytest.raises(SettingError, match="got a folder"):
        save_text(tmp_path, "x")


def test_other_errors_are_not_dressed_up(tmp_path, monkeypatch):
    def fail(*_args):
        raise OSError(errno.EIO, "the disk is on fire")

    monkeypatch.setattr(saving_module.os, "fsync", fail)
    with pytest.raises(OSError, match="on fire") as caught:
        save_text(tmp_path / "x", "y")
    assert not isinstance(caught.value, SettingError) and os.listdir(tmp_path) == []


@pytest.mark.skipif(sys.platform == "win32", reason="permissions and devices of Unix")
def test_permissions_are_kept_and_new_files_follow_the_user_s_mask(tmp_path):
    kept = tmp_path / "kept"
    kept.write_text("old")
    kept.chmod(0o640)
    save_text(kept, "new")
    assert stat.S_IMODE(kept.stat().st_mode) == 0o640
    before = os.umask(0o027)
    try:
        save_text(tmp_path / "fresh", "x")
    finally:
        os.umask(before)
    assert stat.S_IMODE((tmp_path / "fresh").stat().st_mode) == 0o640


@pytest.mark.skipif(sys.platform == "win32", reason="permissions and devices of Unix")
def test_a_link_stays_a_link_and_a_device_is_written_to(tmp_path):
    target = tmp_path / "target"
    target.write_text("old")
    (tmp_path / "link").symlink_to(target)
    save_text(tmp_path / "link", "new")
    assert (tmp_path / "link").is_symlink() and target.read_text() == "new"
    save_text(os.devnull, "x")
    assert stat.S_ISCHR(os.stat(os.devnull).st_mode)


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="no device that is always full")
def test_a_full_device_is_told_in_words():
    with pytest.raises(SettingError, match="full disk"):
        save_text("/dev/full", "x" * 100_000)
