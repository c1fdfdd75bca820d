"""Rivals over random compounds of the open table: nothing raises, environments are known, and it is quick."""

import csv
import gzip
import random
import statistics
import time

import pytest
from rdkit import Chem

from shiftpred.structures.rivals import build_rivals
from shiftpred.structures.rivals.neighbourhoods import compute_neighbourhoods, load_neighbourhood_table


def _random_compounds(shared, number, seed):
    with gzip.open(shared / "data" / "compounds.csv.gz", "rt") as handle:
        smiles = [row["smiles"] for row in csv.DictReader(handle)]
    return random.Random(seed).sample(smiles, number)


@pytest.mark.shared
def test_known_environments_and_speed_on_random_compounds(shared):
    table = load_neighbourhood_table()
    known = total = 0
    seconds = []
    build_rivals(Chem.MolFromSmiles("CCO"))
    for smiles in _random_compounds(shared, 100, seed=20):
        mol = Chem.MolFromSmiles(smiles)
        start = time.process_time()
        rivals = build_rivals(mol)
        seconds.append(time.process_time() - start)
        assert len({rival.smiles for rival in rivals}) == len(rivals)
        for rival in rivals:
            words = compute_neighbourhoods(Chem.MolFromSmiles(rival.smiles))
            known += sum(word in table for word in words)
            total += len(words)
    assert total > 5000
    assert known / total >= 0.95
    assert statistics.median(seconds) < 0.1


@pytest.mark.shared
@pytest.mark.slow
def test_no_compound_of_the_table_raises(shared):
    for smiles in _random_compounds(shared, 1500, seed=21):
        mol = Chem.MolFromSmiles(smiles)
        order = list(range(mol.GetNumAtoms()))
        random.Random(smiles).shuffle(order)
        rivals = build_rivals(mol)
        assert Chem.CanonSmiles(smiles) not in [rival.smiles for rival in rivals]
        assert build_rivals(Chem.RenumberAtoms(mol, order)) == rivals, smiles
