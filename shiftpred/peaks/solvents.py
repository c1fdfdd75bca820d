"""Solvents: their names in all spellings, their own lines, water in each of them."""

from __future__ import annotations

import csv
import re
from dataclasses import dataclass
from functools import lru_cache
from importlib import resources

from shiftpred.errors import SettingError, quote

__all__ = [
    "SolventLine",
    "is_deuterated_exchange",
    "load_table",
    "normalise_solvent",
    "reference_line",
    "solvent_lines",
    "water_line",
]

_SPELLINGS = {
    "CDCl3": (
        "cdcl3",
        "chloroformd",
        "chloroformd1",
        "dchloroform",
        "deuterochloroform",
        "chloroform",
        "chcl3",
        "d1chloroform",
    ),
    "DMSO-d6": (
        "dmsod6",
        "d6dmso",
        "dmso",
        "cd32so",
        "dimethylsulfoxided6",
        "hexadeuterodimethylsulfoxide",
        "d6dimethylsulfoxide",
    ),
    "CD3OD": ("cd3od", "meod", "methanold4", "d4methanol", "meodd4", "d4meod", "methanol", "meoh", "meohd4"),
    "acetone-d6": ("acetoned6", "d6acetone", "acetone", "cd32co", "cd3cocd3"),
    "C6D6": ("c6d6", "benzened6", "d6benzene", "benzene"),
    "D2O": ("d2o", "deuteriumoxide", "heavywater", "water", "h2o"),
    "CD3CN": ("cd3cn", "acetonitriled3", "d3acetonitrile", "mecnd3", "acetonitrile", "d3mecn", "mecn"),
    "CD2Cl2": ("cd2cl2", "dichloromethaned2", "d2dichloromethane", "methylenechlorided2", "dcmd2", "dichloromethane"),
    "THF-d8": ("thfd8", "d8thf", "thf", "tetrahydrofurand8", "d8tetrahydrofuran"),
    "toluene-d8": ("toluened8", "d8toluene", "toluene", "c7d8", "phmed8"),
    "pyridine-d5": ("pyridined5", "d5pyridine", "pyridine", "c5d5n", "pyd5"),
    "TFA-d": ("tfad", "dtfa", "cf3cood", "cf3co2d", "trifluoroaceticacidd", "tfa", "tfad1"),
    "CCl4": ("ccl4", "carbontetrachloride", "tetrachloromethane"),
    "CFCl3": ("cfcl3",),
    "neat": ("neat",),
    "mixture": ("mixture",),
    "other": ("other",),
}
_LOOKUP = {spelling: name for name, all_of_them in _SPELLINGS.items() for spelling in all_of_them}
_SUBSCRIPTS = str.maketrans("₀₁₂₃₄₅₆₇₈₉⁰¹²³⁴⁵⁶⁷⁸⁹", "01234567890123456789")


@dataclass(frozen=True)
class SolventLine:
    """One line that a solvent, or water in it, gives by itself."""

    solvent: str
    kind: str
    """'solvent' or 'water'."""
    nucleus: str
    shift_ppm: float
    multiplicity: str
    source: str
    verified: str
    """'transcription' or 'memory'."""


def normalise_solvent(text: str) -> str:
    """Return the short name of a solvent.

    Parameters
    ----------
    text : str
        Any common spelling: 'CDCl3', 'chloroform-d', '[D6]DMSO', '(CD3)2CO', 'MeOD' …

    Raises
    ------
    SettingError
        If the solvent is not known; the message lists the names.

    Examples
    --------
    >>> normalise_solvent("[D₆]DMSO"), normalise_solvent("methanol-d4"), normalise_solvent("(CD3)2CO")
    ('DMSO-d6', 'CD3OD', 'acetone-d6')
    """
    key = re.sub(r"[^a-z0-9]", "", str(text).translate(_SUBSCRIPTS).lower())
    if key in _LOOKUP:
        return _LOOKUP[key]
    raise SettingError(
        "solvent",
        quote(text),
        "one of " + ", ".join(_SPELLINGS),
        "--solvent CDCl3, or leave the solvent out if it is not known",
    )


def load_table(name: str, columns: tuple[str, ...]) -> list[dict[str, str]]:
    """Read one of this room's tables; every row must state its source.

    Raises
    ------
    ValueError
        If a column is missing or unknown, or a row has no source.
    """
    with resources.files("shiftpred.peaks").joinpath("tables", name).open(encoding="utf-8", newline="") as handle:
        reader = csv.DictReader(handle)
        if tuple(reader.fieldnames or ()) != columns:
            raise ValueError(f"{name}: columns {reader.fieldnames}, expected {columns}")
        rows = list(reader)
    for number, row in enumerate(rows, 2):
        if not row["source"].strip() or row["verified"] not in ("transcription", "memory"):
            raise ValueError(f"{name}, line {number}: no source, or not said whether it was seen")
    return rows


@lru_cache(maxsize=1)
def _load_lines() -> dict[tuple[str, str, str], tuple[SolventLine, ...]]:
    found: dict[tuple[str, str, str], list[SolventLine]] = {}
    columns = ("solvent", "kind", "nucleus", "shift_ppm", "multiplicity", "source", "verified")
    for row in load_table("solvents.csv", columns):
        line = SolventLine(**{**row, "shift_ppm": float(row["shift_ppm"])})
        found.setdefault((line.solvent, line.kind, line.nucleus), []).append(line)
    return {k: tuple(v) for k, v in found.items()}


def solvent_lines(solvent: str | None, nucleus: str) -> tuple[SolventLine, ...]:
    """Return the lines of the solvent itself, empty for an unknown solvent or None."""
    return _load_lines().get((solvent or "", "solvent", nucleus), ())


def water_line(solvent: str | None) -> SolventLine | None:
    """Return where water lies in a solvent, None where it is not known."""
    lines = _load_lines().get((solvent or "", "water", "1H"), ())
    return lines[0] if lines else None


def reference_line(solvent: str | None, nucleus: str) -> float | None:
    """Return the shift (ppm) that a spectrum in this solvent is referenced to, None where there is none."""
    lines = solvent_lines(solvent, nucleus)
    return lines[0].shift_ppm if lines else None


def is_deuterated_exchange(solvent: str | None) -> bool:
    """Say whether O-H, N-H and S-H exchange for deuterium and give no line (CD3OD, D2O, TFA-d)."""
    return solvent in ("CD3OD", "D2O", "TFA-d")
