"""Common impurities as coherent sets of lines: one is named only if all its lines are there."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

from shiftpred.peaks.solvents import load_table, solvent_lines, water_line

__all__ = ["ImpuritySet", "TOLERANCE", "impurity_sets", "name_leftovers"]

TOLERANCE = {"13C": 0.3, "1H": 0.03}
"""ppm by which a line may miss its published place (common practice, no source)."""
_BORROWED = {"13C": 0.8, "1H": 0.10}
"""The same where the solvent has no column of its own and the values in CDCl3 stand in."""
_WATER = 0.15


@dataclass(frozen=True)
class ImpuritySet:
    """All lines that one impurity gives in one solvent."""

    name: str
    smiles: str
    solvent: str
    lines: dict[str, tuple[float, ...]]
    """Nucleus → shifts in ppm, each distinct line once."""
    borrowed: bool
    """True where the values are those in CDCl3 for want of a column of the solvent."""
    source: str
    verified: str


@lru_cache(maxsize=32)
def impurity_sets(solvent: str | None) -> tuple[ImpuritySet, ...]:
    """Return the impurities with their lines in a solvent (in CDCl3, marked as borrowed, where it has no column)."""
    columns = ("name", "smiles", "solvent", "nucleus", "shift_ppm", "multiplicity", "source", "verified")
    found: dict[str, dict[str, list]] = {}
    for row in load_table("impurities.csv", columns):
        found.setdefault(row["name"], {}).setdefault(row["solvent"], []).append(row)
    out = []
    for name, by_solvent in found.items():
        own = solvent in by_solvent
        rows = by_solvent.get(solvent or "CDCl3") or by_solvent.get("CDCl3")
        if rows is None:
            continue
        lines: dict[str, list[float]] = {}
        for row in rows:
            shifts = lines.setdefault(row["nucleus"], [])
            if not any(abs(float(row["shift_ppm"]) - x) < TOLERANCE[row["nucleus"]] / 3 for x in shifts):
                shifts.append(float(row["shift_ppm"]))
        out.append(
            ImpuritySet(
                name,
                rows[0]["smiles"],
                rows[0]["solvent"],
                {k: tuple(v) for k, v in lines.items()},
                not own,
                rows[0]["source"],
                "memory" if any(r["verified"] == "memory" for r in rows) else "transcription",
            )
        )
    return tuple(sorted((s for s in out if not _is_the_solvent(s, solvent)), key=lambda s: s.name))


def _is_the_solvent(entry: ImpuritySet, solvent: str | None) -> bool:
    """Say whether all lines lie where the solvent's own do (chloroform in CDCl3, water in D2O): that is the solvent, no impurity."""
    return all(
        any(abs(x - line.shift_ppm) <= TOLERANCE[nucleus] for line in solvent_lines(solvent, nucleus))
        for nucleus, shifts in entry.lines.items()
        for x in shifts
    )


def name_leftovers(
    unexplained: dict[str, list[float]],
    solvent: str | None,
    also_present: dict[str, list[float]] | None = None,
    offset: dict[str, float] | None = None,
) -> dict[tuple[str, int], str]:
    """Name the lines that no nucleus of the structure takes.

    Parameters
    ----------
    unexplained : dict
        Nucleus → shifts (ppm) of the leftover lines; a nucleus that was not measured is absent.
    solvent : str or None
        Short name.
    also_present : dict, optional
        Nucleus → shifts of lines that are assigned to the structure; a line of an impurity may hide under one of them.
    offset : dict, optional
        Nucleus → reference offset (observed minus true), taken off first.

    Returns
    -------
    dict
        (nucleus, index into its list) → label: 'solvent CDCl3', 'water', the impurity's name, or 'possibly …' where a single
        line is all that could be seen. Lines without a label are absent.
    """
    also_present, offset = also_present or {}, offset or {}
    shifts = {n: [x - offset.get(n, 0.0) for x in values] for n, values in unexplained.items()}
    hidden = {n: [x - offset.get(n, 0.0) for x in also_present.get(n, ())] for n in unexplained}
    labels: dict[tuple[str, int], str] = {}
    for nucleus, values in shifts.items():
        for line in solvent_lines(solvent, nucleus):
            for k, x in enumerate(values):
                if abs(x - line.shift_ppm) <= TOLERANCE[nucleus] and (nucleus, k) not in labels:
                    labels[nucleus, k] = f"solvent {solvent}"
    found = []
    for entry in impurity_sets(solvent):
        match = _match(entry, shifts, hidden, labels, solvent)
        if match:
            found.append((match, entry))
    # The set with most lines first; of equal ones the nearer. A line is named once.
    found.sort(key=lambda pair: (-len(pair[0][0]), pair[0][1], pair[1].name))
    for (keys, _), entry in found:
        if any(k in labels for k in keys):
            continue
        n_lines = sum(len(v) for n, v in entry.lines.items() if n in shifts)
        label = entry.name if n_lines > 1 and len(keys) > 1 else f"possibly {entry.name}"
        for k in keys:
            labels[k] = label
    water = water_line(solvent)
    for k, x in enumerate(shifts.get("1H", ())):
        if water and ("1H", k) not in labels and abs(x - water.shift_ppm) <= _WATER:
            labels["1H", k] = "water"
    return labels


def _match(entry: ImpuritySet, shifts, hidden, labels, solvent):
    """Return (keys of the leftover lines that the set explains, misfit), or None if a line of the set is missing."""
    keys, misfit = [], 0.0
    tolerance = _BORROWED if entry.borrowed else TOLERANCE
    for nucleus, lines in entry.lines.items():
        if nucleus not in shifts:
            continue
        for line in lines:
            near = [
                (abs(x - line), k)
                for k, x in enumerate(shifts[nucleus])
                if abs(x - line) <= tolerance[nucleus] and (nucleus, k) not in labels and (nucleus, k) not in keys
            ]
            if near:
                distance, k = min(near)
                keys.append((nucleus, k))
                misfit += distance / tolerance[nucleus]
            elif any(abs(x - line) <= tolerance[nucleus] for x in hidden[nucleus]) or any(
                abs(s.shift_ppm - line) <= tolerance[nucleus] for s in solvent_lines(solvent, nucleus)
            ):
                misfit += 1.0
            elif nucleus == "1H" and _exchanges(entry, line):
                misfit += 0.5
            else:
                return None
    if not keys or len(keys) * 2 < sum(len(v) for n, v in entry.lines.items() if n in shifts):
        return None
    return keys, misfit / len(keys)


def _exchanges(entry: ImpuritySet, line: float) -> bool:
    """Say whether a 1H line may be absent because it is an O-H or N-H (the tables list them; samples often do not show them)."""
    return (
        entry.name
        in (
            "ethanol",
            "methanol",
            "2-propanol",
            "1-butanol",
            "isobutanol",
            "isoamyl alcohol",
            "benzyl alcohol",
            "tert-butyl alcohol",
            "ethylene glycol",
            "acetic acid",
            "formic acid",
            "pyrrole",
            "imidazole",
            "pyrrolidine",
            "ethyl L-lactate",
            "BHT",
        )
        and line in _LIKELY_LABILE.get(entry.name, ())
        or (entry.name in ("acetic acid", "formic acid") and line > 9)
    )


_LIKELY_LABILE = {"ethanol": (1.32,), "methanol": (1.09,), "BHT": (5.01,)}
"""O-H lines in CDCl3 as Gottlieb 1997 lists them (from memory); other alcohols' O-H lines are not in the table."""
