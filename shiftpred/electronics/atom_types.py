"""The kinds of atom that the topological inductive model and the resonance model tell apart."""

from __future__ import annotations

from shiftpred.electronics.group_graph import GroupGraph

__all__ = ["compute_atom_type"]

_BY_ELEMENT = ("H", "F", "Cl", "Br", "I", "Si", "Ge", "Sn", "B")


def compute_atom_type(group: GroupGraph, atom: int) -> str:
    """Return the kind of an atom by element, hybridisation and what it is bonded to.

    Parameters
    ----------
    group : GroupGraph
    atom : int
        0-based index into the group's lists.

    Returns
    -------
    str
        'Csp3', 'C=X' (carbonyl, imine), 'C#N', 'Car', 'OH', 'O=S', 'Namide', 'Ssp3O2' (sulfone), …
    """
    symbol, hybrid, around = group.symbols[atom], group.hybrids[atom], group.neighbours[atom]
    if symbol in _BY_ELEMENT:
        return symbol
    if symbol == "P":
        return f"PO{group.oxos[atom]}" if group.oxos[atom] else "P"
    if symbol == "S":
        return f"S{hybrid}O{group.oxos[atom]}" if group.oxos[atom] else f"S{hybrid}"
    if symbol == "C":
        if group.aromatic[atom]:
            return "Car"
        if hybrid == "sp" and any(n == 3 and group.symbols[j] != "C" for j, n in around):
            return "C#N"
        if hybrid == "sp2" and any(n == 2 and group.symbols[j] != "C" for j, n in around):
            return "C=X"
    if symbol == "N":
        if group.charges[atom] > 0:
            return f"N{hybrid}+"
        if hybrid == "sp3" and any(group.hybrids[j] == "sp2" and not group.aromatic[j] for j, _ in around):
            return "Namide"
    if symbol == "O":
        if -1 < group.charges[atom] < 0:
            return "O=N+"
        if hybrid == "sp2" and any(group.symbols[j] in ("S", "P", "Se") for j, _ in around):
            return "O=S"
        if hybrid == "sp3" and any(group.symbols[j] == "H" for j, _ in around):
            return "OH"
    return f"{symbol}{hybrid}"
