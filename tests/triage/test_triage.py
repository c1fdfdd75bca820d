"""A night's samples: rows, reports, resuming, one bad sample, one folder for one run."""

import csv
import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from shiftpred.bundles.locations import find_datasets
from shiftpred.errors import InputError, SettingError
from shiftpred.triage import run_triage
from shiftpred.triage.samples import parse_samples

QUEUE = find_datasets() / "demo" / "queue.csv"
SETTINGS = dict(processes=1, rivals=2, date="2025-01-31")


def rows_of(folder):
    with open(Path(folder) / "summary.csv", encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


@pytest.fixture(scope="module")
def night(tmp_path_factory):
    folder = tmp_path_factory.mktemp("night")
    return folder, run_triage(QUEUE, folder, **SETTINGS)


def test_every_sample_has_one_row_and_a_report(night):
    folder, code = night
    rows = rows_of(folder)
    assert code == 3 and len(rows) == 10
    judged = [r for r in rows if r["judgement"]]
    assert len(judged) == 9 and all((folder / r["report"]).stat().st_size > 5000 for r in judged)
    assert {r["sample"]: r["judgement"] for r in rows}["Q-003"] == "contradicted"
    assert {r["sample"]: r["judgement"] for r in rows}["Q-001"] == "supported"


def test_sample_without_peaks_says_so(night):
    row = rows_of(night[0])[-1]
    assert row["judgement"] == "" and "no peaks" in row["note"] and ". Try: " in row["note"]


def test_page_is_self_contained_and_counts(night):
    page = (night[0] / "index.html").read_text(encoding="utf-8")
    assert "10 samples" in page and "1 could not be judged" in page and "evidence, not proof" in page
    assert "http://" not in page.replace("http://www.w3.org", "") and "https://" not in page
    assert page.count("<tr data-sample") == 10


def test_names_are_escaped(tmp_path):
    table = tmp_path / "t.csv"
    table.write_text('sample,smiles,c13\n"<img src=x onerror=alert(1)>",CCO,"58.0, 18.2"\n')
    run_triage(table, tmp_path / "out", **SETTINGS)
    page = (tmp_path / "out" / "index.html").read_text()
    assert "<img src=x" not in page and "&lt;img src=x" in page


def test_second_run_does_nothing_again(night):
    folder, _ = night
    before = {p.name: p.stat().st_mtime_ns for p in (folder / "reports").iterdir()}
    run_triage(QUEUE, folder, **SETTINGS)
    assert {p.name: p.stat().st_mtime_ns for p in (folder / "reports").iterdir()} == before


def test_changed_sample_alone_is_done_again(tmp_path):
    table = tmp_path / "t.csv"
    table.write_text('sample,smiles,c13\na,CCO,"58.0, 18.2"\nb,CC(C)=O,"206.9, 30.9"\n')
    run_triage(table, tmp_path / "out", **SETTINGS)
    stamps = {p.name: p.stat().st_mtime_ns for p in (tmp_path / "out" / "results").iterdir()}
    table.write_text('sample,smiles,c13\na,CCO,"58.1, 18.2"\nb,CC(C)=O,"206.9, 30.9"\n')
    run_triage(table, tmp_path / "out", **SETTINGS)
    after = {p.name: p.stat().st_mtime_ns for p in (tmp_path / "out" / "results").iterdir()}
    assert after["000001.json"] != stamps["000001.json"] and after["000002.json"] == stamps["000002.json"]


def test_half_written_result_is_done_again(tmp_path):
    table = tmp_path / "t.csv"
    table.write_text('sample,smiles,c13\na,CCO,"58.0, 18.2"\n')
    run_triage(table, tmp_path / "out", **SETTINGS)
    result = tmp_path / "out" / "results" / "000001.json"
    result.write_text(result.read_text()[:50])
    run_triage(table, tmp_path / "out", **SETTINGS)
    assert json.loads(result.read_text())["judgement"]


def test_one_folder_for_one_run(tmp_path):
    folder = tmp_path / "out"
    folder.mkdir()
    code = (
        "import pathlib; from shiftpred.triage.folder_lock import hold_folder\n"
        f"with hold_folder(pathlib.Path({str(folder)!r})): print('held', flush=True); input()"
    )
    other = subprocess.Popen([sys.executable, "-c", code], stdin=subprocess.PIPE, stdout=subprocess.PIPE)
    try:
        assert other.stdout.readline().strip() == b"held"
        with pytest.raises(SettingError, match="another run is writing to"):
            run_triage(QUEUE, folder, **SETTINGS)
        assert not (folder / "summary.csv").exists()
    finally:
        other.communicate(b"\n")
    assert other.returncode == 0 and not (folder / ".running").exists()


def test_lock_of_a_dead_run_is_taken_over(tmp_path):
    folder = tmp_path / "out"
    folder.mkdir()
    (folder / ".running").write_text(str(os.getpid()))  # what a killed run leaves; its number may belong to another one now
    table = tmp_path / "t.csv"
    table.write_text('sample,smiles,c13\na,CCO,"58.0, 18.2"\n')
    assert run_triage(table, folder, **SETTINGS) == 0 and not (folder / ".running").exists()


def test_fail_on(tmp_path):
    table = tmp_path / "t.csv"
    table.write_text('sample,smiles,c13\na,COc1ccccn1,"162.5, 139.6, 138.5, 120.2, 105.9, 37.4"\n,,\nb,,"1.0"\n')
    assert run_triage(table, tmp_path / "out", fail_on="contradicted", **SETTINGS) == 4


def test_folder_of_files(tmp_path):
    (tmp_path / "one.smi").write_text("CCO")
    (tmp_path / "one_13C.txt").write_text("58.0, 18.2")
    (tmp_path / "two_1H.txt").write_text("2.17")
    samples = list(parse_samples(tmp_path))
    assert [s.name for s in samples] == ["one", "two"] and samples[0].c13.endswith("one_13C.txt") and samples[1].structure == ""


@pytest.mark.parametrize(
    "text, message", [("", "columns none"), ("a,b\n1,2\n", "columns a, b"), ("sample,smiles,c13\n", "without rows")]
)
def test_tables_that_cannot_be_used(tmp_path, text, message):
    path = tmp_path / "t.csv"
    path.write_text(text)
    with pytest.raises(InputError, match=message):
        list(parse_samples(path))


def test_missing_table():
    with pytest.raises(InputError, match="no such file or folder"):
        list(parse_samples("nowhere.csv"))


def test_killed_run_goes_on(tmp_path):
    """A run that is killed leaves whole results only; the next one does the rest, and all rows are there once."""
    table = tmp_path / "t.csv"
    lines = [
        f'{k},CC(=O)Oc1ccccc1C(=O)O,"170.2, 169.8, 151.3, 134.9, 132.5, 126.2, 124.0, 122.2, {20 + k / 100:.2f}"'
        for k in range(12)
    ]
    table.write_text("sample,smiles,c13\n" + "\n".join(lines) + "\n")
    folder = tmp_path / "out"
    code = f"from shiftpred.triage import run_triage; run_triage({str(table)!r}, {str(folder)!r}, processes=1, rivals=2, date='2025-01-31')"
    process = subprocess.Popen([sys.executable, "-c", code], stderr=subprocess.DEVNULL)
    deadline = time.time() + 60
    while time.time() < deadline and len(list((folder / "results").glob("*.json")) if folder.exists() else []) < 3:
        time.sleep(0.02)
    process.send_signal(signal.SIGKILL)
    process.wait()
    done = {p.name: p.read_bytes() for p in (folder / "results").glob("*.json")}
    assert done and all(json.loads(content) for content in done.values())
    assert run_triage(table, folder, **SETTINGS) == 0
    assert len(rows_of(folder)) == 12
    assert all((folder / "results" / name).read_bytes() == content for name, content in done.items())
