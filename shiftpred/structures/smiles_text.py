"""Lines of text that hold one structure: SMILES, InChI, a name behind it; and what is wrong with them."""

from __future__ import annotations

import re

from rdkit import Chem, rdBase

from shiftpred.errors import InputError, StructureError, quote
from shiftpred.records import RecordFailure, Structure
from shiftpred.structures.building import build_structure, require_readable_size

__all__ = ["attempt", "parse_line", "split_line"]

_CXSMILES_NOTE = "what stands between bars behind the SMILES (CXSMILES) is not used"
_LONGEST_LINE = 20_000
_LONG_LINE = 2_000  # from here on atoms are counted before RDKit looks for rings
_KEY = re.compile(r"^[A-Z]{14}-[A-Z]{10}-[A-Z]$")
_OUTSIDE_BRACKETS = re.compile(r"Cl|Br|[BCNOPSFIbcnops*]|[-=#$:/\\~.]|->|<-|%\d\d|%\(\d+\)|\d|[()]")
_BRACKET = re.compile(r"^\d*([A-Za-z][a-z]?|\*)")


def attempt(name: str, where: str, build) -> Structure | RecordFailure:
    """Return what `build` returns, or a failure under the record's name; a bad record never costs the others."""
    try:
        return build()
    except InputError as error:
        return RecordFailure(name, error)
    except (ValueError, RuntimeError) as error:  # RDKit's own refusals
        first = str(error).strip().splitlines()[:1] or ["no reason given"]
        return RecordFailure(
            name,
            StructureError(where, f"a structure that RDKit refuses ({first[0]})", "a valid structure", "check the structure"),
        )


def split_line(line: str) -> tuple[str, str]:
    """Return the structure's text and the name behind it, '' if there is none.

    Extended SMILES (between bars) are left out; of several columns parted by tabs the first after the structure is the name.

    Examples
    --------
    >>> split_line("CCO ethyl alcohol"), split_line("CCO |$a;b;c$| ethanol")
    (('CCO', 'ethyl alcohol'), ('CCO', 'ethanol'))
    """
    text, _, rest = line.strip().replace("\t", " \t", 1).partition(" ")
    rest = rest.strip()
    if rest.startswith("|"):
        end = rest.rfind("|")
        rest = rest[end + 1 :].strip() if end > 0 else ""
    return text, rest.split("\t", 1)[0].strip()


def parse_line(line: str, name: str, where: str) -> Structure | RecordFailure:
    """Read one line: a SMILES or InChI, and possibly a name.

    Parameters
    ----------
    line : str
    name : str
        Used if the line carries none.
    where : str
        File and line, for errors.

    Returns
    -------
    Structure or RecordFailure
    """
    text, own = split_line(line)
    label = own or name
    notes = (_CXSMILES_NOTE,) if line.strip()[len(text) :].lstrip().startswith("|") else ()

    def build():
        if not text:
            raise StructureError(where, "no structure", "a SMILES", "fill in the structure")
        if len(text) > _LONGEST_LINE:
            raise StructureError(where, f"{len(text):,} characters", f"at most {_LONGEST_LINE:,}", "give one molecule")
        if "\x00" in text:
            raise StructureError(where, f"{quote(text)}, with a null character", "a SMILES", "look whether the file is text")
        if text.startswith("InChI="):
            return build_structure(_read_inchi(text, where), label, where, text, notes)
        mol, is_sanitised = _read_smiles(text, where)
        return build_structure(mol, label, where, text, notes, is_sanitised)

    return attempt(label, where, build)


def _read_inchi(text, where):
    with rdBase.BlockLogs():
        mol = Chem.MolFromInchi(text, sanitize=False, removeHs=False)
    if mol is None:
        raise StructureError(
            where, f"{quote(text)}, an InChI that cannot be read", "a standard InChI", "copy it again, or give the SMILES"
        )
    return mol


def _read_smiles(text, where):
    """Return the molecule and whether it is sanitised; one that is not has a problem that is named later."""
    parameters = Chem.SmilesParserParams()
    parameters.removeHs = False
    parameters.allowCXSMILES = False
    with rdBase.BlockLogs():
        if len(text) < _LONG_LINE:
            mol = Chem.MolFromSmiles(text, parameters)
            if mol is not None:
                return mol, True
        parameters.sanitize = False
        mol = Chem.MolFromSmiles(text, parameters)
        if mol is None:
            raise _name_fault(text, where)
        require_readable_size(mol, where)
    return mol, False


def _name_fault(text: str, where: str) -> StructureError:
    """Say what is wrong with a text that is no SMILES, and at which character."""
    expected = "a SMILES such as CCOC(C)=O"
    if _KEY.match(text):
        return StructureError(
            where, f"{quote(text)}, an InChIKey", expected, "an InChIKey holds no structure: give the SMILES or InChI"
        )
    fault = _find_fault(text)
    advice = "correct it" if fault else "check brackets, ring numbers and element symbols"
    aside = (
        "if a file is meant, there is none of this name"
        if "/" in text or "." in text
        else "names and formulas are not looked up"
    )
    return StructureError(
        where, f"{quote(text)}, which is not a SMILES{': ' if fault else ''}{fault}", expected, f"{advice}; {aside}"
    )


def _find_fault(text: str) -> str:
    """Return the first fault of a SMILES in words, '' if none of the common ones is found."""
    open_branches: list[int] = []
    open_rings: dict[str, int] = {}
    table = Chem.GetPeriodicTable()
    at = 0
    while at < len(text):
        if text[at] == "[":
            end = text.find("]", at)
            if end < 0:
                return f"the bracket [ at character {at + 1} is not closed"
            inside = text[at + 1 : end]
            found = _BRACKET.match(inside)
            if not found or not _is_element(found[1], table):
                return f"{quote('[' + inside + ']', 20)} at character {at + 1} names no element"
            at = end + 1
            continue
        found = _OUTSIDE_BRACKETS.match(text, at)
        if not found:
            return f"{quote(text[at])} at character {at + 1}"
        token = found[0]
        if token == "(":
            open_branches.append(at)
        elif token == ")":
            if not open_branches:
                return f"the parenthesis ) at character {at + 1} was not opened"
            open_branches.pop()
        elif token[0] == "%" or token.isdigit():
            number = token.strip("%()")
            if open_rings.pop(number, None) is None:
                open_rings[number] = at
        at = found.end()
    if open_branches:
        return f"the parenthesis ( at character {open_branches[-1] + 1} is not closed"
    if open_rings:
        number, at = next(iter(open_rings.items()))
        return f"ring {number} at character {at + 1} is not closed"
    if text[-1] in ".-=#$:/\\~":
        return f"{quote(text[-1])} at its end, with no atom behind"
    return ""


def _is_element(symbol, table):
    if symbol == "*":
        return True
    for length in (2, 1):
        try:
            if table.GetAtomicNumber(symbol[:length].capitalize()) > 0:
                return True
        except RuntimeError:
            continue
    return False
