"""`shiftpred triage`: many samples, a page and a table out."""

from __future__ import annotations

import click

from shiftpred.cli.options import coverage_option, fail_on_option, model_option, solvent_option, traceback_option


@click.command("triage", short_help="Judge many samples; write a page, a table and a report each.")
@click.argument("samples")
@click.option("--output", required=True, metavar="FOLDER", help="Folder for the results; a stopped run goes on from it.")
@solvent_option
@coverage_option
@click.option("--rivals", type=click.IntRange(min=0), default=9, show_default=True, metavar="N", help="Most rivals to try.")
@click.option("--mass-confirmed", is_flag=True, help="Masses are known to be right: only isomers are rivals.")
@click.option("--frequency", type=float, metavar="MHZ", help="1H frequency of the spectrometer.")
@click.option("--prior", type=float, default=0.5, show_default=True, metavar="P")
@click.option("--processes", type=click.IntRange(min=1), default=2, show_default=True, metavar="N")
@click.option("--scheduler", metavar="ADDRESS", help="Send the work to this scheduler instead of to local processes.")
@click.option(
    "--format",
    "format_",
    type=click.Choice(["csv", "xlsx"]),
    default="csv",
    show_default=True,
    help="Form of the summary; xlsx writes summary.xlsx beside summary.csv.",
)
@fail_on_option
@model_option
@traceback_option
def command(samples, output, frequency, format_, **options) -> int:
    """Judge every sample of SAMPLES, a table (sample, smiles, c13, h1, solvent) or a folder of files."""
    from shiftpred.triage import run_triage

    if format_ == "csv":
        return run_triage(samples, output, frequency_mhz=frequency, **options)
    from shiftpred.triage.workbook import require_openpyxl, save_summary_workbook

    require_openpyxl()  # before the work, not after it
    code = run_triage(samples, output, frequency_mhz=frequency, **options)
    save_summary_workbook(output)
    return code
