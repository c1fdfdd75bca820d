"""Read structures from text, files and molecules, one record at a time; a bad record never costs the others."""

from __future__ import annotations

import csv
import gzip
import io
import os
import sys
from collections.abc import Iterable, Iterator
from pathlib import Path

from rdkit import Chem, rdBase

from shiftpred.errors import InputError, StructureError, quote
from shiftpred.records import RecordFailure, Structure
from shiftpred.structures.standardise import standardise_mol

__all__ = ["LARGEST_STRUCTURE", "parse_structure", "parse_structures"]

LARGEST_STRUCTURE = 1000
"""Heavy atoms; larger structures are refused."""
_SUFFIXES = (".smi", ".smiles", ".csv", ".tsv", ".mol", ".sdf", ".sd", ".mdl", ".txt", ".inchi")
_NAME_COLUMNS = ("name", "molecule", "sample", "id", "compound")
_LONGEST_LINE = 20_000


def parse_structure(source, name: str | None = None) -> Structure:
    """Read exactly one structure.

    Parameters
    ----------
    source : str, path, rdkit Mol or Structure
        A SMILES, an InChI, the path of a file with one record, a molecule.
    name : str, optional

    Returns
    -------
    Structure

    Raises
    ------
    StructureError
        If it cannot be read, or if the file holds several records.
    """
    if isinstance(source, Structure):
        return source
    found = []
    for record in parse_structures(source, name=name):
        if isinstance(record, RecordFailure):
            raise record.error
        found.append(record)
        if len(found) > 1:
            raise StructureError(
                quote(str(source)), "several records", "exactly one structure here", "give a file with one record, or use `predict` or `rank`"
            )
    if not found:
        raise StructureError(quote(str(source)), "no structure", "one structure", "check that the file is the right one")
    return found[0]


def parse_structures(source, name: str | None = None) -> Iterator[Structure | RecordFailure]:
    """Read structures one after the other, with flat memory.

    Parameters
    ----------
    source : str, path, rdkit Mol, Structure or iterable of these
        A SMILES ('CCO' or 'CCO ethanol'), an InChI, the path of a .smi, .csv, .tsv, .mol or .sdf file (V2000 or V3000, also
        .gz), or '-' for SMILES lines or an SDF on standard input.
    name : str, optional
        Name of a single record.

    Yields
    ------
    Structure or RecordFailure
        In the order of the input. A record's name is the one it carries, or its 1-based number.

    Raises
    ------
    InputError
        If the source as a whole cannot be read (no such file, an empty file, no `smiles` column).
    """
    if isinstance(source, Structure):
        yield source
    elif isinstance(source, Chem.Mol):
        yield _attempt(name or _name_of(source) or "1", lambda: _build(source, name or _name_of(source) or "1", "molecule"))
    elif isinstance(source, Path):
        yield from _parse_file(source)
    elif isinstance(source, str):
        yield from _parse_text(source, name)
    elif isinstance(source, Iterable):
        for number, one in enumerate(source, 1):
            try:
                if isinstance(one, RecordFailure):
                    yield one
                elif isinstance(one, (Structure, Chem.Mol)):
                    label = (one.name if isinstance(one, Structure) else _name_of(one)) or str(number)
                    yield one if isinstance(one, Structure) else _attempt(label, lambda one=one, label=label: _build(one, label, "molecule"))
                elif isinstance(one, str):
                    yield _parse_line(one, str(number), f"structure {number}")
                else:
                    raise StructureError(f"structure {number}", type(one).__name__, "a SMILES or an rdkit Mol", "pass 'CCO'")
            except InputError as error:
                yield RecordFailure(str(number), error)
    else:
        raise StructureError("structure", type(source).__name__, "a SMILES, a path, an rdkit Mol or an iterable of these", "pass 'CCO'")


def _parse_text(text: str, name: str | None) -> Iterator[Structure | RecordFailure]:
    stripped = text.strip().lstrip("\ufeff")
    if stripped == "-":
        yield from _parse_stream(sys.stdin, "standard input", "")
        return
    if stripped and len(stripped) < 1000 and "\n" not in stripped and os.path.isfile(stripped):
        yield from _parse_file(Path(stripped))
        return
    if "\n" in stripped and "M  END" in stripped:
        yield from _parse_blocks(io.StringIO(text), "structure text")
        return
    plain = stripped.lower().removesuffix(".gz")
    if plain.endswith(_SUFFIXES) or (os.sep in stripped and os.path.isdir(os.path.dirname(stripped) or ".") and stripped.startswith((".", os.sep))):
        raise StructureError(
            quote(stripped), "a file name, but there is no such file", "a SMILES, or the path of an existing file",
            "check the path and the current folder",
        )
    if "\n" in stripped:
        yield from _parse_lines(io.StringIO(stripped), "structure text")
        return
    record = _parse_line(stripped, name or "1", "structure")
    if name and isinstance(record, Structure):
        record = Structure(name, record.mol, record.atom_numbers, record.text, record.deuterium, record.notes)
    yield record


def _parse_file(path: Path) -> Iterator[Structure | RecordFailure]:
    try:
        raw = gzip.open(path, "rb") if path.suffix.lower() == ".gz" else open(path, "rb")
        with raw:
            if not raw.peek(1):
                raise InputError(str(path), "an empty file", "at least one structure", "check that the export worked")
            suffix = Path(path.name.lower().removesuffix(".gz")).suffix
            encoding = _guess_encoding(raw.peek(65536)[:65536])
            yield from _parse_stream(io.TextIOWrapper(raw, encoding=encoding, errors="replace"), str(path), suffix)
    except (OSError, EOFError) as error:
        raise InputError(
            str(path), f"a file that cannot be read ({getattr(error, 'strerror', None) or error})", "a readable file", "check path, permissions and compression"
        ) from None


def _guess_encoding(head: bytes) -> str:
    try:
        head.decode("utf-8-sig")
        return "utf-8-sig"
    except UnicodeDecodeError as error:
        # A character cut at the end of what was looked at is no sign of another encoding.
        return "utf-8-sig" if error.start > len(head) - 4 else "latin-1"


def _parse_stream(handle, where: str, suffix: str) -> Iterator[Structure | RecordFailure]:
    if suffix in (".csv", ".tsv"):
        yield from _parse_table(handle, where, "\t" if suffix == ".tsv" else None)
    elif suffix in (".mol", ".sdf", ".sd", ".mdl"):
        yield from _parse_blocks(handle, where)
    elif suffix == "":
        text = handle.read()
        if not text.strip():
            raise InputError(where, "nothing", "SMILES lines or an SDF", "pipe structures into the command")
        head = text.lstrip("\ufeff").split("\n", 1)[0].lower().replace('"', "")
        if "M  END" in text:
            yield from _parse_blocks(io.StringIO(text), where)
        elif "," in head and "smiles" in head.split(","):
            yield from _parse_table(io.StringIO(text), where, None)
        else:
            yield from _parse_lines(io.StringIO(text), where)
    else:
        yield from _parse_lines(handle, where)


def _parse_lines(handle, where: str) -> Iterator[Structure | RecordFailure]:
    number = 0
    for line_number, line in enumerate(handle, 1):
        line = line.strip().lstrip("\ufeff")
        if not line or line.startswith("#") and " " in line:
            continue
        if number == 0 and line.split()[0].lower() in ("smiles", "structure") and len(line.split()) <= 3:
            continue
        number += 1
        yield _parse_line(line, str(number), f"{where}, line {line_number}")
    if number == 0:
        raise InputError(where, "no structure", "one SMILES on each line", "check that the export worked")


def _parse_table(handle, where: str, delimiter: str | None) -> Iterator[Structure | RecordFailure]:
    first = handle.readline()
    delimiter = delimiter or max(",;\t", key=first.count)
    header = [c.strip().lstrip("\ufeff").lower() for c in next(csv.reader([first], delimiter=delimiter), [])]
    if "smiles" not in header:
        raise InputError(
            where, f"columns {', '.join(header) or 'none'}", "a column `smiles`", "rename the column that holds the structures to smiles"
        )
    at = header.index("smiles")
    name_at = next((header.index(c) for c in _NAME_COLUMNS if c in header), None)
    number = 0
    for row in csv.reader(handle, delimiter=delimiter):
        if not any(cell.strip() for cell in row):
            continue
        number += 1
        name = (row[name_at].strip() if name_at is not None and name_at < len(row) else "") or str(number)
        text = row[at].strip() if at < len(row) else ""
        record = _parse_line(text.split()[0] if text.split() else "", name, f"{where}, row {number}")
        yield record
    if number == 0:
        raise InputError(where, "a table without rows", "at least one row below the header", "check that the export worked")


def _parse_blocks(handle, where: str) -> Iterator[Structure | RecordFailure]:
    block: list[str] = []
    number = 0
    for line in handle:
        if line.rstrip() == "$$$$":
            number += 1
            yield _parse_block(block, number, where)
            block = []
        else:
            block.append(line.rstrip("\r\n"))
    if any(line.strip() for line in block):
        number += 1
        yield _parse_block(block, number, where)
    if number == 0:
        raise InputError(where, "no record", "a molfile or an SDF", "check that the export worked")


def _parse_block(lines: list[str], number: int, where: str) -> Structure | RecordFailure:
    title = lines[0].strip() if lines else ""
    name = title or str(number)
    place = f"{where}, record {number}"

    def build():
        end = next((k for k, line in enumerate(lines) if line.startswith("M  END")), len(lines) - 1)
        with rdBase.BlockLogs():
            mol = Chem.MolFromMolBlock("\n".join(lines[: end + 1]) + "\n", sanitize=False, removeHs=False, strictParsing=False)
        if mol is None:
            raise StructureError(place, "a molfile that cannot be read", "MOL V2000 or V3000", "export the structure again")
        notes = ()
        if mol.GetNumAtoms() > 1:
            conformer = mol.GetConformer() if mol.GetNumConformers() else None
            if conformer is None or not conformer.GetPositions().any():
                notes = ("no coordinates in the molfile: wedges and double-bond geometry are not known from it",)
            elif _try_sanitise(mol):
                _read_stereo(mol, conformer)
        return _build(mol, name, place, place, notes)

    return _attempt(name, build)


def _read_stereo(mol, conformer) -> None:
    """Take configurations from coordinates and wedges."""
    if conformer.Is3D():
        Chem.AssignStereochemistryFrom3D(mol)
        return
    Chem.AssignChiralTypesFromBondDirs(mol)
    Chem.SetDoubleBondNeighborDirections(mol)
    Chem.AssignStereochemistry(mol, cleanIt=True, force=True)


def _try_sanitise(mol) -> bool:
    with rdBase.BlockLogs():
        return Chem.SanitizeMol(mol, catchErrors=True) == Chem.SanitizeFlags.SANITIZE_NONE


def _parse_line(line: str, name: str, where: str) -> Structure | RecordFailure:
    parts = line.split(None, 1)
    text = parts[0] if parts else ""
    label = name
    if len(parts) > 1 and not parts[1].startswith("|"):
        label = parts[1].strip() or name
    elif len(parts) > 1 and "|" in parts[1][1:]:
        label = parts[1].rsplit("|", 1)[1].strip() or name

    def build():
        if not text:
            raise StructureError(where, "no structure", "a SMILES", "fill in the structure")
        if len(text) > _LONGEST_LINE:
            raise StructureError(where, f"{len(text):,} characters", f"at most {_LONGEST_LINE:,}", "give one molecule")
        return _build(_read_text(text, where), label, where, text)

    return _attempt(label, build)


def _read_text(text: str, where: str) -> Chem.Mol:
    with rdBase.BlockLogs():
        if text.startswith("InChI="):
            mol = Chem.MolFromInchi(text, sanitize=False, removeHs=False)
            if mol is None:
                raise StructureError(where, f"{quote(text)}, an InChI that cannot be read", "a standard InChI", "copy it again, or give the SMILES")
            return mol
        parameters = Chem.SmilesParserParams()
        parameters.removeHs = False
        parameters.sanitize = True
        parameters.allowCXSMILES = False
        mol = Chem.MolFromSmiles(text, parameters)
        if mol is not None:
            return mol
        parameters.sanitize = False
        mol = Chem.MolFromSmiles(text, parameters)
    if mol is None:
        raise StructureError(
            where, f"{quote(text)}, which is not a SMILES", "a SMILES such as CCOC(C)=O", "check brackets, ring numbers and element symbols"
        )
    return mol  # the problem is named when it is sanitised below


def _build(mol: Chem.Mol, name: str, where: str, text: str | None = None, notes: tuple[str, ...] = ()) -> Structure:
    if mol.GetNumAtoms() == 0:
        raise StructureError(where, "a structure without atoms", "at least one heavy atom", "draw the structure again")
    heavy = 0
    for i in range(mol.GetNumAtoms()):
        atom = mol.GetAtomWithIdx(i)
        heavy += atom.GetAtomicNum() > 1
        if atom.GetAtomicNum() == 0 or atom.HasQuery() and atom.DescribeQuery().count("Atom") > 1:
            raise StructureError(
                where, f"a placeholder (atom {atom.GetIdx() + 1}: *, R group or query)", "a complete structure", "replace it by the atoms that are meant"
            )
    if heavy == 0:
        raise StructureError(where, "no heavy atom", "a molecule with at least one atom other than hydrogen", "check the structure")
    if heavy > LARGEST_STRUCTURE:
        raise StructureError(where, f"{heavy:,} heavy atoms", f"at most {LARGEST_STRUCTURE:,}", "cut the structure down to the part that matters")
    work = Chem.Mol(mol)
    with rdBase.BlockLogs():
        if not _try_sanitise(work):
            raise _name_problem(Chem.Mol(mol), where)
        if mol.NeedsUpdatePropertyCache() or text is None or not work.HasProp("_StereochemDone"):
            Chem.AssignStereochemistry(work, cleanIt=True, force=True)
        work, kept, deuterium, found = standardise_mol(work)
    if work.GetNumAtoms() == 0:
        raise StructureError(where, "no heavy atom", "a molecule with at least one atom other than hydrogen", "check the structure")
    components = len(Chem.GetMolFrags(work))
    if components > 1:
        notes += (f"{components} components (salt or mixture): each is predicted on its own",)
    return Structure(name, work, tuple(i + 1 for i in kept), text or Chem.MolToSmiles(work), deuterium, notes + found)


def _name_problem(mol: Chem.Mol, where: str) -> StructureError:
    """Say in words what RDKit found wrong, with the user's atom numbers."""
    problems = Chem.DetectChemistryProblems(mol)
    for problem in problems:
        kind = problem.GetType()
        if kind == "AtomValenceException":
            atom = mol.GetAtomWithIdx(problem.GetAtomIdx())
            bonds = sum(b.GetBondTypeAsDouble() for b in atom.GetBonds())
            return StructureError(
                where, f"atom {atom.GetIdx() + 1} ({atom.GetSymbol()}) with {bonds:g} bonds besides its hydrogens",
                f"a valence that {atom.GetSymbol()} can have", "check bonds and charge at that atom",
            )
        if kind in ("KekulizeException", "AtomKekulizeException"):
            numbers = [i + 1 for i in problem.GetAtomIndices()] if hasattr(problem, "GetAtomIndices") else [problem.GetAtomIdx() + 1]
            return StructureError(
                where, f"an aromatic ring without a Kekulé form (atoms {', '.join(map(str, numbers[:12]))})",
                "alternating double bonds all round", "write the hydrogen of a pyrrole-like nitrogen as [nH]",
            )
    message = problems[0].Message() if problems else "unknown problem"
    return StructureError(where, f"a structure that makes no chemical sense ({message})", "valid valences", "check the structure")


def _attempt(name: str, build) -> Structure | RecordFailure:
    try:
        return build()
    except InputError as error:
        return RecordFailure(name, error)
    except (ValueError, RuntimeError) as error:  # RDKit's own refusals
        return RecordFailure(name, StructureError(f"structure {name}", f"a structure that RDKit refuses ({error})", "a valid structure", "check it"))


def _name_of(mol: Chem.Mol) -> str:
    return mol.GetProp("_Name").strip() if mol.HasProp("_Name") else ""
