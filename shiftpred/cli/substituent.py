"""`shiftpred substituent`: a group on every electronegativity scale, with its inductive and resonance constants."""

from __future__ import annotations

import click

from shiftpred.cli.options import output_options, traceback_option

FORMATS = ("text", "json")


@click.command("substituent", short_help="Print a group's electronegativities and constants, each with its source.")
@click.argument("groups", nargs=-1, required=True, metavar="GROUP…")
@output_options(*FORMATS)
@traceback_option
def command(groups, format_, output) -> int:
    """Print each GROUP on every scale: electronegativity, inductive and resonance constants, each with its source.

    GROUP is a SMILES with * where the group is attached: '*OC(C)=O', '*[N+](=O)[O-]'.
    """
    from shiftpred.cli.output import choose_format, write_result
    from shiftpred.cli.substituent_entries import build_substituent_entries, render_substituent_entries
    from shiftpred.reporting import render_json

    chosen = choose_format(format_, output, FORMATS)
    entries, code = build_substituent_entries(groups)
    write_result(output, render_json(entries) if chosen == "json" else render_substituent_entries(entries))
    return code
