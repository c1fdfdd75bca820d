"""One sample → one row and one report. Runs in a worker process; whatever goes wrong becomes a row."""

from __future__ import annotations

import hashlib
import json
import re
import time
from pathlib import Path

from shiftpred.errors import InputError, ShiftpredError
from shiftpred.records import RecordFailure
from shiftpred.triage.samples import Sample

__all__ = ["ROW_COLUMNS", "compute_fingerprint", "judge_sample"]

ROW_COLUMNS = (
    "sample",
    "judgement",
    "probability",
    "reason_code",
    "sentence",
    "nearest_rival",
    "leftover_lines",
    "missing_nuclei",
    "c13_offset_ppm",
    "h1_offset_ppm",
    "smiles",
    "report",
    "note",
)
"""Columns of the summary table; `judgement` is blank and `note` says why where a sample could not be judged."""


def compute_fingerprint(sample: Sample, settings: dict, edition: str) -> str:
    """Return a hash of all that a sample's result depends on: its own data (files by content), settings, model edition."""
    parts = [json.dumps(settings, sort_keys=True), edition]
    for text in (sample.name, sample.structure, sample.c13, sample.h1, sample.solvent, sample.frequency):
        path = Path(text) if 0 < len(text) < 1000 and "\n" not in text else None
        try:
            parts.append(hashlib.sha256(path.read_bytes()).hexdigest() if path and path.is_file() else text)
        except OSError:
            parts.append(text)
    return hashlib.sha256("\x1f".join(parts).encode()).hexdigest()


def judge_sample(sample: Sample, settings: dict, folder: str, fingerprint: str, date: str) -> dict:
    """Compare one sample and write its report and its result.

    Parameters
    ----------
    sample : Sample
    settings : dict
        Keywords of `shiftpred.pipeline.compare` (without solvent and frequency of the sample itself), `model` among them.
    folder : str
        The run's folder; the report goes to `reports/`, the result to `results/`, each written aside and renamed.
    fingerprint : str
        From `compute_fingerprint`.
    date : str
        Printed on the report.

    Returns
    -------
    dict
        The row, with `number`, `fingerprint`, `seconds` and the `thumbnail` beside the columns of `ROW_COLUMNS`.
    """
    begun = time.perf_counter()
    row = dict.fromkeys(ROW_COLUMNS, "") | dict(sample=sample.name, smiles=sample.structure)
    try:
        row |= _compare(sample, settings, Path(folder), date)
    except ShiftpredError as error:
        row["note"] = str(error)
    except Exception as error:  # one bad sample costs one row, whatever it found
        row["note"] = f"a fault of ours: {type(error).__name__}: {error}"
        row["fault"] = True
    row |= dict(number=sample.number, fingerprint=fingerprint, seconds=round(time.perf_counter() - begun, 3))
    from shiftpred.reporting import save_text

    save_text(Path(folder) / "results" / f"{sample.number:06d}.json", json.dumps(row))
    return row


def _compare(sample: Sample, settings: dict, folder: Path, date: str) -> dict:
    from shiftpred.peaks import parse_peaks
    from shiftpred.pipeline import compare
    from shiftpred.reporting import (
        compute_comparison_dict,
        render_comparison_html,
        render_structure_svg,
        render_verdict_line,
        save_text,
    )

    structure = _read_structure(sample)
    peaks = {
        key: parse_peaks(text, nucleus, where=f"sample {sample.name}, {key}") if text else None
        for key, nucleus, text in (("c13", "13C", sample.c13), ("h1", "1H", sample.h1))
    }
    if not any(peaks.values()):
        raise InputError(f"sample {sample.name}", "no peaks", "a 13C or a 1H list", "fill in c13 or h1")
    own = dict(settings)
    if sample.solvent:
        own["solvent"] = sample.solvent
    if sample.frequency:
        try:
            own["frequency_mhz"] = float(sample.frequency.replace(",", "."))  # 400,13 as a German Excel has it
        except ValueError:
            raise InputError(f"sample {sample.name}, frequency", repr(sample.frequency), "a number of MHz", "400") from None
    comparison = compare(structure, **peaks, **own)
    document = compute_comparison_dict(comparison, sample.name, date)
    report = f"reports/{sample.number:06d}_{re.sub(r'[^A-Za-z0-9._-]+', '_', sample.name)[:60]}.html"
    save_text(folder / report, render_comparison_html(document))
    rivals = document.get("rivals") or [{}]
    offsets = document.get("reference_offset_ppm") or {}
    return dict(
        judgement=comparison.judgement,
        probability=round(comparison.probability, 4),
        reason_code=comparison.reason_code,
        sentence=comparison.reasons[0] if comparison.reasons else render_verdict_line(document),
        nearest_rival=rivals[0].get("smiles", ""),
        leftover_lines=sum(u.likely is None for u in comparison.unexplained),
        missing_nuclei=sum(not m.note for m in comparison.missing),
        c13_offset_ppm=offsets.get("13C", ""),
        h1_offset_ppm=offsets.get("1H", ""),
        smiles=structure.smiles,
        report=report,
        note="; ".join(structure.notes),
        thumbnail=render_structure_svg(document["structure"], numbers=False),
    )


def _read_structure(sample: Sample):
    from shiftpred.structures import parse_structures

    if not sample.structure:
        raise InputError(f"sample {sample.name}", "no structure", "a SMILES or a structure file", "fill in smiles")
    records = list(parse_structures(sample.structure, name=sample.name))
    if len(records) != 1:
        raise InputError(
            f"sample {sample.name}", f"{len(records)} structures", "one structure", "give one sample for each structure"
        )
    if isinstance(records[0], RecordFailure):
        raise records[0].error
    return records[0]
