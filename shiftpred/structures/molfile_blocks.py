"""Molfiles and SDF, V2000 and V3000, record by record."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator

from rdkit import Chem, rdBase

from shiftpred.errors import InputError, StructureError
from shiftpred.records import RecordFailure, Structure
from shiftpred.structures.building import build_structure, sanitise
from shiftpred.structures.smiles_text import attempt

__all__ = ["is_counts_line", "parse_blocks"]

_COUNTS = re.compile(r"^[ \d]{3}[ \d]{3}.*V[23]000\s*$")
_HEADER_LINES = 3
_LONGEST_RECORD = 50_000  # lines; a thousand heavy atoms take some five thousand


def is_counts_line(line: str) -> bool:
    """Say whether a line is the counts line of a molfile."""
    return bool(_COUNTS.match(line.rstrip("\r\n")))


def parse_blocks(lines: Iterable[str], where: str) -> Iterator[Structure | RecordFailure]:
    """Read molfiles parted by `$$$$`.

    Parameters
    ----------
    lines : iterable of str
    where : str
        File name, for errors.

    Yields
    ------
    Structure or RecordFailure
        Named by the title line, otherwise by the 1-based number.

    Raises
    ------
    InputError
        If there is no record at all.
    """
    block: list[str] = []
    number = length = 0
    for line in lines:
        line = line.rstrip("\r\n")
        if line.rstrip() == "$$$$":
            number += 1
            yield _parse_block(block, length, number, where)
            block, length = [], 0
            continue
        length += 1
        if length <= _LONGEST_RECORD:
            block.append(line)
    if any(line.strip() for line in block):
        number += 1
        yield _parse_block(block, length, number, where)
    if number == 0:
        raise InputError(where, "no record", "a molfile or an SDF", "check that the export worked")


def _parse_block(lines: list[str], length: int, number: int, where: str) -> Structure | RecordFailure:
    place = f"{where}, record {number}"
    # In a header that lacks lines the first need not be the title.
    has_title = not any(is_counts_line(line) for line in lines[:_HEADER_LINES])
    name = (lines[0].strip() if lines and has_title else "") or str(number)

    def build():
        if length > _LONGEST_RECORD:
            raise StructureError(
                place, f"{length:,} lines", f"at most {_LONGEST_RECORD:,} for one record", "look for a missing $$$$"
            )
        block, notes = _cut_connection_table(lines, place)
        with rdBase.BlockLogs():
            mol = Chem.MolFromMolBlock("\n".join(block) + "\n", sanitize=False, removeHs=False, strictParsing=False)
            if mol is None:
                raise StructureError(place, "a molfile that cannot be read", "MOL V2000 or V3000", "export the structure again")
            if mol.GetNumAtoms() > 1:
                conformer = mol.GetConformer() if mol.GetNumConformers() else None
                if conformer is None or not conformer.GetPositions().any():
                    notes += ("no coordinates in the molfile: wedges and double-bond geometry are not known from it",)
                elif sanitise(mol):
                    _read_stereo(mol, conformer)
        return build_structure(mol, name, place, place, notes)

    return attempt(name, place, build)


def _cut_connection_table(lines, place):
    """Return the lines from the title to M END, with a header of three lines, and what had to be mended."""
    counts = next((k for k, line in enumerate(lines[:12]) if is_counts_line(line)), None)
    end = next((k for k, line in enumerate(lines) if line.startswith("M  END")), None)
    notes = ()
    if any(line.startswith(("$RXN", "$RDFILE", "$MDL")) for line in lines[:_HEADER_LINES]):
        raise StructureError(place, "a reaction or query file", "a molfile or an SDF", "export the molecules one by one")
    if counts is None:
        if not any(line.strip() for line in lines):
            raise StructureError(place, "an empty record", "a molfile", "check that the export worked")
        if len(lines) <= _HEADER_LINES or end is None:
            raise StructureError(place, "a molfile without a counts line", "MOL V2000 or V3000", "export the structure again")
        counts = _HEADER_LINES  # old files carry no version
    elif counts != _HEADER_LINES:
        notes = (f"the molfile's header has {counts} lines instead of 3",)
    if end is None:
        if any("V3000" in line for line in lines[counts : counts + 1]):
            raise StructureError(
                place, "a molfile without its end (M  END)", "a complete molfile", "export the structure again"
            )
        end = next((k for k, line in enumerate(lines) if line.startswith("> ")), len(lines)) - 1
    header = (lines[:counts] + [""] * _HEADER_LINES)[:_HEADER_LINES]
    return [*header, *lines[counts : end + 1], *([] if lines[end].startswith("M  END") else ["M  END"])], notes


def _read_stereo(mol, conformer) -> None:
    """Take configurations from coordinates and wedges."""
    if conformer.Is3D():
        Chem.AssignStereochemistryFrom3D(mol)
        return
    Chem.AssignChiralTypesFromBondDirs(mol)
    Chem.SetDoubleBondNeighborDirections(mol)
    Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
