"""`shiftpred evaluate`: how good is a model on compounds that it has not seen?"""

from __future__ import annotations

import json

import click

from shiftpred.cli.options import output_options, traceback_option
from shiftpred.cli.output import choose_format, write_result


@click.command("evaluate", short_help="Print a model's errors by environment class, beside baselines.")
@click.argument("model")
@click.argument("tables")
@click.option(
    "--split",
    type=click.Choice(["test", "calibration", "ours", "all"]),
    default="test",
    show_default=True,
    help="Part of the tables: one of the two that training held out, both (ours), or all compounds of tables never trained on.",
)
@click.option("--max-atoms", type=click.IntRange(min=1), default=70, show_default=True, metavar="N", help="Largest molecule.")
@click.option("--no-baselines", is_flag=True, help="Leave the baselines out; much faster.")
@click.option("--baseline-tables", metavar="FOLDER", help="Tables whose training part the look-up is made of. Default: TABLES.")
@click.option("--plain-network", metavar="FILE", help="plain_network.npz of the plain network, as one more baseline.")
@output_options("text", "json")
@traceback_option
def command(model, tables, split, max_atoms, no_baselines, baseline_tables, plain_network, format_, output) -> int:
    """Print the errors of MODEL on compounds of TABLES that were held out, by environment class, beside baselines.

    Published additivity rules, a look-up of identical environments and the substituent model alone are judged on the same
    sites. Errors against published shifts with known atoms follow at the end.
    """
    from shiftpred.training.evaluate import evaluate_model
    from shiftpred.training.evaluation_text import render_evaluation

    result = evaluate_model(
        model,
        tables,
        split,
        max_atoms=max_atoms,
        baselines=not no_baselines,
        baseline_tables=baseline_tables,
        plain_network=plain_network,
    )
    as_json = choose_format(format_, output, ("text", "json")) == "json"
    write_result(output, json.dumps(result, indent=1, allow_nan=False) + "\n" if as_json else render_evaluation(result))
    return 0
