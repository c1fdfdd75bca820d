"""Isomers by where something sits on a chain: groups moved along it, alkyls branched, multiple bonds walked."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

from rdkit import Chem
from rdkit.Chem import rdMolDescriptors

from shiftpred.structures.rivals.graph_edits import forget_centre, move_bond, move_group, set_bond
from shiftpred.structures.rivals.workspace import Candidate, Workspace

ALKYL_SKELETONS = {
    # bonds between the carbons of an alkyl group; carbon 0 hangs on the molecule
    "propyl": (3, ((0, 1), (1, 2))),
    "isopropyl": (3, ((0, 1), (0, 2))),
    "butyl": (4, ((0, 1), (1, 2), (2, 3))),
    "isobutyl": (4, ((0, 1), (1, 2), (1, 3))),
    "sec-butyl": (4, ((0, 1), (0, 2), (2, 3))),
    "tert-butyl": (4, ((0, 1), (0, 2), (0, 3))),
}
_RING_TO_CHAIN_ELEMENTS = frozenset({6, 7, 8, 9, 16, 17, 35, 53})
_LARGEST_SMALL_GROUP = 4
"""Heavy atoms of a group that moves between a ring and a carbon beside it."""
_FURTHEST_METHYL = 6
"""Bonds that a methyl may jump."""


def build_branched_alkyls(workspace: Workspace) -> Iterator[Candidate]:
    """Exchange propyl and isopropyl, and the four butyls, for one another."""
    for root in range(workspace.n_atoms):
        if not workspace.is_sp3_carbon(root):
            continue
        for anchor in workspace.neighbours[root]:
            if not workspace.is_bridge(anchor, root) or _is_open_chain_carbon(workspace, anchor):
                continue
            group = workspace.side(anchor, root)
            if len(group) not in (3, 4) or not all(
                workspace.is_sp3_carbon(index) and not workspace.ring_degree[index] for index in group
            ):
                continue
            name = workspace.group_name(anchor, root)
            for other, (size, skeleton) in ALKYL_SKELETONS.items():
                if size == len(group) and other != name:
                    yield Candidate(
                        edit=partial(_rebuild_alkyl, root, sorted(group - {root}), skeleton),
                        how=partial("{} instead of {}".format, other, name),
                        key=(workspace.ranks[anchor], workspace.ranks[root], other),
                    )


def build_groups_moved_along_chain(workspace: Workspace) -> Iterator[Candidate]:
    """Move a group from one sp3 carbon to another, one to three carbons further along."""
    for old in range(workspace.n_atoms):
        if not workspace.is_sp3_carbon(old):
            continue
        for group in workspace.neighbours[old]:
            if not workspace.is_bridge(old, group):
                continue
            moved = workspace.side(old, group)
            for new, steps in _along_chain(workspace, old, moved):
                if workspace.hydrogens[new] == 0 or workspace.same_ring(old, new):
                    continue
                yield Candidate(
                    edit=partial(_move, group, old, new),
                    how=partial(_describe_chain_move, workspace, group, old, new, steps),
                    key=(workspace.ranks[old], workspace.ranks[group], workspace.ranks[new]),
                    penalty=0.1 * (steps - 1) + (0.0 if len(moved) <= 3 else 0.05),
                )


def build_groups_between_ring_and_chain(workspace: Workspace) -> Iterator[Candidate]:
    """Move a small group from an aromatic ring onto an sp3 carbon beside it, and the reverse."""
    for system in workspace.aromatic_systems:
        carbons = [index for index in system if workspace.element[index] == 6]
        benzylic = [(ipso, other) for ipso in carbons for other in workspace.neighbours[ipso] if workspace.is_sp3_carbon(other)]
        for ipso, side_chain in benzylic:
            for place in carbons:
                if place == ipso or workspace.distance[place][ipso] > 3:
                    continue
                for group in workspace.exocyclic(place):
                    if group != side_chain and workspace.hydrogens[side_chain] and _is_small(workspace, place, group):
                        yield _between(workspace, group, place, side_chain, "onto the side chain")
                if workspace.hydrogens[place]:
                    for group in workspace.neighbours[side_chain]:
                        if group != ipso and _is_small(workspace, side_chain, group):
                            yield _between(workspace, group, side_chain, place, "from the side chain onto the ring")


def build_groups_across_double_bond(workspace: Workspace) -> Iterator[Candidate]:
    """Move a group to the other carbon of its C=C: 1,1- and 1,2-diphenylethene."""
    for old in range(workspace.n_atoms):
        if workspace.element[old] != 6 or workspace.aromatic[old]:
            continue
        for new in workspace.neighbours[old]:
            if workspace.element[new] != 6 or not workspace.hydrogens[new]:
                continue
            if workspace.bond_type(old, new) != Chem.BondType.DOUBLE:
                continue
            for group in workspace.neighbours[old]:
                if workspace.is_bridge(old, group):
                    yield Candidate(
                        edit=partial(_move, group, old, new),
                        how=partial(_describe_double_bond_move, workspace, group, old),
                        key=(workspace.ranks[old], workspace.ranks[group], workspace.ranks[new]),
                    )


def build_walked_multiple_bonds(workspace: Workspace) -> Iterator[Candidate]:
    """Walk a C=C or C≡C one carbon along; never into a bridgehead, a three- or four-membered ring."""
    bridgeheads: list[int] = []
    rdMolDescriptors.CalcNumBridgeheadAtoms(workspace.mol, atoms=bridgeheads)
    for middle in range(workspace.n_atoms):
        if workspace.element[middle] != 6 or workspace.aromatic[middle] or middle in bridgeheads:
            continue
        for left in workspace.neighbours[middle]:
            bond_type = workspace.bond_type(left, middle)
            if bond_type not in (Chem.BondType.DOUBLE, Chem.BondType.TRIPLE) or workspace.element[left] != 6:
                continue
            needed = 1 if bond_type == Chem.BondType.DOUBLE else 2
            for right in workspace.neighbours[middle]:
                if not workspace.is_sp3_carbon(right) or workspace.hydrogens[right] < needed or right in bridgeheads:
                    continue
                if any(len(ring) <= 4 and {left, middle, right} & set(ring) for ring in workspace.rings):
                    continue
                if needed == 2 and workspace.ring_degree[right]:
                    continue
                yield Candidate(
                    edit=partial(_walk_bond, left, middle, right, bond_type),
                    how=partial("{} bond walked one carbon along".format, "double" if needed == 1 else "triple"),
                    key=(workspace.ranks[left], workspace.ranks[middle], workspace.ranks[right]),
                )


def build_moved_methylenes(workspace: Workspace) -> Iterator[Candidate]:
    """Take a CH2 out of one side of a functional group and put it into the other: ethyl acetate, methyl propanoate."""
    for carbon in range(workspace.n_atoms):
        if not _is_plain_methylene(workspace, carbon):
            continue
        first, second = workspace.neighbours[carbon]
        # both sides of the group that the CH2 hangs on; a bond within four bonds of it
        for left in range(workspace.n_atoms):
            if left == carbon or workspace.distance[carbon][left] > 4:
                continue
            for right in workspace.neighbours[left]:
                if right < left or right == carbon or not workspace.is_bridge(left, right):
                    continue
                if not (_is_function(workspace, left) or _is_function(workspace, right)):
                    continue
                yield Candidate(
                    edit=partial(_move_methylene, carbon, first, second, left, right),
                    how=lambda: "a CH2 taken from one side of a functional group to another",
                    key=(workspace.ranks[carbon], *sorted((workspace.ranks[left], workspace.ranks[right]))),
                    penalty=0.05 * workspace.distance[carbon][left],
                )


def build_benzyl_tolyl_isomers(workspace: Workspace) -> Iterator[Candidate]:
    """Exchange Ar-CH2-X for CH3-Ar-X and the reverse: benzyl and tolyl."""
    for system in workspace.aromatic_systems:
        places = [index for index in system if workspace.element[index] == 6]
        for ipso in places:
            for other in workspace.exocyclic(ipso):
                if not workspace.is_bridge(ipso, other):
                    continue
                if _is_plain_methylene(workspace, other):
                    beyond = next(index for index in workspace.neighbours[other] if index != ipso)
                    for place in places:
                        if workspace.hydrogens[place] and workspace.distance[ipso][place] <= 3:
                            yield Candidate(
                                edit=partial(_benzyl_to_tolyl, ipso, other, beyond, place),
                                how=lambda: "CH2 between ring and group taken out, methyl on the ring instead",
                                key=("tolyl", workspace.ranks[other], workspace.ranks[place]),
                                penalty=0.02 * (3 - workspace.distance[ipso][place]),
                            )
                for place in places:
                    for methyl in workspace.exocyclic(place):
                        if place != ipso and workspace.is_sp3_carbon(methyl) and workspace.degree[methyl] == 1:
                            yield Candidate(
                                edit=partial(_tolyl_to_benzyl, ipso, other, place, methyl),
                                how=lambda: "methyl taken from the ring, CH2 between ring and group instead",
                                key=("benzyl", workspace.ranks[other], workspace.ranks[methyl]),
                            )


def build_moved_methyls(workspace: Workspace) -> Iterator[Candidate]:
    """Move a methyl from carbon, nitrogen, oxygen or sulfur to another carbon up to six bonds away."""
    for methyl in range(workspace.n_atoms):
        if workspace.degree[methyl] != 1 or not workspace.is_sp3_carbon(methyl):
            continue
        old = workspace.neighbours[methyl][0]
        if workspace.charge[old] or workspace.element[old] not in (6, 7, 8, 16):
            continue
        for new in range(workspace.n_atoms):
            distance = workspace.distance[old][new]
            if not 0 < distance <= _FURTHEST_METHYL or new == methyl:
                continue
            if workspace.element[new] == 6 and workspace.hydrogens[new] and not workspace.charge[new]:
                yield Candidate(
                    edit=partial(_move, methyl, old, new),
                    how=partial(_describe_methyl_move, workspace, old, new),
                    key=(workspace.ranks[methyl], workspace.ranks[new]),
                    penalty=0.02 * distance + (0.0 if workspace.element[old] == 6 else 0.1),
                )


def _move(group: int, old: int, new: int, editable: Chem.RWMol) -> None:
    move_group(editable, group, old, new)


def _is_open_chain_carbon(workspace: Workspace, index: int) -> bool:
    return workspace.is_sp3_carbon(index) and not workspace.ring_degree[index]


def _is_function(workspace: Workspace, index: int) -> bool:
    """Tell whether the atom is a heteroatom or a carbon with a multiple bond, not in a ring."""
    return not workspace.ring_degree[index] and not workspace.is_sp3_carbon(index)


def _is_small(workspace: Workspace, cut: int, group: int) -> bool:
    return (
        workspace.is_bridge(cut, group)
        and workspace.element[group] in _RING_TO_CHAIN_ELEMENTS
        and workspace.charge[group] == 0
        and len(workspace.side(cut, group)) <= _LARGEST_SMALL_GROUP
    )


def _along_chain(workspace: Workspace, old: int, moved: frozenset[int]) -> list[tuple[int, int]]:
    """Return the sp3 carbons up to three steps from `old` over sp3 carbons, with the number of steps."""
    steps = {old: 0}
    waiting = [old]
    while waiting:
        here = waiting.pop(0)
        if steps[here] == 3:
            continue
        for other in workspace.neighbours[here]:
            if other not in steps and other not in moved and workspace.is_sp3_carbon(other):
                steps[other] = steps[here] + 1
                waiting.append(other)
    return sorted((index, step) for index, step in steps.items() if step)


def _rebuild_alkyl(root: int, others: list[int], skeleton: tuple[tuple[int, int], ...], editable: Chem.RWMol) -> None:
    carbons = [root, *others]
    for position, first in enumerate(carbons):
        for second in carbons[position + 1 :]:
            if editable.GetBondBetweenAtoms(first, second) is not None:
                editable.RemoveBond(first, second)
    for first, second in skeleton:
        editable.AddBond(carbons[first], carbons[second], Chem.BondType.SINGLE)
    forget_centre(editable, *carbons)


def _between(workspace: Workspace, group: int, old: int, new: int, where: str) -> Candidate:
    return Candidate(
        edit=partial(_move, group, old, new),
        how=lambda: (
            f"{workspace.group_name(old, group)} moved {where}"
            if where.startswith("from")
            else f"{workspace.group_name(old, group)} moved from the ring {where}"
        ),
        key=(workspace.ranks[group], workspace.ranks[old], workspace.ranks[new]),
    )


def _walk_bond(left: int, middle: int, right: int, bond_type: Chem.BondType, editable: Chem.RWMol) -> None:
    set_bond(editable, left, middle, Chem.BondType.SINGLE)
    set_bond(editable, middle, right, bond_type)
    forget_centre(editable, left, middle, right)


def _is_plain_methylene(workspace: Workspace, index: int) -> bool:
    """Tell whether the atom is a CH2 between two single bonds outside all rings."""
    return (
        workspace.is_sp3_carbon(index)
        and workspace.degree[index] == 2
        and all(workspace.is_bridge(index, other) for other in workspace.neighbours[index])
    )


def _benzyl_to_tolyl(ipso: int, methylene: int, beyond: int, place: int, editable: Chem.RWMol) -> None:
    move_bond(editable, beyond, methylene, ipso)
    editable.RemoveBond(ipso, methylene)
    editable.AddBond(place, methylene, Chem.BondType.SINGLE)


def _tolyl_to_benzyl(ipso: int, group: int, place: int, methyl: int, editable: Chem.RWMol) -> None:
    move_bond(editable, group, ipso, methyl)
    editable.RemoveBond(place, methyl)
    editable.AddBond(ipso, methyl, Chem.BondType.SINGLE)


def _move_methylene(carbon: int, first: int, second: int, left: int, right: int, editable: Chem.RWMol) -> None:
    move_bond(editable, first, carbon, second)
    # the bond first-second now exists; `second` still hangs on the carbon
    editable.RemoveBond(carbon, second)
    editable.RemoveBond(left, right)
    editable.AddBond(left, carbon, Chem.BondType.SINGLE)
    editable.AddBond(carbon, right, Chem.BondType.SINGLE)
    forget_centre(editable, first, second, left, right)


def _describe_double_bond_move(workspace: Workspace, group: int, old: int) -> str:
    return f"{workspace.group_name(old, group)} on the other carbon of the double bond"


def _describe_chain_move(workspace: Workspace, group: int, old: int, new: int, steps: int) -> str:
    name = workspace.group_name(old, group)
    return f"{name} moved {'one carbon' if steps == 1 else f'{steps} carbons'} along the chain"


def _describe_methyl_move(workspace: Workspace, old: int, new: int) -> str:
    before, after = (
        f"aromatic {workspace.element_word(index)}" if workspace.aromatic[index] else workspace.element_word(index)
        for index in (old, new)
    )
    return f"methyl moved to another {after}" if before == after else f"methyl moved from {before} to {after}"
