"""Environment classes of sites: what intervals are calibrated by and errors are reported by."""

from __future__ import annotations

from rdkit import Chem

__all__ = ["coarser_environment", "compute_environments", "compute_site_environments"]

_SP, _SP2, _SP3 = Chem.HybridizationType.SP, Chem.HybridizationType.SP2, Chem.HybridizationType.SP3
_DOUBLE, _TRIPLE = Chem.BondType.DOUBLE, Chem.BondType.TRIPLE
_HALOGENS = frozenset((9, 17, 35, 53))
_ORGANIC = frozenset((1, 5, 6, 7, 8, 9, 14, 15, 16, 17, 34, 35, 53))
_LABILE = {7: "N-H", 8: "O-H", 16: "S-H"}


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
    found = compute_site_environments(mol)
    if nucleus == "13C":
        return [e if a.GetAtomicNum() == 6 else None for e, a in zip(found, mol.GetAtoms())]
    return [e if a.GetTotalNumHs() else None for e, a in zip(found, mol.GetAtoms())]


def compute_site_environments(mol: Chem.Mol) -> list[str]:
    """Return the class of each atom's site, (n_atoms,), '' for a site with neither carbon nor hydrogen.

    A carbon and its hydrogens share one class.
    """
    # By index: iterating over GetAtoms() costs several times as much.
    atoms = [mol.GetAtomWithIdx(i) for i in range(mol.GetNumAtoms())]
    elements = [a.GetAtomicNum() for a in atoms]
    heteroaromatic = set()
    for ring in mol.GetRingInfo().AtomRings():
        if any(elements[i] != 6 for i in ring) and all(atoms[i].GetIsAromatic() for i in ring):
            heteroaromatic.update(ring)
    out = []
    for i, (atom, z) in enumerate(zip(atoms, elements)):
        if z == 6:
            out.append(_classify_carbon(atom, i in heteroaromatic))
        else:
            out.append(_classify_hydride(atom, z) if atom.GetTotalNumHs() else "")
    return out


def _classify_carbon(atom, heteroaromatic: bool) -> str:
    hydrogens = atom.GetTotalNumHs()
    neighbours = [(b.GetBondType(), b.GetOtherAtom(atom).GetAtomicNum()) for b in atom.GetBonds()]
    elements = {z for _, z in neighbours}
    if not elements <= _ORGANIC:
        return f"unusual {_count(hydrogens)}, on metal"
    if atom.GetIsAromatic():
        return _classify_aromatic(hydrogens, elements, heteroaromatic)
    hybrid = atom.GetHybridization()
    if hybrid == _SP:
        return _classify_sp(neighbours)
    if hybrid == _SP2:
        return _classify_sp2(hydrogens, neighbours)
    if hybrid == _SP3:
        return f"sp3 {_count(hydrogens)}, {_name_partners([z for _, z in neighbours])}"
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


def _name_partners(elements):
    hetero = [z for z in elements if z != 6]
    if not hetero:
        return "on C only"
    if len(hetero) > 1 and 8 in hetero:
        return "on O and another heteroatom"
    z = hetero[0]
    if z in _HALOGENS:
        return "on halogen"
    return {7: "on N", 8: "on O", 16: "on S"}.get(z, "on another heteroatom")


def _classify_hydride(atom, z):
    if z not in _LABILE:
        return "unusual H"
    if z == 16:
        return "S-H"
    if z == 8:
        for neighbour in atom.GetNeighbors():
            if neighbour.GetIsAromatic():
                return "O-H, phenol"
            if neighbour.GetAtomicNum() == 6:
                acid = any(b.GetBondType() == _DOUBLE and b.GetOtherAtom(neighbour).GetAtomicNum() == 8 for b in neighbour.GetBonds())
                if acid:
                    return "O-H, acid"
                return "O-H, enol" if neighbour.GetHybridization() == _SP2 else "O-H, alcohol"
        return "O-H, on heteroatom"
    if atom.GetIsAromatic():
        return "N-H, aromatic"
    for neighbour in atom.GetNeighbors():
        if any(b.GetBondType() == _DOUBLE and b.GetOtherAtom(neighbour).GetAtomicNum() in (8, 16) for b in neighbour.GetBonds()):
            return "N-H, amide"
    if any(n.GetIsAromatic() for n in atom.GetNeighbors()):
        return "N-H, aniline"
    return "N-H, amine"
