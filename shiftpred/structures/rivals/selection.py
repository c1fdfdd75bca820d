"""From a proposal to its list of rivals."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from rdkit import Chem, rdBase

from shiftpred.errors import SettingError, StructureError, quote
from shiftpred.records import Rival, Structure
from shiftpred.structures.rivals.admission import Gate, compute_mirror_key, join_components
from shiftpred.structures.rivals.candidate_queues import CandidateQueues
from shiftpred.structures.rivals.moves import FURTHER_REACTIONS, MOVES
from shiftpred.structures.rivals.plausibility import PlausibilityFilter
from shiftpred.structures.rivals.tautomers import build_tautomers
from shiftpred.structures.rivals.workspace import Workspace

LARGEST_LIMIT = 1000
_FURTHER_ROUNDS = 2
"""Rounds after the first, each one move further from the proposal, where there are not enough rivals nearby."""
_STARTS = (3, 10)
"""Fewest and most rivals from which a further round starts; in between a fifth of the limit, since each start costs as
much as the first round."""
_LARGEST_WITH_TAUTOMERS = 20
"""Heavy atoms; up to this size the second round starts from the proposal's tautomers too (3-hydroxypyridine is a walked
hydroxypyridine, not a walked pyridone). Enumerating them is slow for larger ones, which have rivals enough."""
_FURTHER_POOL = 2
"""A further round collects this many times what is missing, then keeps the nearest."""


def build_rivals(
    structure: Structure | Chem.Mol,
    limit: int = 9,
    mass_confirmed: bool = False,
    expect: Iterable[str] = (),
    include_tautomers: bool = False,
) -> tuple[Rival, ...]:
    """Return what could be in the tube instead of a proposed structure, the nearest first.

    Isomers (substituents walked or swapped on a ring, ring heteroatoms walked, groups turned round, N against O, azole
    nitrogens, chains branched, multiple bonds walked), stereoisomers that NMR can see, and, unless the mass is
    confirmed, the neighbours by reaction. Where that is not enough, further moves on top of the nearest isomers, then
    neighbours by further reactions (over-reaction, homologues), unless the mass is confirmed. In a mixture or salt the
    component with the most carbons is varied and the others stay.

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
        Without the proposal, its enantiomer and its fast tautomers, and without duplicates; canonical isomeric SMILES.
        The same input gives the same list whatever the order of its atoms.

    Raises
    ------
    StructureError
        If the structure has no atoms, or a SMILES in `expect` cannot be read.
    SettingError
        If `limit` is not a whole number from 0 to 1000, or `expect` is no list.

    Notes
    -----
    Nearness is a sum, small for near:

    - the weight of the move (0 for a substituent walked around a ring, below 0 for an alkyl on N instead of O, 0.3 for
      a methyl that jumps), and the candidate's own penalty;
    - the share of atom environments out to two bonds that are not common to both structures (one minus the Dice
      coefficient of the environment counts), so an isomer with the same multiset of environments is the nearest;
    - the share of its atoms in an environment (two bonds) that neither the open table nor the proposal holds;
    - for each rival of the same move that is already on the list a little more (0.06 to 0.15), so that the first nine
      hold the most plausible confusions of different kinds.

    The rival with the smallest sum is taken, again and again. Ties are broken by SMILES. A rival must have valid
    valences, only atom neighbourhoods (radius 1, hydrogens counted) that occur in at least three compounds of the open
    shift data or in the proposal itself, and no functional group that would not survive in a tube (peroxide,
    hemiaminal, enol, …) beyond those that the proposal has.

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
    if isinstance(expect, str) or not isinstance(expect, Iterable):
        raise SettingError("argument 'expect'", quote(expect), "a list of SMILES", "expect=['CCO']")
    mol = structure.mol if isinstance(structure, Structure) else structure
    if not isinstance(mol, Chem.Mol):
        raise StructureError(
            "argument 'structure'", quote(mol), "a Structure or an RDKit molecule", "read it first, from a SMILES say"
        )
    if mol.GetNumAtoms() == 0:
        raise StructureError("argument 'structure'", "no atoms", "a structure with atoms", "check the input")
    with rdBase.BlockLogs():
        proposal = _canonical(mol)
        taken = {compute_mirror_key(proposal)}
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
        raise StructureError("argument 'structure'", quote(Chem.MolToSmiles(bare)), "valid valences", "check charges and bonds")
    # a second round: the first parse may still follow the input where the canonical order has ties
    return Chem.MolFromSmiles(Chem.MolToSmiles(read))


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


def _expected_rivals(expect: Iterable[str], taken: set[str]) -> list[Rival]:
    rivals = []
    for position, text in enumerate(expect, start=1):
        mol = Chem.MolFromSmiles(text) if isinstance(text, str) else None
        if mol is None or mol.GetNumAtoms() == 0:
            raise StructureError(
                f"argument 'expect', entry {position}", quote(text), "a valid SMILES", "check brackets and ring numbers"
            )
        mol = _canonical(mol)
        key = compute_mirror_key(mol)
        if key not in taken:
            taken.add(key)
            rivals.append(Rival(Chem.MolToSmiles(mol), "named as what else may be in the tube", "candidate"))
    return rivals


@dataclass(frozen=True)
class _Start:
    """Where a further round starts: an isomer on the list, or a tautomer of the proposal."""

    main: str
    how: str
    kind: str


def _select(main: str, others: str, limit: int, mass_confirmed: bool, taken: set[str]) -> list[Rival]:
    """Take the nearest rival again and again; where one move is not enough, further ones on top."""
    if limit <= 0:
        return []
    proposal = Chem.MolFromSmiles(main)
    gate = Gate(main, others, taken)
    moves = [move for move in MOVES if not (mass_confirmed and move.kind == "reaction")]
    queues = CandidateQueues(Workspace(main), moves, proposal, gate)
    rivals: list[Rival] = []
    starts: list[_Start] = []
    while len(rivals) < limit and (found := queues.pop()) is not None:
        _, examined, move, candidate = found
        rivals.append(Rival(examined.smiles, candidate.how(), move.kind))
        if move.kind != "reaction":
            starts.append(_Start(examined.main, rivals[-1].how, move.kind))
    if len(rivals) < limit and proposal.GetNumAtoms() <= _LARGEST_WITH_TAUTOMERS:
        starts = [_Start(smiles, "", "isomer") for smiles, _ in build_tautomers(proposal)[:2]] + starts
    fewest, most = _STARTS
    for _ in range(_FURTHER_ROUNDS):
        if len(rivals) == limit or not starts:
            break
        starts = starts[: max(fewest, min(most, limit // 5))]
        more, starts = _further_round(starts, limit - len(rivals), proposal, gate)
        rivals += more
    if len(rivals) < limit and not mass_confirmed:
        queues = CandidateQueues(Workspace(main), [FURTHER_REACTIONS], proposal, gate)
        while len(rivals) < limit and (found := queues.pop()) is not None:
            _, examined, move, candidate = found
            rivals.append(Rival(examined.smiles, candidate.how(), move.kind))
    return rivals


def _further_round(starts: list[_Start], missing: int, proposal: Chem.Mol, gate: Gate) -> tuple[list[Rival], list[_Start]]:
    """Return isomers one move further away, the nearest first, and where the next round may start."""
    moves = [move for move in MOVES if move.kind != "reaction"]
    pool: list[tuple[float, Rival, str]] = []
    for start in starts:
        queues = CandidateQueues(Workspace(start.main), moves, proposal, gate)
        while len(pool) < _FURTHER_POOL * missing and (found := queues.pop()) is not None:
            score, examined, move, candidate = found
            how = f"{start.how}; and {candidate.how()}" if start.how else candidate.how()
            kind = "stereoisomer" if start.kind == move.kind == "stereoisomer" else "isomer"
            pool.append((score, Rival(examined.smiles, how, kind), examined.main))
    pool.sort(key=lambda entry: (entry[0], entry[1].smiles))
    nearest = pool[:missing]
    return [rival for _, rival, _ in nearest], [_Start(main, rival.how, rival.kind) for _, rival, main in nearest]


def _tautomer_rivals(main: str, others: str, limit: int, taken: set[str]) -> list[Rival]:
    proposal = Chem.MolFromSmiles(main)
    plausible = PlausibilityFilter(proposal)
    rivals: list[Rival] = []
    for smiles, how in build_tautomers(proposal):
        tautomer = Chem.MolFromSmiles(smiles)
        if tautomer is None or len(rivals) >= limit or not plausible.compute_unknown_share(tautomer) is not None:
            continue
        whole = join_components(smiles, others)
        key = compute_mirror_key(whole)
        if key not in taken:
            taken.add(key)
            rivals.append(Rival(Chem.MolToSmiles(whole), how, "tautomer"))
    return rivals
