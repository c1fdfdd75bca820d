"""Run generated inputs for a while and keep every one that ends in anything but an answer or a documented error."""

from __future__ import annotations

import argparse
import faulthandler
import random
import sys
import time
import traceback
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from shiftpred.errors import ShiftpredError

LONGEST_SECONDS = 10.0
"""Processor time that one input may take."""


@dataclass(frozen=True)
class Finding:
    """An input that brought an undocumented error or took too long."""

    number: int
    given: str
    what: str


def run_inputs(
    build: Callable[[random.Random], str],
    use: Callable[[str], object],
    seed: int = 0,
    inputs: int | None = None,
    minutes: float | None = None,
    last_input: Path | None = None,
) -> tuple[int, int, list[Finding]]:
    """Build and use inputs until their number or the time is up.

    Parameters
    ----------
    build : callable
        Random source → input. The n-th input depends on `seed` and n alone.
    use : callable
        What is under test; a `ShiftpredError` is an answer.
    last_input : path, optional
        Keeps the input that is in work, for a crash that takes the interpreter along.

    Returns
    -------
    used, refused : int
    findings : list of Finding
        One for each place of the source at which it went wrong.
    """
    end = time.monotonic() + 60 * minutes if minutes is not None else float("inf")
    used = refused = 0
    findings: dict[str, Finding] = {}
    while (inputs is None or used < inputs) and time.monotonic() < end:
        given = build(random.Random(f"{seed} {used}"))
        if last_input is not None:
            last_input.write_text(given, encoding="utf-8", errors="surrogatepass")
        begun = time.process_time()
        try:
            use(given)
        except ShiftpredError:
            refused += 1
        except Exception as error:
            place = traceback.extract_tb(error.__traceback__)[-1]
            what = f"{type(error).__name__}: {error} at {Path(place.filename).name}:{place.lineno}"
            findings.setdefault(f"{type(error)} {place.filename} {place.lineno}", Finding(used, given, what))
        taken = time.process_time() - begun
        if taken > LONGEST_SECONDS:
            findings.setdefault("time", Finding(used, given, f"took {taken:.1f} s"))
        used += 1
    return used, refused, list(findings.values())


def run_from_command_line(name: str, build, use) -> None:
    """Parse `--minutes`, `--seed` and `--output`, run, print what was found; exit code 1 if anything was."""
    parser = argparse.ArgumentParser(description=name)
    parser.add_argument("--minutes", type=float, default=1.0)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--output", type=Path, default=Path("fuzz-findings"), help="folder for what was found")
    options = parser.parse_args()
    faulthandler.enable()
    options.output.mkdir(parents=True, exist_ok=True)
    last = options.output / f"{name}-last.txt"
    used, refused, findings = run_inputs(build, use, options.seed, minutes=options.minutes, last_input=last)
    print(f"{name}: {used:,} inputs in {options.minutes:g} minutes, {refused:,} refused, {len(findings)} findings")
    for finding in findings:
        path = options.output / f"{name}-{options.seed}-{finding.number}.txt"
        path.write_text(finding.given, encoding="utf-8", errors="surrogatepass")
        print(f"{path}: {finding.what}")
    sys.exit(bool(findings))
