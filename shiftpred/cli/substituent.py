"""`shiftpred substituent`: a group on every electronegativity scale, with its inductive and resonance constants."""

from __future__ import annotations

from collections.abc import Iterable

import click

from shiftpred.cli.options import output_options, traceback_option
from shiftpred.errors import InputError, NotApplicable
from shiftpred.exit_codes import FINE, SOME_RECORDS_FAILED

FORMATS = ("text", "json")


@click.command("substituent", short_help="Print a group's electronegativities and constants, each with its source.")
@click.argument("groups", nargs=-1, required=True, metavar="GROUP…")
@output_options(*FORMATS)
@traceback_option
def command(groups, format_, output) -> int:
    """Print each GROUP on every scale: electronegativity, inductive and resonance constants, each with its source.

    GROUP is a SMILES with * where the group is attached: '*OC(C)=O', '*[N+](=O)[O-]'. A group for which the constants are
    not defined says why; that is an answer, not a failure.
    """
    from shiftpred.cli.boundary import print_message
    from shiftpred.cli.output import choose_format, write_result
    from shiftpred.reporting import compute_substituent_dict, render_json

    chosen = choose_format(format_, output, FORMATS)
    results = [(text, _look_up(text)) for text in groups]
    failed = sum(isinstance(result, InputError) for _, result in results)
    if failed == len(results) == 1:
        raise results[0][1]
    text = render_json(compute_substituent_dict(results)) if chosen == "json" else _render_text(results)
    write_result(output, text)
    if failed:
        print_message(f"{failed} of {len(results)} groups could not be read; the result says why")
    return SOME_RECORDS_FAILED if failed else FINE


def _look_up(text: str):
    from shiftpred.electronics import substituent

    try:
        return substituent(text)
    except (InputError, NotApplicable) as error:
        return error


def _render_text(results: Iterable[tuple[str, object]]) -> str:
    from shiftpred.electronics import render_substituent_text

    blocks = []
    for text, result in results:
        if isinstance(result, NotApplicable):
            blocks.append(f"{text}   not defined here, because {result}\n")
        elif isinstance(result, InputError):
            blocks.append(f"{text}   not read: {result}\n")
        else:
            blocks.append(render_substituent_text(result).rstrip("\n") + "\n")
    return "\n".join(blocks)
