"""What else may give lines: the solvent, water, impurities and whatever the user expects in the tube."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.peaks.impurities import impurity_sets
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
_REACH = {"13C": 0.6, "1H": 0.08}
"""How near an observed line must be for an impurity to be tried, ppm: tolerance and reference offset."""


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
    coherent: bool = True
    """True: only if every line is found."""


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
    return GuestSet(name, tuple(guests), float(np.log(0.5)), coherent=False)


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
            sets.append(GuestSet(label, tuple(guests), 0.0, coherent=False))
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
        lines = {n: v for n, v in entry.lines.items() if n in observed}
        if not lines or not all(_is_near(x, observed[n], n) or _may_be_absent(x, n) for n, v in lines.items() for x in v):
            continue
        complete = sum(len(v) for v in lines.values()) > 1
        label = entry.name if complete else f"possibly {entry.name}"
        prior = _PRESENT if complete else _PRESENT_ONE_LINE
        for nucleus, shifts in lines.items():
            scale = PARAMETERS[nucleus].impurity_scale_ppm * (2.0 if entry.borrowed else 1.0)
            guests = tuple(Guest(label, x, scale, 4.0, 0.05) for x in shifts if _is_near(x, observed[nucleus], nucleus))
            if guests:
                found[nucleus].append(GuestSet(label, guests, float(np.log(prior)) / len(lines)))
    return {n: tuple(sorted(sets, key=lambda s: (-len(s.guests), s.name))) for n, sets in found.items()}


def _is_near(shift: float, observed: np.ndarray, nucleus: str) -> bool:
    reach = _REACH[nucleus]
    return bool(len(observed)) and bool(np.abs(observed - shift).min() <= reach)


def _may_be_absent(shift: float, nucleus: str) -> bool:
    """A carboxylic acid's hydrogen is often not seen."""
    return nucleus == "1H" and shift > 9.5
