"""Options that several commands share, each with one meaning."""

from __future__ import annotations

import datetime
from collections.abc import Callable

import click

__all__ = [
    "ManyWords",
    "build_settings",
    "compare_options",
    "coverage_option",
    "fail_on_option",
    "is_traceback_wanted",
    "model_option",
    "output_options",
    "report_options",
    "solvent_option",
    "traceback_option",
]

_TRACEBACK = "shiftpred.traceback"


def _remember_traceback(ctx: click.Context, _parameter: click.Parameter, wanted: bool) -> None:
    if wanted:
        ctx.meta[_TRACEBACK] = True


traceback_option = click.option(
    "--traceback", is_flag=True, expose_value=False, callback=_remember_traceback, help="Show the full trace of an error."
)


def is_traceback_wanted() -> bool:
    """Say whether the run was asked to show traces."""
    ctx = click.get_current_context(silent=True)
    return bool(ctx and ctx.meta.get(_TRACEBACK))


solvent_option = click.option("--solvent", metavar="NAME", help="CDCl3, DMSO-d6, CD3OD, … Default: not given.")
coverage_option = click.option(
    "--coverage",
    type=float,
    default=0.9,
    show_default=True,
    metavar="SHARE",
    help="How often an interval is meant to hold the observed value.",
)
model_option = click.option(
    "--model", metavar="FOLDER", help="A model that `shiftpred train` wrote. Default: the one that is shipped."
)
fail_on_option = click.option(
    "--fail-on",
    type=click.Choice(["contradicted", "open"]),
    help="Leave with exit code 4 at this judgement or a worse one.",
)


def output_options(*formats: str) -> Callable:
    """Return the options `--format` and `--output` for a command that knows these formats; the first is the default."""

    def decorate(function: Callable) -> Callable:
        function = click.option(
            "--output", metavar="FILE", help="Write to this file, in one step, instead of to standard output."
        )(function)
        return click.option(
            "--format",
            "format_",
            type=click.Choice(formats),
            help=f"Default: what the ending of --output says, otherwise {formats[0]}.",
        )(function)

    return decorate


def report_options(function: Callable) -> Callable:
    """Add what a report says about itself: sample, reviewer, date."""
    for option in (
        click.option(
            "--date",
            metavar="DATE",
            callback=_require_date,
            help="Date of the report, YYYY-MM-DD or 'none'. Default: today.",
        ),
        click.option("--reviewer", default="", metavar="NAME", help="Name for the reviewer's line."),
        click.option("--sample", default="", metavar="NAME", help="Name of the sample. Default: the structure's."),
    ):
        function = option(function)
    return function


def _require_date(_ctx: click.Context, _parameter: click.Parameter, value: str | None) -> str:
    if value is None:
        return datetime.date.today().isoformat()
    if value.strip().lower() in ("", "none"):
        return ""
    try:
        return datetime.date.fromisoformat(value.strip()).isoformat()
    except ValueError:
        raise click.BadParameter(f"{value!r} is not a date such as 2025-03-31.") from None


def compare_options(function: Callable) -> Callable:
    """Add the peak lists and everything that decides how they are compared."""
    for option in (
        click.option(
            "--expect",
            "expected",
            multiple=True,
            metavar="SMILES…",
            help="What else may be in the tube: counter-ion, reagent. One or several.",
        ),
        click.option(
            "--prior",
            type=float,
            default=0.5,
            show_default=True,
            metavar="P",
            help="Probability of the structure before the peaks are seen.",
        ),
        click.option("--frequency", type=float, metavar="MHZ", help="1H frequency of the spectrometer (or the 13C one)."),
        click.option("--mass-confirmed", is_flag=True, help="The mass is known to be right: only isomers are rivals."),
        click.option(
            "--rivals", type=click.IntRange(min=0), default=9, show_default=True, metavar="N", help="Most rivals to try."
        ),
        model_option,
        coverage_option,
        solvent_option,
        click.option("--h1", metavar="PEAKS", help="1H peaks: a file or a text."),
        click.option("--c13", metavar="PEAKS", help="13C peaks: a file or a text."),
    ):
        function = option(function)
    return function


def build_settings(options: dict) -> dict:
    """Return the pipeline's keywords from the options of `compare_options`."""
    return {
        "solvent": options["solvent"],
        "coverage": options["coverage"],
        "frequency_mhz": options["frequency"],
        "rivals": options["rivals"],
        "mass_confirmed": options["mass_confirmed"],
        "prior": options["prior"],
        "expected": tuple(options["expected"]),
        "model": options["model"],
    }


class ManyWords(click.Command):
    """A command whose `--expect` takes every word up to the next option."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        return super().parse_args(ctx, _repeat_option(args, "--expect"))


def _repeat_option(args: list[str], name: str) -> list[str]:
    """Write `--expect A B` as `--expect A --expect B`.

    Examples
    --------
    >>> _repeat_option(["S", "--expect", "CCO", "O", "--rivals", "3"], "--expect")
    ['S', '--expect', 'CCO', '--expect', 'O', '--rivals', '3']
    """
    written: list[str] = []
    repeating = False
    for word in args:
        if word == name:
            repeating = True
            written.append(word)
        elif word.startswith("-") and len(word) > 1:
            repeating = False
            written.append(word)
        elif repeating and written[-1] != name:
            written += [name, word]
        else:
            written.append(word)
    return written
