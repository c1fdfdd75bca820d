"""Read structures and peaks that came over the network: always as text, never as the path of a file."""

from __future__ import annotations

from shiftpred.errors import StructureError
from shiftpred.peaks import reading as peaks
from shiftpred.records import PeakList, RecordFailure, Structure
from shiftpred.structures.molfile_blocks import parse_blocks
from shiftpred.structures.smiles_text import parse_line

__all__ = ["parse_candidate_texts", "parse_peak_text", "parse_structure_text"]


def parse_structure_text(text: str, where: str = "structure") -> Structure:
    """Read exactly one structure from a SMILES, an InChI or a molfile.

    Parameters
    ----------
    text : str
        '-' and the name of an existing file are what they are: texts that are no SMILES.
    where : str
        Name of the field, for messages.

    Raises
    ------
    StructureError
        If it cannot be read, or holds several records.
    """
    records = parse_candidate_texts(text, where)
    if len(records) > 1:
        raise StructureError(where, f"{len(records)} records", "exactly one structure", "leave one, or ask for a ranking")
    if isinstance(records[0], RecordFailure):
        raise records[0].error
    return records[0]


def parse_candidate_texts(text: str, where: str = "structures") -> list[Structure | RecordFailure]:
    """Read structures, one SMILES a line or records of an SDF; a bad one stands in the list as a failure.

    Raises
    ------
    StructureError
        If there is nothing in the text.
    """
    if not text.strip():
        raise StructureError(where, "nothing", "a SMILES or a molfile", "draw or paste a structure")
    if "\0" in text:
        raise StructureError(where, "a text with zero bytes", "a SMILES or a molfile", "copy it again")
    lines = text.replace("\r\n", "\n").replace("\r", "\n").split("\n")
    # Not `parse_structures`: it takes the name of an existing file, and '-', for what they are on a command line.
    if any(line.startswith("M  END") for line in lines):
        return list(parse_blocks(lines, where))
    given = [line.strip() for line in lines if line.strip()]
    return [parse_line(line, str(number), f"{where}, line {number}") for number, line in enumerate(given, 1)]


def parse_peak_text(text: str, nucleus: str) -> PeakList | None:
    """Read a peak list from journal text, plain numbers or a table.

    Parameters
    ----------
    text : str
        Blank: not measured. The name of an existing file is read as what it says, which is no peak.
    nucleus : {'13C', '1H'}

    Returns
    -------
    PeakList or None

    Raises
    ------
    PeakListError
        With everything that was not understood in `problems`.
    """
    return peaks.parse_peak_text(text, nucleus) if text.strip() else None
