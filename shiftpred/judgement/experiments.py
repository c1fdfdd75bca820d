"""Which common experiment tells two structures apart, in a chemist's words."""

from __future__ import annotations

from collections import Counter

import numpy as np
from rdkit import Chem
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from shiftpred.records import MoleculePrediction, NucleusPrediction

__all__ = ["propose_experiment"]

_ORTHO_HZ, _META_HZ = "about 8 Hz", "about 2 Hz"
"""Couplings of benzene hydrogens over three and four bonds (from memory)."""
_CLEAR_CARBON_PPM = 4.0
"""Difference of predicted 13C shifts from which an HMBC partner is told apart (common practice, no source)."""


def propose_experiment(proposal: MoleculePrediction, rival: MoleculePrediction) -> str:
    """Name an experiment that tells the proposal from a rival; '' if they are the same.

    Parameters
    ----------
    proposal, rival : MoleculePrediction
        Predictions for both nuclei.

    Returns
    -------
    str
        Tried in this order: mass, hydrogen counts (DEPT or HSQC), E/Z couplings, NOE from a methyl or methylene on an aromatic
        ring, splitting of the benzene hydrogens, HMBC, NOE for relative configuration.
    """
    if proposal.structure.smiles == rival.structure.smiles:
        return ""
    for propose in (
        _by_mass,
        _by_hydrogen_counts,
        _by_double_bond,
        _by_overhauser,
        _by_splitting,
        _by_long_range,
        _by_configuration,
    ):
        text = propose(proposal, rival)
        if text:
            return text
    return ""


def _formula(prediction: MoleculePrediction) -> str:
    return CalcMolFormula(prediction.structure.mol)


def _by_mass(proposal, rival) -> str:
    ours, theirs = _formula(proposal), _formula(rival)
    if ours != theirs:
        return f"a mass spectrum decides ({ours} against {theirs})"
    return ""


def _count_by_hydrogens(prediction) -> Counter:
    return Counter(s.attached_h for s in prediction.sites if s.element == "C")


def _by_hydrogen_counts(proposal, rival) -> str:
    ours, theirs = _count_by_hydrogens(proposal), _count_by_hydrogens(rival)
    names = {0: "carbons without hydrogen", 1: "CH", 2: "CH2", 3: "CH3"}
    different = [h for h in (3, 2, 1, 0) if ours[h] != theirs[h]]
    if not different:
        return ""
    parts = [f"{ours[h]} against {theirs[h]} {names[h]}" for h in different]
    return f"a DEPT or an edited HSQC decides ({', '.join(parts)})"


def _same_constitution(proposal, rival) -> bool:
    return Chem.MolToSmiles(proposal.structure.mol, isomericSmiles=False) == Chem.MolToSmiles(
        rival.structure.mol, isomericSmiles=False
    )


def _by_double_bond(proposal, rival) -> str:
    if not _same_constitution(proposal, rival):
        return ""
    ours, theirs = (_double_bond_kinds(p.structure.mol) for p in (proposal, rival))
    if ours == theirs:
        return ""
    if any(both for _, both in ours | theirs):
        if _has_only_alike_ends(proposal):
            return (
                "the coupling across the double bond decides (about 16 Hz for trans, about 10 Hz for cis), read from the 13C "
                "satellites in the 1H spectrum, as its two hydrogens are equivalent"
            )
        return "the coupling across the double bond decides (about 16 Hz for trans, about 10 Hz for cis)"
    return "an NOE across the double bond decides (between groups on the same side)"


def _has_only_alike_ends(prediction) -> bool:
    """Tell whether the two hydrogens are equivalent at every CH=CH with a configuration, so that they do not split each other."""
    pairs = [
        (bond.GetBeginAtom(), bond.GetEndAtom())
        for bond in prediction.structure.mol.GetBonds()
        if bond.GetStereo() > Chem.BondStereo.STEREOANY
    ]
    pairs = [(a.GetIdx(), b.GetIdx()) for a, b in pairs if a.GetTotalNumHs() == 1 and b.GetTotalNumHs() == 1]
    return all(prediction.sites[a].equivalent == prediction.sites[b].equivalent for a, b in pairs)


def _double_bond_kinds(mol) -> set[tuple]:
    """Return {((geometry, number of such bonds), whether both ends bear one hydrogen)}."""
    found = Counter()
    for bond in mol.GetBonds():
        if bond.GetStereo() > Chem.BondStereo.STEREOANY:
            both = bond.GetBeginAtom().GetTotalNumHs() == 1 and bond.GetEndAtom().GetTotalNumHs() == 1
            found[str(bond.GetStereo()), both] += 1
    return {((kind, number), both) for (kind, both), number in found.items()}


def _by_overhauser(proposal, rival) -> str:
    """From O-CH3, N-CH3, CH3 or OCH2 on an aromatic ring to the ortho hydrogen: what does it look like in each?"""
    ours, theirs = _ortho_neighbours(proposal), _ortho_neighbours(rival)
    for name in ("O-CH3", "N-CH3", "S-CH3", "CH3", "O-CH2", "N-CH2", "CH2"):
        if name in ours and name in theirs and ours[name] != theirs[name]:
            return f"an NOE from {name} decides: to {_join(ours[name])} in the proposal, to {_join(theirs[name])} in the rival"
    return ""


def _ortho_neighbours(prediction) -> dict[str, tuple[str, ...]]:
    mol = prediction.structure.mol
    found: dict[str, set[str]] = {}
    for atom in mol.GetAtoms():
        if atom.GetAtomicNum() != 6 or atom.GetIsAromatic() or atom.GetTotalNumHs() not in (2, 3) or atom.IsInRing():
            continue
        group = "CH3" if atom.GetTotalNumHs() == 3 else "CH2"
        for neighbour in atom.GetNeighbors():
            if neighbour.GetIsAromatic():
                linker = f"{neighbour.GetSymbol()}-" if neighbour.GetAtomicNum() != 6 else ""
                found.setdefault(linker + group, set()).update(_describe_ortho(mol, neighbour, atom))
            elif neighbour.GetSymbol() in "ONS" and not neighbour.IsInRing():
                for ring_atom in neighbour.GetNeighbors():
                    if ring_atom.GetIsAromatic():
                        found.setdefault(f"{neighbour.GetSymbol()}-{group}", set()).update(
                            _describe_ortho(mol, ring_atom, neighbour)
                        )
    return {name: tuple(sorted(words)) for name, words in found.items()}


def _by_splitting(proposal, rival) -> str:
    """Count the hydrogens of the benzene rings by the large couplings that split them: 1,3 and 1,4 look different."""
    ours, theirs = _benzene_splittings(proposal), _benzene_splittings(rival)
    if ours == theirs:
        return ""
    return (
        f"the splitting of the aromatic hydrogens in the 1H spectrum decides: {_describe_splittings(ours)} in the proposal, "
        f"{_describe_splittings(theirs)} in the rival (counting couplings of {_ORTHO_HZ} only)"
    )


def _benzene_splittings(prediction) -> Counter:
    """Return 'singlet', 'doublet', 'triplet' → number of hydrogens on benzene rings with so many ortho hydrogens."""
    mol = prediction.structure.mol
    found: Counter = Counter()
    for ring in mol.GetRingInfo().AtomRings():
        atoms = [mol.GetAtomWithIdx(i) for i in ring]
        if len(ring) == 6 and all(a.GetIsAromatic() and a.GetAtomicNum() == 6 for a in atoms):
            for place, atom in enumerate(atoms):
                if atom.GetTotalNumHs() == 1:
                    beside = (atoms[place - 1], atoms[(place + 1) % 6])
                    found[("singlet", "doublet", "triplet")[sum(a.GetTotalNumHs() for a in beside)]] += 1
    return found


def _describe_splittings(found: Counter) -> str:
    return " and ".join(f"{name} ({n}H)" for name, n in sorted(found.items())) or "no aromatic hydrogen"


def _describe_ortho(mol, ring_atom, substituent) -> set[str]:
    """Describe the lines of the hydrogens on the ring atoms next to `ring_atom`."""
    words = set()
    for ortho in ring_atom.GetNeighbors():
        if not ortho.GetIsAromatic() or ortho.GetIdx() == substituent.GetIdx():
            continue
        if ortho.GetTotalNumHs() == 0:
            words.add("no ortho hydrogen on one side")
            continue
        ring = next((r for r in mol.GetRingInfo().AtomRings() if ring_atom.GetIdx() in r and ortho.GetIdx() in r), ())
        if len(ring) != 6:
            words.add("an ortho hydrogen of the smaller ring")
            continue
        place = ring.index(ortho.GetIdx())
        around = [mol.GetAtomWithIdx(ring[(place + step) % 6]) for step in (-2, -1, 1, 2)]
        beside = [a for a in (around[1], around[2]) if a.GetTotalNumHs()]
        across = [a for a in (around[0], around[3]) if a.GetTotalNumHs()]
        if len(beside) == 2:
            words.add("a triplet of " + _ORTHO_HZ)
        elif beside:
            words.add("a doublet of " + _ORTHO_HZ)
        elif across:
            words.add("a doublet of " + _META_HZ)
        else:
            words.add("a singlet")
    return words


def _join(words: tuple[str, ...]) -> str:
    plain = [w for w in words if not w.startswith("no ortho")]
    if not plain:
        return "no aromatic hydrogen"
    return " and ".join(plain)


def _by_long_range(proposal, rival) -> str:
    """HMBC: the hydrogens whose carbons two and three bonds away differ most in predicted shift."""
    if _same_constitution(proposal, rival):
        return ""
    best = None
    ours, theirs = _long_range_partners(proposal), _long_range_partners(rival)
    for name in sorted(set(ours) & set(theirs)):
        for a in ours[name]:
            for b in theirs[name]:
                gap = _set_distance(a[1], b[1])
                if gap < _CLEAR_CARBON_PPM:
                    break  # some hydrogens of that kind look the same in both: no decision from them
                if best is None or gap > best[0] + 1e-9:
                    best = (gap, name, a, b)
            else:
                continue
            break
    if best is None:
        return "an HMBC decides the position (two- and three-bond partners of the hydrogens)"
    _, name, a, b = best
    return (
        f"an HMBC from {name} (1H near {a[0]:.1f}) decides: to carbons near {_list(a[1])} in the proposal, "
        f"near {_list(b[1])} in the rival"
    )


def _long_range_partners(prediction: MoleculePrediction) -> dict[str, list[tuple[float, tuple[float, ...]]]]:
    """Return kind of hydrogen → [(its shift, shifts of the carbons two and three bonds from it)] for its CH3 and CH2 groups."""
    mol = prediction.structure.mol
    carbon, hydrogen = _shifts(prediction, "13C"), _shifts(prediction, "1H")
    found: dict[str, dict] = {}
    for atom in mol.GetAtoms():
        index, n_h = atom.GetIdx(), atom.GetTotalNumHs()
        if atom.GetAtomicNum() != 6 or n_h == 0 or index not in hydrogen:
            continue
        hetero = sorted(n.GetSymbol() for n in atom.GetNeighbors() if n.GetAtomicNum() != 6)
        kind = {1: "CH", 2: "CH2", 3: "CH3"}.get(n_h, "CH4")
        name = f"{hetero[0]}-{kind}" if hetero and not atom.GetIsAromatic() else kind
        if atom.GetIsAromatic():
            name = "aromatic CH"
        near = {n.GetIdx() for n in atom.GetNeighbors()}
        far = {m.GetIdx() for i in near for m in mol.GetAtomWithIdx(i).GetNeighbors()} | near
        partners = tuple(sorted(round(carbon[i], 1) for i in far - {index} if i in carbon))
        found.setdefault(name, {})[prediction.sites[index].equivalent] = (hydrogen[index], partners)
    return {name: sorted(groups.values()) for name, groups in found.items() if len(groups) <= 2}


def _shifts(prediction: MoleculePrediction, nucleus: str) -> dict[int, float]:
    rows: dict[int, list[NucleusPrediction]] = {}
    for row in prediction.nuclei:
        if row.nucleus == nucleus:
            rows.setdefault(row.atom_index, []).append(row)
    return {i: float(np.mean([r.shift_ppm for r in found])) for i, found in rows.items()}


def _set_distance(a: tuple[float, ...], b: tuple[float, ...]) -> float:
    """Return the largest distance of a member of one set from the nearest of the other."""
    if not a or not b:
        return 30.0 if a or b else 0.0
    x, y = np.array(a), np.array(b)
    gap = np.abs(x[:, None] - y[None, :])
    return float(max(gap.min(axis=1).max(), gap.min(axis=0).max()))


def _list(shifts: tuple[float, ...]) -> str:
    return ", ".join(f"{s:.0f}" for s in sorted(shifts, reverse=True)) or "none"


def _by_configuration(proposal, rival) -> str:
    if _same_constitution(proposal, rival):
        return "an NOE between groups on the same face, or the vicinal couplings, decide the relative configuration"
    return ""
