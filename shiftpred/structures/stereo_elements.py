"""Stereo elements: what a symmetry operation of a molecule has to keep, or to invert, besides the bonds.

Three kinds. A tetrahedral atom with four different places has a handedness, and so has an even cumulene: a rotation keeps it
and a reflection inverts it. (A lone pair of S, P, As, Se or Te counts as a place; one of N only at a bridgehead or where it is
drawn so, because other amines invert.) A planar element (double bond, odd cumulene, the slowly rotating C-N bond of an amide
and its relatives) is kept by both. An atom with two or more hydrogens is no element: its hydrogens can be numbered to suit.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from rdkit import Chem

from shiftpred.structures.atom_table import AtomTable

__all__ = [
    "PlanarElement",
    "StereoElements",
    "compute_parity",
    "find_stereo_elements",
    "follow_cumulene",
    "holds_nitrogen_planar",
]

_TETRAHEDRAL = frozenset((5, 6, 7, 14, 15, 16, 32, 33, 34, 50, 52))
_PYRAMIDAL = frozenset((15, 16, 33, 34, 52))
_CHALCOGENS = frozenset((8, 16, 34))
_SMALLEST_RING_WITH_E_AND_Z = 8
_LARGEST_RIGID_RING = 7
_LARGEST_CIS_FUSED_RING = 4


@dataclass(slots=True)
class PlanarElement:
    """Two ends, each with one or two ligands in a fixed order."""

    ends: tuple[int, int]
    ligands: tuple[list[int], list[int]]
    """Heavy ligands of each end; a single one stands before the hydrogen or lone pair."""
    handed: bool
    """True: an even cumulene, inverted by a reflection."""
    between: tuple[int, ...]
    """Atoms of a cumulene between the ends, from the first end to the second."""
    drawn: int
    """+1 if the first ligands are drawn on one side, -1 if on opposite sides, 0 if that is not drawn."""


@dataclass(slots=True)
class StereoElements:
    """All stereo elements of a molecule."""

    tetrahedral: dict[int, int] = field(default_factory=dict)
    """Atom → configuration: +1, -1, or 0 where none is drawn (yet to be settled)."""
    planar: list[PlanarElement] = field(default_factory=list)
    at_atom: dict[int, list[int]] = field(default_factory=dict)
    """Atom → places in `planar` of which it is an end."""
    true_centres: set[int] = field(default_factory=set)
    """Tetrahedral atoms whose ligands all differ by constitution."""
    open_centres: set[int] = field(default_factory=set)
    """True centres, and ring atoms with two different faces, whose configuration is neither drawn nor forced by a bridge."""


def compute_parity(given: list[int], wanted: list[int]) -> int:
    """Return +1 if an even number of exchanges turns one order of the same numbers into the other, -1 if an odd one.

    Examples
    --------
    >>> compute_parity([4, 7, 9], [4, 9, 7]), compute_parity([4, 7, 9], [9, 4, 7])
    (-1, 1)
    """
    if given == wanted:
        return 1
    given, sign = list(given), 1
    for k, value in enumerate(wanted):
        if given[k] != value:
            at = given.index(value, k)
            given[k], given[at] = given[at], given[k]
            sign = -sign
    return sign


def find_stereo_elements(table: AtomTable, rank: list[int]) -> StereoElements:
    """Find the stereo elements of a molecule.

    Parameters
    ----------
    table : AtomTable
        The order of `table.neighbours` is changed at atoms with a drawn configuration to the order that it refers to.
    rank : list of int
        (n_atoms,) canonical rank without stereo.

    Returns
    -------
    StereoElements
    """
    elements = StereoElements()
    _find_tetrahedral(table, rank, elements)
    _relate_bridgeheads(table, rank, elements)
    elements.open_centres = {
        i
        for i, drawn in elements.tetrahedral.items()
        if not drawn and (i in elements.true_centres or _is_ring_centre(table, rank, i))
    }
    _find_double_bonds(table, rank, elements)
    _find_slow_rotors(table, rank, elements)
    for k, element in enumerate(elements.planar):
        for end in element.ends:
            elements.at_atom.setdefault(end, []).append(k)
    return elements


def _find_tetrahedral(table, rank, elements):
    clockwise, counter = Chem.ChiralType.CHI_TETRAHEDRAL_CW, Chem.ChiralType.CHI_TETRAHEDRAL_CCW
    for i, near in enumerate(table.neighbours):
        z = table.elements[i]
        if len(near) + table.hydrogens[i] not in (3, 4) or z not in _TETRAHEDRAL or table.aromatic[i] or table.hydrogens[i] > 1:
            continue
        if table.degrees[i] == 3:
            if z == 7:
                if not table.atoms[i].GetChiralTag() and not _is_bridgehead(table, i):
                    continue
            elif z not in _PYRAMIDAL or 2.0 in table.orders[i] and z != 16 and z != 34:
                continue
        if z in _PYRAMIDAL and _has_exchanging_oxygens(table, i):
            continue
        tag = table.atoms[i].GetChiralTag()
        drawn = 1 if tag == clockwise else -1 if tag == counter else 0
        if drawn:
            # A drawn configuration refers to the atom's own order of bonds.
            order = [x.GetIdx() for x in table.atoms[i].GetNeighbors()]
            if order != near:
                table.orders[i] = [table.orders[i][near.index(j)] for j in order]
                table.neighbours[i] = near = order
        elements.tetrahedral[i] = drawn
        if len({rank[j] for j in near}) == len(near):
            elements.true_centres.add(i)


def _is_bridgehead(table, i):
    """Say whether a nitrogen is held from inverting by bridged rings (quinuclidine yes, indolizidine no)."""
    if any(order != 1.0 for order in table.orders[i]):
        return False
    mol, info = table.mol, table.mol.GetRingInfo()
    if not all(info.NumBondRings(mol.GetBondBetweenAtoms(i, j).GetIdx()) for j in table.neighbours[i]):
        return False
    own = [set(ring) for ring in info.AtomRings() if i in ring]
    return any(len(one & other) > 2 for k, one in enumerate(own) for other in own[:k])


def _is_ring_centre(table, rank, i):
    """Say whether equal ligands of an atom are held apart by a ring (C-1 of 1,4-dimethylcyclohexane)."""
    mol, info = table.mol, table.mol.GetRingInfo()
    if not info.NumAtomRings(i):
        return False
    near = table.neighbours[i]
    ranks = [rank[j] for j in near]
    return any(ranks.count(rank[j]) > 1 and info.NumBondRings(mol.GetBondBetweenAtoms(i, j).GetIdx()) for j in near)


def _relate_bridgeheads(table, rank, elements):
    """Give two bridgeheads without drawn configuration the one that the bridges force on them.

    In a small bicycle both point outwards (norbornane), or to one side (fused three- and four-membered rings): each is the
    mirror image of the other along the bridges.
    """
    tetrahedral = elements.tetrahedral
    undrawn: dict[int, list[int]] = {}
    for i, drawn in tetrahedral.items():
        if not drawn and len(table.neighbours[i]) > 2:
            undrawn.setdefault(rank[i], []).append(i)
    pairs = [(u, v) for atoms in undrawn.values() if len(atoms) > 1 for k, v in enumerate(atoms) for u in atoms[:k]]
    if not pairs:
        return
    rings = table.mol.GetRingInfo().AtomRings()
    for u, v in pairs:
        shared = [ring for ring in rings if u in ring and v in ring]
        if tetrahedral[u] and tetrahedral[v] or len(shared) < 2 or max(map(len, shared)) > _LARGEST_RIGID_RING:
            continue
        if v in table.neighbours[u] and min(map(len, shared)) > _LARGEST_CIS_FUSED_RING:
            continue
        other: dict[int, int] = {}
        for ring in shared:
            start = ring.index(u)
            round_u = ring[start:] + ring[:start]
            stop = round_u.index(v)
            # Along each way round the ring: the neighbour of u, and the neighbour of v on the same bridge.
            other[round_u[1]] = round_u[stop - 1]
            other[round_u[-1]] = round_u[(stop + 1) % len(round_u)]
        goal = [other.get(a, -1) for a in table.neighbours[u]]
        rest = [b for b in table.neighbours[v] if b not in goal]
        if goal.count(-1) != len(rest) or len(rest) > 1:
            continue
        goal = [rest[0] if b < 0 else b for b in goal]
        if sorted(goal) != sorted(table.neighbours[v]):
            continue
        parity = compute_parity(goal, table.neighbours[v])
        tetrahedral[u] = tetrahedral[u] or -parity * (tetrahedral[v] or 1)
        tetrahedral[v] = -parity * tetrahedral[u]


def _has_exchanging_oxygens(table, i):
    """Say whether P(=O)OH, P(=O)[O-], S(=O)OH or their sulfur relatives make two ligands one by exchange of the proton."""
    terminal = [j for j in table.neighbours[i] if table.elements[j] in _CHALCOGENS and len(table.neighbours[j]) == 1]
    return len(terminal) > 1 and len({table.elements[j] for j in terminal}) < len(terminal)


def _find_double_bonds(table, rank, elements):
    info = table.mol.GetRingInfo()
    delocalised = _find_delocalised(table, rank)
    for i, orders in enumerate(table.orders):
        if 2.0 not in orders or not _can_end(table, i):
            continue
        for j, order in zip(table.neighbours[i], orders):
            if order != 2.0:
                continue
            *between, end = follow_cumulene(table, i, j)
            before = between[-1] if between else i
            if end <= i or not _can_end(table, end) or frozenset((rank[i], rank[j])) in delocalised:
                continue
            first = [k for k in table.neighbours[i] if k != j]
            last = [k for k in table.neighbours[end] if k != before]
            if not first or not last or len(first) > 2 or len(last) > 2:
                continue
            handed = len(between) % 2 == 1
            if handed and 7 in (table.elements[i], table.elements[end]):
                continue  # carbodiimides and ketenimines turn over quickly
            drawn = 0
            if not between:
                bond = table.mol.GetBondBetweenAtoms(i, j)
                if bond.IsInRing() and info.MinBondRingSize(bond.GetIdx()) < _SMALLEST_RING_WITH_E_AND_Z:
                    continue
                drawn = _read_drawn(bond, i, first[0], last[0])
            elements.planar.append(PlanarElement((i, end), (first, last), handed, tuple(between), drawn))


def follow_cumulene(table: AtomTable, i: int, j: int) -> list[int]:
    """Return the atoms that follow on atom `i` along cumulated double bonds by way of `j`; the last is the other end."""
    found = [j]
    while table.elements[j] == 6 and table.orders[j] == [2.0, 2.0]:
        i, j = j, next((k for k in table.neighbours[j] if k != i), -1)
        if j < 0 or j in found:
            break
        found.append(j)
    return found


def _find_delocalised(table, rank):
    """Return the pairs of ranks whose bond is double in one place and single in another: one bond order by resonance."""
    if not any(a.GetFormalCharge() for a in table.atoms):
        return frozenset()
    found: dict[frozenset[int], set[float]] = {}
    for i, near in enumerate(table.neighbours):
        for j, order in zip(near, table.orders[i]):
            found.setdefault(frozenset((rank[i], rank[j])), set()).add(order)
    return frozenset(pair for pair, orders in found.items() if len(orders) > 1)


def _can_end(table, i):
    return table.elements[i] in (6, 7) and not table.aromatic[i] and table.degrees[i] == (3 if table.elements[i] == 6 else 2)


def _read_drawn(bond, begin, first, last):
    """Return +1 if `first` and `last` are drawn on one side of the bond, -1 if not, 0 if it is not drawn."""
    stereo = bond.GetStereo()
    if stereo in (Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS):
        side = 1
    elif stereo in (Chem.BondStereo.STEREOE, Chem.BondStereo.STEREOTRANS):
        side = -1
    else:
        return 0
    a, b = bond.GetStereoAtoms()
    if bond.GetBeginAtomIdx() != begin:
        a, b = b, a
    return side * (1 if a == first else -1) * (1 if b == last else -1)


def _find_slow_rotors(table, rank, elements):
    """Find nitrogens with two ligands of equal constitution that do not exchange quickly.

    Which do was counted in the complete 13C lists of the open shift table (lists with more lines than the exchanged groups
    would give / all lists): formamides 12/12, other amides 65/78, amides of ring nitrogen 19/27, thioamides 10/12,
    dithiocarbamates 5/5, nitrosamines 6/7, open-chain carbamates 10/14; but carbamates of ring nitrogen 1/14, ureas 0/9,
    thioureas 1/6, sulfonamides 0/17, amidines 1/11, enaminones 17/45.
    """
    ring = table.mol.GetRingInfo()
    for i, z in enumerate(table.elements):
        if z != 7 or len(table.neighbours[i]) != 3 or table.aromatic[i]:
            continue
        for j in table.neighbours[i]:
            held = [k for k in table.neighbours[i] if k != j]
            if rank[held[0]] == rank[held[1]] and holds_nitrogen_planar(table, j, carbamates=not ring.NumAtomRings(i)):
                others = [k for k in table.neighbours[j] if k != i]
                elements.planar.append(PlanarElement((i, j), (held, others), False, (), 0))


def holds_nitrogen_planar(table: AtomTable, i: int, carbamates: bool = True) -> bool:
    """Say whether a single bond from nitrogen to atom `i` turns slowly at room temperature.

    C=O and C=S do so unless a second nitrogen shares in (ureas), or, where `carbamates` is False, an oxygen; so does N=O of
    nitrosamines.
    """
    partner = table.find_double_bond_partner(i)
    if partner < 0 or table.elements[partner] not in _CHALCOGENS or table.aromatic[i]:
        return False
    if table.elements[i] == 7:
        return len(table.neighbours[i]) == 2
    single = [table.elements[k] for k in table.neighbours[i] if k != partner]
    if table.elements[i] != 6 or single.count(7) != 1:
        return False
    return carbamates or 8 not in single
