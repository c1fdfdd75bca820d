"""The network in numpy: the same as in torch, the same alone as in a batch."""

import numpy as np
import pytest
from rdkit import Chem

from shiftpred.features.molecule_arrays import build_molecule_arrays, join_molecule_arrays
from shiftpred.features.solvents import SOLVENTS
from shiftpred.regression.environment_model import EnvironmentModel

SMILES = ["CCO", "CC(=O)Oc1ccccc1C(=O)O", "C", "C/C=C/C(=O)N(C)C", "Cn1c(=O)c2c(ncn2C)n(C)c1=O"]


@pytest.fixture
def torch_network():
    torch = pytest.importorskip("torch")
    from shiftpred.training.network import EnvironmentNetwork

    torch.manual_seed(3)
    return EnvironmentNetwork(width=32, layers=3, message=16, hidden=24).eval()


@pytest.mark.training
def test_numpy_equals_torch(torch_network):
    import torch

    from shiftpred.regression.environment_model import OUTPUT_CENTRE, OUTPUT_UNIT
    from shiftpred.training.network import build_state, export_arrays

    torch_network.solvent_out.data.normal_()
    arrays = export_arrays(torch_network)
    model = EnvironmentModel(arrays)
    graph, _ = join_molecule_arrays([build_molecule_arrays(Chem.MolFromSmiles(s)) for s in SMILES])
    values, scales, inner = model.predict_raw(graph)
    tensors = [torch.from_numpy(x) for x in (graph.atoms, graph.edges, graph.source, graph.target)]
    for k in (0, SOLVENTS.index("C6D6")):
        with torch.no_grad():
            out, scale = torch_network(*tensors, torch.full((len(graph.atoms),), k))
        expected = out.numpy() * np.array(OUTPUT_UNIT) + np.array(OUTPUT_CENTRE)
        expected[:, :2] -= model.predict_solvent_effect(inner, k)
        assert np.allclose(values, expected, atol=2e-4)
        assert np.allclose(scales, np.exp(scale.numpy()) * np.array(OUTPUT_UNIT)[:2], rtol=1e-4)
    torch_network.load_state_dict(build_state(arrays))  # the way back has the same names and shapes


def test_alone_and_in_a_batch_are_the_same(shipped_model):
    parts = [build_molecule_arrays(Chem.MolFromSmiles(s)) for s in SMILES]
    together = shipped_model.environment_model.predict_raw(join_molecule_arrays(parts)[0])[0]
    alone = np.concatenate([shipped_model.environment_model.predict_raw(p)[0] for p in parts])
    assert np.abs(together - alone).max() < 1e-4


def test_not_reported_solvent_changes_nothing(shipped_model):
    inner = shipped_model.environment_model.predict_raw(build_molecule_arrays(Chem.MolFromSmiles("CCO")))[2]
    assert not shipped_model.environment_model.predict_solvent_effect(inner, 0).any()
