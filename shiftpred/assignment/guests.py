"""What else may give lines: the solvent, water, impurities and whatever the user expects in the tube."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from rdkit import Chem

from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.peaks.impurities import ImpurityLine, impurity_sets
from shiftpred.peaks.solvents import solvent_lines, water_line

__all__ = ["Guest", "GuestSet", "build_expected_guests", "build_impurity_guests", "build_solvent_guests"]

_COMMON_SOLVENTS = ("CDCl3", "DMSO-d6", "CD3OD", "acetone-d6")
_LISTED, _LISTED_UNNAMED = 0.25, 0.02
"""Chance that a list gives the solvent's line although it is not asked for (common practice, no source)."""
_MULTIPLET_LINES = {"t": 3, "quint": 5, "sept": 7, "septet": 7, "quintet": 5}
_MULTIPLET_SCALE_PPM = 0.35
_PRESENT, _PRESENT_ONE_LINE = 0.03, 0.008
"""Chance that a given common impurity is in the tube; lower where one line is all it gives, so that a lone line is not
explained away lightly (common practice, no source)."""
_PRESENT_REFERENCE = 0.2
_REACH = {"13C": 0.3, "1H": 0.05}
"""How much farther than its tolerance an observed line may lie for an impurity to be tried, ppm: the reference offset."""


@dataclass(frozen=True)
class Guest:
    """One line that is not the structure's own."""

    name: str
    """'solvent CDCl3', 'water', 'ethyl acetate', …"""
    shift: float
    scale: float
    degrees: float
    missing: float
    """Chance that it is not in the list although its compound is in the tube."""
    anchor: bool = False
    """True for a solvent line that fixes the reference."""
    hides: bool = False
    """True for a solvent line that is strong enough to hide others."""


@dataclass(frozen=True)
class GuestSet:
    """Lines that come together or not at all."""

    name: str
    guests: tuple[Guest, ...]
    log_prior: float
    """Log chance that the compound is in the tube; 0 for what is always there."""
    smiles: str = ""
    """Canonical SMILES without stereo; the compound itself is never its own impurity."""


def build_expected_guests(prediction, nucleus: str, name: str) -> GuestSet:
    """Return the lines of a compound that the user expects in the tube beside the structure.

    Parameters
    ----------
    prediction : MoleculePrediction
        Of the expected compound.
    nucleus : {'13C', '1H'}
    name : str
    """
    seen, guests = set(), []
    for row in prediction.nuclei:
        if row.nucleus != nucleus:
            continue
        key = (row.equivalent_atoms, row.hydrogen)
        if key not in seen:
            seen.add(key)
            guests.append(Guest(name, row.shift_ppm, row.scale_ppm, row.degrees_of_freedom, 0.7 if row.labile else 0.3))
    return GuestSet(name, tuple(guests), float(np.log(0.5)))


def build_solvent_guests(solvent: str | None, nucleus: str) -> tuple[GuestSet, ...]:
    """Return the lines of the solvent and of water; of the commonest solvents, with a low chance, where none is named.

    Parameters
    ----------
    solvent : str or None
        Short name.
    nucleus : {'13C', '1H'}
    """
    parameters = PARAMETERS[nucleus]
    names = (solvent,) if solvent else _COMMON_SOLVENTS
    listed = _LISTED if solvent else _LISTED_UNNAMED
    sets = []
    for name in names:
        label = f"solvent {name}" if solvent else f"possibly solvent {name}"
        guests = []
        for line in solvent_lines(name, nucleus):
            guests.append(
                Guest(label, line.shift_ppm, parameters.solvent_scale_ppm, 3.0, 1 - listed, bool(solvent), bool(solvent))
            )
            if nucleus == "13C" and solvent:
                # Some lists give every line of the solvent's multiplet.
                more = _MULTIPLET_LINES.get(line.multiplicity, 1) - 1
                guests += [Guest(label, line.shift_ppm, _MULTIPLET_SCALE_PPM, 8.0, 0.93)] * more
        water = water_line(name) if nucleus == "1H" and solvent else None
        if water is not None and all(abs(water.shift_ppm - g.shift) > 0.05 for g in guests):
            guests.append(Guest("water", water.shift_ppm, parameters.water_scale_ppm, 4.0, 0.75))
        if guests:
            sets.append(GuestSet(label, tuple(guests), 0.0))
    return tuple(sets)


def build_impurity_guests(solvent: str | None, observed: dict[str, np.ndarray]) -> dict[str, tuple[GuestSet, ...]]:
    """Return the impurities of which every line has an observed line near by, in every list that is given.

    Parameters
    ----------
    solvent : str or None
        Short name.
    observed : dict
        Nucleus → shifts in ppm.

    Returns
    -------
    dict
        Nucleus → sets of lines, the largest sets first.
    """
    found: dict[str, list[GuestSet]] = {nucleus: [] for nucleus in observed}
    for entry in impurity_sets(solvent):
        lines: dict[str, list[ImpurityLine]] = {}
        for line in entry.all_lines:
            if line.nucleus in observed and line.nucleus not in entry.incomplete and not line.labile:
                lines.setdefault(line.nucleus, []).append(line)
        if not lines or not all(_is_near(x, observed[n]) or _may_be_absent(x) for n, v in lines.items() for x in v):
            continue
        complete = sum(len(v) for v in lines.values()) > 1 or entry.kind == "reference"
        label = entry.name if complete else f"possibly {entry.name}"
        prior = _PRESENT_REFERENCE if entry.kind == "reference" else _PRESENT if complete else _PRESENT_ONE_LINE
        for nucleus, listed in lines.items():
            floor = PARAMETERS[nucleus].impurity_scale_ppm
            guests = tuple(
                Guest(label, x.shift_ppm, max(floor, x.tolerance_ppm / 2), 4.0, 0.05, anchor=entry.kind == "reference")
                for x in listed
                if _is_near(x, observed[nucleus])
            )
            if guests:
                found[nucleus].append(
                    GuestSet(label, guests, float(np.log(prior)) / len(lines), smiles=_canonical(entry.smiles))
                )
    return {n: tuple(sorted(sets, key=lambda s: (-len(s.guests), s.name))) for n, sets in found.items()}


@lru_cache(maxsize=512)
def _canonical(smiles: str) -> str:
    mol = Chem.MolFromSmiles(smiles)
    return Chem.MolToSmiles(mol, isomericSmiles=False) if mol is not None else smiles


def _is_near(line: ImpurityLine, observed: np.ndarray) -> bool:
    reach = _REACH[line.nucleus] + line.tolerance_ppm
    return bool(len(observed)) and bool(np.abs(observed - line.shift_ppm).min() <= reach)


def _may_be_absent(line: ImpurityLine) -> bool:
    """A carboxylic acid's hydrogen is often not seen."""
    return line.nucleus == "1H" and line.shift_ppm > 9.5
