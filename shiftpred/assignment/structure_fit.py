"""One structure against all peak lists."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from shiftpred.assignment.guests import GuestSet, build_expected_guests
from shiftpred.assignment.nucleus_fit import NucleusFit, assign_nucleus
from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.assignment.prepared_peaks import PreparedPeaks
from shiftpred.assignment.units import build_units
from shiftpred.records import MoleculePrediction

__all__ = ["StructureFit", "assign_structure"]


@dataclass(frozen=True)
class StructureFit:
    """How one structure explains all lists."""

    prediction: MoleculePrediction
    nuclei: dict[str, NucleusFit]
    """By nucleus, only those with a list."""

    @property
    def log_evidence(self) -> float:
        """Log density of all lists under the structure."""
        return sum(f.log_evidence for f in self.nuclei.values())


def assign_structure(
    prediction: MoleculePrediction,
    peaks: dict[str, PreparedPeaks],
    expected: tuple[MoleculePrediction, ...] = (),
) -> StructureFit:
    """Assign every list to one structure.

    Parameters
    ----------
    prediction : MoleculePrediction
    peaks : dict of str to PreparedPeaks
        By nucleus.
    expected : tuple of MoleculePrediction
        What else may be in the tube.

    Returns
    -------
    StructureFit
    """
    nuclei = {}
    share = 0.5 if len(peaks) == 2 else 1.0
    for nucleus, prepared in peaks.items():
        others = None
        if not np.isnan(prepared.lines.pair).all():
            others = _gather_other_nucleus(prediction, "1H" if nucleus == "13C" else "13C")
        nuclei[nucleus] = assign_nucleus(
            build_units(prediction, nucleus), prepared, others, share, _expected_guests(expected, nucleus)
        )
    return StructureFit(prediction, nuclei)


def _expected_guests(expected, nucleus) -> tuple[GuestSet, ...]:
    return tuple(build_expected_guests(p, nucleus, f"expected: {p.structure.smiles}") for p in expected)


def _gather_other_nucleus(prediction: MoleculePrediction, nucleus: str) -> dict[int, tuple]:
    """Return atom index → (shift, scale, degrees) arrays of the atom's rows of `nucleus`."""
    found: dict[int, list] = {}
    common = PARAMETERS[nucleus].common_scale_ppm
    for row in prediction.nuclei:
        if row.nucleus == nucleus:
            scale = math.hypot(row.scale_ppm, common)
            found.setdefault(row.atom_index, []).append((row.shift_ppm, scale, row.degrees_of_freedom))
    return {i: tuple(np.array(values).T) for i, values in found.items()}
