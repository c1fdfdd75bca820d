"""`shiftpred explain`: why does this shift lie where it lies?"""

from __future__ import annotations

import click

from shiftpred.cli.options import (
    coverage_option,
    model_option,
    output_options,
    solvent_option,
    traceback_option,
)
from shiftpred.errors import SettingError

FORMATS = ("text", "json", "html")


@click.command("explain", short_help="Take a predicted shift apart: base, substituents, remainder.")
@click.argument("structure")
@click.option(
    "--atom",
    type=click.IntRange(min=1),
    required=True,
    metavar="N",
    help="Number of the atom, from 1, in the order of the input.",
)
@click.option("--nucleus", type=click.Choice(["13C", "1H", "both"]), help="Default: 13C for a carbon, otherwise 1H.")
@solvent_option
@coverage_option
@output_options(*FORMATS)
@model_option
@traceback_option
def command(structure, atom, nucleus, solvent, coverage, format_, output, model) -> int:
    """Explain one shift of STRUCTURE: every substituent with its constants and its contribution in ppm.

    The contributions add up to the predicted shift exactly; what the environment model adds stands on a line of its own.
    """
    from shiftpred import reporting
    from shiftpred.cli.output import choose_format, write_result
    from shiftpred.pipeline import explain
    from shiftpred.structures import parse_structure

    chosen = choose_format(format_, output, FORMATS)
    record = parse_structure(structure)
    index = find_atom(record, atom)
    nuclei = choose_nuclei(record, index, nucleus)
    explanations = [explain(record, index, n, solvent=solvent, coverage=coverage, model=model) for n in nuclei]
    document = reporting.compute_explanation_dict(explanations)
    render = {
        "json": reporting.render_json,
        "html": reporting.render_explanation_html,
        "text": reporting.render_explanation_text,
    }
    write_result(output, render[chosen](document))
    return 0


def find_atom(structure, atom: int) -> int:
    """Return the 0-based index of the user's atom number.

    Raises
    ------
    SettingError
        If no heavy atom has that number.
    """
    if atom in structure.atom_numbers:
        return structure.atom_numbers.index(atom)
    numbers = sorted(structure.atom_numbers)
    shown = f"{numbers[0]} to {numbers[-1]}" if numbers else "none"
    raise SettingError(
        "option --atom",
        str(atom),
        f"the number of a heavy atom of this structure ({shown})",
        f"--atom {numbers[0] if numbers else 1}",
    )


def choose_nuclei(structure, index: int, asked: str | None) -> tuple[str, ...]:
    """Return the nuclei to explain: as asked, else what the atom offers first."""
    carbon = structure.mol.GetAtomWithIdx(index).GetAtomicNum() == 6
    if asked == "both":
        return ("13C", "1H")
    return (asked,) if asked else ("13C",) if carbon else ("1H",)
