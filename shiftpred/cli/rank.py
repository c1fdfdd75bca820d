"""`shiftpred rank`: which of these structures fits the peaks best?"""

from __future__ import annotations

import click

from shiftpred.cli.options import (
    ManyWords,
    build_settings,
    compare_options,
    output_options,
    report_options,
    traceback_option,
)
from shiftpred.exit_codes import FINE, SOME_RECORDS_FAILED

FORMATS = ("text", "json", "html")


@click.command("rank", cls=ManyWords, short_help="Put a list of candidate structures in order of fit.")
@click.argument("candidates")
@compare_options
@output_options(*FORMATS)
@report_options
@traceback_option
def command(candidates, c13, h1, format_, output, sample, reviewer, date, **options) -> int:
    """Put CANDIDATES in order: which fits the measured peaks best, and what would decide.

    CANDIDATES is a file with one SMILES a line, an SDF, or - for standard input.
    """
    from shiftpred import reporting
    from shiftpred.cli.boundary import print_message
    from shiftpred.cli.output import choose_format, write_result
    from shiftpred.cli.peak_lists import read_peak_options
    from shiftpred.pipeline import rank_structures
    from shiftpred.structures import parse_structures

    chosen = choose_format(format_, output, FORMATS)
    peaks = read_peak_options(c13, h1)
    ranking = rank_structures(list(parse_structures(candidates)), **peaks, **build_settings(options))
    document = reporting.compute_ranking_dict(ranking, sample, date, reviewer)
    render = {"json": reporting.render_json, "html": reporting.render_ranking_html, "text": reporting.render_ranking_text}
    write_result(output, render[chosen](document))
    if ranking.failures:
        total = len(ranking.candidates) + len(ranking.failures)
        print_message(f"{len(ranking.failures)} of {total} candidates could not be read; the result lists them")
        return SOME_RECORDS_FAILED
    return FINE
