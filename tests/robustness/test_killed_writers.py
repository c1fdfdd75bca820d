"""Kill -9 at random moments: the old file or the new one, never half of one; full disks; two runs at once."""

import csv
import json
import os
import random
import signal
import subprocess
import sys
import time

import pytest

from shiftpred.bundles import load_bundle, load_default_bundle
from shiftpred.reporting import save_text
from shiftpred.triage import run_triage

pytestmark = [
    pytest.mark.slow,
    pytest.mark.skipif(not hasattr(signal, "SIGKILL"), reason="this system has no SIGKILL"),
]
ASPIRIN = 'CC(=O)Oc1ccccc1C(=O)O,"170.2, 169.8, 151.3, 134.9, 132.5, 126.2, 124.0, 122.2, 20.{:02d}"'


def start(code):
    """Start Python with `code`, in a group of its own, and wait until it says that it begins."""
    process = subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, start_new_session=True
    )
    assert process.stdout.readline() == b"begun\n"
    return process


def kill(process):
    """Kill the process and its workers."""
    try:
        os.killpg(process.pid, signal.SIGKILL)
    finally:
        process.wait()
        process.stdout.close()


def test_save_text(tmp_path):
    path = tmp_path / "report.html"
    old, chance = "0" * 1_000_000, random.Random(1)
    save_text(path, old)
    code = (
        "import itertools; from shiftpred.reporting import save_text; print('begun', flush=True)\n"
        f"for k in itertools.count(1): save_text({str(path)!r}, str(k % 10) * 1_000_000)"
    )
    seen, process = set(), start(code)
    for _ in range(100):
        time.sleep(chance.uniform(0, 0.05))
        kill(process)
        text = path.read_text(encoding="utf-8")
        assert len(text) == 1_000_000 and len(set(text)) == 1
        seen.add(text[0])
        process = start(code)
    kill(process)
    assert len(seen) > 1


def test_model_folder(tmp_path):
    """The killed process saves whole models one after the other, all files of each different from the last."""
    import shutil

    shipped = load_default_bundle()
    folder = shutil.copytree(shipped.folder, tmp_path / "model")
    code = f"""
import itertools, json
from shiftpred.bundles import load_bundle, model_bundle as m
folder = m.Path({str(folder)!r})
bundle = load_bundle(folder)
last = int(bundle.edition.split()[1]) if bundle.edition.split()[1].isdigit() else 0
real = {{f: (folder / f).read_bytes() for f in m._CHECKED}}
unpacked = m._unpack(real[m._ARRAYS], folder)
substituents = m._unpack(real[m._SUBSTITUENTS], folder)
print("begun", flush=True)
for k in itertools.count(last + 1):
    def pack(arrays):
        buffer = m.io.BytesIO()
        m.np.savez(buffer, **arrays | dict(mark=m.np.full(1, k)))
        return buffer.getvalue()
    contents = {{
        m._ARRAYS: pack(unpacked),
        m._SUBSTITUENTS: pack(substituents),
        m._CALIBRATION: json.dumps(json.loads(real[m._CALIBRATION]) | dict(judgement=dict(mark=k))).encode(),
    }}
    files = {{f: m._describe(c) for f, c in contents.items()}}
    m._store(folder, contents, bundle.manifest | dict(edition=str(k), files=files))
"""
    chance, editions = random.Random(2), set()
    for _ in range(100):
        process = start(code)
        time.sleep(chance.uniform(0, 0.6))
        kill(process)
        found = load_bundle(folder)
        editions.add(found.edition)
        if found.edition != shipped.edition:
            assert found.judgement == dict(mark=int(found.manifest["edition"]))
        assert found.substituent_model is not None
    assert len(editions) > 20


@pytest.mark.parametrize("processes, times", [(1, 60), (2, 40)])
def test_triage(tmp_path, processes, times):
    """Killed again and again, a run ends with every sample once, and no file that was there in between was half a file."""
    table, folder = tmp_path / "t.csv", tmp_path / "out"
    n = 40
    table.write_text("sample,smiles,c13\n" + "".join(f"{k},{ASPIRIN.format(k)}\n" for k in range(n)), encoding="utf-8")
    code = (
        "if __name__ == '__main__':\n"
        "    import shiftpred.pipeline; from shiftpred.triage import run_triage\n"
        "    shiftpred.pipeline.load_model(); print('begun', flush=True)\n"
        f"    run_triage({str(table)!r}, {str(folder)!r}, processes={processes}, rivals=1, date='2025-01-31')"
    )
    chance = random.Random(3)
    for _ in range(times):
        process = start(code)
        time.sleep(chance.uniform(0, 0.5 if processes == 1 else 4))
        kill(process)
        for path in folder.glob("results/*.json"):
            row = json.loads(path.read_text(encoding="utf-8"))
            report = (folder / row["report"]).read_text(encoding="utf-8")
            assert row["judgement"] and report.rstrip().endswith("</html>")
        for path in folder.glob("reports/*.html"):
            assert path.read_text(encoding="utf-8").rstrip().endswith("</html>")
        for path in folder.glob("index.html"):
            assert path.read_text(encoding="utf-8").rstrip().endswith("</html>")
    assert run_triage(table, folder, processes=1, rivals=1, date="2025-01-31") == 0
    with open(folder / "summary.csv", encoding="utf-8", newline="") as handle:
        assert sorted(int(row["sample"]) for row in csv.DictReader(handle)) == list(range(n))


def test_two_runs_at_once_do_not_mix(tmp_path):
    table, folder = tmp_path / "t.csv", tmp_path / "out"
    table.write_text("sample,smiles,c13\n" + "".join(f"{k},{ASPIRIN.format(k)}\n" for k in range(10)), encoding="utf-8")
    command = [sys.executable, "-m", "shiftpred", "triage", str(table), "--output", str(folder)]
    runs = [subprocess.Popen(command, stderr=subprocess.PIPE, encoding="utf-8") for _ in range(2)]
    said = {run.communicate()[1]: run.returncode for run in runs}
    codes = sorted(run.returncode for run in runs)
    assert codes in ([0, 2], [0, 0]), said  # [0, 0]: the one had finished before the other began
    if codes == [0, 2]:
        assert any("another run is writing to" in text for text in said)


@pytest.mark.parametrize(
    "words", [["predict", "CCO", "--format", "html"], ["compare", "CCO", "--c13", "58, 18"]], ids=lambda w: w[0]
)
def test_full_disk_is_told_and_the_old_file_stays(tmp_path, words):
    """A limit on the size of files stands for the full disk."""
    resource = pytest.importorskip("resource")
    path = tmp_path / "report.html"
    path.write_text("old", encoding="utf-8")

    def limit():
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (2000, 2000))

    command = [sys.executable, "-m", "shiftpred", *words, "--output", str(path)]
    done = subprocess.run(command, preexec_fn=limit, capture_output=True, encoding="utf-8")
    assert done.returncode == 2 and "a full disk" in done.stderr and "Try:" in done.stderr, done.stderr
    assert path.read_text(encoding="utf-8") == "old" and [p.name for p in tmp_path.iterdir()] == ["report.html"]


def test_full_disk_under_triage_is_told(tmp_path):
    resource = pytest.importorskip("resource")
    table, folder = tmp_path / "t.csv", tmp_path / "out"
    table.write_text(f"sample,smiles,c13\n1,{ASPIRIN.format(1)}\n", encoding="utf-8")

    def limit():
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (3000, 3000))

    command = [sys.executable, "-m", "shiftpred", "triage", str(table), "--output", str(folder)]
    done = subprocess.run(command, preexec_fn=limit, capture_output=True, encoding="utf-8")
    assert done.returncode in (2, 3) and "Traceback" not in done.stderr and "fault of ours" not in done.stderr, done.stderr
    assert not list(folder.glob("**/*.part"))
    assert "full disk" in done.stderr + "".join(p.read_text(encoding="utf-8") for p in folder.glob("summary.csv"))
