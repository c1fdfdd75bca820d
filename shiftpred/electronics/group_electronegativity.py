"""Electronegativity of a whole group, by six methods that do not agree and are never averaged."""

from __future__ import annotations

from math import exp, log, nan

from shiftpred.electronics.group_graph import GroupGraph
from shiftpred.electronics.orbital_electronegativity import compute_hinze_jaffe, compute_mullay, find_orbital_parameters
from shiftpred.electronics.sourced_tables import load_element_values

__all__ = [
    "compute_attached_weighted",
    "compute_harmonic_mean",
    "compute_geometric_mean",
    "compute_group_mullay",
    "compute_group_orbital",
    "compute_partial_charges",
    "find_pauling",
]

_HYDROGEN_CATION = 20.02
"""χ of H+ in eV, which stands in for a + b + c of hydrogen."""
_ROUNDS = 6


def find_pauling(symbol: str) -> float:
    """Return an element's electronegativity on Pauling's scale; nan where there is none."""
    return load_element_values("electronegativity", "Pauling (Allred 1961)").get(symbol, nan)


def compute_harmonic_mean(group: GroupGraph) -> float:
    """Return Bratsch's equalised electronegativity, (N + charge) / Σ(1/χ), in Pauling units.

    References
    ----------
    Bratsch, J. Chem. Educ. 1985, 62, 101, doi 10.1021/ed062p101.
    """
    return (len(group.symbols) + group.charge) / sum(1 / find_pauling(symbol) for symbol in group.symbols)


def compute_geometric_mean(group: GroupGraph) -> float:
    """Return Sanderson's equalised electronegativity, the geometric mean over all atoms, in Sanderson units.

    References
    ----------
    Sanderson, Polar Covalence, Academic Press 1983.
    """
    values = load_element_values("electronegativity", "Sanderson")
    return exp(sum(log(values.get(symbol, nan)) for symbol in group.symbols) / len(group.symbols))


def compute_partial_charges(group: GroupGraph, on_carbon: bool) -> tuple[float, ...]:
    """Return charges by iterative partial equalisation of orbital electronegativity.

    In round n each bond moves (χ_j − χ_i) / χ_i⁺ · ½ⁿ electrons from the less electronegative atom i, whose cation has χ⁺.

    Parameters
    ----------
    group : GroupGraph
    on_carbon : bool
        Attach the group to a methyl carbon (methylene for '*=O'); otherwise its open valence takes no part.

    Returns
    -------
    tuple of float
        (n_atoms,), in units of the elementary charge; all nan where an atom has no parameters.

    References
    ----------
    Gasteiger & Marsili, Tetrahedron 1980, 36, 3219, doi 10.1016/0040-4020(80)80168-2.
    """
    found = [find_orbital_parameters(*key) for key in zip(group.symbols, group.hybrids, group.oxos, strict=True)]
    n = len(found)
    if None in found:
        return (nan,) * n
    charges, bonds = list(group.charges), [(a, b) for a, b, _ in group.bonds]
    if on_carbon:
        pi = round(group.attached_order) - 1 if group.attached_order != 1.5 else 1
        found.append(find_orbital_parameters("C", ("sp3", "sp2", "sp")[min(pi, 2)]))
        hydrogens = max(3 - pi, 0)
        found += [find_orbital_parameters("H", "s")] * hydrogens
        charges += [0.0] * (1 + hydrogens)
        bonds += [(group.attached, n)] + [(n, n + 1 + k) for k in range(hydrogens)]
    hydrogen = find_orbital_parameters("H", "s")
    cations = [_HYDROGEN_CATION if p == hydrogen else sum(p) for p in found]
    damping = 0.5
    for _ in range(_ROUNDS):
        chi = [a + b * q + c * q * q for (a, b, c), q in zip(found, charges, strict=True)]
        for i, j in bonds:
            difference = chi[j] - chi[i]
            moved = difference / (cations[i] if difference > 0 else cations[j]) * damping
            charges[i] += moved
            charges[j] -= moved
        damping *= 0.5
    return tuple(charges[:n])


def compute_group_orbital(group: GroupGraph) -> float:
    """Return the attached atom's a + bQ + cQ² in eV, after the group's own atoms have partly equalised.

    The open valence takes no part, so that the value is the group's before it meets the site.
    """
    parameters = find_orbital_parameters(
        group.symbols[group.attached], group.hybrids[group.attached], group.oxos[group.attached]
    )
    if parameters is None:
        return nan
    charge = compute_partial_charges(group, on_carbon=False)[group.attached]
    a, b, c = parameters
    return a + b * charge + c * charge * charge


def _hybrid_pauling(group: GroupGraph, atom: int) -> float:
    """Pauling's value, moved by what hybridisation changes on Hinze and Jaffé's scale (in the same units)."""
    symbol = group.symbols[atom]
    plain = find_pauling(symbol)
    shift = compute_hinze_jaffe(symbol, group.hybrids[atom], 0) - compute_hinze_jaffe(symbol, "sp3", 0)
    return plain if shift != shift else plain + shift


def compute_attached_weighted(group: GroupGraph) -> float:
    """Return a valence value in which the attached atom weighs most, in Pauling units.

    Each atom counts with its valence as weight, each bond away from the site (a double one twice) with weight one, and
    with it what lies behind: χ(A) = (v χ_A + Σ n_j χ(j)) / (v + Σ n_j), v the number of bonds of A. The form is of the
    family of attached-atom-weighted valence scales; the printed ι values use effective nuclear charges instead.

    References
    ----------
    Wilmshurst, J. Chem. Phys. 1957, 27, 1129; Inamoto & Masuda, Tetrahedron Lett. 1977, 18, 3287 (both from memory).
    """
    depths = group.depths
    order = sorted(range(len(depths)), key=depths.__getitem__, reverse=True)
    value = [0.0] * len(depths)
    for atom in order:
        behind = [(j, n) for j, n in group.neighbours[atom] if depths[j] > depths[atom]]
        valence = sum(n for _, n in group.neighbours[atom]) + (group.attached_order if atom == group.attached else 0.0)
        weight = sum(n for _, n in behind)
        total = valence * _hybrid_pauling(group, atom) + sum(n * value[j] for j, n in behind)
        value[atom] = total / (valence + weight)
    return value[group.attached]


def compute_group_mullay(group: GroupGraph) -> float:
    """Return the attached atom's value after bond-wise equalisation with its neighbours, in Pauling units.

    Each bond moves δ = (χ_j − χ_A) / 1.5(χ_j + χ_A), the charge at which both ends agree by χ(1 + 1.5 δ); the charge that
    the attached atom so loses is shared over its valences. A simplified form of Mullay's treatment.

    References
    ----------
    Mullay, J. Am. Chem. Soc. 1985, 107, 7271 (from memory).
    """
    here = group.attached
    own = _hybrid_pauling(group, here)
    around = group.neighbours[here]
    valence = sum(n for _, n in around) + group.attached_order
    charge = 0.0
    for j, n in around:
        other = _hybrid_pauling(group, j)
        charge += n * (other - own) / (1.5 * (other + own))
    # Formal charges within a neutral group (nitro) are an artefact of drawing it with two-electron bonds.
    charge += group.charges[here] if group.charge else 0.0
    return compute_mullay(own, charge / valence)
