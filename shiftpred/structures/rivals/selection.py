"""From a proposal to its list of rivals: build candidates, judge them, order them."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass

from rdkit import Chem, DataStructs, rdBase
from rdkit.Chem import rdFingerprintGenerator, rdMolDescriptors

from shiftpred.errors import SettingError, StructureError, quote
from shiftpred.records import Rival, Structure
from shiftpred.structures.rivals.graph_edits import is_centre, mirror
from shiftpred.structures.rivals.moves import MOVES, Move
from shiftpred.structures.rivals.plausibility import PlausibilityFilter
from shiftpred.structures.rivals.tautomers import build_tautomers, compute_tautomer_key
from shiftpred.structures.rivals.workspace import Candidate, Workspace

LARGEST_LIMIT = 1000
_ATOM_BUDGET = 1500
"""Heavy atoms that one move may build in all: 60 candidates of 25 atoms; keeps large molecules quick."""
_CANDIDATES_PER_MOVE = (8, 60)
"""Fewest and most."""


@dataclass(frozen=True)
class _Ranked:
    """A built candidate in the queue of its move."""

    score: float
    smiles: str
    candidate: Candidate


def build_rivals(
    structure: Structure | Chem.Mol,
    limit: int = 9,
    mass_confirmed: bool = False,
    expect: Iterable[str] = (),
    include_tautomers: bool = False,
) -> tuple[Rival, ...]:
    """Return what could be in the tube instead of a proposed structure, the nearest first.

    Isomers (substituents walked or swapped on a ring, ring heteroatoms walked, groups turned round, N against O, azole
    nitrogens, chains branched, multiple bonds walked), stereoisomers that NMR can see, and, unless the mass is confirmed, the
    neighbours by reaction. In a mixture or salt the component with the most carbons is varied and the others stay.

    Parameters
    ----------
    structure : Structure or rdkit.Chem.Mol
        The proposal.
    limit : int, default 9
        Most rivals, those named by `expect` included.
    mass_confirmed : bool, default False
        True: only isomers, and what `expect` names.
    expect : iterable of str, default ()
        SMILES of what else may be in the tube; they come first, in the order given, as kind 'candidate'.
    include_tautomers : bool, default False
        True: tautomers of the proposal, up to `limit` more, follow at the end. Fast tautomers are the same compound, so
        they are never rivals.

    Returns
    -------
    tuple of Rival
        Without the proposal, its enantiomer and its fast tautomers, and without duplicates; canonical isomeric SMILES. The
        same input gives the same list whatever the order of its atoms.

    Raises
    ------
    StructureError
        If the structure has no atoms, or a SMILES in `expect` cannot be read.
    SettingError
        If `limit` is not a whole number from 0 to 1000.

    Notes
    -----
    Nearness is a sum, small for near:

    - the weight of the move (0 for a substituent walked around a ring or an alkyl on N instead of O, up to 0.3 for a methyl
      that jumps), and the candidate's own penalty;
    - the share of atom environments out to two bonds that are not common to both structures (one minus the Dice coefficient
      of the environment counts), so an isomer with the same multiset of environments is the nearest;
    - for each rival of the same move that is already on the list a little more (0.06 to 0.15), so that the first nine hold
      the most plausible confusions of different kinds.

    The rival with the smallest sum is taken, again and again. Ties are broken by SMILES. A rival must have valid valences,
    only atom neighbourhoods (radius 1, hydrogens counted) that occur in at least three compounds of the open shift data or in
    the proposal itself, and no functional group that would not survive in a tube (peroxide, hemiaminal, enol, …) beyond
    those that the proposal has.

    Examples
    --------
    >>> from rdkit import Chem
    >>> build_rivals(Chem.MolFromSmiles("COc1ccccn1"), limit=1)[0].smiles
    'Cn1ccccc1=O'
    """
    if isinstance(limit, bool) or not isinstance(limit, int) or not 0 <= limit <= LARGEST_LIMIT:
        raise SettingError(
            "argument 'limit'", quote(limit), f"a whole number from 0 to {LARGEST_LIMIT}", "limit=9, the default"
        )
    mol = structure.mol if isinstance(structure, Structure) else structure
    if not isinstance(mol, Chem.Mol):
        raise StructureError(
            "argument 'structure'", quote(mol), "a Structure or an RDKit molecule", "read it first, from a SMILES say"
        )
    if mol.GetNumAtoms() == 0:
        raise StructureError("argument 'structure'", "no atoms", "a structure with atoms", "check the input")
    with rdBase.BlockLogs():
        proposal = _canonical(mol)
        taken = {_nmr_key(proposal)}
        rivals = _expected_rivals(expect, taken)[:limit]
        main, others = _split_components(proposal)
        rivals += _select(main, others, limit - len(rivals), mass_confirmed, taken)
        if include_tautomers:
            rivals += _tautomer_rivals(main, others, limit, taken)
    return tuple(rivals)


def _canonical(mol: Chem.Mol) -> Chem.Mol:
    """Read the molecule back from its SMILES: the user's order of atoms and labels are gone."""
    bare = Chem.RemoveHs(mol)
    for atom in bare.GetAtoms():
        atom.SetAtomMapNum(0)
    read = Chem.MolFromSmiles(Chem.MolToSmiles(bare))
    if read is None:
        raise StructureError(
            "argument 'structure'", quote(Chem.MolToSmiles(bare)), "valid valences", "check charges and bonds"
        )
    # a second round: the first parse may still follow the input where the canonical order has ties
    return Chem.MolFromSmiles(Chem.MolToSmiles(read))


def _nmr_key(mol: Chem.Mol) -> str:
    """Return a SMILES that mirror images share."""
    smiles = Chem.MolToSmiles(mol)
    if any(is_centre(atom) for atom in mol.GetAtoms()):
        return min(smiles, Chem.MolToSmiles(mirror(mol)))
    return smiles


def _split_components(mol: Chem.Mol) -> tuple[str, str]:
    """Return SMILES of the component with the most carbons, and of all others joined with dots ('' for none)."""
    pieces = Chem.MolToSmiles(mol).split(".")
    if len(pieces) == 1:
        return pieces[0], ""
    sizes = []
    for piece in pieces:
        atoms = list(Chem.MolFromSmiles(piece).GetAtoms())
        sizes.append((-sum(atom.GetAtomicNum() == 6 for atom in atoms), -len(atoms), piece))
    order = sorted(range(len(pieces)), key=lambda index: sizes[index])
    return pieces[order[0]], ".".join(pieces[index] for index in sorted(order[1:]))


def _join(main: str, others: str) -> Chem.Mol | None:
    return Chem.MolFromSmiles(f"{main}.{others}" if others else main)


def _expected_rivals(expect: Iterable[str], taken: set[str]) -> list[Rival]:
    rivals = []
    for position, text in enumerate(expect, start=1):
        mol = Chem.MolFromSmiles(text) if isinstance(text, str) else None
        if mol is None or mol.GetNumAtoms() == 0:
            raise StructureError(
                f"argument 'expect', entry {position}", quote(text), "a valid SMILES", "check brackets and ring numbers"
            )
        mol = _canonical(mol)
        key = _nmr_key(mol)
        if key not in taken:
            taken.add(key)
            rivals.append(Rival(Chem.MolToSmiles(mol), "named as what else may be in the tube", "candidate"))
    return rivals


def _select(main: str, others: str, limit: int, mass_confirmed: bool, taken: set[str]) -> list[Rival]:
    """Take the nearest rival again and again, each kind a little dearer with every one taken of it."""
    if limit <= 0:
        return []
    workspace = Workspace(main)
    moves = [move for move in MOVES if not (mass_confirmed and move.kind == "reaction")]
    queues = _build_queues(workspace, moves)
    gate = _Gate(main, others, taken)
    on_list: Counter[str] = Counter()
    rivals: list[Rival] = []
    while len(rivals) < limit:
        waiting = [move for move in moves if queues[move.name]]
        if not waiting:
            break
        move = min(
            waiting,
            key=lambda move: (
                queues[move.name][-1].score + move.crowding * on_list[move.name],
                queues[move.name][-1].smiles,
            ),
        )
        nearest = queues[move.name].pop()
        smiles = gate.admit(nearest.smiles, move.kind)
        if smiles is not None:
            on_list[move.name] += 1
            rivals.append(Rival(smiles, nearest.candidate.how(), move.kind))
    return rivals


def _build_queues(workspace: Workspace, moves: list[Move]) -> dict[str, list[_Ranked]]:
    """Build the candidates of every move; the nearest stands last in its queue."""
    environments = rdFingerprintGenerator.GetMorganGenerator(radius=2)
    own = environments.GetSparseCountFingerprint(workspace.mol)
    fewest, most = _CANDIDATES_PER_MOVE
    wanted = min(most, max(fewest, _ATOM_BUDGET // workspace.n_atoms))
    distances: dict[str, float] = {}
    queues = {}
    for move in moves:
        nearest: dict[str, _Ranked] = {}
        for candidate in _thin(_without_symmetry_copies(move.build(workspace)), wanted):
            mol = _build(workspace, candidate)
            if mol is None:
                continue
            smiles = Chem.MolToSmiles(mol)
            if smiles not in distances:
                rival = environments.GetSparseCountFingerprint(mol)
                distances[smiles] = 1.0 - DataStructs.DiceSimilarity(own, rival)
            score = move.weight + candidate.penalty + distances[smiles]
            if smiles not in nearest or score < nearest[smiles].score:
                nearest[smiles] = _Ranked(score, smiles, candidate)
        queues[move.name] = sorted(nearest.values(), key=lambda ranked: (ranked.score, ranked.smiles), reverse=True)
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
        if len(equals) <= room:
            kept += equals
        else:
            kept += [equals[index * len(equals) // room] for index in range(room)]
            break
    return kept


def _build(workspace: Workspace, candidate: Candidate) -> Chem.Mol | None:
    """Carry out the edit; None where the result has no valid valences or is no molecule of one piece."""
    editable = Chem.RWMol(workspace.mol)
    try:
        edited = candidate.edit(editable)
        mol = editable if edited is None else edited
        Chem.SanitizeMol(mol)
        if workspace.has_stereo:
            Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
    except (ValueError, RuntimeError):
        # RDKit refuses impossible valences, aromatic rings without Kekulé form and bonds that exist already
        return None
    return mol


class _Gate:
    """Lets each compound in once, and none that is the proposal or would not survive."""

    def __init__(self, main: str, others: str, taken: set[str]):
        proposal = Chem.MolFromSmiles(main)
        self._others = others
        self._taken = taken
        self._formula = rdMolDescriptors.CalcMolFormula(proposal)
        self._plausible = PlausibilityFilter(proposal)
        self._tautomers = {compute_tautomer_key(proposal)}

    def admit(self, smiles: str, kind: str) -> str | None:
        """Return the rival's canonical SMILES with all components, or None."""
        main = Chem.MolFromSmiles(smiles)
        if main is None or "." in smiles:
            return None
        if kind != "reaction" and rdMolDescriptors.CalcMolFormula(main) != self._formula:
            return None
        whole = _join(Chem.MolToSmiles(main), self._others)
        whole = Chem.MolFromSmiles(Chem.MolToSmiles(whole))
        key = _nmr_key(whole)
        if key in self._taken:
            return None
        tautomer_key = compute_tautomer_key(main)
        if kind != "stereoisomer" and tautomer_key in self._tautomers:
            return None
        if not self._plausible.accepts(main):
            return None
        self._taken.add(key)
        self._tautomers.add(tautomer_key)
        return Chem.MolToSmiles(whole)


def _tautomer_rivals(main: str, others: str, limit: int, taken: set[str]) -> list[Rival]:
    proposal = Chem.MolFromSmiles(main)
    plausible = PlausibilityFilter(proposal)
    rivals: list[Rival] = []
    for smiles, how in build_tautomers(proposal):
        tautomer = Chem.MolFromSmiles(smiles)
        if tautomer is None or len(rivals) >= limit or not plausible.accepts_neighbourhoods(tautomer):
            continue
        whole = _join(smiles, others)
        key = _nmr_key(whole)
        if key not in taken:
            taken.add(key)
            rivals.append(Rival(Chem.MolToSmiles(whole), how, "tautomer"))
    return rivals
