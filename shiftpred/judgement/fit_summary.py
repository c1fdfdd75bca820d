"""A fit in a few numbers: what the calibrated probability looks at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import digamma, polygamma

from shiftpred.assignment.parameters import PARAMETERS
from shiftpred.assignment.structure_fit import StructureFit

__all__ = ["FEATURES", "FitSummary", "compute_features", "compute_fit_summary"]

_LARGEST_DEVIANCE = 12.0
_WIDE_MARGIN = 8.0
"""Log likelihood ratios count ever less beyond this; also what stands in where there is no rival at all."""
_CLOSE_RIVAL = 3.0

FEATURES = ("margin", "misfit", "worst", "extra", "missing", "lines", "novel", "offset", "rivals", "close_rivals")
"""Names of the features, in the order of their columns."""


_FOREIGN_LIST = 4.0
"""What it costs in log likelihood for each nucleus short of half that the list belongs to solvents and impurities instead: a list
is taken of the compound in the tube (common practice, no source)."""


@dataclass(frozen=True)
class FitSummary:
    """One structure's fit to all lists."""

    log_evidence: float
    misfit: float
    """Sum of the deviances of all lines less its expectation, in units of its standard deviation: 0 usual, 3 bad."""
    worst: float
    """Largest deviance of one nucleus: log density at the centre over the density where the line is."""
    extra: int
    """Lines without any explanation."""
    missing: int
    """Units without a line that nothing excuses."""
    lines: int
    units: int
    novel: float
    """Share of the units whose surroundings the training data do not hold."""
    offset: float
    """Largest reference offset that no solvent line vouches for, in units of its warning level."""
    assigned: int = -1
    """Units that have a line, labile ones aside; -1: not counted."""


def compute_fit_summary(fit: StructureFit) -> FitSummary:
    """Sum up a fit.

    Parameters
    ----------
    fit : StructureFit

    Returns
    -------
    FitSummary
    """
    deviances, expected, variance = [], 0.0, 0.0
    extra = missing = lines = units = novel = assigned = 0
    offset = 0.0
    for nucleus, one in fit.nuclei.items():
        found = one.terms["has_line"] & ~one.units.labile
        degrees, z = one.units.degrees[found], one.terms["z"][found]
        deviance = np.minimum((degrees + 1) / 2 * np.log1p(z * z / degrees), _LARGEST_DEVIANCE)
        deviances.append(deviance)
        expected += float(((degrees + 1) / 2 * (digamma((degrees + 1) / 2) - digamma(degrees / 2))).sum())
        variance += float((((degrees + 1) / 2) ** 2 * (polygamma(1, degrees / 2) - polygamma(1, (degrees + 1) / 2))).sum())
        assigned += int(found.sum())
        extra += len(one.leftover)
        missing += one.terms["unexcused"]
        lines += len(one.lines)
        units += int((~one.units.labile).sum())
        novel += sum("training data" in row.note for row in one.units.rows)
        if not one.anchored:
            offset = max(offset, abs(one.offset_ppm) / PARAMETERS[nucleus].warn_offset_ppm)
    together = np.concatenate(deviances) if deviances else np.zeros(0)
    return FitSummary(
        log_evidence=fit.log_evidence - _FOREIGN_LIST * max(0.0, 0.5 * min(lines, units) - assigned),
        misfit=(float(together.sum()) - expected) / max(variance, 1e-9) ** 0.5 if len(together) else 0.0,
        worst=float(together.max(initial=0.0)),
        extra=extra,
        missing=missing,
        lines=lines,
        units=units,
        novel=novel / max(1, sum(len(f.units) for f in fit.nuclei.values())),
        offset=offset,
        assigned=assigned,
    )


def compute_features(summaries: list[FitSummary], which: int) -> np.ndarray:
    """Return the features of one candidate among all, shape (len(FEATURES),), in the order of `FEATURES`.

    Parameters
    ----------
    summaries : list of FitSummary
        The proposal and its rivals.
    which : int
        The one that is judged.
    """
    own = summaries[which]
    others = [s.log_evidence for k, s in enumerate(summaries) if k != which]
    margin = own.log_evidence - max(others) if others else _WIDE_MARGIN
    close = sum(own.log_evidence - e < _CLOSE_RIVAL for e in others)
    return np.array(
        [
            _bend(margin),
            min(max(own.misfit, -2.0), 12.0),
            own.worst,
            min(own.extra, 6) * (10 / max(own.lines, 10)) ** 0.5,
            min(own.missing, 6) * (10 / max(own.units, 10)) ** 0.5,
            np.log(max(own.lines, 1)),
            own.novel,
            min(own.offset, 4.0),
            np.log1p(len(others)),
            np.log1p(close),
        ]
    )


def _bend(margin: float) -> float:
    """Straight near 0, ever flatter beyond `_WIDE_MARGIN`: errors of one molecule are not independent."""
    return float(np.sign(margin) * _WIDE_MARGIN * np.log1p(abs(margin) / _WIDE_MARGIN))
