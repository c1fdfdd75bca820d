"""Turn a level-2 group code into a small real group, the one whose electronic constants stand for it.

Rule for large groups. The model knows a group out to its gamma atoms (attached atom, its neighbours, theirs). What lies
further out is replaced by hydrogen, except that an aromatic ring is never cut: it is completed to the plain ring
(phenyl, pyridyl, furyl, …) that has the same atoms next to the point of attachment. Of a ring that the site itself
belongs to, the group unrolls the far side; its aromatic bonds alternate, so benzene's ortho carbon counts as a propenyl
group, pyridine's nitrogen as a ethylideneamino group, furan's oxygen as a vinyloxy group. Acetoxy, nitro, tert-butyl,
methoxycarbonyl, benzyl and their like are kept whole by this.
"""

from __future__ import annotations

import re
from functools import lru_cache

from rdkit import Chem, rdBase

__all__ = ["build_model_group"]

_ORDER = {"-": 1, "_": 1, ":": 1, "=": 2, "#": 3, "~": 1}
_TYPE = {1: Chem.BondType.SINGLE, 2: Chem.BondType.DOUBLE, 3: Chem.BondType.TRIPLE}
_NODE = re.compile(r"([-_=#:~])([A-Za-z]{1,2}?)([+-]*)(?:(\d+)(?:r(\d?))?)?(?=[()]|$)")


class _Node:
    """One atom of a parsed code."""

    __slots__ = ("bond", "symbol", "charge", "hydrogens", "ring", "children")

    def __init__(self, bond, symbol, charge, hydrogens, ring):
        self.bond, self.symbol, self.charge = bond, symbol, charge
        self.hydrogens, self.ring = hydrogens, ring
        self.children: list[_Node] = []

    @property
    def aromatic(self) -> bool:
        return self.symbol[0].islower()

    @property
    def takes_double(self) -> bool:
        """True for an aromatic atom that has a double bond within the ring in some Kekulé form."""
        if self.symbol == "c":
            return not self.charge and all(child.bond != "=" for child in self.children)
        if self.symbol == "n":
            three_bonds = self.hydrogens or self.behind(False) or len(self.children) > 1
            return bool(self.charge) == bool(three_bonds)
        return False

    def behind(self, aromatic: bool) -> list[_Node]:
        return [child for child in self.children if (child.bond == ":") == aromatic]


@lru_cache(maxsize=200_000)
def build_model_group(code: str) -> str | None:
    """Return the small group that stands for a level-2 code.

    Parameters
    ----------
    code : str
        Level-2 code, see `shiftpred.substituents.group_codes`.

    Returns
    -------
    str or None
        Canonical SMILES with one '*'; None where no sensible molecule can be built (dative bonds, odd valences).

    Examples
    --------
    >>> build_model_group("-O0(-C0(-C)(=O))"), build_model_group(":c1r6(:c1r6(:c))")
    ('*OC(C)=O', '*C=CC')
    """
    root = _parse(code)
    for plain_rings in (False, True):
        builder = _Builder(plain_rings)
        builder.add(0, root, depth=0, in_tree=root.bond == ":")
        smiles = builder.finish()
        if smiles:
            return smiles
    return None


def _parse(code: str) -> _Node:
    position, stack, root = 0, [], None
    while position < len(code):
        if code[position] == "(":
            position += 1
        elif code[position] == ")":
            stack.pop()
            position += 1
            continue
        match = _NODE.match(code, position)
        if not match:
            raise ValueError(f"not a group code: {code!r} at {position}")
        bond, symbol, sign, hydrogens, ring = match.groups()
        charge = len(sign) if sign.startswith("+") else -len(sign)
        node = _Node(bond, symbol, charge, None if hydrogens is None else int(hydrogens), int(ring or 0))
        if stack:
            stack[-1].children.append(node)
        else:
            root = node
        stack.append(node)
        position = match.end()
    return root


class _Builder:
    """Grows the molecule atom by atom."""

    def __init__(self, plain_rings: bool):
        self.mol = Chem.RWMol()
        self.mol.AddAtom(Chem.Atom(0))
        self.plain_rings = plain_rings
        self.open_nitrogens: list[int] = []

    def atom(self, symbol: str, charge: int = 0, hydrogens: int | None = None, aromatic: bool = False) -> int:
        atom = Chem.Atom(symbol.capitalize())
        atom.SetFormalCharge(charge)
        atom.SetIsAromatic(aromatic)
        if hydrogens is not None:
            atom.SetNoImplicit(True)
            atom.SetNumExplicitHs(hydrogens)
        return self.mol.AddAtom(atom)

    def add(self, parent: int, node: _Node, depth: int, in_tree: bool, order: int | None = None) -> None:
        """Attach `node` and what is behind it; `in_tree`: aromatic atoms of the site's own ring, unrolled."""
        order = order or _ORDER[node.bond]
        if node.aromatic and node.bond != ":" and not in_tree:
            self.add_ring(parent, node, depth)
            return
        if depth == 2 and node.symbol == "N" and node.charge == 1 and order == 1:
            # Cut off behind a cationic nitrogen: a nitro group by far the most often.
            centre = self.atom("N", 1)
            self.mol.AddBond(parent, centre, Chem.BondType.SINGLE)
            for charge, kind in ((0, Chem.BondType.DOUBLE), (-1, Chem.BondType.SINGLE)):
                self.mol.AddBond(centre, self.atom("O", charge), kind)
            return
        known = None if node.aromatic or depth == 2 else node.hydrogens
        here = self.atom(node.symbol, node.charge, known)
        self.mol.AddBond(parent, here, _TYPE[order])
        double = node.aromatic and order == 1 and node.takes_double
        for child in node.children:
            child_order = None
            if child.bond == ":" and double and child.takes_double:
                child_order, double = 2, False
            self.add(here, child, depth + 1, in_tree=child.bond == ":", order=child_order)

    def add_ring(self, parent: int, node: _Node, depth: int) -> None:
        """Attach a complete aromatic ring with what is known of its atoms next to the point of attachment."""
        sides = node.behind(True)[:2]
        # (symbol, non-aromatic neighbours) of the two ortho atoms, and the symbols of the two meta atoms.
        ortho = [(side.symbol, side.hydrogens, side.behind(False)) for side in sides]
        ortho += [("c", None, [])] * (2 - len(ortho))
        meta = [(side.behind(True) or [None])[0] for side in sides] + [None, None]
        meta = [child.symbol if child else "c" for child in meta[:2]]
        root = node.symbol
        five = node.ring == 5 and (
            root == "n" or any(symbol in ("n", "o", "s", "se") for symbol in [*meta, *[o[0] for o in ortho]])
        )
        if self.plain_rings:
            root, five, meta = "c", False, ["c", "c"]
            ortho = [("c", None, behind) for _, _, behind in ortho]
        ring = [self.ring_atom(root)]
        ring += [self.ring_atom(ortho[0][0], ortho[0][1]), self.ring_atom(meta[0])]
        if not five:
            ring.append(self.ring_atom("c"))
        ring += [self.ring_atom(meta[1]), self.ring_atom(ortho[1][0], ortho[1][1])]
        for a, b in zip(ring, ring[1:] + ring[:1], strict=True):
            self.mol.AddBond(a, b, Chem.BondType.AROMATIC)
        self.mol.AddBond(parent, ring[0], Chem.BondType.SINGLE)
        if depth < 2:
            for atom, (_, _, behind) in ((ring[1], ortho[0]), (ring[-1], ortho[1])):
                for child in behind:
                    self.add(atom, child, depth + 2, in_tree=False)

    def ring_atom(self, symbol: str, hydrogens: int | None = None) -> int:
        here = self.atom(symbol, aromatic=True)
        if symbol == "n":
            if hydrogens:
                self.mol.GetAtomWithIdx(here).SetNumExplicitHs(1)
            else:
                self.open_nitrogens.append(here)
        return here

    def finish(self) -> str | None:
        """Return the canonical SMILES; a ring nitrogen gets its hydrogen where the ring needs one."""
        with rdBase.BlockLogs():
            for with_hydrogen in (None, *self.open_nitrogens):
                mol = Chem.RWMol(self.mol)
                if with_hydrogen is not None:
                    if mol.GetAtomWithIdx(with_hydrogen).GetDegree() > 2:
                        continue
                    mol.GetAtomWithIdx(with_hydrogen).SetNumExplicitHs(1)
                try:
                    Chem.SanitizeMol(mol)
                except (ValueError, RuntimeError):
                    continue
                # Read back, so that the text is the canonical one of a molecule read from SMILES.
                again = Chem.MolFromSmiles(Chem.MolToSmiles(mol))
                return None if again is None else Chem.MolToSmiles(again)
        return None
