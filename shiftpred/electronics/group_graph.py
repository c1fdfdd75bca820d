"""Read a group's SMILES into the few facts that every electronegativity method needs.

A group is a SMILES with one `*` where it is attached. Its hydrogens become atoms of their own here, because
equalisation counts them; everything is plain lists, so that tens of thousands of groups can be read quickly.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, lru_cache

from rdkit import Chem, rdBase

from shiftpred.errors import NotApplicable, StructureError, quote

__all__ = ["GroupGraph", "parse_group"]

_ORDERS = frozenset((1.0, 1.5, 2.0, 3.0))
"""Any other bond (to a metal, of no order) counts as single."""
_NON_METALS = frozenset("H B C N O F Ne Si P S Cl Ar Ge As Se Br Kr Sb Te I Xe He".split())
_LOOK = "one group with one '*' at its point of attachment, such as '*OC(C)=O'"


@dataclass(frozen=True, eq=False)
class GroupGraph:
    """A group as lists over its atoms, hydrogens last; the point of attachment itself is not among them."""

    smiles: str
    """Canonical SMILES with one `*`, without isotopes, stereo and atom maps."""
    attached: int
    """Index of the attached atom (of the first one, where the point has several bonds)."""
    attached_order: float
    """Order of the bond to the site."""
    starts: tuple[int, ...]
    """Every attached atom: one, or two of a bridge such as '*1CC1'."""
    symbols: tuple[str, ...]
    hybrids: tuple[str, ...]
    """'s', 'sp3', 'sp2' or 'sp', by the multiple bonds as drawn; sulfonyl sulfur and phosphoryl phosphorus are sp3."""
    oxos: tuple[int, ...]
    """Doubly bonded oxygens on each atom."""
    aromatic: tuple[bool, ...]
    charges: tuple[float, ...]
    """Formal charges, shared equally by equivalent oxygens (nitro, carboxylate, sulfonate)."""
    radicals: int
    bonds: tuple[tuple[int, int, float], ...]
    """(atom, atom, order) within the group."""
    neighbours: tuple[tuple[tuple[int, float], ...], ...]
    """For each atom its (neighbour, order)."""
    n_heavy: int

    @property
    def charge(self) -> int:
        return round(sum(self.charges))

    @property
    def metals(self) -> tuple[str, ...]:
        """Symbols of the metal atoms, sorted."""
        return tuple(sorted(set(self.symbols) - _NON_METALS))

    @cached_property
    def depths(self) -> tuple[int, ...]:
        """Bonds from the nearest attached atom."""
        return tuple(len(path) - 1 for path in self.paths)

    @cached_property
    def paths(self) -> tuple[tuple[int, ...], ...]:
        """Shortest path from an attached atom to each atom, both included."""
        found: dict[int, tuple[int, ...]] = {start: (start,) for start in self.starts}
        queue = list(self.starts)
        for here in queue:
            for there, _ in self.neighbours[here]:
                if there not in found:
                    found[there] = (*found[here], there)
                    queue.append(there)
        return tuple(found[i] for i in range(len(self.symbols)))


@lru_cache(maxsize=20_000)
def parse_group(smiles: str) -> GroupGraph:
    """Read a group.

    Parameters
    ----------
    smiles : str
        SMILES with one '*', such as '*OC(C)=O', '*=O', '*[H]'.

    Returns
    -------
    GroupGraph

    Raises
    ------
    StructureError
        If the text is no SMILES, or an atom has a valence that it cannot have.
    NotApplicable
        If it has no '*', more than one, or more than one part.
    """
    where = f"group {quote(smiles)}"
    if not isinstance(smiles, str) or not smiles.strip():
        raise StructureError(where, "no text", _LOOK, "quote the group, so that the shell leaves '*' alone")
    parser = Chem.SmilesParserParams()
    parser.removeHs = False
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles.strip(), parser)
    if mol is None:
        raise StructureError(
            where,
            "a text that is no SMILES, or an atom with a valence it cannot have",
            _LOOK,
            "drawing the group again and exporting its SMILES",
        )
    atoms = [mol.GetAtomWithIdx(i) for i in range(mol.GetNumAtoms())]
    points = [atom for atom in atoms if not atom.GetAtomicNum()]
    parts = len(Chem.GetMolFrags(mol))
    if len(points) != 1 or parts != 1 or not points[0].GetDegree():
        came = f"{len(points)} points of attachment" if len(points) != 1 else f"{parts} separate parts"
        raise NotApplicable(
            where,
            came if parts != 1 or len(points) != 1 else "a '*' that is bonded to nothing",
            "exactly one '*', bonded to the group: constants belong to a group with one point of attachment",
            "marking only the atom that the group is attached to, '*C(=O)OC' say",
        )
    if points[0].GetDegree() > 1 and not points[0].IsInRing():
        raise NotApplicable(
            where,
            f"a '*' between {points[0].GetDegree()} groups",
            "'*' at the end of one group",
            "each of the groups by itself",
        )
    return _build(mol, atoms, points[0])


def _build(mol: Chem.Mol, atoms: list[Chem.Atom], point: Chem.Atom) -> GroupGraph:
    start = point.GetIdx()
    heavy = [atom for atom in atoms if atom.GetAtomicNum()]
    index = {atom.GetIdx(): k for k, atom in enumerate(heavy)}
    symbols = [atom.GetSymbol() for atom in heavy]
    charges = [float(atom.GetFormalCharge()) for atom in heavy]
    aromatic = [atom.GetIsAromatic() for atom in heavy]
    bonds, oxos, pi = [], [0] * len(heavy), [0.0] * len(heavy)
    for bond in map(mol.GetBondWithIdx, range(mol.GetNumBonds())):
        a, b, order = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx(), _order(bond)
        for one, other in ((a, b), (b, a)) if order in (2.0, 3.0) else ():
            if one in index:
                k = index[one]
                pi[k] += order - 1
                oxos[k] += order == 2 and atoms[other].GetAtomicNum() == 8
        if start not in (a, b):
            bonds.append((index[a], index[b], order))
    hybrids = [_hybrid(s, n, a.GetIsAromatic(), a.GetTotalDegree()) for s, n, a in zip(symbols, pi, heavy, strict=True)]
    for k, atom in enumerate(heavy[: len(index)]):
        for _ in range(atom.GetTotalNumHs()):
            bonds.append((k, len(symbols), 1.0))
            symbols.append("H")
            hybrids.append("s")
            charges.append(0.0)
            aromatic.append(False)
            oxos.append(0)
    neighbours: list[list[tuple[int, float]]] = [[] for _ in symbols]
    for a, b, order in bonds:
        neighbours[a].append((b, order))
        neighbours[b].append((a, order))
    if min(charges) < 0:
        _share_charges(symbols, charges, hybrids, neighbours)
    starts = sorted(index[n.GetIdx()] for n in point.GetNeighbors())
    first = starts[0]
    order = _order(mol.GetBondBetweenAtoms(start, heavy[first].GetIdx()))
    return GroupGraph(
        smiles=_canonical(mol, atoms, hydrogen=len(symbols) == 1),
        attached=first,
        attached_order=order,
        starts=tuple(starts),
        symbols=tuple(symbols),
        hybrids=tuple(hybrids),
        oxos=tuple(oxos),
        aromatic=tuple(aromatic),
        charges=tuple(charges),
        radicals=sum(atom.GetNumRadicalElectrons() for atom in heavy),
        bonds=tuple(bonds),
        neighbours=tuple(map(tuple, neighbours)),
        n_heavy=sum(s != "H" for s in symbols),
    )


def _order(bond: Chem.Bond) -> float:
    order = bond.GetBondTypeAsDouble()
    return order if order in _ORDERS else 1.0


def _canonical(mol: Chem.Mol, atoms: list[Chem.Atom], hydrogen: bool) -> str:
    """Canonical SMILES; isotopes, stereo and atom maps change no constant here."""
    if any(atom.GetAtomMapNum() or atom.GetIsotope() or atom.GetAtomicNum() == 1 for atom in atoms):
        mol = Chem.Mol(mol)
        for atom in mol.GetAtoms():
            atom.SetAtomMapNum(0)
            atom.SetIsotope(0)
        with rdBase.BlockLogs():
            mol = mol if hydrogen else Chem.RemoveHs(mol)
    return Chem.MolToSmiles(mol, isomericSmiles=False)


def _hybrid(symbol: str, pi: float, aromatic: bool, degree: int) -> str:
    if symbol == "H":
        return "s"
    if symbol in ("S", "Se", "Te", "P", "As", "Cl", "Br", "I") and not aromatic and pi and degree > 2:
        return "sp3"  # An S=O or P=O bond takes no s character away from the sigma bonds.
    return "sp" if pi >= 2 else "sp2" if pi or aromatic else "sp3"


def _share_charges(symbols, charges, hybrids, neighbours) -> None:
    """Let the equivalent oxygens of nitro, carboxylate and sulfonate share their formal charge and hybridisation."""
    for around in neighbours:
        ends = [j for j, _ in around if symbols[j] in ("O", "S") and len(neighbours[j]) == 1]
        for symbol in ("O", "S"):
            same = [j for j in ends if symbols[j] == symbol]
            if len(same) > 1 and any(charges[j] < 0 for j in same) and any(hybrids[j] == "sp2" for j in same):
                mean = sum(charges[j] for j in same) / len(same)
                for j in same:
                    charges[j], hybrids[j] = mean, "sp2"
