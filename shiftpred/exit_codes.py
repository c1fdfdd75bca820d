"""What a script may build on, and the order of the judgements that `--fail-on` goes by."""

from __future__ import annotations

FINE = 0
OUR_FAULT = 1
BAD_INPUT = 2
SOME_RECORDS_FAILED = 3
JUDGEMENT_REACHED = 4
"""The judgement that `--fail-on` names, or worse; wins over 3."""
INTERRUPTED = 130
"""Ctrl-C, by the shell's own convention."""

_FROM_GOOD_TO_BAD = ("supported", "open", "contradicted")


def is_judgement_reached(judgement: str, fail_on: str | None) -> bool:
    """Say whether a judgement is the one of `--fail-on` or a worse one.

    Parameters
    ----------
    judgement : {'supported', 'open', 'contradicted', ''}
        '': could not be judged, which is no judgement.
    fail_on : {'open', 'contradicted'} or None

    Examples
    --------
    >>> is_judgement_reached("contradicted", "open"), is_judgement_reached("open", "contradicted")
    (True, False)
    """
    if not fail_on or not judgement:
        return False
    return _FROM_GOOD_TO_BAD.index(judgement) >= _FROM_GOOD_TO_BAD.index(fail_on)
