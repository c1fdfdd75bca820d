"""Published additivity rules for shifts: what a chemist would estimate with a table and a pencil.

A baseline for the trained models, used where it applies and nowhere else: a site gets no value if the rule was not made for it
(a ring for the alkane rules, a fused ring for the benzene rule) or if one of its substituents is not in the table. The
increments, each with its source, are in `datasets/shift_increments`.

References
----------
Shoolery, Varian Technical Information Bulletin 1959, 2(3) (1H of CH2XY).
Williams & Fleming, Spectroscopic Methods in Organic Chemistry (1H of CHXYZ, modified Shoolery).
Beauchamp & Marquez, J. Chem. Educ. 1997, 74, 1483 (1H of sp3 carbons, alpha to gamma).
Pascual, Meier & Simon, Helv. Chim. Acta 1966, 49, 164; Matter et al., Tetrahedron 1969, 25, 691 (1H of alkenes).
Jackman & Sternhell 1969; Beeby, Sternhell et al., Anal. Chem. 1973, 45, 1571 (1H of benzenes).
Ewing, Org. Magn. Reson. 1979, 12, 499 (13C of benzenes).
Grant & Paul, J. Am. Chem. Soc. 1964, 86, 2984; Lindeman & Adams, Anal. Chem. 1971, 43, 1245 (13C of alkanes);
Clerc, Pretsch & Sternhell, 13C-Kernresonanzspektroskopie 1973 (their substituents).
Dorman, Jautelat & Roberts, J. Org. Chem. 1971, 36, 2757 (13C of alkenes).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from rdkit import Chem

from shiftpred.errors import SettingError, quote
from shiftpred.training.additivity_tables import find_group_names, find_increment, load_bases, load_increments

__all__ = ["RULES", "choose_first_rule", "predict_by_rules", "predict_each_rule"]

_SP2, _SP3 = Chem.HybridizationType.SP2, Chem.HybridizationType.SP3
_DOUBLE = Chem.BondType.DOUBLE
_GREEK = ("", "alpha", "beta", "gamma", "delta", "epsilon")
_PRIMARY = ("", "primary", "secondary", "tertiary", "quaternary")
_CIS = (Chem.BondStereo.STEREOZ, Chem.BondStereo.STEREOCIS)
_TRANS = (Chem.BondStereo.STEREOE, Chem.BondStereo.STEREOTRANS)
_LINKING = ("NR2", "NR3+", "COR")
_RING_HELD_CIS = 8
"""A double bond in a ring smaller than this is taken to be cis."""


class _Groups:
    """The molecule with the group names of its substituents; made once for all sites."""

    def __init__(self, mol: Chem.Mol):
        self.mol = mol
        self.atoms = list(mol.GetAtoms())
        self.names = find_group_names(mol)
        self.neighbours = [[x.GetIdx() for x in a.GetNeighbors()] for a in self.atoms]
        self.hydrogens = [a.GetTotalNumHs() for a in self.atoms]
        self.saturated = [a.GetAtomicNum() == 6 and a.GetHybridization() == _SP3 for a in self.atoms]
        self.in_ring = [a.IsInRing() for a in self.atoms]

    def walk(self, start: int, besides: int = -1, reach: int = 5, linking: tuple[str, ...] = ()):
        """Yield (distance, atom before, atom) along saturated carbons; what is not one of them ends its branch, unless it is
        a group of `linking`, whose saturated carbons follow."""
        seen, edge = {start, besides}, [start]
        linked: set[int] = set()
        for distance in range(1, reach + 1):
            following = []
            for i in edge:
                for j in self.neighbours[i]:
                    if j in seen or (i in linked and not self.saturated[j]):
                        continue
                    seen.add(j)
                    yield distance, i, j
                    if self.saturated[j]:
                        following.append(j)
                    elif any(name in linking for name in self.names.get((i, j), ())):
                        linked.add(j)
                        following.append(j)
            edge = following


def _sum_or_none(values) -> float | None:
    total = 0.0
    for value in values:
        if value is None:
            return None
        total += value
    return total


def _shoolery(g: _Groups, i: int) -> float | None:
    """1H of CH2XY: 0.23 + X + Y."""
    if not (g.saturated[i] and g.hydrogens[i] == 2) or g.in_ring[i] or len(g.neighbours[i]) != 2:
        return None
    scheme = ("Shoolery CH2XY",)
    total = _sum_or_none(find_increment("1H", scheme, g.names.get((i, j), ()), "alpha") for j in g.neighbours[i])
    return None if total is None else float(load_bases()["1H", scheme[0]]) + total


def _methine(g: _Groups, i: int) -> float | None:
    """1H of CHXYZ: 1.5 + X + Y + Z with the constants of the modified rule; an alkyl group counts as 0."""
    if not (g.saturated[i] and g.hydrogens[i] == 1) or g.in_ring[i] or len(g.neighbours[i]) != 3:
        return None
    scheme = ("Williams-Fleming CH2XY / CHXYZ",)
    total = _sum_or_none(
        0.0 if g.saturated[j] else find_increment("1H", scheme, g.names.get((i, j), ()), "alpha") for j in g.neighbours[i]
    )
    return None if total is None else _read_base("1H", scheme[0])["CH"] + total


def _saturated_hydrogen(g: _Groups, i: int) -> float | None:
    """1H of an sp3 carbon: 0.9, 1.2 or 1.5 for CH3, CH2, CH, and the groups at alpha, beta and gamma."""
    if not g.saturated[i] or not 1 <= g.hydrogens[i] <= 3 or g.in_ring[i]:
        return None
    scheme = "sp3 CH alpha/beta/gamma"
    total = _sum_or_none(
        find_increment("1H", (scheme,), g.names.get((before, j), ()), _GREEK[distance])
        for distance, before, j in g.walk(i, reach=3)
        if not g.saturated[j]
    )
    kind = "CH" if g.hydrogens[i] == 1 else f"CH{g.hydrogens[i]}"
    return None if total is None else _read_base("1H", scheme)[kind] + total


def _read_base(nucleus: str, scheme: str) -> dict[str, float]:
    """Read 'CH3 0.9; CH2 1.2; CH 1.5'."""
    pairs = (part.split() for part in load_bases()[nucleus, scheme].split(";"))
    return {name: float(value) for name, value in pairs}


def _olefinic_hydrogen(g: _Groups, i: int) -> float | None:
    """1H on C=C: 5.25 + gem + cis + trans; =CH2 and an unknown geometry get the mean of cis and trans."""
    partner = _find_double_bond(g, i)
    if partner is None or not g.hydrogens[i]:
        return None
    own = [j for j in g.neighbours[i] if j != partner]
    other = [j for j in g.neighbours[partner] if j != i]
    conjugating = {j for k, members in ((i, own), (partner, other)) for j in members if _conjugates(g, j)}
    terms = [_olefin_increment(g, i, j, "gem", conjugating - {j}) for j in own]
    for j in other:
        cis, trans = (_olefin_increment(g, partner, j, where, conjugating - {j}) for where in ("cis", "trans"))
        if cis is None or trans is None:
            return None
        # What is cis to the other substituent of this carbon is trans to its hydrogen.
        beside = _find_geometry(g, i, partner, own[0], j) if own else None
        terms.append((cis + trans) / 2 if beside is None else trans if beside else cis)
    total = _sum_or_none(terms)
    return None if total is None else float(load_bases()["1H", "olefin C=CH"]) + total


def _find_double_bond(g: _Groups, i: int) -> int | None:
    """Return the other carbon of an isolated or conjugated C=C (no cumulene, nothing aromatic), or None."""
    atom = g.atoms[i]
    if atom.GetAtomicNum() != 6 or atom.GetHybridization() != _SP2 or atom.GetIsAromatic():
        return None
    for bond in atom.GetBonds():
        if bond.GetBondType() == _DOUBLE:
            other = bond.GetOtherAtom(atom)
            good = other.GetAtomicNum() == 6 and other.GetHybridization() == _SP2 and not other.GetIsAromatic()
            return other.GetIdx() if good else None
    return None


def _conjugates(g: _Groups, j: int) -> bool:
    """Say whether a group conjugates with the double bond it sits on through a multiple bond of its own."""
    atom = g.atoms[j]
    return atom.GetIsAromatic() or any(b.GetBondTypeAsDouble() >= 2 for b in atom.GetBonds())


def _olefin_increment(g, parent, j, position, other_conjugating) -> float | None:
    names = g.names.get((parent, j), ())
    # The table's "(conj)" values are for a group or double bond that is conjugated further.
    further = bool(other_conjugating) or _conjugates_further(g, parent, j)
    preferred = [n + "(conj)" for n in names if further]
    return find_increment("1H", ("olefin C=CH",), tuple(preferred) + names, position)


def _conjugates_further(g: _Groups, parent: int, j: int) -> bool:
    """Say whether a group on a double bond goes on with another multiple bond (C=C-C=C, C=C-CO-Ar)."""
    beyond = set(g.neighbours[j]) - {parent}
    for bond in g.atoms[j].GetBonds():
        if bond.GetBondType() == _DOUBLE:
            far = bond.GetOtherAtomIdx(j)
            beyond = (beyond - {far}) | (set(g.neighbours[far]) - {j})
    return any(_conjugates(g, k) for k in beyond)


def _find_geometry(g: _Groups, i: int, partner: int, own: int, j: int) -> bool | None:
    """Say whether `own` (on i) and `j` (on partner) are cis; None: not known."""
    bond = g.mol.GetBondBetweenAtoms(i, partner)
    for ring in g.mol.GetRingInfo().AtomRings():
        if len(ring) < _RING_HELD_CIS and i in ring and partner in ring:
            return (own in ring) == (j in ring)
    stereo = bond.GetStereo()
    if stereo not in _CIS and stereo not in _TRANS:
        return None
    marked = set(bond.GetStereoAtoms())
    # Each exchange of a marked atom for its unmarked twin turns cis into trans.
    exchanges = (own not in marked) + (j not in marked)
    return (stereo in _CIS) == (exchanges % 2 == 0)


_BENZENE = {
    "1H": ("monosubstituted benzene (Pretsch/Hesse)", "monosubstituted benzene (Jackman-Sternhell)"),
    "13C": ("monosubstituted benzene (Hesse/Ewing)", "monosubstituted benzene (Silverstein/Levy)"),
}


def _benzene(g: _Groups, i: int, nucleus: str) -> float | None:
    """1H or 13C of a benzene ring that is not fused: 7.26 or 128.5 and ipso, ortho, meta, para increments."""
    if nucleus == "1H" and not g.hydrogens[i]:
        return None
    rings = [r for r in g.mol.GetRingInfo().AtomRings() if i in r]
    if (
        len(rings) != 1
        or len(rings[0]) != 6
        or not all(g.atoms[k].GetIsAromatic() and g.atoms[k].GetAtomicNum() == 6 for k in rings[0])
    ):
        return None
    ring, info = rings[0], g.mol.GetRingInfo()
    if any(info.NumAtomRings(k) > 1 for k in ring):
        return None
    start, terms = ring.index(i), []
    for step in range(6):
        k = ring[(start + step) % 6]
        position = ("ipso", "ortho", "meta", "para", "meta", "ortho")[step]
        for j in g.neighbours[k]:
            if j not in ring:
                terms.append(find_increment(nucleus, _BENZENE[nucleus], g.names.get((k, j), ()), position))
    total = _sum_or_none(terms)
    return None if total is None else float(load_bases()[nucleus, _BENZENE[nucleus][0]]) + total


def _alkane_carbon(g: _Groups, i: int) -> float | None:
    """13C of an open-chain sp3 carbon: -2.3, carbons from alpha to epsilon, other groups from alpha to delta, branching.

    The increments of -N< and -CO- are those of the bare groups (22.5 and 9.4 for the methyl beyond it make acetone's 29.6), so
    carbons beyond them count at their own distance; all other groups are taken with what they carry.
    Branching counts all heavy atoms on the carbon and on its neighbours. Two heteroatoms on one carbon do not add up (CF3,
    acetals): such carbons get no value.
    """
    if not g.saturated[i] or g.in_ring[i] or sum(g.atoms[j].GetAtomicNum() != 6 for j in g.neighbours[i]) > 1:
        return None
    table = load_increments()
    total = table["13C", "alkane (Grant-Paul)", "C", "base"]
    for distance, before, j in g.walk(i, linking=_LINKING):
        if g.saturated[j]:
            total += table["13C", "alkane (Grant-Paul)", "C", _GREEK[distance]]
        elif distance < 5:
            scheme = ("alkane substituent (Pretsch/Clerc)",)
            value = find_increment("13C", scheme, g.names.get((before, j), ()), _GREEK[distance])
            if value is None:
                return None
            total += value
    own = len(g.neighbours[i])
    for j in g.neighbours[i]:
        if g.saturated[j]:
            row = f"observed {_PRIMARY[own]}, attached {_PRIMARY[len(g.neighbours[j])]}"
            total += table["13C", "alkane steric correction", row, "steric"]
    return total


def _alkene_carbon(g: _Groups, i: int) -> float | None:
    """13C of an open-chain C=C: 123.3, carbons at alpha to gamma on this side and the other, other groups on the double bond
    itself, and branching. Heteroatoms at beta are not in the tables; from gamma on they are not counted."""
    partner = _find_double_bond(g, i)
    if partner is None or g.in_ring[i] or g.in_ring[partner]:
        return None
    table = load_increments()
    total, scheme = table["13C", "alkene C=C", "C", "base"], "alkene C=C"
    alkyls: dict[int, list[int]] = {i: [], partner: []}
    for start, other, prime, column in ((i, partner, "", "C1"), (partner, i, "'", "C2")):
        branches = 0
        for distance, _, j in g.walk(start, other, reach=3):
            if g.saturated[j]:
                total += table["13C", scheme, "C", _GREEK[distance] + prime]
                if distance == 1:
                    alkyls[start].append(j)
                branches += distance == 2
            elif distance == 1:
                value = find_increment("13C", ("vinyl substituent",), g.names.get((start, j), ()), column)
                if value is None:
                    return None
                total += value
            elif distance == 2:
                return None
        if start == i and branches >= 2 and len(alkyls[i]) == 1:
            total += table["13C", "alkene steric correction", "C", "two or more at C-beta"]
    if len(alkyls[i]) == 2:
        total += table["13C", "alkene steric correction", "C", "two alkyls at C1"]
    if len(alkyls[partner]) == 2:
        total += table["13C", "alkene steric correction", "C", "two alkyls at C2"]
    pairs = [_find_geometry(g, i, partner, a, b) for a in alkyls[i] for b in alkyls[partner]]
    n_cis = min(len(alkyls[i]), len(alkyls[partner])) if len(pairs) > 1 else sum(p is True for p in pairs)
    return total + n_cis * table["13C", "alkene steric correction", "C", "Z (cis) alkyls"]


RULES: dict[str, dict[str, Callable[[_Groups, int], float | None]]] = {
    "13C": {
        "benzene": lambda g, i: _benzene(g, i, "13C"),
        "alkane": _alkane_carbon,
        "alkene": _alkene_carbon,
    },
    "1H": {
        "benzene": lambda g, i: _benzene(g, i, "1H"),
        "olefin": _olefinic_hydrogen,
        "sp3 C-H": _saturated_hydrogen,
        "Shoolery": _shoolery,
        "CHXYZ": _methine,
    },
}
"""Nucleus → rules in the order in which they are asked; the first that applies gives the value. The rule that counts alpha to
gamma comes before the two that count alpha alone: on 600 CH2 of the training compounds to which both apply its mean error is
0.19 ppm against Shoolery's 0.39."""


def predict_each_rule(mol: Chem.Mol) -> dict[str, dict[str, np.ndarray]]:
    """Estimate shifts with every rule on its own.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.

    Returns
    -------
    dict
        Nucleus → rule → (n_atoms,) ppm; nan where the rule does not apply.
    """
    groups = _Groups(mol)
    return {
        nucleus: {name: np.array([_apply(rule, groups, i) for i in range(mol.GetNumAtoms())]) for name, rule in rules.items()}
        for nucleus, rules in RULES.items()
    }


def predict_by_rules(mol: Chem.Mol, nucleus: str) -> np.ndarray:
    """Estimate shifts with the first published rule that applies to each site.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
        Sanitised, hydrogens implicit.
    nucleus : {'13C', '1H'}

    Returns
    -------
    ndarray of shape (n_atoms,)
        ppm; nan where no rule applies. For 1H the value stands at the atom that bears the hydrogen.

    Raises
    ------
    SettingError
        For another nucleus.

    Examples
    --------
    >>> from rdkit import Chem
    >>> predict_by_rules(Chem.MolFromSmiles("CCCCC"), "13C").round(1)
    array([14. , 22.8, 34.7, 22.8, 14. ])
    """
    if nucleus not in RULES:
        raise SettingError("argument 'nucleus'", quote(nucleus), "'13C' or '1H'", "nucleus='13C'")
    return choose_first_rule(predict_each_rule(mol)[nucleus])


def choose_first_rule(by_rule: dict[str, np.ndarray]) -> np.ndarray:
    """Return, for each atom, the value of the first rule that has one; nan: none has."""
    out = None
    for values in by_rule.values():
        out = values.copy() if out is None else np.where(np.isnan(out), values, out)
    return out


def _apply(rule, groups: _Groups, i: int) -> float:
    if groups.atoms[i].GetAtomicNum() != 6:
        return np.nan
    value = rule(groups, i)
    return np.nan if value is None else value
