"""Speed, watched and never asserted: `pytest tests/benchmarks -m benchmark` (left out of the everyday run)."""

import subprocess
import sys

import pytest
from rdkit import Chem

from shiftpred.pipeline import iterate_predictions, load_model, predict_structures
from shiftpred.structures import parse_structure, parse_structures

pytest.importorskip("pytest_benchmark")
pytestmark = pytest.mark.benchmark

# Twenty drug-sized molecules of 20 to 30 heavy atoms (SMILES from memory).
DRUGS = [
    "CC(C)NCC(O)COc1cccc2ccccc12",
    "CN1CCC23C4Oc5c(O)ccc(CC1C2C=CC4O)c35",
    "CC(=O)NC1CCc2cc(OC)c(OC)c(OC)c2C2=CC=C(OC)C(=O)C=C12",
    "Cc1ccc(-c2cc(C(F)(F)F)nn2-c2ccc(S(N)(=O)=O)cc2)cc1",
    "CN(C)CCCN1c2ccccc2Sc2ccc(Cl)cc21",
    "COc1ccc2[nH]c(S(=O)Cc3ncc(C)c(OC)c3C)nc2c1",
    "CN1C(=O)CN=C(c2ccccc2)c2cc(Cl)ccc21",
    "O=C(O)c1cn(C2CC2)c2cc(N3CCNCC3)c(F)cc2c1=O",
    "CC(C)(C)NCC(O)c1ccc(O)c(CO)c1",
    "CCOC(=O)N1CCC(=C2c3ccc(Cl)cc3CCc3cccnc32)CC1",
    "CNCCC(Oc1ccc(C(F)(F)F)cc1)c1ccccc1",
    "COc1ccc(CCN(C)CCCC(C#N)(C(C)C)c2ccc(OC)c(OC)c2)cc1OC",
    "CC12CCC3C(CCC4=CC(=O)CCC34C)C1CCC2O",
    "CC(=O)OC1C(Sc2ccccc2N(CCN(C)C)C1=O)c1ccc(OC)cc1",
    "Nc1ccc(S(=O)(=O)Nc2ncccn2)cc1",
    "CC1(C)SC2C(NC(=O)Cc3ccccc3)C(=O)N2C1C(=O)O",
    "O=C1NC(=O)C(c2ccccc2)(c2ccccc2)N1",
    "CN1C2CCC1CC(OC(=O)C(CO)c1ccccc1)C2",
    "COc1cc(C=CC(=O)CC(=O)C=Cc2ccc(O)c(OC)c2)ccc1O",
    "OC(=O)COCCN1CCN(C(c2ccccc2)c2ccc(Cl)cc2)CC1",
]


def test_cold_start_of_the_whole_process(benchmark):
    command = [sys.executable, "-m", "shiftpred", "predict", "CCOC(=O)c1ccccc1"]
    benchmark.pedantic(lambda: subprocess.run(command, check=True, capture_output=True), rounds=5, warmup_rounds=1)


def test_predict_200_molecules(benchmark):
    load_model()
    smiles = DRUGS * 10
    found = benchmark.pedantic(lambda: list(iterate_predictions(parse_structures(smiles))), rounds=3, warmup_rounds=1)
    assert len(found) == 200
    benchmark.extra_info["molecules_per_second"] = 200 / benchmark.stats.stats.min


def test_network_alone(benchmark):
    from shiftpred.features.molecule_arrays import build_molecule_arrays, join_molecule_arrays

    model = load_model().environment_model
    graph, _ = join_molecule_arrays([build_molecule_arrays(Chem.MolFromSmiles(s)) for s in DRUGS])
    benchmark(model.predict_raw, graph)


def test_sites(benchmark):
    from shiftpred.structures import compute_sites

    structures = [parse_structure(s) for s in DRUGS]
    benchmark(lambda: [compute_sites(s) for s in structures])


def test_one_molecule_warm(benchmark):
    structure = parse_structure(DRUGS[0])
    benchmark(lambda: predict_structures([structure]))
