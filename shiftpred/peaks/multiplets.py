"""Multiplets that were picked line by line, and carbon doublets by fluorine or phosphorus."""

from __future__ import annotations

from dataclasses import dataclass, replace

from shiftpred.errors import PeakError
from shiftpred.records import Peak, PeakList

__all__ = ["DoubletPair", "group_multiplets", "looks_line_by_line", "pair_doublets", "require_grouped"]

_WIDEST_HZ = 20.0
"""Spacings below this are read as couplings (common practice, no source)."""
_NARROWEST_HZ = 1.5
_REGULAR = 0.2
"""Spacings of one multiplet differ by at most this share, or by 0.5 Hz."""
_NAMES = {2: "d", 3: "t", 4: "q", 5: "quint", 6: "sext", 7: "sept"}
COUPLING_RANGES_HZ = {
    "F": ((140.0, 320.0), (10.0, 50.0), (2.0, 14.0), (0.5, 5.0)),
    "P": ((5.0, 200.0), (1.0, 30.0), (1.0, 20.0), (0.5, 5.0)),
}
"""Usual |J(C,X)| over one, two, three and four bonds (textbook ranges, from memory)."""


@dataclass(frozen=True)
class DoubletPair:
    """Two carbon lines that may be the halves of one doublet."""

    first: int
    """0-based place of the line at higher shift."""
    second: int
    centre_ppm: float
    coupling_hz: float
    bonds: tuple[int, ...]
    """Over how many bonds such a coupling is usual."""


def _find_runs(shifts: list[float], widest: float, regular: float) -> list[list[int]]:
    """Return runs of at least three equally spaced shifts (or pairs are left to others), as indices in descending order."""
    order = sorted(range(len(shifts)), key=lambda i: -shifts[i])
    runs, run = [], order[:1]
    for i in order[1:]:
        step = shifts[run[-1]] - shifts[i]
        usual = (shifts[run[0]] - shifts[run[-1]]) / (len(run) - 1) if len(run) > 1 else step
        if 0 < step <= widest and abs(step - usual) <= max(_REGULAR * usual, regular):
            run.append(i)
        else:
            runs.append(run)
            run = [i]
    runs.append(run)
    return [r for r in runs if len(r) > 1]


def looks_line_by_line(peaks: PeakList) -> bool:
    """Say whether a 1H list has the regular spacings of multiplets picked line by line.

    Without the spectrometer frequency spacings cannot be read in Hz, so three or more lines at equal distances below 0.05 ppm,
    none of them with hydrogens, multiplicity or a range, are taken as the sign; one such run is enough if it has four lines,
    otherwise two are needed.
    """
    plain = [p for p in peaks.peaks if not (p.is_range or p.hydrogens or p.multiplicity or p.couplings_hz)]
    runs = [r for r in _find_runs([p.shift_ppm for p in plain], 0.05, 0.0012) if len(r) >= 3]
    return any(len(r) >= 4 for r in runs) or len(runs) >= 2


def require_grouped(peaks: PeakList, frequency_mhz: float | None) -> PeakList:
    """Group a 1H list that was picked line by line; ask for the frequency where it is needed.

    Raises
    ------
    PeakError
        If the list looks picked line by line and the frequency is not known.
    """
    frequency = frequency_mhz or peaks.frequency_mhz
    if not looks_line_by_line(peaks):
        return peaks
    if frequency is None:
        raise PeakError(
            "--h1",
            "lines at regular distances, as if a multiplet had been picked line by line",
            "multiplet centres, or the frequency",
            "give --frequency 400 (the spectrometer's 1H frequency in MHz), or the multiplets as '4.12 (q, J = 7.1 Hz, 2H)'",
        )
    return group_multiplets(peaks, frequency)


def group_multiplets(peaks: PeakList, frequency_mhz: float) -> PeakList:
    """Join the lines of multiplets: regular spacings below 20 Hz.

    Parameters
    ----------
    peaks : PeakList
    frequency_mhz : float
        Frequency of this nucleus.

    Returns
    -------
    PeakList
        One peak for each multiplet with its spacing as coupling; `notes` say what was joined.
    """
    plain = [k for k, p in enumerate(peaks.peaks) if not (p.is_range or p.hydrogens or p.multiplicity or p.couplings_hz)]
    shifts = [peaks.peaks[k].shift_ppm for k in plain]
    runs = _find_runs(shifts, _WIDEST_HZ / frequency_mhz, 0.5 / frequency_mhz)
    joined: dict[int, Peak] = {}
    gone: set[int] = set()
    notes = list(peaks.notes)
    for run in runs:
        members = [plain[i] for i in run]
        values = [peaks.peaks[k].shift_ppm for k in members]
        spacing = (values[0] - values[-1]) / (len(values) - 1) * frequency_mhz
        if spacing < _NARROWEST_HZ:
            continue
        centre = (values[0] + values[-1]) / 2
        name = _NAMES.get(len(values), "m")
        first = peaks.peaks[min(members)]
        joined[min(members)] = replace(
            first,
            shift_ppm=centre,
            lower_ppm=centre,
            upper_ppm=centre,
            multiplicity=name,
            couplings_hz=(round(spacing, 1),),
            text=", ".join(peaks.peaks[k].text or f"{peaks.peaks[k].shift_ppm:g}" for k in sorted(members)),
        )
        gone.update(k for k in members if k != min(members))
        notes.append(
            f"{len(values)} lines from {values[0]:g} to {values[-1]:g} ppm read as one {name} at {centre:.3f} (J = {spacing:.1f} Hz at {frequency_mhz:g} MHz)"
        )
    kept = [joined.get(k, p) for k, p in enumerate(peaks.peaks) if k not in gone]
    return replace(peaks, peaks=tuple(kept), notes=tuple(notes))


def pair_doublets(
    shifts: list[float], frequency_mhz_13c: float, partner: str = "F", tolerance_hz: float = 0.0
) -> list[DoubletPair]:
    """List the pairs of carbon lines that may be doublets by fluorine or phosphorus.

    Parameters
    ----------
    shifts : list of float
        13C lines in ppm.
    frequency_mhz_13c : float
        13C frequency.
    partner : {'F', 'P'}
    tolerance_hz : float, default 0
        Widens the usual ranges.

    Returns
    -------
    list of DoubletPair
        Each pair with the numbers of bonds over which such a coupling is usual; pairs may share lines.
    """
    out = []
    order = sorted(range(len(shifts)), key=lambda i: -shifts[i])
    for k, i in enumerate(order):
        for j in order[k + 1 :]:
            coupling = (shifts[i] - shifts[j]) * frequency_mhz_13c
            if coupling > COUPLING_RANGES_HZ[partner][0][1] + tolerance_hz:
                break
            bonds = tuple(
                n
                for n, (low, high) in enumerate(COUPLING_RANGES_HZ[partner], 1)
                if low - tolerance_hz <= coupling <= high + tolerance_hz
            )
            if bonds:
                out.append(DoubletPair(i, j, (shifts[i] + shifts[j]) / 2, coupling, bonds))
    return out
