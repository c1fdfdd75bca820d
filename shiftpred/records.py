"""Frozen records that travel between the rooms of the package.

Under each field stand its shape, its unit and what a missing value means. Atoms carry two numbers: `atom_index`, 0-based,
into `Structure.mol`, and `atom`, 1-based, in the order of the user's own input (explicit hydrogens counted where drawn).
"""

from __future__ import annotations

from dataclasses import dataclass, field

from rdkit import Chem

NUCLEI = ("13C", "1H")


@dataclass(frozen=True)
class Structure:
    """One structure as read, ready for prediction."""

    name: str
    """The record's name, or its 1-based number as text."""
    mol: Chem.Mol
    """Sanitised; hydrogens implicit (drawn hydrogens and isotopes of hydrogen folded in); charge-separated and
    pentavalent drawings of one group brought to one form; stereo assigned. One or several components."""
    atom_numbers: tuple[int, ...]
    """(n_atoms,) the user's 1-based number of each atom of `mol`."""
    text: str
    """The text or file name that was given."""
    deuterium: tuple[int, ...] = ()
    """(n_atoms,) deuterium atoms on each atom; they are counted among the hydrogens of `mol`. Empty: none."""
    notes: tuple[str, ...] = ()
    """What was noticed while reading (salt, metal, isotopes, no coordinates, …), in words."""
    drawn_hydrogens: tuple[tuple[int, int, int], ...] = ()
    """(the user's number of a drawn hydrogen, that of the atom that bears it, isotope or 0), ascending. Empty: none drawn."""

    def __post_init__(self):
        if len(self.atom_numbers) != self.mol.GetNumAtoms():
            raise ValueError(f"{len(self.atom_numbers)} atom numbers for {self.mol.GetNumAtoms()} atoms")
        if self.deuterium and len(self.deuterium) != self.mol.GetNumAtoms():
            raise ValueError(f"{len(self.deuterium)} deuterium counts for {self.mol.GetNumAtoms()} atoms")

    @property
    def n_atoms(self) -> int:
        return self.mol.GetNumAtoms()

    @property
    def smiles(self) -> str:
        """Canonical isomeric SMILES."""
        return Chem.MolToSmiles(self.mol)


@dataclass(frozen=True)
class Site:
    """One heavy atom and its attached hydrogens."""

    atom_index: int
    """0-based, into `Structure.mol`."""
    atom: int
    """The user's 1-based number."""
    element: str
    attached_h: int
    """Hydrogens on the atom, deuterium not counted."""
    deuterium: int
    equivalent: tuple[int, ...]
    """0-based indices of all homotopic and enantiotopic atoms, itself among them, ascending."""
    diastereotopic: tuple[int, ...]
    """0-based indices of atoms that are constitutionally the same but diastereotopic to it (valine's methyls, the two
    N-CH3 of a tertiary amide): one line or two. Empty: none."""
    geminal_differ: bool
    """True for a CH2 (or NH2 of an amide) whose two hydrogens are diastereotopic: rows `a` and `b`."""
    labile: bool
    """True for a hydrogen on O, N, S, Se or P that may exchange: anywhere, broad, or absent."""
    environment: str
    """Environment class, for instance 'sp3 CH2, on O' (see `shiftpred.structures.environments`)."""


@dataclass(frozen=True)
class NucleusPrediction:
    """One predicted shift: a row of `predict`'s table."""

    nucleus: str
    atom_index: int
    atom: int
    hydrogen: str
    """'' or, for the two non-equivalent hydrogens of a CH2, 'a' and 'b'."""
    attached_h: int
    equivalent_atoms: tuple[int, ...]
    """The user's numbers of all equivalent atoms, itself among them."""
    shift_ppm: float
    lower_ppm: float
    upper_ppm: float
    coverage: float
    scale_ppm: float
    """Scale of the Student t distribution of (observed - shift_ppm), calibrated."""
    degrees_of_freedom: float
    """Of the same Student t distribution."""
    environment: str
    labile: bool
    note: str
    """'' or words: unlike the training data, labile, coincides, …"""
    measured_ppm: float = 0.0
    """Part of `shift_ppm` that comes from training atoms measured in the same surroundings."""
    measured_sites: int = 0
    """How many such atoms there are; 0: none."""
    measured_bonds: int = 0
    """Bonds out to which their surroundings are the same."""


@dataclass(frozen=True)
class MoleculePrediction:
    """All predicted shifts of one structure."""

    structure: Structure
    sites: tuple[Site, ...]
    """(n_atoms,) one for each atom of `structure.mol`, in its order."""
    nuclei: tuple[NucleusPrediction, ...]
    """Every carbon, then every hydrogen-bearing site, each atom of an equivalent set with a row of its own."""
    solvent: str | None
    """Short name of the solvent that was asked for; None: not given."""
    model: str
    """Edition of the model bundle."""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class RecordFailure:
    """A record that could not be read: one row with only `molecule` and `note`."""

    name: str
    error: Exception


@dataclass(frozen=True)
class Peak:
    """One observed line (13C) or multiplet (1H) as the user gave it."""

    nucleus: str
    shift_ppm: float
    """Centre; of a range, its middle (never used as a centre, see `lower_ppm`)."""
    lower_ppm: float
    """Lower end of a range; equal to `shift_ppm` where one number was given."""
    upper_ppm: float
    hydrogens: float | None = None
    """1H: integral as a number of hydrogens (2H). None: not given."""
    attached_h: int | None = None
    """13C: hydrogens on the carbon (DEPT, HSQC, multiplicity letter). None: not given."""
    carbons: int | None = None
    """13C: number of coinciding carbons (2C). None: not given."""
    multiplicity: str | None = None
    """s, d, t, q, m, br s, dd, …; None: not given."""
    couplings_hz: tuple[float, ...] = ()
    pair_ppm: float | None = None
    """The other nucleus' shift of a C-H pair (HSQC). None: not given."""
    assignment: tuple[int, ...] = ()
    """The user's own atom numbers for the peak. Empty: not given."""
    position: int = 0
    """1-based place in the list as given."""
    text: str = ""
    """As written."""

    @property
    def is_range(self) -> bool:
        return self.upper_ppm > self.lower_ppm


@dataclass(frozen=True)
class PeakList:
    """A peak list as read."""

    nucleus: str
    peaks: tuple[Peak, ...]
    solvent: str | None = None
    """Short name found in the heading of journal text. None: not stated."""
    frequency_mhz: float | None = None
    """Spectrometer frequency of this nucleus found in the heading. None: not stated."""
    text: str = ""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Settings:
    """What a run was asked for; every default filled in; goes into JSON and HTML."""

    solvent: str | None = None
    coverage: float = 0.9
    nucleus: str = "both"
    frequency_mhz: float | None = None
    """1H frequency of the spectrometer; the 13C frequency is 0.25145 times as large. None: not given."""
    rivals: int = 9
    """Most rivals that are tried."""
    mass_confirmed: bool = False
    """True: only isomers are rivals."""
    prior: float = 0.5
    """Probability of the proposed structure before the peaks are seen."""
    expected: tuple[str, ...] = ()
    """SMILES of what else may be in the tube."""


@dataclass(frozen=True)
class Assignment:
    """One observed peak on one set of equivalent nuclei."""

    nucleus: str
    atom: int
    equivalent_atoms: tuple[int, ...]
    hydrogen: str
    attached_h: int
    shift_ppm: float
    lower_ppm: float
    upper_ppm: float
    observed_ppm: float
    deviation_ppm: float
    """observed - predicted, after the reference offset."""
    within_interval: bool
    probability: float
    """That this peak belongs to these nuclei and to no others."""
    interchangeable: tuple[int, ...]
    """The user's numbers of atoms that could as well have this peak. Empty: none."""
    peak: int
    """Index into the nucleus' peak list (0-based)."""
    note: str = ""


@dataclass(frozen=True)
class Unexplained:
    """An observed line that no nucleus of the structure takes."""

    nucleus: str
    observed_ppm: float
    likely: str | None
    """What it probably is ('solvent CDCl3', 'water', 'ethyl acetate'). None: nothing known fits."""
    note: str = ""


@dataclass(frozen=True)
class Missing:
    """Expected nuclei without an observed line."""

    nucleus: str
    atom: int
    equivalent_atoms: tuple[int, ...]
    hydrogen: str
    attached_h: int
    shift_ppm: float
    lower_ppm: float
    upper_ppm: float
    note: str
    """Why that may be (labile, under the solvent, quaternary, split by fluorine, …); '' where nothing excuses it."""


@dataclass(frozen=True)
class Rival:
    """A structure that could be in the tube instead."""

    smiles: str
    how: str
    """In words: 'methyl walked to position 3', 'hydrolysed ester', …"""
    kind: str
    """'isomer', 'stereoisomer', 'tautomer', 'reaction', 'candidate'."""
    probability: float | None = None
    log_likelihood: float | None = None
    decided_by: str = ""
    """Lines or experiment that would tell it from the proposal."""


@dataclass(frozen=True)
class Balance:
    """Expected, found, missing and surplus carbons or hydrogens."""

    nucleus: str
    expected: float
    found: float
    missing: float
    excess: float
    labile: float = 0.0


@dataclass(frozen=True)
class Comparison:
    """Whether the peaks bear the structure out, and why."""

    structure: Structure
    settings: Settings
    judgement: str
    """'supported', 'open' or 'contradicted'."""
    reason_code: str
    """Machine-readable reason of an open judgement: 'too_little_evidence', 'rival_fits', 'mixture_or_salt',
    'outside_training_data'; otherwise ''."""
    probability: float
    likelihood_ratio: float
    """Likelihood of the proposal over that of its nearest rival."""
    reasons: tuple[str, ...]
    """In words with numbers, the weightiest first."""
    assignments: tuple[Assignment, ...]
    unexplained: tuple[Unexplained, ...]
    missing: tuple[Missing, ...]
    balance: tuple[Balance, ...]
    reference_offset_ppm: dict[str, float]
    rivals: tuple[Rival, ...]
    cautions: tuple[str, ...]
    prediction: MoleculePrediction
    peaks: dict[str, PeakList] = field(default_factory=dict)
    input_hash: str = ""
    """SHA-256 of structure text and peak texts."""
    steps: tuple[str, ...] = ()
    """What each step did, with counts and settings."""

    def to_dict(self) -> dict:
        """The versioned JSON form (see the README)."""
        from shiftpred.reporting import compute_comparison_dict

        return compute_comparison_dict(self)

    def to_nmredata(self) -> str:
        """The NMReDATA record (SDF, version 1.1)."""
        from shiftpred.reporting import render_comparison_nmredata

        return render_comparison_nmredata(self)

    def to_html(self) -> str:
        """The self-contained HTML report."""
        from shiftpred.reporting import render_comparison_html

        return render_comparison_html(self)

    def _repr_html_(self) -> str:
        """The report as Jupyter shows it."""
        from shiftpred.reporting import render_notebook_frame

        return render_notebook_frame(self.to_html())


@dataclass(frozen=True)
class RankedCandidate:
    """One structure of a list of candidates, judged against the same peaks as the others."""

    candidate: int
    """0-based position in the list as given."""
    structure: Structure
    probability: float
    """That this one is in the tube; with `Ranking.none_of_these` all candidates add up to 1."""
    misfit: float
    """How badly the peaks fit: minus the log likelihood, smaller is better; differences mean something, sizes do not."""
    assignments: tuple[Assignment, ...] = ()
    unexplained: tuple[Unexplained, ...] = ()
    missing: tuple[Missing, ...] = ()
    decided_by: str = ""
    """Lines or experiment that would tell it from the first one; '' for the first."""
    note: str = ""


@dataclass(frozen=True)
class Ranking:
    """A list of candidates, best first."""

    candidates: tuple[RankedCandidate, ...]
    none_of_these: float
    """Probability that the right structure is not in the list."""
    settings: Settings
    model: str
    """Edition of the model bundle."""
    reasons: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    peaks: dict[str, PeakList] = field(default_factory=dict)
    input_hash: str = ""
    """SHA-256 of structure texts and peak texts."""
    steps: tuple[str, ...] = ()
    failures: tuple[RecordFailure, ...] = ()
    """Candidates that could not be read; their positions count all the same."""

    def _repr_html_(self) -> str:
        """The report as Jupyter shows it."""
        from shiftpred.reporting import render_notebook_frame, render_ranking_html

        return render_notebook_frame(render_ranking_html(self))


@dataclass(frozen=True)
class Contribution:
    """One line of an explanation."""

    label: str
    """'base: sp3 CH2', 'alpha acetoxy', 'environment model, remainder', …"""
    kind: str
    """'base', 'substituent', 'solvent', 'measured' or 'remainder'."""
    position: str
    """'alpha', 'beta', 'gamma' or ''."""
    group: str
    """Canonical SMILES of the substituent with '*', or ''."""
    atoms: tuple[int, ...]
    """The user's numbers of the substituent's atoms."""
    constants: dict[str, float]
    """Name of each constant that was used and its value."""
    contribution_ppm: float
    flag: str = ""
    """'large remainder' where the remainder is beyond what is usual; otherwise ''."""


@dataclass(frozen=True)
class Explanation:
    """Why a shift lies where it lies; contributions add up to `shift_ppm` exactly."""

    structure: Structure
    nucleus: str
    atom_index: int
    atom: int
    shift_ppm: float
    lower_ppm: float
    upper_ppm: float
    coverage: float
    contributions: tuple[Contribution, ...]
    model: str
    notes: tuple[str, ...] = ()

    def _repr_html_(self) -> str:
        """The report as Jupyter shows it."""
        from shiftpred.reporting import render_explanation_html, render_notebook_frame

        return render_notebook_frame(render_explanation_html(self), height=820)
