"""Where the work is done: here, in worker processes, or on a cluster. All give the same rows."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import FIRST_COMPLETED, ProcessPoolExecutor, wait
from concurrent.futures.process import BrokenProcessPool
from itertools import islice

from shiftpred.errors import SettingError

__all__ = ["iterate_results"]


def iterate_results(function: Callable, jobs: Iterable[tuple], processes: int = 2, scheduler: str | None = None) -> Iterator:
    """Run `function(*job)` for every job and yield results as they are ready.

    Parameters
    ----------
    function : callable
        Importable by name (it is sent to other processes).
    jobs : iterable of tuple
        Read a few at a time, so that memory stays flat.
    processes : int
        1: in this process.
    scheduler : str, optional
        Address of a running Dask scheduler (extra `cluster`); its workers must see the same files.
    """
    if scheduler:
        yield from _iterate_cluster(function, jobs, scheduler)
    elif processes <= 1:
        yield from (function(*job) for job in jobs)
    else:
        yield from _iterate_processes(function, iter(jobs), processes)


def _iterate_processes(function, jobs, processes):
    """Keep a few jobs per worker in flight; a worker that dies takes the pool along, so its jobs are done again in a new one."""
    waiting: dict = {}
    lost: list[tuple] = []
    while True:
        with ProcessPoolExecutor(processes, mp_context=_choose_context()) as pool:
            try:
                for job in lost:
                    waiting[pool.submit(function, *job)] = job
                lost = []
                while True:
                    for job in islice(jobs, max(0, 4 * processes - len(waiting))):
                        waiting[pool.submit(function, *job)] = job
                    if not waiting:
                        return
                    done, _ = wait(waiting, return_when=FIRST_COMPLETED)
                    for future in done:
                        result = future.result()
                        del waiting[future]
                        yield result
            except BrokenProcessPool:
                lost = list(waiting.values())
                waiting = {}


def _choose_context():
    """Fresh processes rather than copies: the same on every system, and safe beside threads."""
    import multiprocessing

    return multiprocessing.get_context("spawn")


def _iterate_cluster(function, jobs, scheduler):
    try:
        from dask.distributed import Client, as_completed
    except ImportError:
        raise SettingError(
            "--scheduler",
            "an address, and dask.distributed is not installed",
            "the extra `cluster`",
            "pip install 'shiftpred[cluster]'",
        ) from None
    try:
        client = Client(scheduler, timeout="20s")
    except (OSError, TimeoutError, ValueError) as error:
        raise SettingError(
            "--scheduler",
            f"{scheduler!r}, which does not answer ({error})",
            "the address of a running scheduler, tcp://host:8786",
            "start one with `dask scheduler` and workers with `dask worker ADDRESS`",
        ) from None
    with client:
        jobs = iter(jobs)
        # Dask sends a job again when its worker dies; results are the same, and each file is written in one step.
        running = as_completed([client.submit(function, *job, pure=False, retries=3) for job in islice(jobs, 256)])
        for future in running:
            yield future.result()
            for job in islice(jobs, 1):
                running.add(client.submit(function, *job, pure=False, retries=3))
