"""`shiftpred evaluate`: how good is a model on tables that it has not seen?"""

from __future__ import annotations

import click

from shiftpred.cli.options import traceback_option


@click.command("evaluate", short_help="Print a model's errors by environment class, beside baselines.")
@click.argument("model")
@click.argument("tables")
@traceback_option
def command(model, tables) -> int:
    """Print the errors of MODEL on the held-out part of TABLES, by environment class, beside published baselines."""
    from shiftpred.cli.extras import require_extra

    require_extra("train", "sklearn")
    from shiftpred.training.evaluate_model import evaluate_model

    evaluate_model(model, tables, report=click.echo)
    return 0
