"""Predictions made by hand: the shifts that a test names, one scale for all, Student t with four degrees of freedom."""

from scipy.stats import t as student

from shiftpred.records import MoleculePrediction, NucleusPrediction, Peak, PeakList
from shiftpred.structures.reading import parse_structure
from shiftpred.structures.sites import compute_sites


def build_prediction(smiles, c13=(), h1=(), solvent="CDCl3", scale=(0.8, 0.10), coverage=0.9):
    """`c13` and `h1`: 0-based atom index → shift, or (shift of a, shift of b); equivalent atoms may be left out."""
    structure = parse_structure(smiles)
    sites = compute_sites(structure)
    rows = []
    for nucleus, given, size in (("13C", dict(c13), scale[0]), ("1H", dict(h1), scale[1])):
        half = size * student.ppf(0.5 + coverage / 2, 4)
        for site in sites:
            if (site.element != "C") if nucleus == "13C" else site.attached_h == 0:
                continue
            shift = next((given[j] for j in (site.atom_index, *site.equivalent) if j in given), None)
            if shift is None:
                continue
            pairs = zip(("a", "b"), shift) if isinstance(shift, tuple) else [("", shift)]
            for hydrogen, ppm in pairs:
                wide = 3.0 if nucleus == "1H" and site.labile else 1.0
                rows.append(
                    NucleusPrediction(
                        nucleus, site.atom_index, site.atom, hydrogen, site.attached_h,
                        tuple(structure.atom_numbers[j] for j in site.equivalent), ppm, ppm - half * wide, ppm + half * wide,
                        coverage, size * wide, 4.0, site.environment, nucleus == "1H" and site.labile, "",
                    )
                )  # fmt: skip
    return MoleculePrediction(structure, sites, tuple(rows), solvent, "made by hand", structure.notes)


def build_peaks(nucleus, *peaks, **keywords):
    """Numbers, or dictionaries with the fields of `Peak` (`shift_ppm`, or `lower_ppm` and `upper_ppm` for a range)."""
    out = []
    for position, one in enumerate(peaks, 1):
        fields = dict(one) if isinstance(one, dict) else {"shift_ppm": float(one)}
        if "lower_ppm" in fields:
            fields["shift_ppm"] = (fields["lower_ppm"] + fields["upper_ppm"]) / 2
        fields = {"lower_ppm": fields["shift_ppm"], "upper_ppm": fields["shift_ppm"]} | fields
        out.append(Peak(nucleus=nucleus, position=position, **fields))
    return PeakList(nucleus, tuple(out), **keywords)


# Ethyl benzoate in CDCl3, from memory: atoms 0 CH3, 1 OCH2, 2 O, 3 C=O, 4 =O, 5 ipso, 6/10 ortho, 7/9 meta, 8 para.
ETHYL_BENZOATE = "CCOC(=O)c1ccccc1"
ETHYL_BENZOATE_C13 = {0: 14.3, 1: 60.9, 3: 166.6, 5: 130.5, 6: 129.5, 7: 128.3, 8: 132.8}
ETHYL_BENZOATE_H1 = {0: 1.39, 1: 4.37, 6: 8.05, 7: 7.43, 8: 7.54}


def build_ethyl_benzoate(**keywords):
    return build_prediction(ETHYL_BENZOATE, ETHYL_BENZOATE_C13, ETHYL_BENZOATE_H1, **keywords)
