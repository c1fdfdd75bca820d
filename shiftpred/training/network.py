"""The environment model as a trainable torch module; `shiftpred.regression.environment_model` runs the same in numpy."""

from __future__ import annotations

import numpy as np
import torch
from torch import nn

from shiftpred.features.molecule_arrays import ATOM_FEATURES, BOND_FEATURES
from shiftpred.features.solvents import SOLVENTS
from shiftpred.regression.environment_model import SOLVENT_RANK

__all__ = ["EnvironmentNetwork", "build_state", "export_arrays"]


class MessageLayer(nn.Module):
    """One round of messages along bonds and stereo relations, with a residual update."""

    def __init__(self, width: int, message: int, hidden: int):
        super().__init__()
        self.message = message
        self.norm = nn.LayerNorm(width)
        # One product gives what an atom says (message), what it listens for (message) and what it thinks itself (hidden).
        self.project = nn.Linear(width, 2 * message + hidden)
        self.from_edge = nn.Linear(len(BOND_FEATURES), message, bias=False)
        self.update_heard = nn.Linear(message, hidden, bias=False)
        self.update_out = nn.Linear(hidden, width)
        nn.init.zeros_(self.update_out.bias)
        self.update_out.weight.data *= 0.3

    def forward(self, h, edges, source, target):
        projected = self.project(self.norm(h))
        says, listens = projected[:, : self.message], projected[:, self.message : 2 * self.message]
        message = torch.relu(
            says.index_select(0, source) + listens.index_select(0, target) + self.from_edge(edges)
        )
        heard = message.new_zeros((len(h), self.message)).index_add(0, target, message)
        return h + self.update_out(torch.relu(projected[:, 2 * self.message :] + self.update_heard(heard)))


class EnvironmentNetwork(nn.Module):
    """Message passing on the molecular graph.

    Parameters
    ----------
    width : int
        Numbers kept for each atom.
    layers : int
        Rounds of messages, and so how many bonds far an atom hears.
    message : int
        Width of a message.
    hidden : int
        Width inside an update.
    """

    def __init__(self, width: int = 256, layers: int = 6, message: int = 128, hidden: int = 384):
        super().__init__()
        self.embed = nn.Linear(len(ATOM_FEATURES), width)
        self.layers = nn.ModuleList(MessageLayer(width, message, hidden) for _ in range(layers))
        self.norm = nn.LayerNorm(width)
        # One head for each quantity: 13C shift, 1H shift, half gap of a CH2.
        self.head_in = nn.Linear(width, 3 * 128)
        self.head_out = nn.Parameter(torch.randn(3, 128) * 0.05)
        self.head_bias = nn.Parameter(torch.zeros(3))
        # Scale of the error, learned without pulling at the trunk.
        self.scale_in = nn.Linear(width, 2 * 64)
        self.scale_out = nn.Parameter(torch.randn(2, 64) * 0.05)
        self.scale_bias = nn.Parameter(torch.zeros(2))
        self.solvent_in = nn.Linear(width, SOLVENT_RANK)
        self.solvent_out = nn.Parameter(torch.randn(len(SOLVENTS), 2, SOLVENT_RANK) * 0.01)
        self.register_buffer("known", (torch.arange(len(SOLVENTS)) > 0).float()[:, None, None])

    def forward(self, atoms, edges, source, target, solvent):
        """Return (n_atoms, 3) outputs and (n_atoms, 2) log scales, both in units of OUTPUT_UNIT."""
        h = torch.relu(self.embed(atoms)).float()
        for layer in self.layers:
            h = layer(h, edges, source, target)
        f = self.norm(h)
        inside = torch.relu(self.head_in(f)).float().view(-1, 3, 128)
        out = (inside * self.head_out).sum(2) + self.head_bias
        shape = torch.tanh(self.solvent_in(f)).float()
        shift = torch.einsum("nr,nkr->nk", shape, (self.solvent_out * self.known)[solvent])
        out = torch.cat([out[:, :2] + shift, nn.functional.softplus(out[:, 2:])], dim=1)
        inside = torch.relu(self.scale_in(f.detach())).float().view(-1, 2, 64)
        scale = (inside * self.scale_out).sum(2) + self.scale_bias
        return out, scale


def export_arrays(network: EnvironmentNetwork) -> dict[str, np.ndarray]:
    """Return the weights as named numpy arrays, as `EnvironmentModel` reads them (matrices transposed for x @ W)."""
    out = {}
    for name, tensor in network.state_dict().items():
        value = tensor.detach().float().cpu().numpy()
        if name == "known":
            continue
        if name.endswith(".weight") and value.ndim == 2:
            value = value.T
        out[name] = np.ascontiguousarray(value)
    out["solvent_out"][0] = 0.0
    return out



def build_state(arrays: dict[str, np.ndarray]) -> dict[str, torch.Tensor]:
    """Return the torch state of a network from the arrays of a bundle: the inverse of `export_arrays`."""
    state = {}
    for name, value in arrays.items():
        if name.endswith(".weight") and value.ndim == 2:
            value = value.T
        state[name] = torch.from_numpy(np.ascontiguousarray(value, dtype=np.float32))
    state["known"] = (torch.arange(len(SOLVENTS)) > 0).float()[:, None, None]
    return state
