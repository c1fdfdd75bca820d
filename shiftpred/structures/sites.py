"""Sites of a structure: every heavy atom with its hydrogens, its equivalents and its environment class."""

from __future__ import annotations

from shiftpred.records import Site, Structure
from shiftpred.structures.atom_table import build_atom_table
from shiftpred.structures.environments import compute_site_environments
from shiftpred.structures.equivalence import Equivalence, compute_equivalence

__all__ = ["Equivalence", "compute_equivalence", "compute_sites"]

_LABILE = frozenset((7, 8, 15, 16, 34))


def compute_sites(structure: Structure) -> tuple[Site, ...]:
    """Return the site of every atom, in the order of `structure.mol`.

    Parameters
    ----------
    structure : Structure

    Returns
    -------
    tuple of Site
        (n_atoms,)
    """
    table = build_atom_table(structure.mol)
    environments = compute_site_environments(structure.mol, table)
    equivalence = compute_equivalence(structure.mol, table, structure.deuterium)
    groups, ranks = equivalence.group.tolist(), equivalence.constitutional.tolist()
    differ = equivalence.geminal_differ.tolist()
    members: dict[int, list[int]] = {}
    alike: dict[int, list[int]] = {}
    for i, (group, rank) in enumerate(zip(groups, ranks)):
        members.setdefault(group, []).append(i)
        alike.setdefault(rank, []).append(i)
    equivalent = {group: tuple(atoms) for group, atoms in members.items()}
    deuterium = structure.deuterium or (0,) * len(groups)
    sites = []
    for i, (group, total, heavy) in enumerate(zip(groups, table.hydrogens, deuterium)):
        own, same = equivalent[group], alike[ranks[i]]
        others = tuple(j for j in same if groups[j] != group) if len(same) > len(own) else ()
        light = total - heavy
        sites.append(
            Site(
                i,
                structure.atom_numbers[i],
                table.atoms[i].GetSymbol(),
                light,
                heavy,
                own,
                others,
                differ[i] and light == 2,
                light > 0 and table.elements[i] in _LABILE,
                environments[i],
            )
        )
    return tuple(sites)
