"""From a molecule as RDKit read it to a `Structure`, or to words that say why it cannot be one."""

from __future__ import annotations

from rdkit import Chem, rdBase

from shiftpred.errors import StructureError
from shiftpred.records import Structure
from shiftpred.structures.standardise import charge_dative_bonds, standardise_mol

__all__ = ["LARGEST_STRUCTURE", "build_structure", "require_readable_size", "sanitise"]

LARGEST_STRUCTURE = 1000
"""Heavy atoms; larger structures are refused."""
_MOST_NUMBERS = 12


def build_structure(
    mol: Chem.Mol, name: str, where: str, text: str = "", notes: tuple[str, ...] = (), is_sanitised: bool = False
) -> Structure:
    """Check and standardise a molecule.

    Parameters
    ----------
    mol : rdkit Mol
        Not changed.
    name : str
        The record's name.
    where : str
        File and line, for errors.
    text : str
        What was given; '' for the canonical SMILES.
    notes : tuple of str
        What was noticed before.
    is_sanitised : bool
        True: RDKit has just sanitised it and assigned its stereo.

    Returns
    -------
    Structure

    Raises
    ------
    StructureError
        For a structure without heavy atoms, with placeholders or query features, with too many atoms, an impossible valence
        or an aromatic ring without a Kekulé form.
    """
    require_readable_size(mol, where)
    _require_definite(mol, where)
    with rdBase.BlockLogs():
        if not is_sanitised:
            mol = _sanitise_copy(mol, where)
        standard, kept, deuterium, found = standardise_mol(mol)
    components = len(Chem.GetMolFrags(standard))
    if components > 1:
        notes += (f"{components} components (salt or mixture): each is predicted on its own",)
    if any(
        group.HasProp("TYPE") and group.GetProp("TYPE") in ("SRU", "MON", "COP") for group in Chem.GetMolSubstanceGroups(mol)
    ):
        notes += ("brackets of a repeating unit are ignored: what is drawn is predicted once",)
    numbers = tuple([i + 1 for i in kept])
    drawn = _list_drawn_hydrogens(mol, kept)
    return Structure(name, standard, numbers, text or Chem.MolToSmiles(standard), deuterium, notes + found, drawn)


def _list_drawn_hydrogens(mol, kept) -> tuple[tuple[int, int, int], ...]:
    """Return number, bearer's number and isotope of the hydrogens that were folded in."""
    if len(kept) == mol.GetNumAtoms():
        return ()
    folded = [mol.GetAtomWithIdx(i) for i in sorted(set(range(mol.GetNumAtoms())) - set(kept))]
    return tuple((a.GetIdx() + 1, b.GetIdx() + 1, a.GetIsotope()) for a in folded for b in a.GetNeighbors()[:1])


def require_readable_size(mol: Chem.Mol, where: str) -> None:
    """Refuse structures without heavy atoms or with too many.

    Raises
    ------
    StructureError
    """
    if mol.GetNumAtoms() == 0:
        raise StructureError(where, "a structure without atoms", "at least one heavy atom", "draw the structure again")
    heavy = mol.GetNumHeavyAtoms()
    if heavy > LARGEST_STRUCTURE:
        raise StructureError(
            where, f"{heavy:,} heavy atoms", f"at most {LARGEST_STRUCTURE:,}", "cut the structure down to the part that matters"
        )
    if heavy == 0 and not any(a.GetAtomicNum() == 0 for a in mol.GetAtoms()):
        raise StructureError(
            where, "no heavy atom", "a molecule with at least one atom other than hydrogen", "check the structure"
        )


def sanitise(mol: Chem.Mol) -> bool:
    """Sanitise in place; False if the molecule has a problem."""
    return Chem.SanitizeMol(mol, catchErrors=True) == Chem.SanitizeFlags.SANITIZE_NONE


def _require_definite(mol, where):
    """Refuse R groups, wildcards, atom lists and query bonds."""
    if mol.GetNumAtoms() != mol.GetNumHeavyAtoms() or mol.HasQuery():
        for atom in mol.GetAtoms():
            if atom.GetAtomicNum() == 0 or (atom.HasQuery() and atom.DescribeQuery().count("Atom") > 1):
                symbol = atom.GetProp("dummyLabel") if atom.HasProp("dummyLabel") else atom.GetSymbol()
                raise StructureError(
                    where,
                    f"a placeholder (atom {atom.GetIdx() + 1}, {symbol}: R group, wildcard or list of elements)",
                    "a complete structure",
                    "replace it by the atoms that are meant",
                )
        for bond in mol.GetBonds():
            if bond.HasQuery() and bond.GetBondType() not in (Chem.BondType.SINGLE, Chem.BondType.DOUBLE, Chem.BondType.TRIPLE):
                raise StructureError(
                    where,
                    f"a bond of no definite order between atoms {bond.GetBeginAtomIdx() + 1} and {bond.GetEndAtomIdx() + 1}",
                    "single, double, triple or aromatic bonds",
                    "draw the bond that is meant",
                )


def _sanitise_copy(mol, where):
    work = Chem.RWMol(mol)
    if not sanitise(work):
        # Drawn with a dative bond to a full octet (N->BH3): readable once the charges are written out.
        work = Chem.RWMol(mol)
        if not (charge_dative_bonds(work) and sanitise(work)):
            raise _name_problem(Chem.Mol(mol), where)
    work = work.GetMol()
    Chem.AssignStereochemistry(work, cleanIt=True, force=True)
    return work


def _name_problem(mol: Chem.Mol, where: str) -> StructureError:
    """Say in words what RDKit found wrong, with the user's atom numbers."""
    problems = Chem.DetectChemistryProblems(mol)
    for problem in problems:
        kind = problem.GetType()
        if kind == "AtomValenceException":
            atom = mol.GetAtomWithIdx(problem.GetAtomIdx())
            symbol, number = atom.GetSymbol(), atom.GetIdx() + 1
            bonds = sum(b.GetBondTypeAsDouble() for b in atom.GetBonds())
            charge = atom.GetFormalCharge()
            drawn = f"{bonds:g} bond{'s' if bonds != 1 else ''}"
            if atom.GetNumExplicitHs():
                drawn += f" and {atom.GetNumExplicitHs()} H"
            return StructureError(
                where,
                f"atom {number} ({symbol}{f', charge {charge:+d}' if charge else ''}) with {drawn}",
                f"a valence that {symbol} can have",
                f"check bonds and charge at atom {number}",
            )
        if kind in ("KekulizeException", "AtomKekulizeException"):
            indices = problem.GetAtomIndices() if hasattr(problem, "GetAtomIndices") else [problem.GetAtomIdx()]
            numbers = [str(i + 1) for i in indices]
            shown = ", ".join(numbers[:_MOST_NUMBERS]) + (", …" if len(numbers) > _MOST_NUMBERS else "")
            return StructureError(
                where,
                f"an aromatic ring without a Kekulé form (atoms {shown})",
                "alternating double bonds all round",
                "write the hydrogen of a pyrrole-like nitrogen as [nH]",
            )
    message = problems[0].Message() if problems else "unknown problem"
    return StructureError(
        where, f"a structure that makes no chemical sense ({message})", "valid valences", "check the structure"
    )
