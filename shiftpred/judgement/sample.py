"""What a run was asked for, checked and with every default filled in; the peak lists of a sample made ready."""

from __future__ import annotations

from collections.abc import Iterable

from shiftpred.assignment.prepared_peaks import PreparedPeaks, prepare_peaks
from shiftpred.errors import InputError, SettingError, quote
from shiftpred.judgement.probability import require_prior
from shiftpred.peaks import normalise_solvent, parse_peaks, require_grouped
from shiftpred.records import RecordFailure, Settings, Structure

__all__ = ["build_settings", "choose_solvent", "read_sample", "require_candidates"]

_MOST_RIVALS = 200
_LOWEST_MHZ, _HIGHEST_MHZ = 10.0, 1500.0


def build_settings(
    *,
    solvent: str | None = None,
    coverage: float = 0.9,
    frequency_mhz: float | None = None,
    rivals: int = 9,
    mass_confirmed: bool = False,
    prior: float = 0.5,
    expected: Iterable[str] = (),
) -> Settings:
    """Check the settings of a comparison.

    Raises
    ------
    SettingError
        If one is outside what is accepted; the message says which and what would do.
    """
    if isinstance(rivals, bool) or not isinstance(rivals, int) or not 0 <= rivals <= _MOST_RIVALS:
        raise SettingError("rivals", quote(rivals), f"a whole number from 0 to {_MOST_RIVALS}", "rivals=9")
    if frequency_mhz is not None:
        if isinstance(frequency_mhz, bool) or not isinstance(frequency_mhz, (int, float)):
            raise SettingError("frequency_mhz", quote(frequency_mhz), "a number of MHz", "frequency_mhz=400")
        if not _LOWEST_MHZ <= frequency_mhz <= _HIGHEST_MHZ:
            raise SettingError(
                "frequency_mhz", f"{frequency_mhz:g}", f"{_LOWEST_MHZ:g} to {_HIGHEST_MHZ:g} MHz", "the 1H frequency, 400 say"
            )
    if isinstance(expected, str):
        expected = (expected,)
    return Settings(
        solvent=normalise_solvent(solvent) if solvent else None,
        coverage=coverage,
        nucleus="both",
        frequency_mhz=float(frequency_mhz) if frequency_mhz is not None else None,
        rivals=rivals,
        mass_confirmed=bool(mass_confirmed),
        prior=require_prior(prior),
        expected=tuple(expected),
    )


def read_sample(c13, h1, settings: Settings) -> dict[str, PreparedPeaks]:
    """Read the peak lists of one sample and make them ready for assignment.

    Parameters
    ----------
    c13, h1 : str, path, PeakList, iterable of numbers or None
        As `shiftpred.peaks.parse_peaks` takes them; None: not measured.
    settings : Settings

    Returns
    -------
    dict of str to PreparedPeaks
        By nucleus, 13C first; only those with peaks.

    Raises
    ------
    InputError
        If there are no peaks at all, if a list cannot be read, or if 1H multiplets were picked line by line and the frequency
        is not known.
    """
    lists = {}
    for nucleus, source in (("13C", c13), ("1H", h1)):
        if source is None or (hasattr(source, "__len__") and len(source) == 0):
            continue
        lists[nucleus] = parse_peaks(source, nucleus)
    if not any(found.peaks for found in lists.values()):
        raise InputError("c13 and h1", "no peaks", "a 13C list, a 1H list or both", "c13='166.6, 132.8, 130.5'")
    if "1H" in lists:
        lists["1H"] = require_grouped(lists["1H"], settings.frequency_mhz)
    return prepare_peaks(lists, settings.solvent, settings.frequency_mhz)


def choose_solvent(peaks: dict[str, PreparedPeaks], settings: Settings) -> str | None:
    """Return the solvent that was asked for, else the one that a list's heading states, else None."""
    return settings.solvent or next((p.peak_list.solvent for p in peaks.values() if p.peak_list.solvent), None)


def require_candidates(
    records: Iterable[Structure | RecordFailure],
) -> tuple[list[int], list[Structure], list[RecordFailure]]:
    """Return positions and structures of the candidates that could be read, and those that could not.

    Raises
    ------
    InputError
        If none could be read.
    """
    positions, read, failures = [], [], []
    for position, record in enumerate(records):
        if isinstance(record, RecordFailure):
            failures.append(record)
        else:
            positions.append(position)
            read.append(record)
    if not read:
        came = "no candidates" if not failures else f"{len(failures)} candidates of which none can be read"
        raise InputError("structures", came, "at least one structure that can be read", "shiftpred.rank(['CCO', 'COC'], ...)")
    return positions, read, failures
