"""Common impurities, greases and counter-ions as coherent sets of lines: one is named only if all its lines are there.

A 13C spectrum is so much weaker than the 1H spectrum that traces are often seen in the latter only. So an impurity whose 1H
lines are all there while none of its 13C lines is, is called "possibly …"; the other way round it is not named at all.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property, lru_cache

from shiftpred.peaks.solvents import is_deuterated_exchange, load_table, solvent_lines, water_line

__all__ = ["TOLERANCE", "ImpurityLine", "ImpuritySet", "find_known_set", "impurity_sets", "name_leftovers"]

TOLERANCE = {"13C": 0.3, "1H": 0.03}
"""ppm by which a line may miss its published place (common practice, no source)."""
_OF_MULTIPLETS = {"13C": 0.3, "1H": 0.06}
"""The same for unresolved multiplets, whose centre is read differently by everybody."""
_BORROWED = {"13C": 0.8, "1H": 0.10}
"""The same where the solvent has no column of its own and the values of another stand in."""
_OF_IONS = {"13C": 1.5, "1H": 0.15}
"""The same for counter-ions, whose shifts follow pH and concentration."""
_WATER = 0.2
"""ppm by which water may miss its place: it follows concentration and temperature (common practice, no source)."""
_SAME_LINE = {"13C": 0.1, "1H": 0.01}
_STANDS_IN = {"toluene-d8": "C6D6", "THF-d8": "acetone-d6", "dioxane-d8": "acetone-d6", "DMF-d7": "DMSO-d6", "C6D5Br": "C6D6",
              "C6D4Cl2": "C6D6", "pyridine-d5": "DMSO-d6", "TFE-d3": "CD3OD", "acetic acid-d4": "CD3OD",
              "CD3NO2": "CD3CN"}  # fmt: skip
"""Solvents without a column → the most similar one that has one; CDCl3 for all others (common practice, no source)."""


@dataclass(frozen=True)
class ImpurityLine:
    """One line of an impurity."""

    nucleus: str
    shift_ppm: float
    tolerance_ppm: float
    labile: bool
    """True for an O-H or N-H: it may lie elsewhere or be absent, and is never asked for."""
    multiplicity: str
    source: str
    verified: str
    """'transcription' or 'memory'."""


@dataclass(frozen=True)
class ImpuritySet:
    """All lines that one impurity gives in one solvent."""

    name: str
    smiles: str
    kind: str
    """'impurity', 'grease', 'counter-ion' or 'reference'."""
    solvent: str
    """Where the values were measured."""
    all_lines: tuple[ImpurityLine, ...]
    borrowed: bool
    """True where the values are wide: those of another solvent for want of a column, or of a counter-ion."""
    incomplete: tuple[str, ...] = ()
    """Nuclei of which the tables do not have every line."""

    @cached_property
    def lines(self) -> dict[str, tuple[float, ...]]:
        """Nucleus → shifts in ppm, each distinct line once, labile hydrogens left out."""
        out: dict[str, list[float]] = {}
        for line in self.all_lines:
            if not line.labile:
                out.setdefault(line.nucleus, []).append(line.shift_ppm)
        return {nucleus: tuple(shifts) for nucleus, shifts in out.items()}

    @property
    def source(self) -> str:
        """Every source of its lines."""
        return "; ".join(sorted({line.source for line in self.all_lines}))

    @property
    def verified(self) -> str:
        """'transcription' if every line was seen, else 'memory'."""
        return "memory" if any(line.verified == "memory" for line in self.all_lines) else "transcription"


@lru_cache(maxsize=1)
def _load_rows() -> dict[str, dict[str, list[dict[str, str]]]]:
    """Return name → solvent → rows of the table."""
    columns = (
        "name",
        "smiles",
        "kind",
        "solvent",
        "nucleus",
        "shift_ppm",
        "nuclei",
        "labile",
        "complete",
        "multiplicity",
        "source",
        "verified",
    )
    found: dict[str, dict[str, list]] = {}
    for row in load_table("impurities.csv", columns):
        found.setdefault(row["name"], {}).setdefault(row["solvent"], []).append(row)
    return found


@lru_cache(maxsize=32)
def impurity_sets(solvent: str | None) -> tuple[ImpuritySet, ...]:
    """Return the impurities with their lines in a solvent.

    Parameters
    ----------
    solvent : str or None
        Short name. Where it has no column, the values of the most similar solvent stand in (CDCl3 for most, and for None) with
        wider tolerances, marked as borrowed. In D2O only what was measured in D2O is returned: the rest does not dissolve.

    Returns
    -------
    tuple of ImpuritySet
        By name. Tetramethylsilane comes once for each nucleus, as its line in one spectrum says nothing about the other.
    """
    out = []
    for name, by_solvent in _load_rows().items():
        home = next((s for s in (solvent, _STANDS_IN.get(solvent or ""), "CDCl3") if s in by_solvent), None)
        if home is None or (solvent == "D2O" and home != "D2O"):
            continue
        rows, ion = by_solvent[home], by_solvent[home][0]["kind"] == "counter-ion"
        borrowed = home != solvent or ion
        if ion and home != solvent and solvent is not None:
            continue  # the shift of a salt in one solvent says little about another
        lines = _build_lines(rows, borrowed, ion, solvent)
        incomplete = tuple(sorted({r["nucleus"] for r in rows if r["complete"] == "0"}))
        kind = rows[0]["kind"]
        groups = [lines] if kind != "reference" else [tuple(x for x in lines if x.nucleus == n) for n in ("13C", "1H")]
        out += [ImpuritySet(name, rows[0]["smiles"], kind, home, g, borrowed, incomplete) for g in groups if g]
    return tuple(sorted((s for s in out if s.lines and not _is_the_solvent(s, solvent)), key=lambda s: s.name))


def _build_lines(rows, borrowed: bool, ion: bool, solvent: str | None) -> tuple[ImpurityLine, ...]:
    lines: list[ImpurityLine] = []
    for row in rows:
        nucleus, shift, labile = row["nucleus"], float(row["shift_ppm"]), row["labile"] == "1"
        if labile and is_deuterated_exchange(solvent):
            continue
        if any(x.nucleus == nucleus and x.labile == labile and abs(x.shift_ppm - shift) < _SAME_LINE[nucleus] for x in lines):
            continue
        widths = _OF_IONS if ion else _BORROWED if borrowed else _OF_MULTIPLETS if row["multiplicity"] == "m" else TOLERANCE
        lines.append(ImpurityLine(nucleus, shift, widths[nucleus], labile, row["multiplicity"], row["source"], row["verified"]))
    return tuple(lines)


def _is_the_solvent(entry: ImpuritySet, solvent: str | None) -> bool:
    """Say whether all lines lie where the solvent's own do (chloroform in CDCl3): that is the solvent, no impurity."""
    return all(
        any(abs(x - line.shift_ppm) <= TOLERANCE[nucleus] for line in solvent_lines(solvent, nucleus))
        for nucleus, shifts in entry.lines.items()
        for x in shifts
    )


def find_known_set(smiles: str, solvent: str | None) -> ImpuritySet | None:
    """Return the published lines of a compound, None if it is not in the tables.

    Parameters
    ----------
    smiles : str
        Any SMILES of it. An acid finds the set of its anion and a base that of its cation, if it has none of its own. One that
        cannot be read gives None.
    solvent : str or None
        Short name.
    """
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        return None
    exact, uncharged = _index_by_structure(solvent)
    return exact.get(_write_plain(mol)) or uncharged.get(_write_uncharged(mol))


@lru_cache(maxsize=8)
def _index_by_structure(solvent: str | None) -> tuple[dict[str, ImpuritySet], dict[str, ImpuritySet]]:
    """Return SMILES → set, as drawn and uncharged."""
    from rdkit import Chem

    exact, uncharged = {}, {}
    for entry in impurity_sets(solvent):
        mol = Chem.MolFromSmiles(entry.smiles)
        exact.setdefault(_write_plain(mol), entry)
        uncharged.setdefault(_write_uncharged(mol), entry)
    return exact, uncharged


def _write_plain(mol) -> str:
    """Return the SMILES with double-bond geometry, without handedness: enantiomers give the same lines."""
    from rdkit import Chem

    mol = Chem.Mol(mol)
    for atom in mol.GetAtoms():
        atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    return Chem.MolToSmiles(mol)


def _write_uncharged(mol) -> str:
    """Return the SMILES with acids protonated and protonated bases freed."""
    from rdkit import Chem

    mol = Chem.RWMol(mol)
    for atom in mol.GetAtoms():
        opposite = any(n.GetFormalCharge() * atom.GetFormalCharge() < 0 for n in atom.GetNeighbors())
        if atom.GetFormalCharge() == -1 and atom.GetSymbol() in "OSN" and not opposite:
            atom.SetFormalCharge(0)
            atom.SetNoImplicit(False)
        elif atom.GetFormalCharge() == 1 and atom.GetSymbol() == "N" and atom.GetTotalNumHs() and not opposite:
            atom.SetFormalCharge(0)
            atom.SetNumExplicitHs(0)
            atom.SetNoImplicit(False)
    mol.UpdatePropertyCache(strict=False)
    return _write_plain(mol)


@dataclass
class _Match:
    """One set of lines laid over the leftovers."""

    entry: ImpuritySet
    keys: list[tuple[str, int]] = field(default_factory=list)
    misfit: float = 0.0
    expected: int = 0
    """Lines asked for in the measured nuclei."""
    unseen_carbons: bool = False
    """True where 13C was measured and none of its 13C lines is there."""

    @property
    def is_sure(self) -> bool:
        """More than one line speaks for it, and none of the measured spectra lacks it."""
        return len(self.keys) > 1 and self.expected > 1 and not self.unseen_carbons


def name_leftovers(
    unexplained: dict[str, list[float]],
    solvent: str | None,
    also_present: dict[str, list[float]] | None = None,
    offset: dict[str, float] | None = None,
    frequency_mhz: float | None = None,
) -> dict[tuple[str, int], str]:
    """Name the lines that no nucleus of the structure takes.

    Parameters
    ----------
    unexplained : dict
        Nucleus → shifts (ppm) of the leftover lines; a nucleus that was not measured is absent, one that was measured and
        has no leftovers has an empty list.
    solvent : str or None
        Short name.
    also_present : dict, optional
        Nucleus → shifts of lines that are assigned to the structure; a line of an impurity may hide under one of them.
    offset : dict, optional
        Nucleus → reference offset (observed minus true), taken off first.
    frequency_mhz : float, optional
        13C frequency, for the width of the solvent's multiplet; without it that at 75 MHz.

    Returns
    -------
    dict
        (nucleus, index into its list) → label: 'solvent CDCl3', 'water', the impurity's name, or 'possibly …' where a single
        line is all that speaks for it. Lines without a label are absent.
    """
    also_present, offset = also_present or {}, offset or {}
    shifts = {n: [x - offset.get(n, 0.0) for x in values] for n, values in unexplained.items()}
    hidden = {n: [x - offset.get(n, 0.0) for x in also_present.get(n, ())] for n in unexplained}
    hidden = {n: [*values, *(line.shift_ppm for line in solvent_lines(solvent, n))] for n, values in hidden.items()}
    labels = _name_solvent_lines(shifts, solvent, frequency_mhz)
    matches = [m for entry in impurity_sets(solvent) if (m := _match(entry, shifts, hidden, labels))]
    # What is sure first, then the set with most lines; of equal ones the nearer. A line is named once, a doubtful one twice.
    matches.sort(
        key=lambda m: (not m.is_sure, -len(m.keys), m.entry.kind == "counter-ion", m.misfit / len(m.keys), m.entry.name)
    )
    taken = set(labels)
    for match in matches:
        if match.is_sure and not taken & set(match.keys):
            taken |= set(match.keys)
            labels.update(dict.fromkeys(match.keys, match.entry.name))
    for match in matches:  # several lines that only one spectrum shows weigh more than a single line
        if not match.is_sure and len(match.keys) > 1 and not taken & set(match.keys):
            taken |= set(match.keys)
            labels.update(dict.fromkeys(match.keys, f"possibly {match.entry.name}"))
    doubtful: dict[tuple[str, int], list[_Match]] = {}
    for match in matches:
        if len(match.keys) == 1 and match.keys[0] not in taken:
            doubtful.setdefault(match.keys[0], []).append(match)
    for k, x in enumerate(shifts.get("1H", ())):
        if ("1H", k) not in labels and _is_water(x, solvent, doubtful.get(("1H", k), [])):
            labels["1H", k] = "water"
    for key, found in doubtful.items():
        names = dict.fromkeys(m.entry.name for m in found)
        labels.setdefault(key, f"possibly {' or '.join(list(names)[:2])}")
    return labels


def _is_water(shift_ppm: float, solvent: str | None, rivals: list[_Match]) -> bool:
    """Say whether a leftover 1H line is water: near its place, unless it is a good deal nearer to a line of something else."""
    water = water_line(solvent)
    if water is None:
        return False
    away = abs(shift_ppm - water.shift_ppm)
    closest = min((abs(shift_ppm - x) for m in rivals for x in m.entry.lines["1H"]), default=9.0)
    return away <= _WATER and (away <= _WATER / 2 or closest >= away)


def _name_solvent_lines(shifts, solvent: str | None, frequency_mhz: float | None) -> dict[tuple[str, int], str]:
    labels = {}
    for nucleus, values in shifts.items():
        for line in solvent_lines(solvent, nucleus):
            width = TOLERANCE[nucleus] + line.compute_half_width_ppm(frequency_mhz or 75.0)
            for k, x in enumerate(values):
                if abs(x - line.shift_ppm) <= width:
                    labels.setdefault((nucleus, k), f"solvent {solvent}")
    return labels


def _match(entry: ImpuritySet, shifts, hidden, labels) -> _Match | None:
    """Lay a set over the leftovers; None if a line that must be there is not."""
    match = _Match(entry)
    for nucleus in ("1H", "13C"):
        own = [line for line in entry.all_lines if line.nucleus == nucleus]
        if nucleus not in shifts or not any(not line.labile for line in own):
            continue
        keys, misfit, absent = _match_nucleus(own, shifts[nucleus], hidden[nucleus], labels)
        asked = sum(not line.labile for line in own)
        if nucleus == "13C" and absent and not keys and match.keys:
            match.unseen_carbons = True  # a trace that the weaker spectrum does not show
            continue
        if absent:
            return None
        match.keys += keys
        match.misfit += misfit
        match.expected += asked
    visible = sum(key[0] == n for key in match.keys for n in shifts)
    return match if match.keys and visible * 2 >= match.expected else None


def _match_nucleus(lines, shifts, hidden, labels):
    """Return (keys of the leftovers that are taken, misfit, whether a line is missing)."""
    keys, misfit, absent = [], 0.0, False
    for line in sorted(lines, key=lambda x: x.labile):
        near = [
            (abs(x - line.shift_ppm), k)
            for k, x in enumerate(shifts)
            if abs(x - line.shift_ppm) <= line.tolerance_ppm
            and (line.nucleus, k) not in labels
            and (line.nucleus, k) not in keys
        ]
        if near:
            distance, k = min(near)
            keys.append((line.nucleus, k))
            misfit += distance / line.tolerance_ppm
        elif line.labile:
            continue
        elif any(abs(x - line.shift_ppm) <= line.tolerance_ppm for x in [*hidden, *shifts]):
            misfit += 1.0  # under a line of the structure, of the solvent, or of the impurity itself
        else:
            absent = True
    return keys, misfit, absent
