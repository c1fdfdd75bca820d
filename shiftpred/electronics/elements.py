"""Electronegativity scales of the elements, computed from their physical inputs."""

from __future__ import annotations

from functools import lru_cache

from rdkit import Chem

from shiftpred.electronics.constants import SourcedConstant
from shiftpred.electronics.pauling_scale import compute_pauling_scale
from shiftpred.electronics.sourced_tables import load_element_values, load_rows
from shiftpred.errors import NotApplicable, SettingError, quote

__all__ = [
    "compute_allen",
    "compute_allred_rochow",
    "compute_mulliken_absolute",
    "compute_mulliken_pauling_units",
    "compute_sanderson_ratio",
    "compute_slater_effective_charge",
    "element_scales",
]

_KJ_PER_EV = 96.485

# Order in which shells fill (Madelung), and the neutral atoms that do otherwise: what they move from s (or f) to d.
_FILLING = ("1s", "2s", "2p", "3s", "3p", "4s", "3d", "4p", "5s", "4d", "5p", "6s", "4f", "5d", "6p", "7s", "5f", "6d", "7p")
_CAPACITY = {"s": 2, "p": 6, "d": 10, "f": 14}
_MOVED = {
    **dict.fromkeys((24, 29), (("4s", "3d", 1),)),
    **dict.fromkeys((41, 42, 44, 45, 47), (("5s", "4d", 1),)),
    46: (("5s", "4d", 2),),
    **dict.fromkeys((57, 58, 64), (("4f", "5d", 1),)),
    **dict.fromkeys((78, 79), (("6s", "5d", 1),)),
    **dict.fromkeys((89, 91, 92, 93, 96), (("5f", "6d", 1),)),
    90: (("5f", "6d", 2),),
    103: (("6d", "7p", 1),),
}


def compute_mulliken_absolute(ionisation_energy: float, electron_affinity: float) -> float:
    """Return ½(IE + EA), in the unit of its arguments.

    References
    ----------
    Mulliken, J. Chem. Phys. 1934, 2, 782, doi 10.1063/1.1749394.
    """
    return (ionisation_energy + electron_affinity) / 2


def compute_mulliken_pauling_units(ionisation_energy: float, electron_affinity: float, unit: str = "eV") -> float:
    """Return Mulliken's electronegativity in Pauling units.

    Parameters
    ----------
    ionisation_energy, electron_affinity : float
        In `unit`.
    unit : {'eV', 'kJ/mol'}, default 'eV'
        0.187 (IE + EA) + 0.17 in eV, 1.97·10⁻³ (IE + EA) + 0.19 in kJ/mol; the two published lines differ by up to 0.06
        at H to F.

    Returns
    -------
    float

    Raises
    ------
    SettingError
        If `unit` is another.
    """
    total = ionisation_energy + electron_affinity
    if unit == "eV":
        return 0.187 * total + 0.17
    if unit == "kJ/mol":
        return 1.97e-3 * total + 0.19
    raise SettingError("argument 'unit'", quote(unit), "'eV' or 'kJ/mol'", "unit='eV'")


@lru_cache(maxsize=128)
def _configuration(atomic_number: int) -> dict[str, int]:
    left, filled = atomic_number, {}
    for shell in _FILLING:
        filled[shell] = min(left, _CAPACITY[shell[1]])
        left -= filled[shell]
    for source, target, n in _MOVED.get(atomic_number, ()):
        filled[source] -= n
        filled[target] += n
    return {shell: n for shell, n in filled.items() if n}


def compute_slater_effective_charge(symbol: str, for_added_electron: bool = False) -> float:
    """Return Z_eff for the outermost electron by Slater's rules: s or p, in palladium 4d.

    Parameters
    ----------
    symbol : str
    for_added_electron : bool, default False
        Count every electron of the valence shell as screening (0.35), as Allred and Rochow do, for whom the electron
        that is felt comes from outside; otherwise one fewer.

    Returns
    -------
    float
        In elementary charges.

    Raises
    ------
    NotApplicable
        If the symbol is no element up to Lr.

    References
    ----------
    Slater, Phys. Rev. 1930, 36, 57, doi 10.1103/PhysRev.36.57.

    Examples
    --------
    >>> round(compute_slater_effective_charge("C"), 2), round(compute_slater_effective_charge("F"), 2)
    (3.25, 5.2)
    """
    z = _atomic_number(symbol)
    shells = _configuration(z)
    outer = max(int(shell[0]) for shell in shells if shell[1] in "sp")
    if n_d := shells.get(f"{outer}d", 0):  # Palladium, whose outermost electrons are 4d: the next one would be 5s.
        return z - 0.85 * 18 - (z - 18) if for_added_electron else z - 0.35 * (n_d - 1) - (z - n_d)
    same = sum(n for shell, n in shells.items() if int(shell[0]) == outer and shell[1] in "sp")
    inside = sum(n for shell, n in shells.items() if int(shell[0]) == outer - 1)
    deeper = z - same - inside - sum(n for s, n in shells.items() if int(s[0]) >= outer and s[1] in "df")
    if outer == 1:
        return z - 0.30 * (same - (not for_added_electron))
    return z - 0.35 * (same - (not for_added_electron)) - 0.85 * inside - deeper


def compute_allred_rochow(symbol: str, radius_pm: float | None = None) -> float:
    """Return 3590 Z_eff / r² + 0.744 in Pauling units.

    Parameters
    ----------
    symbol : str
    radius_pm : float or None, default None
        Covalent radius in pm; by default Pauling's, which Allred and Rochow used (non-metals), else Cordero's (2008):
        with radii as short as Cordero's 57 pm for fluorine the same formula gives 6.1. It was never meant for hydrogen.

    Returns
    -------
    float

    Raises
    ------
    NotApplicable
        If the element has no radius in the table.

    References
    ----------
    Allred & Rochow, J. Inorg. Nucl. Chem. 1958, 5, 264, doi 10.1016/0022-1902(58)80003-2.
    """
    if radius_pm is None:
        radius_pm = load_element_values("covalent_radius", "Pauling 1960").get(symbol)
        radius_pm = radius_pm or _require("covalent_radius", "Cordero 2008", symbol, "covalent radius")
    return 3590 * compute_slater_effective_charge(symbol, for_added_electron=True) / radius_pm**2 + 0.744


_WITHOUT_ALLRED_ROCHOW = ("H", "He", "Ne", "Ar", "Kr", "Xe", "Rn")
"""They have no covalent radius of the kind that the formula was drawn up with (fluorine's was 72 pm, not 57)."""
_NOBLE = (("He", 2), ("Ne", 10), ("Ar", 18), ("Kr", 36), ("Xe", 54), ("Rn", 86))


def compute_sanderson_ratio(symbol: str) -> float:
    """Return Sanderson's stability ratio, the atom's electron density over that of a noble gas with as many electrons.

    Densities are Z / (4π/3 r³) with Pyykkö's single-bond radii; the noble gas's is interpolated linearly in Z between its
    two neighbours. The tabulated Sanderson electronegativities come from his own radii: same order, other numbers.

    Parameters
    ----------
    symbol : str

    Returns
    -------
    float
        Dimensionless, about 1 for halogens.

    Raises
    ------
    NotApplicable
        If the element has no radius, or lies beyond radon or before helium.

    References
    ----------
    Sanderson, Science 1951, 114, 670, doi 10.1126/science.114.2973.670.
    """
    z = _atomic_number(symbol)
    radius = _require("covalent_radius", "Pyykko 2009 (single bond)", symbol, "covalent radius")
    for (low, z_low), (high, z_high) in zip(_NOBLE, _NOBLE[1:], strict=False):
        if z_low <= z <= z_high:
            below, above = (
                n / _require("covalent_radius", "Pyykko 2009 (single bond)", gas, "covalent radius") ** 3
                for gas, n in ((low, z_low), (high, z_high))
            )
            return z / radius**3 / (below + (above - below) * (z - z_low) / (z_high - z_low))
    raise NotApplicable(
        f"element {symbol!r}", "an atom outside helium to radon", "one within", "another scale for this element"
    )


def compute_allen(configuration_energy: float) -> float:
    """Return 0.169 × the mean energy of the valence electrons (eV), in Pauling units.

    References
    ----------
    Allen, J. Am. Chem. Soc. 1989, 111, 9003, doi 10.1021/ja00207a003.
    """
    return 0.169 * configuration_energy


def _atomic_number(symbol: str) -> int:
    try:
        z = Chem.GetPeriodicTable().GetAtomicNumber(symbol)
    except RuntimeError:
        z = 0
    if not 0 < z <= 103:
        raise NotApplicable(f"element {quote(symbol)}", "no element up to Lr", "a chemical symbol", "'Cl', not 'CL'")
    return z


def _require(element_property: str, scale: str, symbol: str, what: str) -> float:
    _atomic_number(symbol)
    value = load_element_values(element_property, scale).get(symbol)
    if value is None:
        raise NotApplicable(
            f"element {symbol!r}", f"no {what} in the table", "an element with one", "another scale for this element"
        )
    return value


@lru_cache(maxsize=128)
def element_scales(symbol: str) -> tuple[SourcedConstant, ...]:
    """Return an element on every scale, published values and computed ones side by side.

    Parameters
    ----------
    symbol : str

    Returns
    -------
    tuple of SourcedConstant
        Scales for which an input is missing are absent.

    Raises
    ------
    NotApplicable
        If the symbol is no element up to Lr.
    """
    _atomic_number(symbol)
    found = [
        SourcedConstant(
            row["property"],
            row["scale"],
            float(row["value"]),
            row["unit"],
            row["source"],
            "published",
            row["verified"],
            row["note"],
        )
        for row in load_rows("elements")
        if row["symbol"] == symbol and row["property"] == "electronegativity" and row["value"]
    ]

    def add(scale: str, value: float, unit: str, source: str) -> None:
        found.append(SourcedConstant("electronegativity", scale, value, unit, source, "computed", "computed"))

    for mean in ("arithmetic", "geometric"):
        value = compute_pauling_scale(mean).get(symbol)
        if value is not None:
            inputs = f"least squares over the bonds of bond_energies.csv, {mean} mean, H = 2.20"
            add(f"Pauling from bond energies ({mean} mean)", value, "Pauling units", inputs)
    energy = load_element_values("ionisation_energy_1", "NIST ASD").get(symbol)
    affinity = load_element_values("electron_affinity", "evaluated").get(symbol)
    if energy is not None and affinity is not None:
        inputs = f"IE {energy:g} eV (NIST), EA {affinity:g} eV (evaluated)"
        add("Mulliken absolute", compute_mulliken_absolute(energy, affinity), "eV", f"(IE + EA)/2; {inputs}")
        value = compute_mulliken_pauling_units(energy, affinity)
        add("Mulliken in Pauling units (eV line)", value, "Pauling units", f"0.187 (IE + EA) + 0.17; {inputs}")
        value = compute_mulliken_pauling_units(energy * _KJ_PER_EV, affinity * _KJ_PER_EV, "kJ/mol")
        add("Mulliken in Pauling units (kJ/mol line)", value, "Pauling units", f"0.00197 (IE + EA) + 0.19; {inputs}")
    radii = {name: load_element_values("covalent_radius", name).get(symbol) for name in ("Pauling 1960", "Cordero 2008")}
    source, radius = next(((name, value) for name, value in radii.items() if value), ("", None))
    if radius is not None and symbol not in _WITHOUT_ALLRED_ROCHOW:
        charge = compute_slater_effective_charge(symbol, for_added_electron=True)
        inputs = f"Slater Z_eff {charge:.2f}, radius {radius:g} pm ({source})"
        add("Allred-Rochow", compute_allred_rochow(symbol), "Pauling units", f"3590 Z_eff/r² + 0.744; {inputs}")
    if symbol != "H" and _atomic_number(symbol) <= 86 and radii["Cordero 2008"]:
        inputs = "Z/r³ over that of the noble gases, Pyykkö's single-bond radii (2009)"
        add("Sanderson stability ratio", compute_sanderson_ratio(symbol), "dimensionless", inputs)
    configuration = load_element_values("configuration_energy", "Allen").get(symbol)
    if configuration is not None:
        add("Allen", compute_allen(configuration), "Pauling units", f"0.169 × configuration energy {configuration:g} eV")
    return tuple(found)
