"""The same rows from one process, from several, and from a cluster of which a worker dies."""

import csv
import os
import signal
import subprocess
import sys
import time

import pytest

from shiftpred.bundles.locations import find_datasets
from shiftpred.errors import SettingError
from shiftpred.triage import run_triage
from shiftpred.triage.engines import iterate_results

QUEUE = find_datasets() / "demo" / "queue.csv"


def double(x):
    return 2 * x


def die_once(folder, x):
    """Kill the worker the first time that 3 comes along."""
    mark = os.path.join(folder, "died")
    if x == 3 and not os.path.exists(mark):
        open(mark, "w").close()
        os.kill(os.getpid(), signal.SIGKILL)
    return x


def rows_of(folder):
    with open(folder / "summary.csv", encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def test_jobs_are_read_a_few_at_a_time():
    taken = []

    def jobs():
        for k in range(100):
            taken.append(k)
            yield (k,)

    results = iterate_results(double, jobs(), processes=1)
    assert next(results) == 0 and len(taken) == 1


@pytest.mark.slow
def test_two_processes_give_the_same_rows(tmp_path):
    run_triage(QUEUE, tmp_path / "one", processes=1, rivals=2, date="2025-01-31")
    run_triage(QUEUE, tmp_path / "two", processes=2, rivals=2, date="2025-01-31")
    assert rows_of(tmp_path / "one") == rows_of(tmp_path / "two")


@pytest.mark.slow
def test_dead_worker_process_costs_nothing(tmp_path):
    assert sorted(iterate_results(die_once, ((str(tmp_path), k) for k in range(8)), processes=2)) == list(range(8))


@pytest.mark.slow
def test_cluster_with_a_killed_worker_gives_the_same_rows(tmp_path):
    pytest.importorskip("distributed")
    run_triage(QUEUE, tmp_path / "one", processes=1, rivals=2, date="2025-01-31")
    scheduler = subprocess.Popen(
        [
            sys.executable,
            "-m",
            "distributed.cli.dask_scheduler",
            "--host",
            "127.0.0.1",
            "--port",
            "0",
            "--no-dashboard",
            "--scheduler-file",
            str(tmp_path / "where.json"),
        ],
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    workers = []
    try:
        deadline = time.time() + 60
        while not (tmp_path / "where.json").exists() and time.time() < deadline:
            time.sleep(0.2)
        import json

        time.sleep(0.5)
        address = json.loads((tmp_path / "where.json").read_text())["address"]
        for _ in range(2):
            workers.append(
                subprocess.Popen(
                    [
                        sys.executable,
                        "-m",
                        "distributed.cli.dask_worker",
                        address,
                        "--nthreads",
                        "1",
                        "--no-nanny",
                        "--no-dashboard",
                        "--local-directory",
                        str(tmp_path),
                    ],
                    stdout=subprocess.DEVNULL,
                    stderr=subprocess.DEVNULL,
                )
            )
        code = (
            f"from shiftpred.triage import run_triage; run_triage({str(QUEUE)!r}, {str(tmp_path / 'two')!r}, rivals=2, "
            f"date='2025-01-31', scheduler={address!r})"
        )
        run = subprocess.Popen([sys.executable, "-c", code])
        while len(list((tmp_path / "two" / "results").glob("*.json")) if (tmp_path / "two").exists() else []) < 2:
            time.sleep(0.05)
            assert run.poll() is None and time.time() < deadline + 120
        workers[0].send_signal(signal.SIGKILL)
        assert run.wait(timeout=180) == 0
    finally:
        for process in (*workers, scheduler):
            process.kill()
    assert rows_of(tmp_path / "one") == rows_of(tmp_path / "two")


def test_scheduler_that_does_not_answer(tmp_path, monkeypatch):
    distributed = pytest.importorskip("dask.distributed")

    def refuse(*_args, **_keywords):
        raise OSError("no answer")

    monkeypatch.setattr(distributed, "Client", refuse)
    with pytest.raises(SettingError, match="does not answer"):
        list(iterate_results(double, [(1,)], scheduler="tcp://127.0.0.1:1"))
