"""Multiplets that were picked line by line, and carbon doublets by fluorine or phosphorus.

Lines closer than 20 Hz are taken as one cluster. A cluster is one multiplet if its spacings are regular (d, t, q, …), if it
is a doublet of doublets, or if it is symmetrical about its middle; else it is cut at its widest gap and both parts are looked
at; what still has no pattern becomes a range, which says no more than that something lies there.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from shiftpred.peaks.problems import PeakListError
from shiftpred.records import Peak, PeakList

__all__ = ["COUPLING_RANGES_HZ", "DoubletPair", "group_multiplets", "looks_line_by_line", "pair_doublets", "require_grouped"]

_WIDEST_HZ = 20.0
"""Spacings below this are read as couplings (common practice, no source)."""
_NARROWEST_HZ = 1.0
_WIDEST_MULTIPLET_HZ = 60.0
_REGULAR = 0.2
"""Spacings of one multiplet differ by at most this share, by 0.5 Hz, or by what rounding explains."""
_RANGE_NEEDS = 4
"""Lines without a pattern that make a range; fewer are left as they are."""
_NAMES = {2: "d", 3: "t", 4: "q", 5: "quint", 6: "sext", 7: "sept", 8: "oct", 9: "non"}
_NEAR_PPM = 0.05
_WIDEST_OF_RUN_PPM = 0.032
_SHARE_WITH_NEIGHBOUR = 0.6
"""Share of lines with a neighbour within 0.05 ppm from which a list is suspected. Of 14,992 1H lists in the
open shift data 48 are."""
_SHARE_IN_RUNS = 0.25
"""Share of lines in runs that lists of two decimals must show besides."""
COUPLING_RANGES_HZ = {
    "F": ((140.0, 380.0), (10.0, 65.0), (2.0, 14.0), (0.5, 5.0)),
    "P": ((5.0, 250.0), (1.0, 30.0), (1.0, 20.0), (0.5, 5.0)),
}
"""Usual |J(C,X)| over one, two, three and four bonds (textbook ranges, from memory; acyl fluorides reach 370 and 60 Hz)."""


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


@dataclass(frozen=True)
class _Group:
    """Lines that belong together: indices in descending order of shift."""

    members: tuple[int, ...]
    name: str
    """'d', 't', …, 'dd'; 'm' for a symmetrical one without a simple name; '' for a range without a pattern."""
    couplings_hz: tuple[float, ...] = ()


def _is_plain(peak: Peak) -> bool:
    return not (peak.is_range or peak.hydrogens or peak.multiplicity or peak.couplings_hz or peak.pair_ppm is not None)


def _find_step(shifts: list[float]) -> float:
    """Return the rounding step of the list in ppm: 0.001 for three decimals, which at least half of the shifts must show."""
    decimals = sorted(len(f"{x:.4f}".rstrip("0").split(".")[1]) for x in shifts)
    return 10.0 ** -max(decimals[len(decimals) // 2] if decimals else 1, 1)


def looks_line_by_line(peaks: PeakList) -> bool:
    """Say whether a 1H list has the regular spacings of multiplets picked line by line.

    Without the spectrometer frequency spacings cannot be read in Hz. So the signs are: lines without hydrogens, multiplicity or
    range; most of them with a neighbour within 0.05 ppm; and runs of equal distances among them: one run of three or more lines
    where shifts have three decimals, else one of four or two of three.

    Parameters
    ----------
    peaks : PeakList

    Returns
    -------
    bool
    """
    shifts = sorted((p.shift_ppm for p in peaks.peaks if _is_plain(p)), reverse=True)
    if peaks.nucleus != "1H" or len(shifts) < 3 or len(shifts) < 0.5 * len(peaks.peaks):
        return False
    gaps = [a - b for a, b in zip(shifts, shifts[1:])]
    close = [0 < g <= _NEAR_PPM for g in gaps]
    crowded = sum(left or right for left, right in zip([False, *close], [*close, False]))
    if crowded < _SHARE_WITH_NEIGHBOUR * len(shifts):
        return False
    step = _find_step(shifts)
    runs = _count_runs(gaps, step)
    if step < 0.005:
        return any(n >= 3 for n in runs)
    in_runs = sum(n for n in runs if n >= 3)
    return in_runs >= _SHARE_IN_RUNS * len(shifts) and (any(n >= 4 for n in runs) or sum(n >= 3 for n in runs) >= 2)


def _count_runs(gaps: list[float], step: float) -> list[int]:
    """Return the numbers of lines of all runs of equal gaps up to 0.032 ppm (8 Hz at 250 MHz)."""
    runs, length, usual = [], 1, 0.0
    allowed = 2.2 * step if step < 0.005 else 1.2 * step
    for gap in gaps:
        inside = 0.9 * step < gap <= _WIDEST_OF_RUN_PPM
        if inside and (length == 1 or abs(gap - usual) <= allowed):
            usual = (usual * (length - 1) + gap) / length
            length += 1
        else:
            runs.append(length if usual > 1.3 * step else 1)
            length, usual = (2, gap) if inside else (1, 0.0)
    return [*runs, length if usual > 1.3 * step else 1]


def require_grouped(peaks: PeakList, frequency_mhz: float | None) -> PeakList:
    """Group a 1H list that was picked line by line; ask for the frequency where it is needed.

    Parameters
    ----------
    peaks : PeakList
    frequency_mhz : float or None
        1H frequency. A magnet's 13C frequency is taken for that of its 1H; that of the list's own heading wins.

    Returns
    -------
    PeakList
        The same list if it holds multiplet centres.

    Raises
    ------
    PeakError
        If the list looks picked line by line and the frequency is not known.
    """
    frequency = peaks.frequency_mhz or _read_frequency(frequency_mhz)
    if not looks_line_by_line(peaks):
        return peaks
    if frequency is None:
        came = "lines at regular distances, as if multiplets had been picked line by line"
        raise PeakListError(
            "--h1",
            came,
            "multiplet centres, or the frequency",
            "give --frequency 400 (the spectrometer's 1H frequency in MHz), or the multiplets as '4.12 (q, J = 7.1 Hz, 2H)'",
            [("whole list", "", came)],
        )
    return group_multiplets(peaks, frequency)


def _read_frequency(frequency_mhz: float | None) -> float | None:
    """Return the 1H frequency of a magnet that may be named by its 13C frequency (101, 126, 151, … MHz)."""
    if frequency_mhz is None:
        return None
    carbons = (75.5, 100.6, 125.8, 150.9, 176.0, 201.2, 226.3)
    return frequency_mhz / 0.25145 if any(abs(frequency_mhz - c) <= 0.7 for c in carbons) else frequency_mhz


def group_multiplets(peaks: PeakList, frequency_mhz: float) -> PeakList:
    """Join the lines of multiplets: spacings below 20 Hz.

    Parameters
    ----------
    peaks : PeakList
        Lines that carry hydrogens, multiplicity, couplings or a range are left alone.
    frequency_mhz : float
        Frequency of this nucleus.

    Returns
    -------
    PeakList
        One peak for each multiplet with its couplings; lines without a pattern as a range; `notes` say what was joined.

    Examples
    --------
    >>> lines = tuple(Peak("1H", x, x, x) for x in (1.276, 1.258, 1.240))
    >>> found = group_multiplets(PeakList("1H", lines), 400)
    >>> [(round(p.shift_ppm, 3), p.multiplicity, p.couplings_hz) for p in found.peaks]
    [(1.258, 't', (7.2,))]
    """
    plain = sorted((k for k, p in enumerate(peaks.peaks) if _is_plain(p)), key=lambda k: -peaks.peaks[k].shift_ppm)
    hertz = {k: peaks.peaks[k].shift_ppm * frequency_mhz for k in plain}
    groups: list[_Group] = []
    for cluster in _split_clusters(plain, hertz):
        finest = min(_find_step([peaks.peaks[k].shift_ppm]) for k in cluster)
        groups += _explain(cluster, hertz, 1.2 * finest * frequency_mhz)
    joined: dict[int, Peak] = {}
    gone: set[int] = set()
    notes = list(peaks.notes)
    for group in groups:
        if len(group.members) < 2:
            continue
        place = min(group.members)
        joined[place], note = _join(group, peaks, frequency_mhz, place)
        gone.update(k for k in group.members if k != place)
        notes.append(note)
    kept = [joined.get(k, p) for k, p in enumerate(peaks.peaks) if k not in gone]
    kept = [replace(p, position=k) for k, p in enumerate(kept, 1)]
    return replace(peaks, peaks=tuple(kept), notes=tuple(notes))


def _join(group: _Group, peaks: PeakList, frequency_mhz: float, place: int) -> tuple[Peak, str]:
    members = [peaks.peaks[k] for k in group.members]
    high, low = members[0].shift_ppm, members[-1].shift_ppm
    centre = (high + low) / 2
    text = ", ".join(p.text or f"{p.shift_ppm:g}" for p in members)
    lines = f"{len(members)} lines from {high:g} to {low:g} ppm"
    if not group.name:
        peak = replace(peaks.peaks[place], shift_ppm=centre, lower_ppm=low, upper_ppm=high, multiplicity="m", text=text)
        return peak, f"{lines} have no simple pattern at {frequency_mhz:g} MHz: read as a range"
    peak = replace(
        peaks.peaks[place],
        shift_ppm=centre,
        lower_ppm=centre,
        upper_ppm=centre,
        multiplicity=group.name,
        couplings_hz=tuple(round(j, 1) for j in group.couplings_hz),
        text=text,
    )
    couplings = f"J = {', '.join(f'{j:.1f}' for j in group.couplings_hz)} Hz " if group.couplings_hz else ""
    return peak, f"{lines} read as one {group.name} at {centre:.3f} ({couplings}at {frequency_mhz:g} MHz)"


def _split_clusters(ordered: list[int], hertz: dict[int, float]) -> list[list[int]]:
    clusters: list[list[int]] = []
    for k in ordered:
        if clusters and hertz[clusters[-1][-1]] - hertz[k] <= _WIDEST_HZ:
            clusters[-1].append(k)
        else:
            clusters.append([k])
    return clusters


def _explain(cluster: list[int], hertz: dict[int, float], rounding: float) -> list[_Group]:
    """Return the multiplets of one cluster."""
    if len(cluster) == 1:
        return [_Group(tuple(cluster), "s")]
    found = _describe(cluster, hertz, rounding)
    if found:
        return [found]
    gaps = [hertz[a] - hertz[b] for a, b in zip(cluster, cluster[1:])]
    widest = max(range(len(gaps)), key=gaps.__getitem__)
    if len(cluster) > 2:
        parts = _explain(cluster[: widest + 1], hertz, rounding) + _explain(cluster[widest + 1 :], hertz, rounding)
        alone = sum(len(g.members) == 1 for g in parts)
        if all(g.name for g in parts) and (alone == 0 or len(cluster) < _RANGE_NEEDS or alone * 4 <= len(cluster)):
            return parts
    if len(cluster) < _RANGE_NEEDS:
        return [_Group((k,), "s") for k in cluster]
    return [_Group(tuple(cluster), "")]


def _describe(cluster: list[int], hertz: dict[int, float], rounding: float) -> _Group | None:
    """Name a regular or symmetrical multiplet, None for anything else."""
    places = [hertz[k] for k in cluster]
    gaps = [a - b for a, b in zip(places, places[1:])]
    width = places[0] - places[-1]
    mean = width / len(gaps)
    allowed = max(0.5, _REGULAR * mean, rounding)
    if width > _WIDEST_MULTIPLET_HZ:
        return None
    if max(gaps) - min(gaps) <= allowed and mean >= max(_NARROWEST_HZ, 0.5 * rounding) and len(places) in _NAMES:
        return _Group(tuple(cluster), _NAMES[len(places)], (mean,))
    middle = (places[0] + places[-1]) / 2
    mirrored = all(abs((a + b) / 2 - middle) <= max(0.4, rounding / 2) for a, b in zip(places, reversed(places)))
    half = len(places) // 2
    largest = (sum(places[:half]) - sum(places[-half:])) / half
    if len(places) == 4 and mirrored and largest <= _WIDEST_HZ:
        return _Group(tuple(cluster), "dd", (largest, (gaps[0] + gaps[2]) / 2))
    if 5 <= len(places) <= 16 and mirrored and largest <= _WIDEST_HZ:
        return _Group(tuple(cluster), "m")
    return None


def pair_doublets(
    shifts: list[float],
    frequency_mhz_13c: float,
    partner: str = "F",
    tolerance_hz: float = 0.0,
    allowed_j_hz: tuple[tuple[float, float], ...] | None = None,
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
    allowed_j_hz : tuple of (low, high), optional
        |J| over one, two, three, … bonds; default `COUPLING_RANGES_HZ[partner]`.

    Returns
    -------
    list of DoubletPair
        Each pair with the numbers of bonds over which such a coupling is usual; pairs may share lines. In descending order of
        the first line's shift.

    Examples
    --------
    >>> [(round(p.centre_ppm, 1), round(p.coupling_hz), p.bonds) for p in pair_doublets([166.96, 164.44], 101.0)]
    [(165.7, 255, (1,))]
    """
    ranges = allowed_j_hz if allowed_j_hz is not None else COUPLING_RANGES_HZ[partner]
    widest = max((high for _, high in ranges), default=0.0) + tolerance_hz
    out = []
    order = sorted(range(len(shifts)), key=lambda i: -shifts[i])
    for k, i in enumerate(order):
        for j in order[k + 1 :]:
            coupling = (shifts[i] - shifts[j]) * frequency_mhz_13c
            if coupling > widest:
                break
            bonds = tuple(n for n, (low, high) in enumerate(ranges, 1) if low - tolerance_hz <= coupling <= high + tolerance_hz)
            if bonds:
                out.append(DoubletPair(i, j, (shifts[i] + shifts[j]) / 2, coupling, bonds))
    return out
