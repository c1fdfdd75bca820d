"""Environment classes of sites: what intervals are calibrated by and errors are reported by."""

from __future__ import annotations

from rdkit import Chem

from shiftpred.structures.atom_table import AtomTable, build_atom_table

__all__ = ["coarser_environment", "compute_environments", "compute_site_environments"]

_HYBRIDS = {Chem.HybridizationType.SP3: 4, Chem.HybridizationType.SP2: 3, Chem.HybridizationType.SP: 2}
_DOUBLE, _TRIPLE = 2.0, 3.0
_HALOGENS = frozenset((9, 17, 35, 53))
_ORGANIC = frozenset((1, 5, 6, 7, 8, 9, 14, 15, 16, 17, 34, 35, 53))
_LABILE = frozenset((7, 8, 16))


def coarser_environment(name: str) -> str:
    """Return the next coarser class, '' after the coarsest.

    Examples
    --------
    >>> coarser_environment("sp3 CH2, on O"), coarser_environment("sp3 CH2"), coarser_environment("sp3")
    ('sp3 CH2', 'sp3', '')
    """
    if ", " in name:
        return name.rsplit(", ", 1)[0]
    if " " in name:
        return name.split(" ", 1)[0]
    return ""


def compute_environments(mol: Chem.Mol, nucleus: str) -> list[str | None]:
    """Return the class of each atom's site.

    Parameters
    ----------
    mol : rdkit Mol
        Standardised.
    nucleus : {'13C', '1H'}

    Returns
    -------
    list of str or None
        (n_atoms,); None where the atom has no such nucleus (not a carbon; no hydrogen).
    """
    table = build_atom_table(mol)
    found = compute_site_environments(mol, table)
    if nucleus == "13C":
        return [name if z == 6 else None for name, z in zip(found, table.elements)]
    return [name if hydrogens else None for name, hydrogens in zip(found, table.hydrogens)]


def compute_site_environments(mol: Chem.Mol, table: AtomTable | None = None) -> list[str]:
    """Return the class of each atom's site, '' for a site with neither carbon nor hydrogen.

    A carbon and its hydrogens share one class.

    Parameters
    ----------
    mol : rdkit Mol
        Standardised.
    table : AtomTable, optional
        Of the same molecule, where it is at hand.

    Returns
    -------
    list of str
        (n_atoms,)
    """
    table = table or build_atom_table(mol)
    elements, hydrogens = table.elements, table.hydrogens
    heteroaromatic = _find_heteroaromatic(table)
    classes = []
    for i, z in enumerate(elements):
        if z == 6:
            classes.append(_classify_carbon(table, i, i in heteroaromatic))
        else:
            classes.append(_classify_hydride(table, i) if hydrogens[i] else "")
    return classes


def _find_heteroaromatic(table: AtomTable) -> set[int]:
    """Return the atoms of all aromatic rings that contain another element than carbon."""
    found: set[int] = set()
    if any(aromatic and z != 6 for aromatic, z in zip(table.aromatic, table.elements)):
        for ring in table.mol.GetRingInfo().AtomRings():
            if any(table.elements[i] != 6 for i in ring) and all(table.aromatic[i] for i in ring):
                found.update(ring)
    return found


def _classify_carbon(table: AtomTable, i: int, heteroaromatic: bool) -> str:
    hydrogens = table.hydrogens[i]
    neighbours = [table.elements[j] for j in table.neighbours[i]]
    elements = set(neighbours)
    if not elements <= _ORGANIC:
        return f"unusual {_count(hydrogens)}, on metal"
    if table.aromatic[i]:
        return _classify_aromatic(hydrogens, elements, heteroaromatic)
    atom = table.atoms[i]
    bonded = list(zip(table.orders[i], neighbours))
    if atom.GetFormalCharge() or atom.GetNumRadicalElectrons():
        hybrid = _HYBRIDS.get(atom.GetHybridization(), 0)
    else:
        hybrid = table.degrees[i]  # of a neutral carbon the number of neighbours says it, and costs less to ask
    if hybrid == 4:
        return f"sp3 {_count(hydrogens)}, {_name_partners(neighbours)}"
    if hybrid == 3:
        return _classify_sp2(hydrogens, bonded)
    if hybrid == 2:
        return _classify_sp(bonded)
    return f"unusual {_count(hydrogens)}"


def _count(hydrogens: int) -> str:
    return "C" if hydrogens == 0 else "CH" if hydrogens == 1 else f"CH{hydrogens}"


def _classify_aromatic(hydrogens, elements, heteroaromatic):
    kind = "heteroaromatic" if heteroaromatic else "aromatic"
    if hydrogens:
        return f"{kind} CH, beside heteroatom" if heteroaromatic and elements - {6} else f"{kind} CH"
    if elements & _HALOGENS:
        return f"{kind} C, on halogen"
    if 8 in elements:
        return f"{kind} C, on O"
    if elements - {6}:
        return f"{kind} C, on N or other heteroatom"
    return f"{kind} C, on C"


def _classify_sp(neighbours):
    for order, z in neighbours:
        if order == _TRIPLE:
            return "sp nitrile C" if z == 7 else "sp alkyne C"
    return "sp cumulene C"


def _classify_sp2(hydrogens, neighbours):
    double = [z for order, z in neighbours if order == _DOUBLE]
    single = {z for order, z in neighbours if order != _DOUBLE}
    if 8 in double:
        if single - {6, 7, 8}:
            return "carbonyl C=O, on other heteroatom"
        if 7 in single:
            return "carbonyl C=O, on N"
        if 8 in single:
            return "carbonyl C=O, on O"
        return "carbonyl C=O, aldehyde" if hydrogens else "carbonyl C=O, ketone"
    if 7 in double:
        return "sp2 C=N, with H" if hydrogens else "sp2 C=N, without H"
    if 16 in double or 34 in double:
        return "sp2 C=S"
    return f"alkene {_count(hydrogens)}, {'on heteroatom' if single - {6} else 'on C only'}"


def _name_partners(elements: list[int]) -> str:
    hetero = [z for z in elements if z != 6]
    if not hetero:
        return "on C only"
    if 8 in hetero:
        return "on O" if len(hetero) == 1 else "on O and another heteroatom"
    # The order of the questions, not that of the atoms, decides between two heteroatoms.
    if not _HALOGENS.isdisjoint(hetero):
        return "on halogen"
    if 7 in hetero:
        return "on N"
    return "on S" if 16 in hetero else "on another heteroatom"


def _classify_hydride(table: AtomTable, i: int) -> str:
    z = table.elements[i]
    if z not in _LABILE:
        return "unusual H"
    if z == 16:
        return "S-H"
    neighbours = table.neighbours[i]
    if z == 8:
        for j in neighbours:
            if table.aromatic[j]:
                return "O-H, phenol"
            if table.elements[j] == 6:
                if _is_doubly_bonded_to(table, j, (8,)):
                    return "O-H, acid"
                return "O-H, enol" if table.degrees[j] == 3 else "O-H, alcohol"
        return "O-H, on heteroatom"
    if table.aromatic[i]:
        return "N-H, aromatic"
    if any(_is_doubly_bonded_to(table, j, (8, 16)) for j in neighbours):
        return "N-H, amide"
    if any(table.aromatic[j] for j in neighbours):
        return "N-H, aniline"
    return "N-H, amine"


def _is_doubly_bonded_to(table: AtomTable, i: int, elements: tuple[int, ...]) -> bool:
    return any(order == _DOUBLE and table.elements[j] in elements for order, j in zip(table.orders[i], table.neighbours[i]))
