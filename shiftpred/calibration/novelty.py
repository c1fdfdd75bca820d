"""Is this site like the training data? Codes of the surroundings of every atom, and a table of those seen in training."""

from __future__ import annotations

import numpy as np

from shiftpred.features.molecule_arrays import ATOM_FEATURES, BOND_FEATURES, MoleculeArrays

__all__ = ["FAMILIAR", "NEW_NEIGHBOURS", "NEW_SURROUNDINGS", "NoveltyTable", "compute_surroundings_codes"]

FAMILIAR, NEW_SURROUNDINGS, NEW_NEIGHBOURS = 0, 1, 2
"""Levels of novelty: the atom with all atoms up to two bonds away, their hydrogens and rings occurs in training; only the atom
with the elements and hybrids of its direct neighbours does; not even that."""

_DISCRETE = [
    i
    for i, n in enumerate(ATOM_FEATURES)
    if n.split("_")[0] in ("element", "hydrogens", "neighbours", "positive", "negative", "aromatic", "sp", "sp2", "sp3", "ring")
]
_COARSE = [
    i
    for i, n in enumerate(ATOM_FEATURES)
    if n.split("_")[0] in ("element", "positive", "negative", "aromatic", "sp", "sp2", "sp3")
]
_OWN = _COARSE + [i for i, n in enumerate(ATOM_FEATURES) if n.split("_")[0] == "hydrogens"]
_PAULING, _RADIUS = ATOM_FEATURES.index("pauling"), ATOM_FEATURES.index("covalent_radius")
_ORDERS = [BOND_FEATURES.index(n) for n in ("single", "double", "triple", "aromatic", "other_order")]
_random = np.random.default_rng(20240229)
_ATOM_KEYS = _random.integers(1, 2**62, len(_DISCRETE) + 2, dtype=np.uint64) | np.uint64(1)
_ORDER_KEYS = _random.integers(1, 2**62, len(_ORDERS), dtype=np.uint64) | np.uint64(1)
_MIX = np.uint64(0x9E3779B97F4A7C15)


def compute_surroundings_codes(graph: MoleculeArrays) -> np.ndarray:
    """Compute a code of each atom's surroundings out to one and to two bonds.

    Parameters
    ----------
    graph : MoleculeArrays
        With the electronic columns filled (they tell the rarer elements apart).

    Returns
    -------
    ndarray of shape (n_atoms, 2), uint32
        Equal codes mean equal surroundings out to one bond (column 0) and to two bonds (column 1), up to chance collisions
        (one in 4·10⁹ for each pair).
    """
    bonded = graph.edges[:, _ORDERS].any(axis=1)
    source, target = graph.source[bonded], graph.target[bonded]
    order = _ORDER_KEYS[graph.edges[bonded][:, _ORDERS].argmax(axis=1)]

    def listen(own, said):
        heard = np.zeros(len(own), dtype=np.uint64)
        np.add.at(heard, target, _scramble(said[source] * order + _MIX))
        return _scramble(own * np.uint64(3) + heard)

    one = listen(_compute_codes(graph, _OWN), _compute_codes(graph, _COARSE))
    full = _compute_codes(graph, _DISCRETE)
    shell = listen(full, full)
    two = listen(shell, shell)
    return (np.stack([one, two], axis=1) >> np.uint64(32)).astype(np.uint32)


def _compute_codes(graph: MoleculeArrays, columns: list[int]) -> np.ndarray:
    """Return (n_atoms,) codes of the atoms themselves by some of their columns and by what tells rarer elements apart."""
    exact = np.rint(graph.atoms[:, [_PAULING, _RADIUS]] * 100).astype(np.int64).view(np.uint64)
    values = np.concatenate([graph.atoms[:, columns].astype(np.int64).view(np.uint64), exact], axis=1)
    return _scramble((values * np.concatenate([_ATOM_KEYS[: len(columns)], _ATOM_KEYS[-2:]])).sum(axis=1, dtype=np.uint64))


def _scramble(x: np.ndarray) -> np.ndarray:
    x = x ^ (x >> np.uint64(31))
    x = x * np.uint64(0xBF58476D1CE4E5B9)
    return x ^ (x >> np.uint64(27))


class NoveltyTable:
    """The surroundings that training has seen.

    Parameters
    ----------
    one_bond, two_bonds : ndarray of uint32, ascending
    """

    def __init__(self, one_bond: np.ndarray, two_bonds: np.ndarray):
        self.one_bond, self.two_bonds = one_bond, two_bonds

    def compute_levels(self, codes: np.ndarray) -> np.ndarray:
        """Return (n_atoms,) FAMILIAR, NEW_SURROUNDINGS or NEW_NEIGHBOURS for codes of shape (n_atoms, 2)."""
        near, far = _contains(self.one_bond, codes[:, 0]), _contains(self.two_bonds, codes[:, 1])
        return np.where(~near, NEW_NEIGHBOURS, np.where(~far, NEW_SURROUNDINGS, FAMILIAR))


def _contains(table: np.ndarray, values: np.ndarray) -> np.ndarray:
    if len(table) == 0:
        return np.zeros(len(values), dtype=bool)
    place = np.minimum(np.searchsorted(table, values), len(table) - 1)
    return table[place] == values
