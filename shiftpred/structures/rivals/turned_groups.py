"""Isomers by turning an unsymmetrical link round: esters, amides, sulfonamides, carbamates, ethers, ketones, enones, …

``A-l1-…-ln-B`` becomes ``B-l1-…-ln-A``. An end may be a hydrogen: an aldehyde turned gives a methyl ketone, an anisole
a benzyl alcohol.
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import lru_cache, partial

from rdkit import Chem

from shiftpred.structures.rivals.graph_edits import forget_centre, move_bond, remember_geometry, restore_geometry
from shiftpred.structures.rivals.workspace import Candidate, Workspace

LINKS = (
    # name, SMARTS, first atom, last atom of the link within the SMARTS, penalty (own choice of the order, no source)
    ("ester", "[CX3](=O)[OX2]", 0, 2, 0.0),
    ("thioester", "[CX3](=O)[SX2]", 0, 2, 0.0),
    ("amide", "[CX3](=[O,S])[NX3]", 0, 2, 0.0),
    ("sulfonamide", "[SX4](=O)(=O)[NX3]", 0, 3, 0.0),
    ("sulfonate", "[SX4](=O)(=O)[OX2]", 0, 3, 0.0),
    ("carbamate", "[OX2][CX3](=O)[NX3]", 0, 3, 0.0),
    ("ketone", "[CX3](=O)[CX4;H2,H3]", 0, 2, 0.1),
    ("enone", "[CX3](=O)[CX3;H1]=[CX3;H1,H2]", 0, 3, 0.0),
    ("ester with its CH2", "[CX3](=O)[OX2][CX4;H2]", 0, 3, 0.1),
    ("amide with its CH2", "[CX3](=O)[NX3;H1][CX4;H2]", 0, 3, 0.1),
    ("ether", "[OX2][CX4;H2,H3]", 0, 1, 0.1),
    ("thioether", "[SX2][CX4;H2,H3]", 0, 1, 0.1),
    ("amine", "[NX3;+0;!$(N-C=[O,S,N]);!$(N-S=O)][CX4;H2,H3]", 0, 1, 0.1),
    ("imine", "[CX3;H1]=[NX2]", 0, 1, 0.0),
)
_TURNED_ENDS = {
    # what turning means where one end is a hydrogen: (link, hydrogen on the first end, hydrogen on the last end)
    ("ester", False, True): "formate ester instead of the carboxylic acid",
    ("ester", True, False): "carboxylic acid instead of the formate ester",
    ("amide", False, True): "N-formyl amine instead of the carboxamide",
    ("amide", True, False): "carboxamide instead of the N-formyl amine",
    ("ketone", False, True): "aldehyde instead of the methyl ketone",
    ("ketone", True, False): "methyl ketone instead of the aldehyde",
    ("ether", False, True): "CH2-OH instead of O-CH3",
    ("ether", True, False): "O-CH3 instead of CH2-OH",
    ("thioether", False, True): "CH2-SH instead of S-CH3",
    ("thioether", True, False): "S-CH3 instead of CH2-SH",
    ("amine", False, True): "aminomethyl (CH2-N) instead of N-CH3",
    ("amine", True, False): "N-CH3 instead of aminomethyl (CH2-N)",
}


def build_turned_groups(workspace: Workspace) -> Iterator[Candidate]:
    """Turn each unsymmetrical link round, wherever both its ends hang on bonds outside all rings."""
    for name, pattern, begin, end, penalty in _compiled_links():
        for match in workspace.mol.GetSubstructMatches(pattern, maxMatches=200):
            first, last = match[begin], match[end]
            if any(workspace.ring_degree[index] for index in match):
                continue
            inside = set(match)
            for left in _ends(workspace, first, inside):
                for right in _ends(workspace, last, inside):
                    if left is None and right is None:
                        continue
                    if left is not None and right is not None and workspace.ranks[left] == workspace.ranks[right]:
                        continue
                    yield Candidate(
                        edit=partial(_turn, first, last, left, right),
                        how=partial(_describe_turn, workspace, name, first, last, left, right),
                        key=(
                            name,
                            workspace.ranks[first],
                            workspace.ranks[last],
                            -1 if left is None else workspace.ranks[left],
                            -1 if right is None else workspace.ranks[right],
                        ),
                        penalty=penalty + (0.1 if left is None or right is None else 0.0),
                    )


@lru_cache(maxsize=1)
def _compiled_links() -> tuple[tuple[str, Chem.Mol, int, int, float], ...]:
    return tuple((name, Chem.MolFromSmarts(smarts), begin, end, penalty) for name, smarts, begin, end, penalty in LINKS)


def _ends(workspace: Workspace, terminal: int, inside: set[int]) -> list[int | None]:
    """Return what hangs on one end of a link: heavy atoms, and None for a hydrogen."""
    ends: list[int | None] = [
        other for other in workspace.neighbours[terminal] if other not in inside and workspace.is_bridge(terminal, other)
    ]
    if workspace.hydrogens[terminal]:
        ends.append(None)
    return ends


def _turn(first: int, last: int, left: int | None, right: int | None, editable: Chem.RWMol) -> None:
    geometry = remember_geometry(editable.GetAtomWithIdx(first), editable.GetAtomWithIdx(last))
    if left is not None:
        move_bond(editable, left, first, last)
    if right is not None:
        move_bond(editable, right, last, first)
    forget_centre(editable, first, last)
    if left is not None and right is not None:
        restore_geometry(editable, geometry, {left: right, right: left})


def _describe_turn(workspace: Workspace, name: str, first: int, last: int, left: int | None, right: int | None) -> str:
    if (name, left is None, right is None) in _TURNED_ENDS:
        return _TURNED_ENDS[name, left is None, right is None]
    if left is None:
        return f"{name} turned round, {workspace.group_name(last, right)} on the other end"
    if right is None:
        return f"{name} turned round, {workspace.group_name(first, left)} on the other end"
    names = sorted((workspace.group_name(first, left), workspace.group_name(last, right)))
    return f"{name} turned round: {names[0]} and {names[1]} change ends"
