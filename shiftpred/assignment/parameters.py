"""The numbers of the peak model, in one place, each with its origin.

"fitted" numbers were chosen on held-out compounds of the open shift data by how often the right structure among its rivals
came first; "common practice, no source" are a bench chemist's expectations.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["PARAMETERS", "PeakModelParameters"]


@dataclass(frozen=True)
class PeakModelParameters:
    """What is expected of one nucleus' peak list."""

    resolution_ppm: float
    """Width of the window within which two nuclei give one line (common practice, no source)."""
    extra_lines: float
    """Expected number of lines in a list that belong to nothing known (fitted)."""
    reference_prior_ppm: float
    """Standard deviation of the reference offset where no solvent line is listed (the design's choice)."""
    solvent_scale_ppm: float
    """How closely a listed solvent line repeats the published one (common practice, no source)."""
    impurity_scale_ppm: float
    """How closely a line of an impurity repeats the published one (common practice, no source)."""
    water_scale_ppm: float
    """The same for water, which moves with concentration and temperature (common practice, no source)."""
    warn_offset_ppm: float
    """Offset from which a warning is given (the design's choice)."""
    common_scale_ppm: float
    """Added in quadrature to the error scale of every site: what moves lines without any single site's interval knowing of it
    (temperature, concentration, digits, and that the errors of one molecule go together); fitted."""


PARAMETERS = {
    "13C": PeakModelParameters(0.15, 0.10, 0.30, 0.12, 0.15, 0.15, 0.30, 0.70),
    "1H": PeakModelParameters(0.04, 0.15, 0.03, 0.012, 0.02, 0.12, 0.05, 0.03),
}
