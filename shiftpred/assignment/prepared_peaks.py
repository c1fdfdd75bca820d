"""A peak list made ready once for all candidates: arrays, guests, frequencies."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import stdtr

from shiftpred.assignment.guests import GuestSet, build_impurity_guests, build_solvent_guests
from shiftpred.assignment.lines import Lines, build_lines
from shiftpred.assignment.units import Units
from shiftpred.assignment.weights import COMMON_CARBON_FREQUENCIES
from shiftpred.records import NUCLEI, PeakList

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


def prepare_peaks(
    peak_lists: dict[str, PeakList], solvent: str | None = None, frequency_mhz: float | None = None
) -> dict[str, PreparedPeaks]:
    """Make all peak lists of a sample ready for assignment.

    Parameters
    ----------
    peak_lists : dict of str to PeakList
        By nucleus.
    solvent : str, optional
        Short name; None: the one that a list states, if any.
    frequency_mhz : float, optional
        Of the spectrometer (1H, or 13C where it is a common magnet's 13C frequency); a list's own heading wins.

    Returns
    -------
    dict of str to PreparedPeaks
        By nucleus, 13C first.
    """
    ordered = [peak_lists[n] for n in NUCLEI if n in peak_lists and peak_lists[n].peaks]
    solvent = solvent or next((p.solvent for p in ordered if p.solvent), None)
    lines = {p.nucleus: build_lines(p) for p in ordered}
    impurities = build_impurity_guests(solvent, {n: x.shift for n, x in lines.items()})
    frequency = next((p.frequency_mhz for p in ordered if p.nucleus == "13C"), None) or compute_carbon_frequency(frequency_mhz)
    frequency = frequency or next((p.frequency_mhz * _CARBON_RATIO for p in ordered if p.frequency_mhz), None)
    out = {}
    for peak_list in ordered:
        nucleus = peak_list.nucleus
        always = build_solvent_guests(solvent, nucleus)
        hiding = np.array([g.shift for s in always for g in s.guests if g.hides])
        out[nucleus] = PreparedPeaks(
            peak_list,
            lines[nucleus],
            always,
            impurities[nucleus],
            (frequency,) if frequency else COMMON_CARBON_FREQUENCIES,
            hiding if len(hiding) else None,
        )
    return out
