"""An assignment that comes with a file against the predictions: are two of its labels exchanged?"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from itertools import combinations

from shiftpred.peaks.nmredata import NmredataRecord, Signal
from shiftpred.records import NUCLEI, MoleculePrediction, NucleusPrediction

__all__ = ["ExchangedPair", "check_given_assignment", "find_exchanged_labels"]

_CLEARLY_BETTER = math.log(100.0)
"""Log likelihood that an exchange must gain before it is named; see `find_exchanged_labels` for how often that is right."""
_MOST_SIGNALS = 400
_DIGITS = {"13C": 1, "1H": 2}


@dataclass(frozen=True)
class ExchangedPair:
    """Two labels whose shifts fit clearly better the other way round."""

    nucleus: str
    first: Signal
    second: Signal
    first_predicted_ppm: float
    """For the atoms of `first`."""
    second_predicted_ppm: float
    gain: float
    """Log likelihood that the exchange gains."""


def find_exchanged_labels(
    prediction: MoleculePrediction, record: NmredataRecord, offset_ppm: Mapping[str, float] | None = None
) -> tuple[ExchangedPair, ...]:
    """Return pairs of labels that look exchanged, the clearest first; each label stands in one pair at most.

    Parameters
    ----------
    prediction : MoleculePrediction
        Of the record's structure.
    record : NmredataRecord
    offset_ppm : mapping of str to float, optional
        Reference offset by nucleus.

    Notes
    -----
    Exchangeable hydrogens are passed over, and so are labels that the file itself calls interchangeable. Protons are compared
    with sets of as many protons only, since another integral would have given the exchange away. An exchange is named if it
    raises the likelihood a hundredfold: on the 61 compounds of `datasets/measured_shifts` in CDCl3, which no model was trained
    on, that named no pair of a right assignment.
    """
    rows = [r for r in prediction.nuclei if not r.labile]
    free = {frozenset(label for group in groups for label in group) for groups in record.interchangeable}
    found: list[ExchangedPair] = []
    for nucleus in NUCLEI:
        offset = (offset_ppm or {}).get(nucleus, 0.0)
        signals = []
        for signal in record.signals[:_MOST_SIGNALS]:
            if signal.nucleus == nucleus and signal.shift_ppm is not None:
                own = [r for r in rows if r.nucleus == nucleus and r.atom in signal.atoms]
                if own:
                    signals.append((signal, own, _count_nuclei(signal, own)))
        for (first, own, size), (second, other, other_size) in combinations(signals, 2):
            if (nucleus == "1H" and size != other_size) or any({first.label, second.label} <= group for group in free):
                continue
            a, b = first.shift_ppm - offset, second.shift_ppm - offset
            gain = _cost(a, own) + _cost(b, other) - _cost(a, other) - _cost(b, own)
            if gain >= _CLEARLY_BETTER:
                found.append(ExchangedPair(nucleus, first, second, _nearest(b, own), _nearest(a, other), gain))
    found.sort(key=lambda pair: (-round(pair.gain, 9), pair.first.line, pair.second.line))
    taken: set[str] = set()
    chosen = []
    for pair in found:
        if not {pair.first.label, pair.second.label} & taken:
            taken |= {pair.first.label, pair.second.label}
            chosen.append(pair)
    return tuple(chosen)


def check_given_assignment(
    prediction: MoleculePrediction, record: NmredataRecord, offset_ppm: Mapping[str, float] | None = None
) -> tuple[str, ...]:
    """Say in words which labels of the file's own assignment look exchanged; parameters as for `find_exchanged_labels`."""
    return tuple(_describe(pair) for pair in find_exchanged_labels(prediction, record, offset_ppm))


def _count_nuclei(signal: Signal, rows: list[NucleusPrediction]) -> int:
    return len(signal.hydrogens) or sum({r.atom: r.attached_h for r in rows}.values())


def _cost(ppm: float, rows: list[NucleusPrediction]) -> float:
    """Minus the log likelihood of a shift, up to a constant that an exchange does not change; of several rows the best."""
    return min(
        0.5 * (r.degrees_of_freedom + 1) * math.log1p(((ppm - r.shift_ppm) / r.scale_ppm) ** 2 / r.degrees_of_freedom)
        for r in rows
    )


def _nearest(ppm: float, rows: list[NucleusPrediction]) -> float:
    return min((r.shift_ppm for r in rows), key=lambda shift: abs(shift - ppm))


def _describe(pair: ExchangedPair) -> str:
    digits = _DIGITS[pair.nucleus]
    times = "more than a million" if pair.gain > math.log(1e6) else f"{float(f'{math.exp(pair.gain):.2g}'):,.0f}"
    sides = [
        f"'{signal.label}' ({_name_atoms(signal)}) has {signal.shift_ppm:.{digits}f} and {predicted:.{digits}f} is predicted"
        for signal, predicted in ((pair.first, pair.first_predicted_ppm), (pair.second, pair.second_predicted_ppm))
    ]
    return (
        f"{pair.nucleus}: the file's own assignment has two labels that look exchanged: {sides[0]}, {sides[1]}; "
        f"exchanged they fit {times} times better"
    )


def _name_atoms(signal: Signal) -> str:
    atoms = ", ".join(map(str, signal.atoms[:6])) + (", …" if len(signal.atoms) > 6 else "")
    return f"{'hydrogens on ' if signal.nucleus == '1H' else ''}atom{'s' if len(signal.atoms) > 1 else ''} {atoms}"
