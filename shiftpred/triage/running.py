"""A night's samples: go through the queue, go on after a stop, write the table and the page."""

from __future__ import annotations

import csv
import datetime
import io
import json
import sys
from collections import Counter
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path

from tqdm import tqdm

from shiftpred.errors import SettingError
from shiftpred.exit_codes import FINE, JUDGEMENT_REACHED, OUR_FAULT, SOME_RECORDS_FAILED, is_judgement_reached
from shiftpred.triage.engines import iterate_results
from shiftpred.triage.folder_lock import hold_folder
from shiftpred.triage.judging import ROW_COLUMNS, compute_fingerprint, judge_sample
from shiftpred.triage.page import render_triage_page
from shiftpred.triage.samples import parse_samples

__all__ = ["run_triage"]


def run_triage(
    samples: str | Path,
    output: str | Path,
    *,
    processes: int = 2,
    scheduler: str | None = None,
    fail_on: str | None = None,
    date: str | None = None,
    **settings,
) -> int:
    """Judge every sample and write `summary.csv`, `index.html`, `results/` and `reports/` to a folder.

    Parameters
    ----------
    samples : path
        A table or a folder (see `parse_samples`).
    output : path
        Made if it is not there. Samples whose result is there already, from the same data, settings and model, are not done
        again.
    processes : int, default 2
    scheduler : str, optional
        Address of a Dask scheduler to send the work to.
    fail_on : {'contradicted', 'open'}, optional
    date : str, optional
        Printed on reports; default today.
    **settings
        Keywords of `shiftpred.pipeline.compare`.

    Returns
    -------
    int
        Exit code: 0, 3 if samples could not be judged, 4 if a judgement is the one of `fail_on` or worse.

    Raises
    ------
    InputError, SettingError
        If samples or folder cannot be used.
    """
    from shiftpred.pipeline import load_model

    folder = Path(output)
    date = date or datetime.date.today().isoformat()
    edition = load_model(settings.get("model")).edition
    queue = list(parse_samples(samples))
    with _lock(folder):
        jobs, rows = [], {}
        for sample in queue:
            fingerprint = compute_fingerprint(sample, settings, edition)
            done = _read_result(folder, sample.number, fingerprint)
            if done is None:
                jobs.append((sample, settings, str(folder), fingerprint, date))
            else:
                rows[sample.number] = done
        kept = len(rows)
        _remove_surplus(folder, {s.number for s in queue})
        bar = tqdm(total=len(queue), initial=kept, unit="sample", desc="triage", disable=not sys.stderr.isatty())
        with bar:
            for row in iterate_results(judge_sample, jobs, processes, scheduler):
                rows[row["number"]] = row
                bar.update()
        ordered = [rows[s.number] for s in queue]
        _save_outcome(folder, ordered, edition, settings, date)
    counts = Counter(row["judgement"] or "not judged" for row in ordered)
    said = ", ".join(f"{counts[k]} {k}" for k in ("supported", "open", "contradicted", "not judged") if counts[k])
    again = f" ({kept} from an earlier run)" if kept else ""
    print(f"{len(ordered)} samples: {said}{again}; {folder / 'index.html'}, {folder / 'summary.csv'}", file=sys.stderr)
    if any(is_judgement_reached(row["judgement"], fail_on) for row in ordered):
        return JUDGEMENT_REACHED
    if any(row.get("fault") for row in ordered):
        return OUR_FAULT
    return SOME_RECORDS_FAILED if counts["not judged"] else FINE


def _read_result(folder: Path, number: int, fingerprint: str) -> dict | None:
    """Return a result of an earlier run if it is whole, of the same input, and its report is there."""
    try:
        row = json.loads((folder / "results" / f"{number:06d}.json").read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    if not isinstance(row, dict) or row.get("fingerprint") != fingerprint or row.get("fault"):
        return None
    return row if not row.get("report") or (folder / row["report"]).exists() else None


def _remove_surplus(folder: Path, numbers: set[int]) -> None:
    """Remove results of samples that are no longer in the table."""
    for path in (folder / "results").glob("[0-9]*.json"):
        if path.stem.isdigit() and int(path.stem) not in numbers:
            path.unlink(missing_ok=True)


def _save_outcome(folder: Path, rows: list[dict], edition: str, settings: dict, date: str) -> None:
    from shiftpred.reporting import save_text

    table = io.StringIO()
    writer = csv.DictWriter(table, ROW_COLUMNS, extrasaction="ignore", lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    save_text(folder / "summary.csv", table.getvalue())
    save_text(folder / "index.html", render_triage_page(rows, edition, settings, date))


@contextmanager
def _lock(folder: Path) -> Iterator[None]:
    """Make the folder and hold it for this run; a second run into it is refused."""
    with ExitStack() as held:
        try:
            for name in ("", "results", "reports"):
                (folder / name).mkdir(parents=True, exist_ok=True)
            held.enter_context(hold_folder(folder))
        except BlockingIOError:
            raise SettingError(
                "--output",
                f"{str(folder)!r}, which another run is writing to",
                "a folder of its own for each run",
                "wait for that run, or choose another folder",
            ) from None
        except OSError as error:
            raise SettingError(
                "--output", f"{str(folder)!r} ({error.strerror})", "a folder that can be written to", "choose another"
            ) from None
        yield
