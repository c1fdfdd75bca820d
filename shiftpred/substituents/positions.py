"""Where every other atom stands as seen from a site: alpha, beta, gamma; ortho, meta, para on a benzene-like ring.

Rule for rings. Every atom hangs on exactly one neighbour that is one bond nearer to the site: the shortest way wins.
Of two equally short ways the one whose atoms read first in alphabetical order wins, then the group that reads first,
then the lower canonical rank. The bonds that are not used (one for each ring) are cut. So the ways form a tree, every
atom is covered once, and the outcome does not depend on how the atoms were numbered.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

from shiftpred.substituents.group_codes import GroupCodes

__all__ = ["POSITIONS", "Place", "compute_places"]

POSITIONS = ("alpha", "beta", "gamma", "ortho", "meta", "para")
"""Positions that count in the substituent model; further atoms are 'delta' (four bonds) or 'remote'."""

_BY_DISTANCE = ("site", "alpha", "beta", "gamma", "delta")
_ON_RING = {2: "ortho", 3: "meta", 4: "para"}


class Place(NamedTuple):
    """One atom as seen from the site."""

    atom: int
    """0-based index of the atom."""
    parent: int
    """0-based index of the atom it hangs on, one bond nearer to the site."""
    distance: int
    """Bonds from the site, 1 for alpha."""
    path: str
    """Codes of the bonds and atoms between, the site's neighbour first; '' at alpha."""
    position: str
    """'alpha', 'beta', 'gamma', 'delta' or 'remote'; on a six-membered aromatic ring that the site belongs to, a
    substituent of the ring is 'ortho', 'meta' or 'para' instead."""


def compute_places(
    codes: GroupCodes, atom_index: int, reach: int | None = None, ranks: Sequence[int] | None = None
) -> list[Place]:
    """List all atoms of the site's component, nearest first, each with the one atom it hangs on.

    Parameters
    ----------
    codes : GroupCodes
        From `compute_group_codes`.
    atom_index : int
        0-based index of the site.
    reach : int or None, default None
        Bonds to go at most; None goes to the end of the component.
    ranks : sequence of int or None, default None
        Canonical ranks of all atoms; they decide between ways that read alike. None: the lower index does, which
        changes no code, path or position, only which of two equal atoms is named.

    Returns
    -------
    list of Place
        By rising distance; the site itself is not among them.
    """
    neighbours, short, long = codes.neighbours, codes.levels[0], codes.levels[-1]
    ring_sets, own_rings = codes.six_rings, codes.six_rings[atom_index]
    seen = {atom_index}
    places = []
    layer = [(atom_index, "")]
    distance = 0
    while layer and distance != reach:
        distance += 1
        found: dict[int, tuple] = {}
        for parent, path in layer:
            behind = long[parent]
            for v in neighbours[parent]:
                if v in seen:
                    continue
                way = (path, behind[v], ranks[parent] if ranks else parent, parent)
                if v not in found or way < found[v]:
                    found[v] = way
        seen.update(found)
        layer = []
        for v, (path, _, _, parent) in found.items():
            position = _BY_DISTANCE[distance] if distance < 5 else "remote"
            if own_rings and 2 <= distance <= 4:
                shared = own_rings & ring_sets[parent]
                if shared and not shared & ring_sets[v]:
                    position = _ON_RING[distance]
            places.append(Place(v, parent, distance, path, position))
            layer.append((v, path + short[parent][v]))
    return places
