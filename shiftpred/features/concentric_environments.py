"""Codes of what surrounds an atom out to one, two … five bonds: equal codes, equal surroundings.

The idea of describing a carbon by its spheres of neighbours is Bremser's (Anal. Chim. Acta 1978, 103, 355,
doi 10.1016/S0003-2670(01)83100-7, doi from memory); the codes here are hashes that are refined bond by bond (Weisfeiler & Leman,
Nauchno-Technicheskaya Informatsia 1968, Ser. 2, 9, 12), so that they can be looked up without any string.
"""

from __future__ import annotations

import numpy as np

from shiftpred.features.molecule_arrays import ATOM_FEATURES, BOND_FEATURES, MoleculeArrays

__all__ = ["RADII", "compute_environment_codes"]

RADII = 5
"""Codes are computed out to so many bonds."""

_KINDS = ("element", "hydrogens", "neighbours", "positive", "negative", "aromatic", "sp", "sp2", "sp3", "ring")
_DISCRETE = [i for i, name in enumerate(ATOM_FEATURES) if name.split("_")[0] in _KINDS]
_EXACT = [ATOM_FEATURES.index("pauling"), ATOM_FEATURES.index("covalent_radius")]
_ORDERS = [BOND_FEATURES.index(name) for name in ("single", "double", "triple", "aromatic", "other_order")]
_STEP = np.uint64(0x9E3779B97F4A7C15)


def _scramble(x: np.ndarray) -> np.ndarray:
    """Mix the bits of (…,) uint64 (finaliser of splitmix64: Steele, Lea & Flood, OOPSLA 2014); products wrap round."""
    x = x ^ (x >> np.uint64(30))
    x = x * np.uint64(0xBF58476D1CE4E5B9)
    x = x ^ (x >> np.uint64(27))
    x = x * np.uint64(0x94D049BB133111EB)
    return x ^ (x >> np.uint64(31))


def _build_constants(count: int, start: int) -> np.ndarray:
    return _scramble(np.arange(start, start + count, dtype=np.uint64) * _STEP)


_ATOM_CONSTANTS = _build_constants(len(_DISCRETE) + len(_EXACT), 1)
_ORDER_CONSTANTS = _build_constants(len(_ORDERS), 1001)
_RADIUS_CONSTANTS = _build_constants(RADII, 2001)


def compute_environment_codes(graph: MoleculeArrays) -> np.ndarray:
    """Compute a code of each atom's surroundings for every radius.

    Elements, hydrogens, neighbours, charges, hybrids, ring sizes and bond orders count; stereo does not.

    Parameters
    ----------
    graph : MoleculeArrays
        Of one molecule or of several joined, with the electronic columns filled (they tell the rarer elements apart).

    Returns
    -------
    ndarray of shape (n_atoms, RADII), uint64
        40-bit numbers. Column k: out to k + 1 bonds. Codes of different radii never mean the same; two different surroundings
        share a code by chance once in 10¹² pairs.
    """
    exact = np.rint(graph.atoms[:, _EXACT] * 100).astype(np.int64).view(np.uint64)
    values = np.concatenate([(graph.atoms[:, _DISCRETE] > 0).astype(np.uint64), exact], axis=1)
    own = _scramble((values * _ATOM_CONSTANTS).sum(axis=1, dtype=np.uint64))
    orders = graph.edges[:, _ORDERS]
    bonded = orders.any(axis=1)  # relations of stereo are edges, too
    source, target = graph.source[bonded], graph.target[bonded]
    along = _ORDER_CONSTANTS[orders[bonded].argmax(axis=1)]
    first = np.flatnonzero(np.concatenate([[True], target[1:] != target[:-1]])) if len(target) else []
    out = np.empty((len(own), RADII), dtype=np.uint64)
    for k in range(RADII):
        heard = np.zeros(len(own), dtype=np.uint64)
        if len(target):
            heard[target[first]] = np.add.reduceat(_scramble(own[source] + along), first)
        own = _scramble(own * np.uint64(3) + heard + _RADIUS_CONSTANTS[k])
        out[:, k] = own
    return out >> np.uint64(24)
