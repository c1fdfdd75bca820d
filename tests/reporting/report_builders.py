"""Hand-made records: ethyl benzoate wet with ethyl acetate, against phenyl propanoate.

Observed shifts of ethyl benzoate are from memory (within 0.3 ppm for 13C and 0.05 ppm for 1H); ethyl acetate's are from
Fulmer et al., Organometallics 2010, 29, 2176 (CDCl3). Predicted shifts, intervals and probabilities are made up.
"""

from __future__ import annotations

from dataclasses import replace

from rdkit import Chem

from shiftpred.records import (
    Assignment,
    Balance,
    Comparison,
    Contribution,
    Explanation,
    Missing,
    MoleculePrediction,
    NucleusPrediction,
    Peak,
    PeakList,
    RankedCandidate,
    Ranking,
    Rival,
    Settings,
    Structure,
    Unexplained,
)

ETHYL_BENZOATE = "CCOC(=O)c1ccccc1"
PHENYL_PROPANOATE = "CCC(=O)Oc1ccccc1"
C13_TEXT = "13C NMR (101 MHz, CDCl3) δ 171.4, 166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 60.5, 21.0, 14.3, 14.2"
H1_TEXT = "δ 8.04 (m, 2H), 7.58–7.50 (m, 1H), 7.43 (t, J = 7.6 Hz, 2H), 4.38 (q, J = 7.1 Hz, 2H), 1.39 (t, J = 7.1 Hz, 3H)"

# atoms, predicted, half interval, hydrogens, environment, observed 13C
CARBONS = [
    ((4,), 166.2, 2.1, 0, "carboxyl carbon", 166.6),
    ((9,), 133.0, 1.6, 1, "aromatic CH", 132.8),
    ((6,), 130.4, 2.4, 0, "aromatic C", 130.5),
    ((7, 11), 129.6, 1.4, 1, "aromatic CH", 129.5),
    ((8, 10), 128.4, 1.4, 1, "aromatic CH", 128.3),
    ((2,), 60.8, 1.7, 2, "sp3 CH2, on O", 60.9),
    ((1,), 14.3, 1.2, 3, "sp3 CH3", 14.3),
]
HYDROGENS = [
    ((7, 11), 8.05, 0.20, 1, "aromatic CH", 8.04),
    ((9,), 7.55, 0.21, 1, "aromatic CH", 7.54),
    ((8, 10), 7.44, 0.19, 1, "aromatic CH", 7.43),
    ((2,), 4.37, 0.22, 2, "sp3 CH2, on O", 4.38),
    ((1,), 1.38, 0.17, 3, "sp3 CH3", 1.39),
]


def build_structure(smiles: str = ETHYL_BENZOATE, name: str = "ethyl benzoate", notes: tuple[str, ...] = ()) -> Structure:
    """Return a structure numbered in the order of its SMILES."""
    mol = Chem.MolFromSmiles(smiles)
    return Structure(name, mol, tuple(range(1, mol.GetNumAtoms() + 1)), smiles, (), notes)


def build_prediction(structure: Structure | None = None, **changes) -> MoleculePrediction:
    """Return ethyl benzoate's prediction, one row an atom."""
    structure = structure or build_structure()
    nuclei = []
    for nucleus, table in (("13C", CARBONS), ("1H", HYDROGENS)):
        for atoms, shift, half, attached, environment, _ in table:
            for atom in atoms:
                nuclei.append(
                    NucleusPrediction(
                        nucleus=nucleus,
                        atom_index=atom - 1,
                        atom=atom,
                        hydrogen="",
                        attached_h=attached,
                        equivalent_atoms=atoms,
                        shift_ppm=shift,
                        lower_ppm=round(shift - half, 3),
                        upper_ppm=round(shift + half, 3),
                        coverage=0.9,
                        scale_ppm=half / 2,
                        degrees_of_freedom=4.0,
                        environment=environment,
                        labile=False,
                        note="",
                    )
                )
    return replace(MoleculePrediction(structure, (), tuple(nuclei), "CDCl3", "2025-edition-1"), **changes)


def build_peak_list(nucleus: str, text: str, shifts, ranges=None) -> PeakList:
    """Return a peak list with one peak a shift; `ranges` maps a shift to its two ends."""
    peaks = []
    for position, ppm in enumerate(shifts, start=1):
        lower, upper = (ranges or {}).get(ppm, (ppm, ppm))
        peaks.append(Peak(nucleus, ppm, lower, upper, position=position, text=str(ppm)))
    return PeakList(nucleus, tuple(peaks), "CDCl3", 101.0 if nucleus == "13C" else 400.0, text)


def build_assignments(nucleus: str, table, shifts, outside=()) -> tuple[Assignment, ...]:
    """Assign each row's own line; rows whose first atom is in `outside` are reported outside their interval."""
    entries = []
    for atoms, shift, half, attached, _, observed in table:
        entries.append(
            Assignment(
                nucleus=nucleus,
                atom=atoms[0],
                equivalent_atoms=atoms,
                hydrogen="",
                attached_h=attached,
                shift_ppm=shift,
                lower_ppm=shift - half,
                upper_ppm=shift + half,
                observed_ppm=observed,
                deviation_ppm=observed - shift - 0.02,
                within_interval=atoms[0] not in outside,
                probability=0.62 if atoms[0] in (7, 8) else 0.985,
                interchangeable=(8, 10) if atoms[0] == 7 else (7, 11) if atoms[0] == 8 else (),
                peak=shifts.index(observed),
                note="two coinciding carbons" if len(atoms) == 2 and nucleus == "13C" else "",
            )
        )
    return tuple(entries)


C13_SHIFTS = [171.4, 166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 60.5, 21.0, 14.3, 14.2]
H1_SHIFTS = [8.04, 7.54, 7.43, 4.38, 1.39]


def build_supported(**changes) -> Comparison:
    """Return ethyl benzoate, wet with ethyl acetate, supported."""
    comparison = Comparison(
        structure=build_structure(),
        settings=Settings(solvent="CDCl3", frequency_mhz=400.0),
        judgement="supported",
        reason_code="",
        probability=0.9731,
        likelihood_ratio=3812.4,
        reasons=(
            "All 7 kinds of carbon have a line inside their 90 % interval; mean difference 0.13 ppm.",
            "The nearest rival, phenyl propanoate, fits 3,800 times worse: it needs a carbon near 150 ppm (ipso C-O), "
            "and none is there.",
            "4 leftover lines are all of ethyl acetate in CDCl3.",
        ),
        assignments=build_assignments("13C", CARBONS, C13_SHIFTS) + build_assignments("1H", HYDROGENS, H1_SHIFTS),
        unexplained=tuple(
            Unexplained("13C", ppm, "ethyl acetate", "one of a set of 4 lines") for ppm in (171.4, 60.5, 21.0, 14.2)
        ),
        missing=(),
        balance=(Balance("13C", 9, 9, 0, 0), Balance("1H", 10, 10, 0, 0)),
        reference_offset_ppm={"13C": 0.02, "1H": 0.004},
        rivals=(
            Rival(
                PHENYL_PROPANOATE,
                "ester turned round: phenyl propanoate",
                "isomer",
                0.0003,
                -61.2,
                "13C 60.9 (O-CH2, predicted 27.7 in the rival) and a C-O carbon near 150.8",
            ),
            Rival("CCc1ccccc1C(=O)O", "2-ethylbenzoic acid", "isomer", 0.00001, -88.0, "13C 60.9; DEPT counts six CH"),
            Rival("O=C(O)c1ccccc1", "hydrolysed ester", "reaction", 0.00002, -80.5, "the lines 60.9 and 14.3"),
        ),
        cautions=("Two pairs of lines (129.5, 128.3) may be interchanged.",),
        prediction=build_prediction(),
        peaks={
            "13C": build_peak_list("13C", C13_TEXT, C13_SHIFTS),
            "1H": build_peak_list("1H", H1_TEXT, H1_SHIFTS, {7.54: (7.50, 7.58)}),
        },
        input_hash="5f" * 32,
        steps=(
            "Read 1 structure (11 heavy atoms) and 2 peak lists (11 lines of 13C, 5 of 1H).",
            "Predicted 9 carbons and 5 kinds of hydrogen, coverage 0.9, solvent CDCl3.",
            "Tried 3 rivals: 2 isomers, 1 by reaction.",
        ),
    )
    return replace(comparison, **changes)


def build_contradicted() -> Comparison:
    """Return phenyl propanoate against the same 13C list: contradicted."""
    structure = build_structure(PHENYL_PROPANOATE, "phenyl propanoate")
    table = [
        ((3,), 172.9, 2.0, 0, "carboxyl carbon", 171.4),
        ((7, 11), 121.6, 1.6, 1, "aromatic CH", 128.3),
        ((8, 10), 129.4, 1.2, 1, "aromatic CH", 129.5),
        ((9,), 125.8, 1.8, 1, "aromatic CH", 130.5),
        ((2,), 27.8, 1.9, 2, "sp3 CH2", 21.0),
        ((1,), 9.1, 1.4, 3, "sp3 CH3", 14.3),
    ]
    return Comparison(
        structure=structure,
        settings=Settings(solvent="CDCl3"),
        judgement="contradicted",
        reason_code="",
        probability=0.0004,
        likelihood_ratio=0.00026,
        reasons=(
            "Nothing near 150.8 ppm for atom 6 (ipso C-O).",
            "60.9 ppm is left over, and nothing known fits.",
            "4 of 6 assigned lines lie outside their interval; the worst, 128.3 ppm on atoms 7, 11, by 4.2 half widths.",
        ),
        assignments=build_assignments("13C", table, C13_SHIFTS, outside=(7, 9, 2, 1)),
        unexplained=(
            Unexplained("13C", 166.6, None),
            Unexplained("13C", 132.8, None),
            Unexplained("13C", 60.9, None),
            Unexplained("13C", 60.5, "ethyl acetate", "its other lines are taken"),
            Unexplained("13C", 14.2, None),
        ),
        missing=(Missing("13C", 6, (6,), "", 0, 150.8, 148.9, 152.7, ""),),
        balance=(Balance("13C", 9, 8, 1, 4),),
        reference_offset_ppm={"13C": 0.0},
        rivals=(Rival(ETHYL_BENZOATE, "ester turned round: ethyl benzoate", "isomer", 0.96, -20.1, "13C 60.9"),),
        cautions=(),
        prediction=build_prediction(structure, nuclei=()),
        peaks={"13C": build_peak_list("13C", C13_TEXT, C13_SHIFTS)},
        input_hash="a0" * 32,
    )


def build_open(name: str = "ethyl benzoate") -> Comparison:
    """Return an open case: a rival fits as well, one carbon is missing with an excuse, one end is unbounded."""
    base = build_supported()
    return replace(
        base,
        structure=build_structure(name=name),
        judgement="open",
        reason_code="rival_fits",
        probability=0.48,
        likelihood_ratio=1.1,
        assignments=tuple(
            replace(a, upper_ppm=float("inf")) if a.atom == 2 and a.nucleus == "1H" else a
            for a in base.assignments
            if not (a.nucleus == "13C" and a.atom == 6)
        ),
        missing=(Missing("13C", 6, (6,), "", 0, 130.4, 128.0, 132.8, "quaternary: may be too weak to see"),),
    )


def build_explanation(nucleus: str = "13C") -> Explanation:
    """Return why the O-CH2 lies where it lies; the parts add up exactly."""
    parts = (
        Contribution("base: sp3 CH2", "base", "", "", (), {}, 26.4),
        Contribution(
            "alpha benzoyloxy", "substituent", "alpha", "*OC(=O)c1ccccc1", (3, 4, 5, 6), {"sigma_I": 0.36, "chi": 3.51}, 38.7
        ),
        Contribution("alpha methyl", "substituent", "alpha", "*C", (1,), {"sigma_I": -0.01}, -2.9),
        Contribution("beta C(=O)Ph", "substituent", "beta", "*C(=O)c1ccccc1", (4, 5, 6), {"sigma_I": 0.28}, -2.2),
        Contribution("solvent CDCl3", "solvent", "", "", (), {}, 0.3),
        Contribution("environment model, remainder", "remainder", "", "", (), {}, 0.5, "large remainder"),
    )
    scale = 1.0 if nucleus == "13C" else 0.07
    parts = tuple(replace(p, contribution_ppm=p.contribution_ppm * scale) for p in parts)
    total = sum(p.contribution_ppm for p in parts)
    half = 1.7 * scale
    return Explanation(build_structure(), nucleus, 1, 2, total, total - half, total + half, 0.9, parts, "2025-edition-1")


def build_ranking() -> Ranking:
    """Return ethyl benzoate before phenyl propanoate."""
    right, wrong = build_supported(), build_contradicted()
    return Ranking(
        candidates=(
            RankedCandidate(1, right.structure, 0.962, 20.1, right.assignments, right.unexplained, right.missing),
            RankedCandidate(
                0, wrong.structure, 0.0003, 61.2, wrong.assignments, wrong.unexplained, wrong.missing, "13C 60.9 and 150.8"
            ),
        ),
        none_of_these=0.0377,
        settings=Settings(solvent="CDCl3"),
        model="2025-edition-1",
        reasons=("The first fits 10^17 times better than the second.",),
        peaks=right.peaks,
        input_hash="0b" * 32,
    )
