"""The only place where an error becomes a line on standard error and an exit code."""

from __future__ import annotations

import os
import sys
import traceback
from collections.abc import Callable

import click

from shiftpred.errors import ShiftpredError
from shiftpred.exit_codes import BAD_INPUT, FINE, INTERRUPTED, OUR_FAULT

__all__ = ["ReaderGone", "print_message", "run_guarded"]


class ReaderGone(Exception):
    """Whoever read our output has stopped reading (`| head`); not an error."""


def run_guarded(run: Callable[[], object], show_traceback: bool) -> int:
    """Run a command and return its exit code; every error becomes one line on standard error.

    Parameters
    ----------
    run : callable
        Returns an exit code, or anything else for 0.
    show_traceback : bool
        Print the full trace before the line.
    """
    _prepare_streams()
    try:
        code = run()
        return code if isinstance(code, int) else FINE
    except (ReaderGone, BrokenPipeError):
        _let_output_go()
        return FINE
    except click.exceptions.NoArgsIsHelpError as error:
        click.echo(error.format_message(), err=True)
        return BAD_INPUT
    except click.UsageError as error:
        command = error.ctx.command_path if error.ctx else "shiftpred"
        print_message(f"{error.format_message()} Try: {command} --help")
        return BAD_INPUT
    except click.ClickException as error:
        print_message(error.format_message())
        return BAD_INPUT
    except (click.Abort, KeyboardInterrupt):
        print_message("interrupted")
        return INTERRUPTED
    except ShiftpredError as error:
        if show_traceback:
            traceback.print_exc()
        print_message(str(error))
        return BAD_INPUT
    except Exception as error:
        refusal = _build_refusal(error)
        if refusal:
            _let_output_go()
            print_message(refusal)
            return BAD_INPUT
        if show_traceback:
            traceback.print_exc()
            print_message(f"{type(error).__name__}: {error}. This is a fault of ours.")
        else:
            print_message(f"{type(error).__name__}: {error}. This is a fault of ours; run again with --traceback.")
        return OUR_FAULT


def print_message(text: str) -> None:
    """Write one line to standard error, whatever line ends the text has."""
    click.echo(f"shiftpred: {' '.join(str(text).split())}", err=True)


def _build_refusal(error: Exception) -> str | None:
    """Return the message where standard output could not be written (a full disk), which is no fault of ours."""
    if not isinstance(error, OSError):
        return None
    from shiftpred.reporting import build_refusal

    refusal = build_refusal(error, "standard output", "free space where the output goes")
    return None if refusal is None else str(refusal)


def _prepare_streams() -> None:
    """Write UTF-8 into files and pipes on every system; on a terminal never fail for want of a character."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            encoding = stream.encoding if stream.isatty() else "utf-8"
            stream.reconfigure(encoding=encoding, errors="backslashreplace")


def _let_output_go() -> None:
    """Keep the interpreter from complaining about the closed pipe when it shuts down."""
    try:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except (OSError, ValueError, AttributeError):
        return
