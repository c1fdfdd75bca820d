"""`shiftpred predict`: every nucleus of every structure, with an interval."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import click

from shiftpred.cli.options import (
    coverage_option,
    is_traceback_wanted,
    model_option,
    output_options,
    solvent_option,
    traceback_option,
)
from shiftpred.exit_codes import FINE, OUR_FAULT, SOME_RECORDS_FAILED

FORMATS = ("table", "csv", "json", "html", "sdf")


@click.command("predict", short_help="Predict every shift of a structure, with intervals.")
@click.argument("source", metavar="INPUT")
@click.option("--nucleus", type=click.Choice(["13C", "1H", "both"]), default="both", show_default=True)
@solvent_option
@coverage_option
@output_options(*FORMATS)
@model_option
@traceback_option
def command(source, nucleus, solvent, coverage, format_, output, model) -> int:
    """Predict every shift of every structure in INPUT, with prediction intervals.

    INPUT is a SMILES, a file (.smi, .csv with a column `smiles`, .mol, .sdf) or - for standard input. A record that cannot
    be read becomes one row with a note, and the run goes on (exit code 3).
    """
    from shiftpred.cli.batches import Tally, iterate_outcomes
    from shiftpred.cli.boundary import print_message
    from shiftpred.cli.output import choose_format, open_output, track_progress
    from shiftpred.pipeline import load_model, predict_structures
    from shiftpred.structures import parse_structures

    chosen = choose_format(format_, output, FORMATS)
    bundle = load_model(model)
    # Refuse a wrong option before the first record, not after the last.
    predict_structures([], nucleus, solvent, coverage, bundle)
    tally = Tally()
    outcomes = iterate_outcomes(
        parse_structures(source),
        lambda structures: predict_structures(structures, nucleus, solvent, coverage, bundle),
        tally,
        raise_faults=is_traceback_wanted(),
    )
    outcomes = track_progress(outcomes, output, "molecules")
    with open_output(output) as stream:
        for piece in _PIECES[chosen](outcomes, bundle.edition, nucleus, solvent, coverage):
            stream.write(piece)
    if tally.failed:
        rows = "its row says" if tally.failed == 1 else "their rows say"
        print_message(f"{tally.failed} of {tally.records} records failed; {rows} why")
    if tally.faults:
        print_message(f"{tally.faults} of them through a fault of ours; run again with --traceback")
        return OUR_FAULT
    return SOME_RECORDS_FAILED if tally.failed else FINE


def _iterate_csv(outcomes: Iterable, *_settings) -> Iterator[str]:
    from shiftpred.reporting import iterate_prediction_csv

    return iterate_prediction_csv(outcomes)


def _iterate_table(outcomes: Iterable, *_settings) -> Iterator[str]:
    from shiftpred.reporting.text.prediction import iterate_prediction_table

    return iterate_prediction_table(outcomes)


def _iterate_sdf(outcomes: Iterable, *_settings) -> Iterator[str]:
    from shiftpred.reporting import iterate_prediction_sdf

    return iterate_prediction_sdf(outcomes)


def _iterate_json(outcomes: Iterable, edition, nucleus, solvent, coverage) -> Iterator[str]:
    from shiftpred.reporting import compute_prediction_heading, iterate_prediction_json

    return iterate_prediction_json(compute_prediction_heading(edition, nucleus, solvent, coverage), outcomes)


def _iterate_html(outcomes: Iterable, edition, nucleus, solvent, coverage) -> Iterator[str]:
    import datetime

    from shiftpred.reporting import compute_prediction_heading, iterate_prediction_html

    today = datetime.date.today().isoformat()
    return iterate_prediction_html(compute_prediction_heading(edition, nucleus, solvent, coverage, today), outcomes)


_PIECES = {"csv": _iterate_csv, "table": _iterate_table, "json": _iterate_json, "html": _iterate_html, "sdf": _iterate_sdf}
