"""What a script may build on."""

FINE = 0
OUR_FAULT = 1
BAD_INPUT = 2
SOME_RECORDS_FAILED = 3
JUDGEMENT_REACHED = 4
"""The judgement that `--fail-on` names, or worse; wins over 3."""
INTERRUPTED = 130
"""Ctrl-C, by the shell's own convention."""
