"""`shiftpred train`: from tables of structures and peaks to a model."""

from __future__ import annotations

import click

from shiftpred.cli.options import traceback_option


@click.command("train", short_help="Train a model from tables of structures and peaks.")
@click.argument("tables")
@click.option("--output", required=True, metavar="MODEL", help="Folder of the new model; a stopped run goes on from it.")
@click.option("--start-from", metavar="MODEL", help="A trained model to go on from.")
@click.option("--processes", type=click.IntRange(min=1), default=2, show_default=True, metavar="N")
@traceback_option
def command(tables, output, start_from, processes) -> int:
    """Train a model from TABLES, a folder with `compounds` and `peaks`; no atom numbers are needed."""
    from shiftpred.cli.extras import require_extra

    require_extra("train", "torch", "sklearn")
    from shiftpred.training.train_model import train_model

    train_model(tables, output, start_from=start_from, processes=processes, report=lambda line: click.echo(line, err=True))
    return 0
