"""Bring the fitted increments into their most readable form: what is additive goes to the substituents.

The fit may credit a part of what oxygen does to the term "carbon and oxygen on one CH2", because both columns say the
same on most sites. Here every such term keeps only what is left after the best additive account of all terms of its
class; the rest moves to the base and to the single substituents. Where all terms involved are known the sum does not
change; a combination that was never seen gets the additive part.
"""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Mapping

import numpy as np

__all__ = ["compute_settled_increments", "parse_elements"]

_INNER = re.compile(r"\([^()]*\)")
_HEAD = re.compile(r"([-_=#:~][A-Za-z]{1,2}[+-]*)(?:\d+(?:r\d?)?)?(?=[-_=#:~]|$)")


def compute_settled_increments(increments: Mapping[str, float], seen: Mapping[str, float]) -> dict[str, float]:
    """Move the additive part of 'alpha atoms together' terms to the base and to the alpha substituents.

    Parameters
    ----------
    increments : mapping of str to float
        Term → ppm, as fitted; see `shiftpred.regression.substituent_model` for the terms.
    seen : mapping of str to float
        Term → number of sites it was seen on, for every term of `increments`.

    Returns
    -------
    dict of str to float
        The same terms, and an alpha term for every element of a combination.

    Examples
    --------
    >>> settled = compute_settled_increments({"C3H2&-C-O": 4.0, "C3H2&-C-C": 0.0}, {"C3H2&-C-O": 9, "C3H2&-C-C": 9})
    >>> round(abs(settled["C3H2&-C-O"]), 6), round(settled["C3H2|alpha|-O"] - settled["C3H2|alpha|-C"], 6)
    (0.0, 4.0)
    """
    out = dict(increments)
    by_class = defaultdict(list)
    for term in increments:
        if "&" in term and "&&" not in term:
            by_class[term.split("&")[0]].append(term)
    for fine, terms in by_class.items():
        found = [parse_elements(term.split("&")[1]) for term in terms]
        elements = sorted({e for each in found for e in each})
        # Columns: the base, then how often each element stands at alpha; rows weighted by what was seen.
        columns = np.array([[1.0] + [each.count(e) for e in elements] for each in found])
        root = np.sqrt([seen[t] for t in terms])
        values = np.array([increments[t] for t in terms])
        shares = np.linalg.lstsq(columns * root[:, None], values * root, rcond=None)[0]
        out[fine] = out.get(fine, 0.0) + float(shares[0])
        for element, share in zip(elements, shares[1:].tolist(), strict=True):
            key = f"{fine}|alpha|{element}"
            out[key] = out.get(key, 0.0) + share
        for term, additive in zip(terms, (columns @ shares).tolist(), strict=True):
            out[term] -= additive
    return out


def parse_elements(groups: str) -> list[str]:
    """Return the bonds and elements of several group codes written one after the other, sorted."""
    while "(" in groups:
        groups = _INNER.sub("", groups)
    return sorted(_HEAD.findall(groups))
