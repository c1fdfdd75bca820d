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
    "CDCl3": "cdcl3 cdcl3d cdcl3d1 chloroformd chloroformd1 dchloroform d1chloroform chloroform chcl3 trichloromethane",
    "DMSO-d6": "dmsod6 d6dmso dmso cd32so dimethylsulfoxided6 dimethylsulphoxided6 dimethylsulfoxide cd3socd3",
    "CD3OD": "cd3od meod methanold4 d4methanol meodd4 d4meod methanol meoh meohd4 d4meoh cd3odd4 methanold",
    "acetone-d6": "acetoned6 d6acetone acetone cd32co cd3cocd3 aceton acetond6 me2cod6",
    "C6D6": "c6d6 benzened6 d6benzene benzene benzold6 benzol",
    "D2O": "d2o deuteriumoxide heavywater water h2o waterd2",
    "CD3CN": "cd3cn acetonitriled3 d3acetonitrile mecnd3 d3mecn acetonitrile mecn acetonitrild3",
    "CD2Cl2": "cd2cl2 dichloromethaned2 d2dichloromethane methylenechlorided2 dcmd2 d2dcm dichloromethane dcm ch2cl2",
    "THF-d8": "thfd8 d8thf thf tetrahydrofurand8 d8tetrahydrofuran tetrahydrofuran c4d8o",
    "toluene-d8": "toluened8 d8toluene toluene c7d8 phmed8 c6d5cd3 toluold8",
    "pyridine-d5": "pyridined5 d5pyridine pyridine c5d5n pyd5 pyridind5",
    "TFA-d": "tfad tfad1 dtfa cf3cood cf3co2d trifluoroaceticacidd trifluoroaceticacidd1 tfa",
    "DMF-d7": "dmfd7 d7dmf dmf nndimethylformamided7 dimethylformamided7 d7dimethylformamide",
    "C2D2Cl4": "c2d2cl4 tced2 d2tce tetrachloroethaned2 1122tetrachloroethaned2 d2tetrachloroethane cdcl2cdcl2",
    "dioxane-d8": "dioxaned8 14dioxaned8 d8dioxane d814dioxane dioxane",
    "acetic acid-d4": "aceticacidd4 d4aceticacid cd3cood cd3co2d acohd4",
    "cyclohexane-d12": "cyclohexaned12 d12cyclohexane c6d12",
    "CD3NO2": "cd3no2 nitromethaned3 d3nitromethane nitromethane",
    "C6D5Br": "c6d5br bromobenzened5 d5bromobenzene",
    "C6D4Cl2": "c6d4cl2 odichlorobenzened4 12dichlorobenzened4 odcbd4 dcbd4 d4odichlorobenzene",
    "TFE-d3": "tfed3 d3tfe trifluoroethanold3 222trifluoroethanold3 cf3cd2od",
    "CCl4": "ccl4 carbontetrachloride tetrachloromethane",
    "CFCl3": "cfcl3",
    "neat": "neat none solventfree",
    "mixture": "mixture",
    "other": "other",
}
_LOOKUP = {spelling: name for name, spellings in _SPELLINGS.items() for spelling in spellings.split()}
_SUBSCRIPTS = str.maketrans("₀₁₂₃₄₅₆₇₈₉⁰¹²³⁴⁵⁶⁷⁸⁹", "01234567890123456789")
_ADDITIVES = {"tms", "dss", "tsp", "nad", "naod", "dcl", "k2co3"}


@dataclass(frozen=True)
class SolventLine:
    """One line that a solvent, or water in it, gives by itself."""

    solvent: str
    kind: str
    """'solvent' or 'water'."""
    nucleus: str
    shift_ppm: float
    multiplicity: str
    """By deuterium (13C: t, quint, septet) or by residual hydrogen and deuterium (1H)."""
    source: str
    verified: str
    """'transcription' or 'memory'."""
    j_hz: float | None = None
    """13C: coupling by deuterium (or fluorine), from memory. None: not split, or not known."""

    def compute_half_width_ppm(self, frequency_mhz: float = 75.0) -> float:
        """Return how far the outermost line of the multiplet lies from its centre, at a 13C frequency."""
        lines = {"t": 3, "q": 4, "quint": 5, "septet": 7}.get(self.multiplicity, 1)
        return (lines - 1) / 2 * (self.j_hz or 0.0) / frequency_mhz


def normalise_solvent(text: str | None) -> str | None:
    """Return the short name of a solvent, None for a blank or None.

    Parameters
    ----------
    text : str or None
        Any common spelling: 'CDCl3', 'chloroform-d', '[D6]DMSO', '(CD3)2CO', 'MeOD', 'CDCl3 + TMS' …; two solvents give
        'mixture'.

    Raises
    ------
    SettingError
        If the solvent is not known; the message lists the names.

    Examples
    --------
    >>> [normalise_solvent(x) for x in ("[D₆]DMSO", "methanol-d4", "(CD3)2CO", "CDCl3/CD3OD 9:1")]
    ['DMSO-d6', 'CD3OD', 'acetone-d6', 'mixture']
    """
    if text is None or not str(text).strip():
        return None
    plain = str(text).translate(_SUBSCRIPTS).lower()
    found = _look_up(plain)
    if found:
        return found
    plain = re.sub(r"\(?\b\d{1,3}(?:\.\d+)?\s?[:/]\s?\d{1,3}(?:\.\d+)?\b\)?|\d{1,3}(?:\.\d+)?\s?%|\bv/v\b", " ", plain)
    parts = [p for p in re.split(r"\s*(?:/|\+|&|,|;|:|\band\b|\bwith\b)\s*", plain) if re.search(r"[a-z]", p)]
    parts = [p for p in parts if re.sub(r"[^a-z0-9]", "", p) not in _ADDITIVES]
    names = {_look_up(p) for p in parts}
    if parts and None not in names:
        return names.pop() if len(names) == 1 else "mixture"
    raise SettingError(
        "solvent",
        quote(text),
        "one of " + ", ".join(_SPELLINGS),
        "--solvent CDCl3, or leave the solvent out if it is not known",
    )


def _look_up(plain: str) -> str | None:
    plain = re.sub(r"\[\s?2h_?(\d{1,2})\s?\]", r"d\1", plain)
    key = re.sub(r"[^a-z0-9]", "", plain)
    return _LOOKUP.get(key) or _LOOKUP.get(re.sub(r"^(?:per)?deuter(?:ated|iated|o)", "", key))


@lru_cache(maxsize=1)
def _load_citations() -> dict[str, str]:
    with resources.files("shiftpred.peaks").joinpath("tables", "sources.csv").open(encoding="utf-8", newline="") as handle:
        return {row["key"]: row["citation"] for row in csv.DictReader(handle)}


def load_table(name: str, columns: tuple[str, ...]) -> list[dict[str, str]]:
    """Read one of this room's tables; every row must state a source that `sources.csv` knows, which is written out in full.

    Parameters
    ----------
    name : str
        File name in `tables/`.
    columns : tuple of str
        The columns in their order.

    Raises
    ------
    ValueError
        If a column is missing or unknown, or a row has no known source or does not say whether it was seen.
    """
    with resources.files("shiftpred.peaks").joinpath("tables", name).open(encoding="utf-8", newline="") as handle:
        reader = csv.DictReader(handle)
        if tuple(reader.fieldnames or ()) != columns:
            raise ValueError(f"{name}: columns {reader.fieldnames}, expected {columns}")
        rows = list(reader)
    citations = _load_citations()
    for number, row in enumerate(rows, 2):
        if row["source"] not in citations or row["verified"] not in ("transcription", "memory"):
            raise ValueError(f"{name}, line {number}: no known source, or not said whether it was seen")
        row["source"] = citations[row["source"]]
    return rows


@lru_cache(maxsize=1)
def _load_lines() -> dict[tuple[str, str, str], tuple[SolventLine, ...]]:
    found: dict[tuple[str, str, str], list[SolventLine]] = {}
    columns = ("solvent", "kind", "nucleus", "shift_ppm", "multiplicity", "j_hz", "source", "verified")
    for row in load_table("solvents.csv", columns):
        values = {**row, "shift_ppm": float(row["shift_ppm"]), "j_hz": float(row["j_hz"]) if row["j_hz"] else None}
        line = SolventLine(**values)
        found.setdefault((line.solvent, line.kind, line.nucleus), []).append(line)
    return {k: tuple(v) for k, v in found.items()}


def solvent_lines(solvent: str | None, nucleus: str) -> tuple[SolventLine, ...]:
    """Return the lines of the solvent itself, empty for an unknown solvent or None.

    Parameters
    ----------
    solvent : str or None
        Short name.
    nucleus : {'13C', '1H'}
    """
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
    """Say whether O-H, N-H and S-H exchange for deuterium and give no line (CD3OD, D2O, acids and alcohols with O-D)."""
    return solvent in ("CD3OD", "D2O", "TFA-d", "acetic acid-d4", "TFE-d3")
