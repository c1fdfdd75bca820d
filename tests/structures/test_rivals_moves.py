"""The list of moves: complete, and in an order that has reasons."""

import importlib
import inspect

import pytest
from rdkit import Chem

from shiftpred.structures.rivals.moves import FURTHER_REACTIONS, MOVES
from shiftpred.structures.rivals.workspace import Candidate, Workspace

FAMILIES = ("alkylation_sites", "chains", "reactions", "ring_walks", "stereo", "turned_groups")


def _moves_in_families():
    found = set()
    for family in FAMILIES:
        module = importlib.import_module(f"shiftpred.structures.rivals.{family}")
        for name, function in inspect.getmembers(module, inspect.isfunction):
            if name.startswith("build_") and function.__module__ == module.__name__:
                found.add(function)
    return found


def test_no_move_is_missing_from_the_list():
    assert _moves_in_families() == {move.build for move in (*MOVES, FURTHER_REACTIONS)}
    assert len({move.name for move in MOVES}) == len(MOVES)


def test_every_family_file_is_known_here():
    from pathlib import Path

    import shiftpred.structures.rivals as rivals

    files = {path.stem for path in Path(rivals.__file__).parent.glob("*.py")}
    shared_files = {
        "__init__",
        "admission",
        "candidate_queues",
        "graph_edits",
        "group_names",
        "moves",
        "neighbourhoods",
        "plausibility",
        "selection",
        "tautomers",
        "workspace",
    }
    assert files == set(FAMILIES) | shared_files


@pytest.mark.parametrize(
    ("before", "after", "reason"),
    [
        ("lactam_lactim_alkyls", "moved_methyls", "an alkylation site is mixed up every day, a methyl that jumps is not"),
        ("walked_substituents", "swapped_substituents", "one thing out of place is likelier than two"),
        ("walked_substituents", "reaction_neighbours", "regioisomers come first, they have the same mass"),
        ("walked_substituents", "inverted_centres", "regioisomers come before epimers"),
        ("groups_moved_along_chain", "moved_methyls", "the shorter way comes first"),
    ],
)
def test_weights_put_one_move_before_another(before, after, reason):
    weights = {move.name: move.weight for move in MOVES}
    assert weights[before] < weights[after], reason


@pytest.mark.parametrize("move", MOVES, ids=lambda move: move.name)
def test_each_move_yields_candidates_on_some_compound(move):
    compounds = (
        "COc1ccccn1",
        "Cn1ncc2ccccc21",
        "CC(C)Cc1ccc(C(C)C(=O)O)cc1",
        "CNC(=O)c1ccc(O)cc1",
        "NCCc1ccc2OCOc2c1",
        "c1ccc(CN2CCCCC2)cc1",
        "C/C=C/C(=O)OCC",
        "C[C@H]1CC[C@H](O)CC1",
        "O=C(Nc1ccccc1)c1ccc(Cl)cc1",
    )
    candidates = [candidate for smiles in compounds for candidate in move.build(Workspace(Chem.CanonSmiles(smiles)))]
    assert candidates
    for candidate in candidates:
        assert isinstance(candidate, Candidate)
        words = candidate.how()
        assert words and words == words.strip() and "\n" not in words
