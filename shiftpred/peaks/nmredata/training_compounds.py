"""NMReDATA files as training data: each compound's SMILES and the shifts of its atoms."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from rdkit import Chem

from shiftpred.errors import InputError
from shiftpred.peaks.nmredata.contents import NmredataError, NmredataRecord
from shiftpred.peaks.nmredata.reading import parse_nmredata
from shiftpred.records import NUCLEI

__all__ = ["AssignedCompound", "load_nmredata_compounds"]

_ENDINGS = (".sdf", ".sd", ".mol", ".nmredata")


@dataclass(frozen=True)
class AssignedCompound:
    """One compound with measured shifts on known atoms."""

    name: str
    smiles: str
    """Canonical."""
    shifts: tuple[tuple[int, str, float], ...]
    """(0-based atom in the order of `smiles`, nucleus, ppm); a 1H shift names the atom that bears the hydrogen. Labels that the
    file calls interchangeable are left out; two hydrogens of a CH2 that are told apart give two entries."""
    solvent: str | None
    source: str
    """File name."""
    left_out: int = 0
    """Signals that name no atom of ours, are interchangeable or have no shift."""


def load_nmredata_compounds(
    paths: str | os.PathLike | Iterable, report: Callable[[InputError], None] | None = None
) -> Iterator[AssignedCompound]:
    """Read every assigned compound of files and folders.

    Parameters
    ----------
    paths : path or iterable of paths
        Files, or folders that are searched for .sdf, .sd, .mol and .nmredata files, also gzipped, in the order of their names.
    report : callable, optional
        Is called with everything that was wrong, a file or a line of it; the rest is yielded all the same. None: a file that
        cannot be read raises, and problems inside a file are passed over.

    Yields
    ------
    AssignedCompound
        Only those with at least one shift.

    Raises
    ------
    NmredataError
        Without `report`, for a file that cannot be read; for a path that does not exist in any case.
    """
    for path in _iterate_files(paths):
        try:
            for record in parse_nmredata(path):
                if report:
                    for problem in record.problems:
                        report(problem)
                if record.structure is not None:
                    compound = _build_compound(record, str(path))
                    if compound.shifts:
                        yield compound
        except NmredataError as error:
            if report is None:
                raise
            report(error)


def _iterate_files(paths) -> Iterator[Path]:
    for given in [paths] if isinstance(paths, (str, os.PathLike)) else paths:
        path = Path(given)
        if path.is_dir():
            yield from (
                p for p in sorted(path.rglob("*")) if p.name.lower().removesuffix(".gz").endswith(_ENDINGS) and p.is_file()
            )
        elif path.exists():
            yield path
        else:
            raise NmredataError(str(path), "no such file or folder", "an NMReDATA file or a folder of them", "check the path")


def _build_compound(record: NmredataRecord, source: str) -> AssignedCompound:
    structure = record.structure
    smiles = structure.smiles
    # RDKit leaves the order of the atoms as it wrote them on the molecule.
    order = list(structure.mol.GetPropsAsDict(True, True)["_smilesAtomOutputOrder"]) if structure.n_atoms else []
    place = {structure.atom_numbers[index]: k for k, index in enumerate(order)}
    uncertain = {label for groups in record.interchangeable for group in groups for label in group}
    shifts, left_out = [], 0
    for signal in record.signals:
        atoms = [place[a] for a in signal.atoms if a in place]
        if signal.label in uncertain or signal.shift_ppm is None or signal.nucleus not in NUCLEI or not atoms:
            left_out += 1
            continue
        shifts += [(atom, signal.nucleus, signal.shift_ppm) for atom in atoms]
    if Chem.MolFromSmiles(smiles) is None:  # written, but not readable: no use for training
        return AssignedCompound(record.name, smiles, (), record.solvent, source, len(record.signals))
    return AssignedCompound(record.name, smiles, tuple(shifts), record.solvent, source, left_out)
