"""The options `--c13` and `--h1`: a file or a text."""

from __future__ import annotations

import click

from shiftpred.records import PeakList

__all__ = ["read_peak_options"]


def read_peak_options(c13: str | None, h1: str | None, given=None) -> dict[str, PeakList | None]:
    """Read both peak lists.

    Parameters
    ----------
    c13, h1 : str or None
        A file name or the peaks themselves.
    given : NmredataRecord, optional
        What the structure's own file holds; its peaks are taken where neither option is given.

    Returns
    -------
    dict
        `c13` and `h1` for the pipeline; None where there is no list, or where the file's own are to be taken.

    Raises
    ------
    click.UsageError
        If neither is given.
    PeakError
        If a list cannot be read.
    """
    if c13 is None and h1 is None and given is not None and any(map(given.build_peak_list, ("13C", "1H"))):
        return {"c13": None, "h1": None}
    if c13 is None and h1 is None:
        raise click.UsageError("No peaks: give --c13 or --h1, or both.", click.get_current_context(silent=True))
    from shiftpred.peaks import parse_peaks

    return {
        "c13": None if c13 is None else parse_peaks(c13, "13C"),
        "h1": None if h1 is None else parse_peaks(h1, "1H"),
    }
