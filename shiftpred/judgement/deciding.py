"""What would tell the proposal from a rival: the lines on which they differ most, and a common experiment."""

from __future__ import annotations

import numpy as np

from shiftpred.assignment.nucleus_fit import NucleusFit
from shiftpred.assignment.structure_fit import StructureFit
from shiftpred.judgement.experiments import propose_experiment

__all__ = ["build_decision", "list_differing_lines"]

_MOST_LINES = 3
_SMALLEST_DIFFERENCE = {"13C": 0.8, "1H": 0.08}
"""Differences below this say nothing (ppm; about the error of a good prediction)."""


def build_decision(proposal: StructureFit, rival: StructureFit) -> str:
    """Say in words which lines and which experiment tell two structures apart.

    Parameters
    ----------
    proposal, rival : StructureFit
        Fits to the same lists.

    Returns
    -------
    str
    """
    lines = [_describe(nucleus, entry) for nucleus, entry in list_differing_lines(proposal, rival)]
    parts = []
    if lines:
        parts.append("lines that differ most: " + "; ".join(lines))
    else:
        parts.append("no line differs by more than the predictions can tell")
    experiment = propose_experiment(proposal.prediction, rival.prediction)
    if experiment:
        parts.append(experiment)
    return "; ".join(parts)


def list_differing_lines(proposal: StructureFit, rival: StructureFit) -> list[tuple[str, tuple[float, float, float]]]:
    """Return (nucleus, (observed, expected by the proposal, expected by the rival)), the most telling first; ppm.

    A line that one of them does not explain has nan there.
    """
    found = []
    for nucleus, one in proposal.nuclei.items():
        other = rival.nuclei[nucleus]
        own, foreign = _expected_by_line(one), _expected_by_line(other)
        for line, observed in enumerate(one.lines.shift):
            a, b = own.get(line, (np.nan, np.nan)), foreign.get(line, (np.nan, np.nan))
            if np.isnan(a[0]) and np.isnan(b[0]):
                continue
            if np.isnan(a[0]) or np.isnan(b[0]):
                weight = 6.0
            elif abs(a[0] - b[0]) < _SMALLEST_DIFFERENCE[nucleus]:
                continue
            else:
                weight = abs(a[1] - b[1])
            found.append((weight, nucleus, (float(observed), float(a[0]), float(b[0]))))
    found.sort(key=lambda f: (-round(f[0], 6), f[1], f[2][0]))
    seen, kept = set(), []
    for _, nucleus, entry in found:
        # The two lines of one split carbon tell the same thing.
        key = (nucleus, str(entry[1]), str(entry[2]))
        if key not in seen:
            seen.add(key)
            kept.append((nucleus, entry))
    return kept[:_MOST_LINES]


def _expected_by_line(fit: NucleusFit) -> dict[int, tuple[float, float]]:
    """Return line → (expected shift on the observed scale, misfit as log density below the centre)."""
    out: dict[int, tuple[float, float]] = {}
    for k in range(len(fit.units)):
        column = fit.chosen[k] if fit.chosen[k] >= 0 else fit.sharing[k]
        if column < 0 or fit.units.labile[k]:
            continue
        degrees, z = fit.units.degrees[k], fit.terms["z"][k]
        misfit = (degrees + 1) / 2 * np.log1p(z * z / degrees)
        for line in fit.columns[column].lines:
            if line not in out or misfit < out[line][1]:
                out[line] = (fit.units.shift[k] + fit.offset_ppm, float(misfit))
    return out


def _describe(nucleus: str, entry: tuple[float, float, float]) -> str:
    observed, own, foreign = entry
    digits = 1 if nucleus == "13C" else 2

    def word(value: float) -> str:
        return "nothing" if np.isnan(value) else f"{value:.{digits}f}"

    return f"{nucleus} {observed:.{digits}f} (expected {word(own)} for the proposal, {word(foreign)} for the rival)"
