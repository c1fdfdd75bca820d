"""Search for a rotation or reflection of a molecule that carries given atoms onto given others.

A symmetry operation is an automorphism of the molecular graph together with a sign, +1 for a rotation and -1 for a
reflection, that treats every stereo element accordingly (see `shiftpred.structures.stereo_elements`). Free rotation about
single bonds, ring inversion and inversion at nitrogen are taken for granted, as on the time scale of the spectrum at room
temperature. Atoms that such an operation carries onto one another are homotopic (+1) or enantiotopic (-1).

A stereo element whose configuration is not drawn may have either: an operation that exchanges it with another one is
admitted if some choice of configurations allows it (2,3-butanediol, meso or not), and settles that choice for the searches
after it. A strict search neither exchanges true centres that are not drawn nor settles anything.
"""

from __future__ import annotations

from itertools import permutations, product

from shiftpred.structures.atom_table import AtomTable
from shiftpred.structures.stereo_elements import StereoElements, compute_parity

__all__ = ["SymmetrySearch"]

_MOST_STEPS = 20_000
_MOST_EQUAL = 5  # equal neighbours of one atom whose permutations are all tried; more occur only around metals


class SymmetrySearch:
    """Finds symmetry operations of one molecule.

    Parameters
    ----------
    table : AtomTable
    rank : list of int
        (n_atoms,) canonical rank without stereo; an operation keeps it.
    elements : StereoElements
    """

    def __init__(self, table: AtomTable, rank: list[int], elements: StereoElements):
        self.neighbours, self.rank, self.elements = table.neighbours, rank, elements
        self.handed = len(elements.tetrahedral) + sum(e.handed for e in elements.planar)

    def find(self, start: tuple[tuple[int, int], ...], sign: int, strict: bool = False) -> dict[int, int] | None:
        """Return an operation that carries each first atom of `start` onto its second, or None if there is none.

        Parameters
        ----------
        start : tuple of (int, int)
            Atoms and where they go.
        sign : {1, -1}
            Rotation or reflection.
        strict : bool
            True: true centres without drawn configuration may not be exchanged, and nothing is settled.

        Returns
        -------
        dict of int to int or None
            Where atoms go; atoms that are not named stay. None also if the search was given up as too long.
        """
        self.sign, self.strict = sign, strict
        self.image: dict[int, int] = {}
        self.source: dict[int, int] = {}
        self.open_images = 0  # atoms that others go onto while it is not known where they themselves go
        self.moved, self.fixed = [], []
        self.moved_at = self.fixed_at = 0
        self.done: list[int] = []
        self.is_done: set[int] = set()
        self.deferred: list[tuple[tuple[str, int], tuple[str, int], int]] = []
        self.checked = 0
        self.steps = 0
        for u, v in start:
            if u in self.image and self.image[u] == v:
                continue
            if u in self.image or v in self.source or self.rank[u] != self.rank[v] or not self._place(u, v):
                return None
        return self.image if self._extend() else None

    def _place(self, u, v):
        """Let atom u go onto v; False if a bond of u to an atom that is already placed is not one at v."""
        near = self.neighbours[v]
        for w in self.neighbours[u]:
            if w in self.image and self.image[w] not in near:
                return False
        if u in self.source:
            self.open_images -= 1
        self.image[u], self.source[v] = v, u
        if v not in self.image:
            self.open_images += 1
        (self.fixed if u == v else self.moved).append(u)
        return True

    def _extend(self):
        """Place the rest atom by atom; where several choices are left, try each in turn."""
        neighbours, rank, image, source = self.neighbours, self.rank, self.image, self.source
        while True:
            u = self._next()
            if u is None:
                return self._close_cycles()
            free = [w for w in neighbours[u] if w not in image]
            if free:
                targets = [x for x in neighbours[image[u]] if x not in source]
                place = {rank[x]: x for x in targets}
                if len(targets) != len(free):
                    return False
                if len(place) < len(targets):
                    return self._branch(u, free, targets)
                try:
                    pairs = [(w, place[rank[w]]) for w in free]
                except KeyError:
                    return False
            else:
                pairs = ()
            if not self._settle(u, pairs):
                return False

    def _branch(self, u, free, targets):
        """Try the ways to send the neighbours of u that are not placed yet, the one that moves least first."""
        mark = self._mark()
        for pairs in self._list_choices(free, targets):
            self.steps += 1
            if self.steps > _MOST_STEPS:
                return False
            if self._settle(u, pairs) and self._extend():
                return True
            self._undo(mark)
        return False

    def _next(self):
        """Return the next atom whose neighbours are to be placed; None if all the rest may stay where it is."""
        while self.moved_at < len(self.moved):
            u = self.moved[self.moved_at]
            self.moved_at += 1
            if u not in self.is_done and u in self.image:
                return u
        if self.open_images == 0 and (self.sign == 1 or self.checked == self.handed):
            return None
        while self.fixed_at < len(self.fixed):
            u = self.fixed[self.fixed_at]
            self.fixed_at += 1
            if u not in self.is_done:
                return u
        return None

    def _list_choices(self, free, targets):
        rank = self.rank
        groups: dict[int, tuple[list[int], list[int]]] = {}
        for w in sorted(free):
            groups.setdefault(rank[w], ([], []))[0].append(w)
        for x in sorted(targets):
            if rank[x] not in groups:
                return
            groups[rank[x]][1].append(x)
        ways = []
        for own, others in groups.values():
            if len(own) != len(others):
                return
            # Those that can stay stand at their own places, so that the first permutation keeps them.
            spare = iter([x for x in others if x not in own])
            ordered = [w if w in others else next(spare) for w in own]
            ways.append([tuple(zip(own, p)) for p in (permutations(ordered) if len(own) <= _MOST_EQUAL else (ordered,))])
        for way in product(*ways):
            yield [pair for part in way for pair in part]

    def _settle(self, u, pairs):
        """Place the neighbours of u and check the stereo elements that are complete with it."""
        for w, x in pairs:
            if not self._place(w, x):
                return False
        self.done.append(u)
        self.is_done.add(u)
        if self.image[u] != u:
            # Atoms that stay beside one that moves have to be looked at as well.
            self.moved.extend(w for w in self.neighbours[u] if self.image[w] == w and w not in self.is_done)
        return self._check_tetrahedral(u) and all(self._check_planar(k) for k in self.elements.at_atom.get(u, ()))

    def _check_tetrahedral(self, u):
        tetrahedral = self.elements.tetrahedral
        v = self.image[u]
        if u not in tetrahedral:
            return True
        self.checked += 1
        if v not in tetrahedral:
            return True
        parity = compute_parity([self.image[w] for w in self.neighbours[u]], self.neighbours[v])
        if self.strict and u != v and u in self.elements.open_centres:
            return False
        if tetrahedral[u] and tetrahedral[v]:
            return parity * tetrahedral[u] * tetrahedral[v] == self.sign
        if u == v:
            return parity == self.sign
        self.deferred.append((("tetrahedral", u), ("tetrahedral", v), parity * self.sign))
        return True

    def _check_planar(self, k):
        planar = self.elements.planar
        element = planar[k]
        a, b = element.ends
        if a not in self.is_done or b not in self.is_done:
            # The other end has to be looked at as well.
            self.moved.extend(x for x in (*element.between, b) if b not in self.is_done)
            self.moved.extend(x for x in (*element.between[::-1], a) if a not in self.is_done)
            return True
        self.checked += element.handed
        goal = (self.image[a], self.image[b])
        other = next((m for m in self.elements.at_atom.get(goal[0], ()) if set(planar[m].ends) == set(goal)), None)
        if other is None:
            return True  # another resonance form of the same bonds
        target = planar[other]
        turned = target.ends != goal
        parity = 1
        for ligands, there in zip(element.ligands, target.ligands[::-1] if turned else target.ligands):
            parity *= 1 if self.image[ligands[0]] == there[0] else -1
        wanted = self.sign if element.handed else 1
        if element.drawn and target.drawn:
            return parity * element.drawn * target.drawn == wanted
        if other == k:
            return parity == wanted
        if self.strict:
            return False
        self.deferred.append((("planar", k), ("planar", other), parity * wanted))
        return True

    def _close_cycles(self):
        """Settle elements without drawn configuration that are exchanged with others; False if no choice fits."""
        step = {source: (goal, factor) for source, goal, factor in self.deferred}
        goals = {goal for goal, _ in step.values()}
        choice: dict[tuple[str, int], int] = {}
        # Open chains (onto another component) from their first element, then closed ones from any.
        for start in sorted(step, key=lambda element: element in goals):
            if start in choice:
                continue
            chain, at, total = {start: 1}, start, 1
            while at in step:
                at, factor = step[at]
                total *= factor
                if at in chain:
                    break
                chain[at] = total
            if at == start and total != 1:
                return False
            known = {self._read(element) * factor for element, factor in chain.items()} - {0}
            if len(known) > 1:
                return False
            first = known.pop() if known else 1
            choice.update((element, first * factor) for element, factor in chain.items())
        if not self.strict:
            for (kind, place), configuration in choice.items():
                if kind == "planar":
                    self.elements.planar[place].drawn = configuration
                else:
                    self.elements.tetrahedral[place] = configuration
        return True

    def _read(self, element):
        kind, place = element
        return self.elements.planar[place].drawn if kind == "planar" else self.elements.tetrahedral[place]

    def _mark(self):
        return (
            len(self.image),
            len(self.done),
            len(self.moved),
            len(self.fixed),
            self.moved_at,
            self.fixed_at,
            len(self.deferred),
            self.checked,
            self.open_images,
        )

    def _undo(self, mark):
        placed, done, moved, fixed, self.moved_at, self.fixed_at, deferred, self.checked, self.open_images = mark
        while len(self.image) > placed:
            _, v = self.image.popitem()
            del self.source[v]
        for u in self.done[done:]:
            self.is_done.discard(u)
        del self.done[done:], self.moved[moved:], self.fixed[fixed:], self.deferred[deferred:]
