"""What else may give lines: the solvent, water, impurities and whatever the user expects in the tube."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

__all__ = ["Guest", "GuestSet", "build_expected_guests", "build_impurity_guests", "build_solvent_guests"]


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
            guests.append(
                Guest(name, row.shift_ppm, row.scale_ppm, row.degrees_of_freedom, 0.7 if row.labile else 0.3)
            )
    return GuestSet(name, tuple(guests), float(np.log(0.5)), coherent=False)


def build_solvent_guests(solvent, nucleus):
    return ()


def build_impurity_guests(solvent, lines):
    return ()
