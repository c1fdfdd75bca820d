"""A structure as a molfile with the user's own atom numbers."""

from __future__ import annotations

from rdkit import Chem, rdBase
from rdkit.Chem import rdDepictor

from shiftpred.errors import NotApplicable
from shiftpred.records import Structure

__all__ = ["render_molfile", "render_sdf_property"]

_MOST_V2000_ATOMS = 999
_LONGEST_TITLE = 80


def render_molfile(structure: Structure, title: str = "") -> str:
    """Return a molfile whose atoms stand where the user had them, drawn hydrogens among them.

    Parameters
    ----------
    structure : Structure
    title : str, default ''
        '' for the structure's name.

    Returns
    -------
    str
        V2000; V3000 where more than 999 atoms or a kind of bond needs it. Coordinates are the user's, or a new drawing where there
        are none. Without the line `$$$$`.

    Raises
    ------
    NotApplicable
        If the record does not say where the hydrogens are that its atom numbers leave out.
    """
    mol = _restore_drawn_hydrogens(structure)
    with rdBase.BlockLogs():
        if not mol.GetNumConformers():
            rdDepictor.Compute2DCoords(mol)
        mol.SetProp("_Name", _clean_title(title or structure.name))
        block = Chem.MolToMolBlock(mol, forceV3000=mol.GetNumAtoms() > _MOST_V2000_ATOMS)
    # RDKit writes the time into the second line; equal input is to give equal output.
    lines = block.split("\n")
    lines[1] = f"  shiftpred         {'3D' if mol.GetNumConformers() and mol.GetConformer().Is3D() else '2D'}"
    return "\n".join(lines)


def render_sdf_property(name: str, lines: list[str]) -> str:
    """Return one data item of an SDF record; blank lines, which would end it, are left out."""
    content = [" ".join(line.split()) for line in lines]
    return "\n".join([f">  <{name}>", *(line for line in content if line), "", ""])


def _clean_title(text: str) -> str:
    title = " ".join(text.split())[:_LONGEST_TITLE]
    return f"_{title}" if title.startswith(("$", ">")) else title


def _restore_drawn_hydrogens(structure: Structure) -> Chem.Mol:
    """Put hydrogens that were folded in back where they stood."""
    mol = Chem.Mol(structure.mol)
    drawn = structure.drawn_hydrogens
    place = dict(zip(structure.atom_numbers, range(mol.GetNumAtoms())))
    total = mol.GetNumAtoms() + len(drawn)
    if sorted([*place, *(number for number, _, _ in drawn)]) != list(range(1, total + 1)):
        raise NotApplicable(
            f"structure {structure.name}",
            "atom numbers with gaps and no record of the hydrogens that fill them",
            "a structure that shiftpred has read itself",
            "read it with shiftpred.structures.parse_structure",
        )
    if drawn:
        mol = _add_hydrogens(mol, [(number, place[bearer], isotope) for number, bearer, isotope in drawn], place)
    order = [place[number] for number in range(1, total + 1)]
    return mol if order == list(range(total)) else Chem.RenumberAtoms(mol, order)


def _add_hydrogens(mol, drawn, place) -> Chem.Mol:
    """Add the drawn hydrogens behind the other atoms; `place` learns where each of them is."""
    wanted: dict[int, list[tuple[int, int]]] = {}
    for number, bearer, isotope in drawn:
        wanted.setdefault(bearer, []).append((number, isotope))
    before = mol.GetNumAtoms()
    work = Chem.RWMol(Chem.AddHs(mol, addCoords=bool(mol.GetNumConformers()), onlyOnAtoms=sorted(wanted)))
    surplus: list[int] = []
    kept = 0
    for atom in list(work.GetAtoms())[before:]:
        bearer = atom.GetNeighbors()[0].GetIdx()
        if wanted[bearer]:
            number, isotope = wanted[bearer].pop(0)
            atom.SetIsotope(isotope)
            place[number] = before + kept  # once the surplus is gone
            kept += 1
        else:
            # One of several hydrogens is drawn: the others go back to being implied.
            surplus.append(atom.GetIdx())
            work.GetAtomWithIdx(bearer).SetNoImplicit(False)
    for index in sorted(surplus, reverse=True):
        work.RemoveAtom(index)
    out = work.GetMol()
    Chem.SanitizeMol(out)
    return out
