"""All moves, in the order in which they are tried."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

from shiftpred.structures.rivals import alkylation_sites, chains, reactions, ring_walks, stereo, turned_groups
from shiftpred.structures.rivals.workspace import Candidate, Workspace


@dataclass(frozen=True)
class Move:
    """One way to get from a structure to its rivals."""

    build: Callable[[Workspace], Iterator[Candidate]]
    kind: str
    """'isomer', 'stereoisomer' or 'reaction', as in `shiftpred.records.Rival`."""
    weight: float
    """How unusual this confusion is. Below 0 for what chemistry mixes up although the environments differ much (O- and
    N-alkylation). Our own order of common practice, no source."""
    crowding: float
    """Added for each rival of this move that is already on the list, so that kinds mix."""

    @property
    def name(self) -> str:
        return self.build.__name__.removeprefix("build_")


MOVES = (
    Move(alkylation_sites.build_lactam_lactim_alkyls, "isomer", -0.2, 0.15),
    Move(alkylation_sites.build_moved_heteroatom_groups, "isomer", -0.05, 0.12),
    Move(ring_walks.build_azole_nitrogen_isomers, "isomer", -0.1, 0.10),
    Move(ring_walks.build_walked_substituents, "isomer", 0.0, 0.06),
    Move(ring_walks.build_swapped_substituents, "isomer", 0.1, 0.10),
    Move(ring_walks.build_substituents_on_another_ring, "isomer", 0.1, 0.12),
    Move(ring_walks.build_walked_ring_heteroatoms, "isomer", 0.15, 0.10),
    Move(ring_walks.build_exchanged_ring_heteroatoms, "isomer", 0.1, 0.12),
    Move(ring_walks.build_refused_rings, "isomer", 0.1, 0.12),
    Move(turned_groups.build_turned_groups, "isomer", 0.0, 0.12),
    Move(chains.build_branched_alkyls, "isomer", 0.1, 0.10),
    Move(chains.build_groups_moved_along_chain, "isomer", 0.15, 0.10),
    Move(chains.build_groups_across_double_bond, "isomer", 0.15, 0.12),
    Move(chains.build_walked_multiple_bonds, "isomer", 0.2, 0.12),
    Move(chains.build_groups_between_ring_and_chain, "isomer", 0.25, 0.12),
    Move(chains.build_moved_methylenes, "isomer", 0.25, 0.12),
    Move(chains.build_benzyl_tolyl_isomers, "isomer", 0.25, 0.12),
    Move(chains.build_moved_methyls, "isomer", 0.3, 0.10),
    Move(stereo.build_inverted_centres, "stereoisomer", 0.2, 0.12),
    Move(stereo.build_turned_double_bonds, "stereoisomer", 0.15, 0.12),
    Move(reactions.build_reaction_neighbours, "reaction", 0.15, 0.10),
)

FURTHER_REACTIONS = Move(reactions.build_further_neighbours, "reaction", 0.3, 0.05)
"""Tried last, where everything else gives fewer rivals than wanted and the mass is not confirmed."""
