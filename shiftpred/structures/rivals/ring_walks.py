"""Isomers by what sits where on a ring: substituents walked or swapped, heteroatoms walked, azole N-substituents moved.

All of them are one edit: two atoms of a ring change places with everything that hangs on them.
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from itertools import combinations

from rdkit import Chem

from shiftpred.structures.rivals.graph_edits import forget_centre, move_group, swap_ring_atoms
from shiftpred.structures.rivals.workspace import Candidate, Workspace

_LARGEST_WHOLE_RING = 8
"""In a larger ring only places up to two bonds apart are exchanged."""
_LARGEST_MOVED_SUBSTITUENT = 4
"""Heavy atoms of a substituent that changes to another ring: up to nitro, acetyl, trifluoromethyl."""
_BENZENE_PLACES = {1: "ortho", 2: "meta", 3: "para"}


def build_walked_substituents(workspace: Workspace) -> Iterator[Candidate]:
    """Walk each ring substituent to every free place of its ring (of its fused system, where that is aromatic)."""
    for first, second in _pairs(workspace):
        if workspace.element[first] == workspace.element[second] == 6:
            free = [not workspace.exocyclic(index) for index in (first, second)]
            if free[0] != free[1]:
                old, new = (second, first) if free[0] else (first, second)
                yield Candidate(
                    edit=partial(_swap, workspace, old, new),
                    how=partial(_describe_walk, workspace, old, new),
                    key=_symmetry_key(workspace, old, new),
                    penalty=_apart(workspace, old, new),
                )


def build_swapped_substituents(workspace: Workspace) -> Iterator[Candidate]:
    """Let two different substituents of one ring change places."""
    for first, second in _pairs(workspace):
        if workspace.element[first] == workspace.element[second] == 6:
            groups = workspace.exocyclic(first), workspace.exocyclic(second)
            if all(groups) and not _alike(workspace, *groups):
                yield Candidate(
                    edit=partial(_swap, workspace, first, second),
                    how=partial(_describe_swap, workspace, first, second),
                    key=_symmetry_key(workspace, *sorted((first, second), key=lambda index: workspace.ranks[index])),
                    penalty=_apart(workspace, first, second),
                )


def build_substituents_on_another_ring(workspace: Workspace) -> Iterator[Candidate]:
    """Move a small substituent from one aromatic ring to another one that is not fused with it."""
    for home in workspace.aromatic_systems:
        for old in home:
            for group in workspace.exocyclic(old):
                if workspace.element[old] != 6 or not workspace.is_bridge(old, group):
                    continue
                if len(workspace.side(old, group)) > _LARGEST_MOVED_SUBSTITUENT:
                    continue
                for other in workspace.aromatic_systems:
                    if other == home or other[0] in workspace.side(old, group):
                        continue
                    for new in other:
                        if workspace.element[new] == 6 and workspace.hydrogens[new]:
                            yield Candidate(
                                edit=partial(_move, group, old, new),
                                how=partial(_describe_ring_change, workspace, group, old),
                                key=(workspace.ranks[old], workspace.ranks[group], workspace.ranks[new]),
                            )


def build_walked_ring_heteroatoms(workspace: Workspace) -> Iterator[Candidate]:
    """Walk nitrogen, oxygen, sulfur, … of a ring to another place of it: azines, azoles, saturated heterocycles."""
    for first, second in _pairs(workspace):
        elements = workspace.element[first], workspace.element[second]
        if elements[0] != elements[1]:
            # the heteroatom walks; of two heteroatoms, the heavier one
            walker, other = (first, second) if (elements[0] != 6 and elements[0] > elements[1]) else (second, first)
            if workspace.element[walker] == 6:
                walker, other = other, walker
            yield Candidate(
                edit=partial(_swap, workspace, walker, other),
                how=partial(_describe_heteroatom_walk, workspace, walker, other),
                key=_symmetry_key(workspace, walker, other),
                penalty=0.1 if workspace.exocyclic(walker) or workspace.exocyclic(other) else 0.0,
            )


def build_exchanged_ring_heteroatoms(workspace: Workspace) -> Iterator[Candidate]:
    """Walk a ring's heteroatom while the substituents stay in their places.

    N- and 4-benzylpiperidine, N- and 2-phenylpyrrole.
    """
    for first, second in _pairs(workspace, lone_substituents=True):
        elements = workspace.element[first], workspace.element[second]
        if (elements[0] == 6) == (elements[1] == 6) or not (workspace.exocyclic(first) or workspace.exocyclic(second)):
            continue
        walker, other = (first, second) if elements[1] == 6 else (second, first)
        if workspace.charge[walker] or workspace.charge[other]:
            continue
        yield Candidate(
            edit=partial(_exchange_elements, workspace, walker, other),
            how=partial(_describe_exchange, workspace, walker, other),
            key=_symmetry_key(workspace, walker, other),
        )


def build_azole_nitrogen_isomers(workspace: Workspace) -> Iterator[Candidate]:
    """Move an azole's N-substituent to another nitrogen of its ring.

    N1/N2 of pyrazoles, indazoles and tetrazoles, 1,4/1,5-triazoles, 4/5-substituted N-alkyl imidazoles.
    """
    for first, second in _pairs(workspace):
        if workspace.element[first] == workspace.element[second] == 7 and workspace.aromatic[first]:
            carries = [bool(workspace.exocyclic(index)) for index in (first, second)]
            if carries[0] != carries[1]:
                old, new = (first, second) if carries[0] else (second, first)
                if workspace.charge[old] == workspace.charge[new] == 0 and workspace.hydrogens[new] == 0:
                    yield Candidate(
                        edit=partial(_swap, workspace, old, new),
                        how=partial(_describe_azole, workspace, old, new),
                        key=_symmetry_key(workspace, old, new),
                    )


def build_refused_rings(workspace: Workspace) -> Iterator[Candidate]:
    """Fuse a ring onto the neighbouring bond of an aromatic ring.

    3,4- and 2,3-methylenedioxy, anthracene and phenanthrene.
    """
    for kept in range(workspace.n_atoms):
        if not _is_fusion_carbon(workspace, kept):
            continue
        for old in workspace.ring_neighbours[kept]:
            if not _is_fusion_carbon(workspace, old):
                continue
            for new in workspace.ring_neighbours[kept]:
                if new == old or workspace.element[new] != 6 or not workspace.hydrogens[new]:
                    continue
                if not workspace.aromatic[new] or not workspace.same_ring(old, new):
                    continue
                for end in workspace.ring_neighbours[old]:
                    if end != kept and not workspace.same_ring(end, new):
                        yield Candidate(
                            edit=partial(_move, end, old, new),
                            how=partial(_describe_refusion, workspace, end, old),
                            key=(workspace.ranks[kept], workspace.ranks[end], workspace.ranks[new]),
                        )


def _is_fusion_carbon(workspace: Workspace, index: int) -> bool:
    return workspace.element[index] == 6 and workspace.aromatic[index] and workspace.ring_degree[index] == 3


def _move(group: int, old: int, new: int, editable: Chem.RWMol) -> None:
    move_group(editable, group, old, new)


def _describe_ring_change(workspace: Workspace, group: int, old: int) -> str:
    return f"{workspace.group_name(old, group)} on another ring"


def _describe_refusion(workspace: Workspace, end: int, old: int) -> str:
    ring = min((ring for ring in workspace.rings if end in ring and old in ring), key=len)
    hetero = sorted({workspace.element_word(index) for index in ring if workspace.element[index] != 6})
    name = f"{len(ring)}-membered ring" + (f" with {' and '.join(hetero)}" if hetero else "")
    return f"{name} fused onto the neighbouring bond"


def _swap(workspace: Workspace, first: int, second: int, editable: Chem.RWMol) -> None:
    swap_ring_atoms(workspace, editable, first, second)


def _pairs(workspace: Workspace, lone_substituents: bool = False) -> Iterator[tuple[int, int]]:
    """Yield pairs of ring atoms with two ring bonds each, in one aromatic system or one other ring.

    Pairs that are alike by symmetry are left out, and rings with a single marked place unless `lone_substituents`: on
    those a swap changes nothing.
    """
    units = list(workspace.aromatic_systems)
    units += [ring for ring in workspace.rings if not all(workspace.aromatic[index] for index in ring)]
    seen = set()
    for unit in units:
        if not lone_substituents and not _has_two_marks(workspace, unit):
            continue
        movable = [index for index in unit if workspace.ring_degree[index] == 2]
        for first, second in combinations(sorted(movable), 2):
            if (first, second) in seen or workspace.ranks[first] == workspace.ranks[second]:
                continue
            if workspace.aromatic[first] != workspace.aromatic[second]:
                continue
            if len(unit) > _LARGEST_WHOLE_RING and not workspace.aromatic[first]:
                if workspace.distance[first][second] > 2:
                    continue
            seen.add((first, second))
            yield first, second


def _has_two_marks(workspace: Workspace, unit: tuple[int, ...]) -> bool:
    """Tell whether more than one place of a ring is marked: by element, substituent, fusion or multiple bond."""
    marked = [
        index
        for index in unit
        if workspace.element[index] != 6
        or workspace.degree[index] != 2
        or (not workspace.aromatic[index] and not workspace.is_sp3_carbon(index))
    ]
    return len(marked) > 1


def _symmetry_key(workspace: Workspace, first: int, second: int) -> tuple[int, int, int]:
    return workspace.ranks[first], workspace.ranks[second], workspace.distance[first][second]


def _apart(workspace: Workspace, first: int, second: int) -> float:
    """Penalise slightly what goes from one ring of a fused system into another."""
    return 0.0 if workspace.same_ring(first, second) else 0.05


def _alike(workspace: Workspace, groups: list[int], others: list[int]) -> bool:
    """Tell whether both places carry the same one-atom substituents."""
    kinds = [
        sorted((workspace.element[g], workspace.hydrogens[g], workspace.degree[g]) for g in side) for side in (groups, others)
    ]
    return kinds[0] == kinds[1] and all(degree == 1 for _, _, degree in kinds[0])


def _names(workspace: Workspace, index: int) -> str:
    return " and ".join(workspace.group_name(index, group) for group in workspace.exocyclic(index))


def _ring_of(workspace: Workspace, first: int, second: int) -> tuple[int, ...]:
    """Return the smallest ring with both atoms, or () when they lie in two rings of a fused system."""
    return min((ring for ring in workspace.rings if first in ring and second in ring), key=len, default=())


def _describe_walk(workspace: Workspace, old: int, new: int) -> str:
    moved = sum(len(workspace.side(old, group)) for group in workspace.exocyclic(old))
    if 2 * moved > workspace.n_atoms:
        name, verb = "ring", "joined to the rest at another place,"
    else:
        name, verb = _names(workspace, old), "walked"
    ring = _ring_of(workspace, old, new)
    hetero = [index for index in ring if workspace.element[index] != 6]
    if len(ring) == 6 and not hetero and workspace.aromatic[old]:
        others = [index for index in ring if index not in (old, new) and workspace.exocyclic(index)]
        others = [i for i in others if workspace.ring_degree[i] == 2] or others
        if others:
            # the most telling reference: a heteroatom on the ring, else the largest group
            anchor = min(
                others,
                key=lambda index: (
                    all(workspace.element[group] == 6 for group in workspace.exocyclic(index)),
                    -len(workspace.side(index, workspace.exocyclic(index)[0])),
                    index,
                ),
            )
            places = [_BENZENE_PLACES[workspace.distance[anchor][index]] for index in (old, new)]
            if places[0] != places[1]:
                return f"{name} {verb} from {places[0]} to {places[1]} of {_names(workspace, anchor)}"
    if hetero:
        anchor = min(hetero, key=lambda index: (abs(workspace.distance[index][old]), -workspace.element[index], index))
        before, after = workspace.distance[anchor][old], workspace.distance[anchor][new]
        if before != after:
            return (
                f"{name} {verb} from {before} to {after} {_bonds(after)} away from the ring's {workspace.element_word(anchor)}"
            )
    if not ring:
        return f"{name} {verb} {_places(workspace.distance[old][new])} away on the fused rings"
    return f"{name} {verb} {_places(workspace.distance[old][new])} around the ring"


def _describe_swap(workspace: Workspace, first: int, second: int) -> str:
    names = sorted((_names(workspace, first), _names(workspace, second)))
    return f"{names[0]} and {names[1]} swapped on the ring"


def _describe_heteroatom_walk(workspace: Workspace, walker: int, other: int) -> str:
    word = workspace.element_word(walker)
    distance = workspace.distance[walker][other]
    if workspace.element[other] != 6:
        return f"{word} and {workspace.element_word(other)} of the ring swapped"
    return f"ring {word} walked {_places(distance)}"


def _exchange_elements(workspace: Workspace, walker: int, other: int, editable: Chem.RWMol) -> None:
    for index, model in ((walker, other), (other, walker)):
        atom = editable.GetAtomWithIdx(index)
        atom.SetAtomicNum(workspace.element[model])
        # RDKit does not count hydrogens on aromatic nitrogen by itself
        pyrrole_like = workspace.aromatic[index] and workspace.element[model] in (7, 15) and not workspace.exocyclic(index)
        had_three = bool(workspace.exocyclic(model)) or workspace.hydrogens[model] > 0
        atom.SetNumExplicitHs(1 if pyrrole_like and had_three else 0)
    forget_centre(editable, walker, other)


def _describe_exchange(workspace: Workspace, walker: int, other: int) -> str:
    word = workspace.element_word(walker)
    if workspace.exocyclic(walker):
        return f"{_names(workspace, walker)} on carbon instead of the ring's {word}"
    return f"{_names(workspace, other)} on the ring's {word} instead of carbon"


def _describe_azole(workspace: Workspace, old: int, new: int) -> str:
    where = "the neighbouring" if workspace.distance[old][new] == 1 else "the other"
    return f"{_names(workspace, old)} on {where} nitrogen of the azole"


def _places(number: int) -> str:
    return "one place" if number == 1 else f"{number} places"


def _bonds(number: int) -> str:
    return "bond" if number == 1 else "bonds"
