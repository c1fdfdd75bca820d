"""Isomers by which heteroatom carries a carbon group: N against O, one oxygen or nitrogen against another."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

from rdkit import Chem

from shiftpred.structures.rivals.graph_edits import forget_centre, move_bond, move_group, set_bond
from shiftpred.structures.rivals.workspace import Candidate, Workspace

_BEARERS = frozenset({7, 8, 16})


def build_lactam_lactim_alkyls(workspace: Workspace) -> Iterator[Candidate]:
    """Exchange C(-O-R)=N for C(=O)-N(R) and the reverse, also across a conjugated ring.

    2-Methoxypyridine and N-methyl-2-pyridone, 4-methoxyquinoline and N-methyl-4-quinolone.
    """
    for carbon in range(workspace.n_atoms):
        if workspace.element[carbon] != 6:
            continue
        for chalcogen in workspace.neighbours[carbon]:
            if workspace.element[chalcogen] not in (8, 16) or workspace.charge[chalcogen]:
                continue
            if workspace.is_bridge(carbon, chalcogen) and workspace.degree[chalcogen] == 2:
                yield from _ether_to_amide(workspace, carbon, chalcogen)
            elif workspace.bond_type(carbon, chalcogen) == Chem.BondType.DOUBLE and workspace.aromatic[carbon]:
                yield from _amide_to_ether(workspace, carbon, chalcogen)


def build_moved_heteroatom_groups(workspace: Workspace) -> Iterator[Candidate]:
    """Move an alkyl, acyl or aryl group from one heteroatom to another one that has a hydrogen."""
    bearers = [
        index for index in range(workspace.n_atoms) if workspace.element[index] in _BEARERS and workspace.charge[index] == 0
    ]
    for old in bearers:
        for group in workspace.neighbours[old]:
            if workspace.element[group] != 6 or not workspace.is_bridge(old, group):
                continue
            if workspace.degree[old] == 1 or (workspace.element[old] != 7 and workspace.degree[old] != 2):
                continue
            moved = workspace.side(old, group)
            if len(moved) > workspace.n_atoms // 2:
                continue  # the smaller part moves: from the other end this is the same edit
            for new in bearers:
                if new == old or new in moved or workspace.hydrogens[new] == 0:
                    continue
                yield Candidate(
                    edit=partial(_move, group, old, new),
                    how=partial(_describe_move, workspace, group, old, new),
                    key=(workspace.ranks[old], workspace.ranks[group], workspace.ranks[new]),
                    penalty=(0.0 if len(moved) <= 2 else 0.1) + (0.15 if workspace.aromatic[group] else 0.0),
                )


def _move(group: int, old: int, new: int, editable: Chem.RWMol) -> None:
    move_group(editable, group, old, new)


def _describe_move(workspace: Workspace, group: int, old: int, new: int) -> str:
    name = workspace.group_name(old, group)
    if workspace.element[old] == workspace.element[new]:
        return f"{name} on another {workspace.element_word(new)}"
    return f"{name} on {workspace.element_word(new)} instead of {workspace.element_word(old)}"


def _ether_to_amide(workspace: Workspace, carbon: int, chalcogen: int) -> Iterator[Candidate]:
    group = next(other for other in workspace.neighbours[chalcogen] if other != carbon)
    if not workspace.is_bridge(chalcogen, group) or not workspace.is_sp3_carbon(group):
        return
    if workspace.aromatic[carbon]:
        system = next(system for system in workspace.aromatic_systems if carbon in system)
        nitrogens = [
            index
            for index in system
            if workspace.element[index] == 7 and workspace.degree[index] == 2 and workspace.hydrogens[index] == 0
        ]
    else:
        nitrogens = [
            index
            for index in workspace.neighbours[carbon]
            if workspace.element[index] == 7
            and workspace.bond_type(carbon, index) == Chem.BondType.DOUBLE
            and workspace.charge[index] == 0
        ]
    for nitrogen in nitrogens:
        yield Candidate(
            edit=partial(_make_amide, workspace, carbon, chalcogen, group, nitrogen),
            how=partial(_describe_lactam, workspace, chalcogen, group, chalcogen, nitrogen),
            key=(workspace.ranks[carbon], workspace.ranks[group], workspace.ranks[nitrogen]),
        )


def _make_amide(workspace: Workspace, carbon: int, chalcogen: int, group: int, nitrogen: int, editable: Chem.RWMol) -> None:
    move_bond(editable, group, chalcogen, nitrogen)
    set_bond(editable, carbon, chalcogen, Chem.BondType.DOUBLE)
    if not workspace.aromatic[carbon]:
        set_bond(editable, carbon, nitrogen, Chem.BondType.SINGLE)


def _amide_to_ether(workspace: Workspace, carbon: int, chalcogen: int) -> Iterator[Candidate]:
    system = next(system for system in workspace.aromatic_systems if carbon in system)
    for nitrogen in system:
        if workspace.element[nitrogen] != 7 or workspace.charge[nitrogen]:
            continue
        for group in workspace.exocyclic(nitrogen):
            if workspace.is_sp3_carbon(group):
                yield Candidate(
                    edit=partial(_make_ether, carbon, chalcogen, group, nitrogen),
                    how=partial(_describe_lactam, workspace, nitrogen, group, nitrogen, chalcogen),
                    key=(workspace.ranks[carbon], workspace.ranks[group], workspace.ranks[nitrogen]),
                )


def _make_ether(carbon: int, chalcogen: int, group: int, nitrogen: int, editable: Chem.RWMol) -> None:
    move_bond(editable, group, nitrogen, chalcogen)
    set_bond(editable, carbon, chalcogen, Chem.BondType.SINGLE)
    forget_centre(editable, nitrogen)


def _describe_lactam(workspace: Workspace, cut: int, group: int, old: int, new: int) -> str:
    words = workspace.element_word(new), workspace.element_word(old)
    return f"{workspace.group_name(cut, group)} on {words[0]} instead of {words[1]}"
