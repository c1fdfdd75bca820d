"""Codes of surroundings: equal for equal surroundings, different otherwise, whatever the order of the atoms."""

import numpy as np
from rdkit import Chem

from shiftpred.calibration.novelty import (
    FAMILIAR,
    NEW_NEIGHBOURS,
    NEW_SURROUNDINGS,
    NoveltyTable,
    compute_surroundings_codes,
)
from shiftpred.features.molecule_arrays import build_molecule_arrays


def codes(smiles):
    return compute_surroundings_codes(build_molecule_arrays(Chem.MolFromSmiles(smiles)))


def test_codes_do_not_depend_on_the_order_of_atoms():
    assert sorted(map(tuple, codes("CC(=O)OCC"))) == sorted(map(tuple, codes("CCOC(C)=O")))


def test_codes_tell_rare_elements_apart():
    assert codes("C[Ge](C)(C)C")[0, 0] != codes("C[Sn](C)(C)C")[0, 0]


def test_shells_reach_one_and_two_bonds():
    linear, branched = codes("CCCO"), codes("CCC(C)O")
    assert linear[0, 0] == branched[0, 0] and linear[0, 1] != branched[0, 1]


def test_levels():
    seen = codes("CCCO")
    table = NoveltyTable(np.unique(seen[:, 0]), np.unique(seen[:, 1]))
    assert set(table.compute_levels(codes("OCCC"))) == {FAMILIAR}
    assert set(table.compute_levels(codes("CCO"))) <= {FAMILIAR, NEW_SURROUNDINGS}
    other = table.compute_levels(codes("CCC(C)O"))
    assert other[0] == NEW_SURROUNDINGS
    assert set(table.compute_levels(codes("C[Se]C"))) == {NEW_NEIGHBOURS}


def test_empty_table_knows_nothing():
    empty = NoveltyTable(np.zeros(0, np.uint32), np.zeros(0, np.uint32))
    assert set(empty.compute_levels(codes("CCO"))) == {NEW_NEIGHBOURS}
