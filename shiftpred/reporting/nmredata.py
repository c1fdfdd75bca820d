r"""`compare --format nmredata`: the assignment as an NMReDATA 1.1 record.

References
----------
Pupier et al., Magn. Reson. Chem. 2018, 56, 703, doi:10.1002/mrc.4737; tags as the NMReDATA initiative publishes them.
"""

from __future__ import annotations

from decimal import Decimal

from rdkit import Chem
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from shiftpred.records import Assignment, Comparison, Peak, PeakList, Structure
from shiftpred.reporting.molfiles import render_molfile
from shiftpred.reporting.summaries.common import CAUTION
from shiftpred.reporting.wording import format_probability

__all__ = ["render_comparison_nmredata"]

_PREFIX = {"13C": "C", "1H": "H"}
_WORDS = {"br s": "bs", "sept": "hept"}
_DIGITS = 4
_GAMMA_RATIO = 0.25145
"""13C frequency over 1H frequency, as in `Settings.frequency_mhz`."""


def render_comparison_nmredata(comparison: Comparison) -> str:
    r"""Return a comparison as an NMReDATA 1.1 record.

    Parameters
    ----------
    comparison : Comparison

    Returns
    -------
    str
        One SDF record. `shiftpred.peaks.nmredata.parse_nmredata` reads back its structure, shifts, atoms, interchangeable labels
        and peaks. What the standard has no place for (numbers of coinciding carbons, C-H pairs, what a leftover line probably
        is) stands in comments. Larmor frequencies are written where they are known.

    Raises
    ------
    NotApplicable
        As `shiftpred.reporting.molfiles.render_molfile`.
    """
    labels = _build_labels(comparison.assignments)
    swaps = _list_interchangeable(comparison.assignments, labels)
    structure = comparison.structure
    parts = [
        render_molfile(structure),
        _render_tag("VERSION", ["1.1"]),
        _render_tag("LEVEL", ["1" if swaps else "0"]),
        _render_tag("ID", _list_remarks(comparison)),
        _render_tag("FORMULA", [CalcMolFormula(structure.mol)]),
    ]
    # A backslash would part the item; SMILES without stereo, which the standard asks for anyway, have none.
    parts.append(_render_tag("SMILES", [Chem.MolToSmiles(structure.mol, isomericSmiles=False)]))
    solvent = comparison.prediction.solvent or comparison.settings.solvent
    if solvent:
        parts.append(_render_tag("SOLVENT", [solvent]))
    rows = [_render_assignment(a, label, structure) for a, label in zip(comparison.assignments, labels)]
    if rows:
        parts.append(_render_tag("ASSIGNMENT", [*rows, *(f"Interchangeable={', '.join(group)}" for group in swaps)]))
    parts += [_render_spectrum(comparison, nucleus, peaks, labels) for nucleus, peaks in comparison.peaks.items()]
    return "".join(parts) + "$$$$\n"


def _render_tag(name: str, items: list[str]) -> str:
    return f">  <NMREDATA_{name}>\n" + "".join(f"{item}\\\n" for item in items) + "\n"


def _build_labels(assignments: tuple[Assignment, ...]) -> list[str]:
    """Return one label for each assignment: the element and the first atom's number, 'C7', 'H3', 'H3a'."""
    labels: list[str] = []
    for a in assignments:
        label = f"{_PREFIX[a.nucleus]}{a.atom}{a.hydrogen}"
        while label in labels:
            label += "'"
        labels.append(label)
    return labels


def _list_interchangeable(assignments, labels) -> list[tuple[str, ...]]:
    by_atom: dict[tuple[str, int], list[str]] = {}
    for a, label in zip(assignments, labels):
        for atom in a.equivalent_atoms or (a.atom,):
            by_atom.setdefault((a.nucleus, atom), []).append(label)
    groups: list[tuple[str, ...]] = []
    for a, label in zip(assignments, labels):
        others = [other for atom in a.interchangeable for other in by_atom.get((a.nucleus, atom), ())]
        group = tuple(sorted({label, *others}, key=labels.index))
        if len(group) > 1 and group not in groups:
            groups.append(group)
    return [group for group in groups if not any(set(group) < set(other) for other in groups)]


def _render_assignment(a: Assignment, label: str, structure: Structure) -> str:
    heavy = a.equivalent_atoms or (a.atom,)
    if a.nucleus == "13C":
        atoms = [str(atom) for atom in heavy]
    else:
        atoms = [text for atom in heavy for text in _name_hydrogens(atom, a, structure)]
    return f"{label}, {_plain(a.observed_ppm)}, {', '.join(atoms)}"


def _name_hydrogens(atom: int, a: Assignment, structure: Structure) -> list[str]:
    """Return 'H3', or the hydrogens' own numbers where every one on the atom is drawn and they are not told apart."""
    drawn = [number for number, bearer, isotope in structure.drawn_hydrogens if bearer == atom and isotope not in (2, 3)]
    return [str(n) for n in drawn] if not a.hydrogen and len(drawn) == a.attached_h else [f"H{atom}"]


def _render_spectrum(comparison: Comparison, nucleus: str, peaks: PeakList, labels: list[str]) -> str:
    of_peak: dict[int, list[str]] = {}
    for a, label in zip(comparison.assignments, labels):
        if a.nucleus == nucleus:
            of_peak.setdefault(a.peak, []).append(label)
    likely = {round(u.observed_ppm, 6): u.likely for u in comparison.unexplained if u.nucleus == nucleus and u.likely}
    frequency = peaks.frequency_mhz or _find_frequency(comparison, nucleus)
    items = [f"Larmor={_plain(frequency, 2)}"] if frequency else []
    if nucleus == "13C":
        items.append("Decoupled=1H")
    for k, peak in enumerate(peaks.peaks):
        remark = likely.get(round(peak.shift_ppm, 6), "") if k not in of_peak else ""
        items.append(_render_peak(peak, of_peak.get(k, []), remark))
    return _render_tag(f"1D_{nucleus}", items)


def _find_frequency(comparison: Comparison, nucleus: str) -> float | None:
    proton = comparison.settings.frequency_mhz
    if proton is None and nucleus == "13C" and "1H" in comparison.peaks:
        proton = comparison.peaks["1H"].frequency_mhz
    if proton is None:
        return None
    return proton if nucleus == "1H" else round(proton * _GAMMA_RATIO, 2)


def _render_peak(peak: Peak, labels: list[str], remark: str) -> str:
    """Return one signal; the attributes in the order that the standard names."""
    fields = [f"{_plain(peak.lower_ppm)}-{_plain(peak.upper_ppm)}" if peak.is_range else _plain(peak.shift_ppm)]
    if peak.multiplicity:
        fields.append(f"S={_WORDS.get(peak.multiplicity, peak.multiplicity)}")
    if peak.couplings_hz:
        fields.append("J=" + ", ".join(_plain(j, 2) for j in peak.couplings_hz))
    if peak.nucleus == "1H" and peak.hydrogens is not None:
        fields.append(f"N={round(peak.hydrogens)}")
    if peak.nucleus == "13C" and peak.attached_h is not None:
        fields.append(f"N={peak.attached_h}")
    if labels:
        fields.append(f"L={', '.join(labels)}")
    if peak.nucleus == "1H" and peak.hydrogens is not None and peak.hydrogens != round(peak.hydrogens):
        fields.append(f"E={_plain(peak.hydrogens, 2)}")
    aside = [f"{peak.carbons}C"] if peak.carbons else []
    aside += [f"C-H pair with {_plain(peak.pair_ppm)}"] if peak.pair_ppm is not None else []
    aside += [f"likely {_clean(remark)}"] if remark else []
    return ", ".join(fields) + (f" ; {', '.join(aside)}" if aside else "")


def _list_remarks(comparison: Comparison) -> list[str]:
    remarks = [
        f"Title={_clean(comparison.structure.name)}",
        f"Comment=assigned by shiftpred with model {_clean(comparison.prediction.model)}",
        f"Comment1=judgement {comparison.judgement}, probability {format_probability(comparison.probability)}",
    ]
    # A semicolon would begin a comment of the format: each of its parts is a remark of its own.
    remarks += [f"Comment{k}={_clean(part)}" for k, part in enumerate(CAUTION.split(";"), 2)]
    if not all(p.frequency_mhz or _find_frequency(comparison, n) for n, p in comparison.peaks.items()):
        remarks.append("Comment0=the Larmor frequency was not given")
    return remarks


def _clean(text: str) -> str:
    """Leave out what would end an item or begin a comment."""
    return " ".join(text.replace("\\", "/").replace(";", ",").split())


def _plain(value: float, digits: int = _DIGITS) -> str:
    """Return a number in full, without an exponent, with at least so many digits behind the point."""
    text = format(Decimal(repr(float(value))), "f")
    whole, _, rest = text.partition(".")
    return f"{whole}.{rest.ljust(digits, '0')}"
