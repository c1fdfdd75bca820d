"""`shiftpred compare`: do the peaks bear the structure out?"""

from __future__ import annotations

import click

from shiftpred.cli.options import (
    ManyWords,
    build_settings,
    compare_options,
    fail_on_option,
    output_options,
    report_options,
    traceback_option,
)
from shiftpred.exit_codes import FINE, JUDGEMENT_REACHED, is_judgement_reached

FORMATS = ("text", "json", "html", "nmredata")


@click.command("compare", cls=ManyWords, short_help="Judge whether peaks bear a structure out; assign them; write a report.")
@click.argument("structure")
@compare_options
@fail_on_option
@output_options(*FORMATS)
@report_options
@traceback_option
def command(structure, c13, h1, fail_on, format_, output, sample, reviewer, date, **options) -> int:
    """Compare the measured peaks with STRUCTURE: assignment, leftovers, rivals, judgement.

    STRUCTURE is a SMILES, a file with one record, or - for standard input. PEAKS are a file or a text, plain numbers or as
    journals print them: '13C NMR (101 MHz, CDCl3) δ 166.6, 132.8, 129.5 (2C)', 'δ 4.38 (q, J = 7.1 Hz, 2H)'. An NMReDATA
    file as STRUCTURE brings its own peaks, and its assignment is checked.
    """
    from shiftpred.cli.boundary import print_message
    from shiftpred.cli.output import choose_format, write_result
    from shiftpred.cli.peak_lists import read_peak_options
    from shiftpred.peaks.nmredata import find_nmredata
    from shiftpred.pipeline import compare
    from shiftpred.reporting import compute_comparison_dict, render_verdict_line
    from shiftpred.structures import parse_structure

    chosen = choose_format(format_, output, FORMATS)
    given = find_nmredata(structure)
    peaks = read_peak_options(c13, h1, given)
    comparison = compare(given or parse_structure(structure), **peaks, **build_settings(options))
    document = compute_comparison_dict(comparison, sample, date, reviewer)
    write_result(output, comparison.to_nmredata() if chosen == "nmredata" else _render(document, chosen))
    if output not in (None, "-"):
        print_message(f"{render_verdict_line(document)}; written to {output}")
    return JUDGEMENT_REACHED if is_judgement_reached(comparison.judgement, fail_on) else FINE


def _render(document: dict, chosen: str) -> str:
    from shiftpred import reporting

    if chosen == "json":
        return reporting.render_json(document)
    if chosen == "html":
        return reporting.render_comparison_html(document)
    return reporting.render_comparison_text(document)
