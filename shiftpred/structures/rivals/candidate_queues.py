"""Candidates built, measured against the proposal and queued, the nearest first."""

from __future__ import annotations

import heapq
from collections import Counter
from collections.abc import Iterable, Sequence

from rdkit import Chem, DataStructs
from rdkit.Chem import rdFingerprintGenerator

from shiftpred.structures.rivals.admission import Examined, Gate
from shiftpred.structures.rivals.moves import Move
from shiftpred.structures.rivals.workspace import Candidate, Workspace

_ATOM_BUDGET = 1500
"""Heavy atoms that one move may build in all: 60 candidates of 25 atoms; keeps large molecules quick."""
_CANDIDATES_PER_MOVE = (8, 60)
"""Fewest and most."""
UNKNOWN_ENVIRONMENT_WEIGHT = 2.0
"""Added to the distance for the share of atoms in an environment (two bonds) that nobody has measured; own choice."""


class CandidateQueues:
    """One queue a move; `pop` gives the nearest candidate over all of them.

    Parameters
    ----------
    workspace : Workspace
        The molecule that is edited.
    moves : sequence of Move
    proposal : rdkit.Chem.Mol
        What distances are measured from; in a second round it is not the molecule that is edited.
    gate : Gate
    """

    def __init__(self, workspace: Workspace, moves: Sequence[Move], proposal: Chem.Mol, gate: Gate):
        self._gate = gate
        self._moves = {move.name: move for move in moves}
        self._taken_of: Counter[str] = Counter()
        # an entry: (score, SMILES, candidate, examined or None); SMILES differ within a queue, so no more is compared
        self._queues = _build_queues(workspace, moves, proposal)

    def pop(self) -> tuple[float, Examined, Move, Candidate] | None:
        """Return the nearest rival that the gate admits, with its score; None: nothing is left."""
        while True:
            heads = [
                (queue[0][0] + self._moves[name].crowding * self._taken_of[name], queue[0][1], name)
                for name, queue in self._queues.items()
                if queue
            ]
            if not heads:
                return None
            name = min(heads)[2]
            score, smiles, candidate, examined = heapq.heappop(self._queues[name])
            if examined is None:
                # examined only now, when it is nearest; its share of unknown environments may put it further back
                examined = self._gate.examine(smiles, self._moves[name].kind)
                if examined is not None:
                    score += UNKNOWN_ENVIRONMENT_WEIGHT * examined.unknown_share
                    heapq.heappush(self._queues[name], (score, smiles, candidate, examined))
            elif self._gate.admit(examined):
                self._taken_of[name] += 1
                return score, examined, self._moves[name], candidate


def _build_queues(workspace: Workspace, moves: Sequence[Move], proposal: Chem.Mol) -> dict[str, list[tuple]]:
    environments = rdFingerprintGenerator.GetMorganGenerator(radius=2)
    own = environments.GetSparseCountFingerprint(proposal)
    fewest, most = _CANDIDATES_PER_MOVE
    wanted = min(most, max(fewest, _ATOM_BUDGET // workspace.n_atoms))
    distances: dict[str, float] = {}
    queues = {}
    for move in moves:
        nearest: dict[str, tuple] = {}
        for candidate in _thin(_without_symmetry_copies(move.build(workspace)), wanted):
            mol = build_structure(workspace, candidate)
            if mol is None:
                continue
            smiles = Chem.MolToSmiles(mol)
            if smiles not in distances:
                rival = environments.GetSparseCountFingerprint(mol)
                distances[smiles] = 1.0 - DataStructs.DiceSimilarity(own, rival)
            score = move.weight + candidate.penalty + distances[smiles]
            if smiles not in nearest or score < nearest[smiles][0]:
                nearest[smiles] = (score, smiles, candidate, None)
        queues[move.name] = list(nearest.values())
        heapq.heapify(queues[move.name])
    return queues


def _without_symmetry_copies(candidates: Iterable[Candidate]) -> list[Candidate]:
    seen = set()
    different = []
    for candidate in candidates:
        if candidate.key is None or candidate.key not in seen:
            seen.add(candidate.key)
            different.append(candidate)
    return different


def _thin(candidates: list[Candidate], wanted: int) -> list[Candidate]:
    """Keep at most `wanted`: the least penalised ones, evenly spread over the molecule among equals."""
    if len(candidates) <= wanted:
        return candidates
    kept: list[Candidate] = []
    for penalty in sorted({candidate.penalty for candidate in candidates}):
        equals = [candidate for candidate in candidates if candidate.penalty == penalty]
        room = wanted - len(kept)
        if len(equals) > room:
            return kept + [equals[index * len(equals) // room] for index in range(room)]
        kept += equals
    return kept


def build_structure(workspace: Workspace, candidate: Candidate) -> Chem.Mol | None:
    """Carry out the edit; None where the result has no valid valences."""
    editable = Chem.RWMol(workspace.mol)
    try:
        edited = candidate.edit(editable)
        mol = editable if edited is None else edited
        Chem.SanitizeMol(mol)
        if workspace.has_stereo:
            # cleaning reads geometry from the directions of the neighbouring bonds only, so they are drawn afresh
            Chem.SetDoubleBondNeighborDirections(mol)
            Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
    except (ValueError, RuntimeError):
        # RDKit refuses impossible valences, aromatic rings without a Kekulé form, and bonds that exist already
        return None
    return mol
