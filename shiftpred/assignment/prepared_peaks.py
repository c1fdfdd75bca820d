"""A peak list made ready once for all candidates: arrays, guests, frequencies."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import stdtr

from shiftpred.assignment.guests import GuestSet, build_impurity_guests, build_solvent_guests
from shiftpred.assignment.lines import Lines, build_lines
from shiftpred.assignment.units import Units
from shiftpred.assignment.weights import COMMON_CARBON_FREQUENCIES
from shiftpred.records import PeakList

__all__ = ["PreparedPeaks", "compute_carbon_frequency", "prepare_peaks"]

_CARBON_RATIO = 0.25145
"""13C frequency over 1H frequency in one magnet."""
_CARBON_OF_COMMON_MAGNETS = (50.3, 62.9, 75.5, 100.6, 125.8, 150.9, 176.0, 201.2, 226.3)
_HIDING_HALF_WIDTH = {"13C": 0.45, "1H": 0.04}
"""How near a line may come to a solvent line and be hidden, ppm, and how often it then is (common practice, no source)."""
_HIDING_CHANCE = 0.6


@dataclass(frozen=True)
class PreparedPeaks:
    """One peak list, ready to be compared with many structures."""

    peak_list: PeakList
    lines: Lines
    always: tuple[GuestSet, ...]
    """Solvent and water: they may always be there."""
    impurities: tuple[GuestSet, ...]
    """Sets of which every line has an observed line near by."""
    carbon_frequencies: tuple[float, ...]
    """13C frequencies (MHz) that come into question."""
    hiding: np.ndarray | None
    """(k,) solvent lines (ppm) under which a nucleus may hide; None: none known."""

    @property
    def nucleus(self) -> str:
        return self.peak_list.nucleus

    def compute_hidden(self, units: Units) -> np.ndarray:
        """Return (n_units,) the chance that each unit lies under a solvent line."""
        half = _HIDING_HALF_WIDTH[self.nucleus]
        out = np.zeros(len(units))
        for place in self.hiding:
            low = (place - half - units.shift) / units.scale
            high = (place + half - units.shift) / units.scale
            out += _HIDING_CHANCE * (stdtr(units.degrees, high) - stdtr(units.degrees, low))
        return np.minimum(out, 0.9)


def compute_carbon_frequency(frequency_mhz: float | None) -> float | None:
    """Return the 13C frequency of a spectrometer named by its 1H frequency or, as journals do, by its 13C frequency.

    A number within 1.5 MHz of a common magnet's 13C frequency (101, 126, 151, …) is taken as that.
    """
    if frequency_mhz is None:
        return None
    if any(abs(frequency_mhz - c) <= 1.5 for c in _CARBON_OF_COMMON_MAGNETS):
        return frequency_mhz
    return frequency_mhz * _CARBON_RATIO


def prepare_peaks(peak_list: PeakList, solvent: str | None = None, frequency_mhz: float | None = None) -> PreparedPeaks:
    """Make a peak list ready for assignment.

    Parameters
    ----------
    peak_list : PeakList
    solvent : str, optional
        Short name; None: the one that the list states, if any.
    frequency_mhz : float, optional
        Of the spectrometer (1H, or 13C where it is a common magnet's 13C frequency); the list's own heading wins.

    Returns
    -------
    PreparedPeaks
    """
    solvent = solvent or peak_list.solvent
    lines = build_lines(peak_list)
    frequency = peak_list.frequency_mhz if peak_list.nucleus == "13C" else None
    frequency = frequency or compute_carbon_frequency(frequency_mhz)
    always = build_solvent_guests(solvent, peak_list.nucleus)
    hiding = np.array([g.shift for s in always for g in s.guests if g.hides])
    return PreparedPeaks(
        peak_list,
        lines,
        always,
        build_impurity_guests(solvent, lines),
        (frequency,) if frequency else COMMON_CARBON_FREQUENCIES,
        hiding if len(hiding) else None,
    )
