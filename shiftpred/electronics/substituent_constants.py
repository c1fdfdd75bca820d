"""Everything that is known or computed of one group, each number with scale, unit and source."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from html import escape
from math import isfinite, nan

from shiftpred.electronics import group_electronegativity as methods
from shiftpred.electronics.constants import SourcedConstant
from shiftpred.electronics.group_graph import GroupGraph, parse_group
from shiftpred.electronics.inductive import compute_topological
from shiftpred.electronics.orbital_electronegativity import compute_hinze_jaffe
from shiftpred.electronics.published import find_published_rows
from shiftpred.electronics.resonance import compute_resonance
from shiftpred.electronics.sourced_tables import load_rows
from shiftpred.errors import NotApplicable, quote

__all__ = ["SubstituentConstants", "UndefinedConstant", "render_substituent_text", "substituent"]

_PUBLISHED_NAMES = ("sigma_meta", "sigma_para", "F", "R", "sigma_I", "sigma_star")
_SCALES = {
    "sigma_meta": "Hammett",
    "sigma_para": "Hammett",
    "F": "field, Swain-Lupton type",
    "R": "resonance, Swain-Lupton type",
    "sigma_I": "inductive, Taft/Charton type",
    "sigma_star": "polar, Taft",
}
_LOCAL_ONLY = "no published value is at hand, and no model of it is kept here"
_MODELS = {
    "sigma_I": (
        "topological model",
        "Σ σ_A/r² over the atoms (after Cherkasov & Galkin), σ_A fitted here to published sigma_I, sigma* and F",
    ),
    "sigma_star": (
        "topological model",
        "Σ σ_A/r² over the atoms (after Cherkasov & Galkin), σ_A fitted here to published sigma_I, sigma* and F",
    ),
    "R": ("additive model", "attached atom and what it is conjugated with, terms fitted here to published R"),
}


@dataclass(frozen=True)
class UndefinedConstant:
    """A constant that this group does not have here."""

    name: str
    scale: str
    reason: str


@dataclass(frozen=True)
class SubstituentConstants:
    """All constants of one group."""

    smiles: str
    """Canonical SMILES with one '*'."""
    values: tuple[SourcedConstant, ...]
    """Electronegativities first, then the constants; of one name published values stand before computed ones."""
    undefined: tuple[UndefinedConstant, ...]

    def get(self, name: str, scale: str | None = None) -> SourcedConstant | None:
        """Return the first value of a name (and scale, if given); published wins, computed stands in; None if neither."""
        return next((v for v in self.values if v.name == name and scale in (None, v.scale)), None)

    def __str__(self) -> str:
        return render_substituent_text(self).rstrip("\n")

    def _repr_html_(self) -> str:
        """The constants as a table, as Jupyter shows them."""
        heads = ("constant", "value", "unit", "scale", "origin", "source")
        rows = [(v.name, f"{v.value:.3f}", v.unit, v.scale, v.origin, v.source) for v in self.values]
        rows += [(u.name, "not defined", "", u.scale, "", u.reason) for u in self.undefined]
        lines = ["<tr>" + "".join(f"<td style='text-align:left'>{escape(str(c))}</td>" for c in row) + "</tr>" for row in rows]
        head = "".join(f"<th style='text-align:left'>{name}</th>" for name in heads)
        return f"<table><caption>{escape(self.smiles)}</caption><thead><tr>{head}</tr></thead><tbody>{''.join(lines)}</tbody></table>"

    def to_dict(self) -> dict[str, object]:
        """Return plain dictionaries, lists, texts and numbers."""
        return {
            "smiles": self.smiles,
            "values": [value.to_dict() for value in self.values],
            "undefined": [{"name": u.name, "scale": u.scale, "reason": u.reason} for u in self.undefined],
        }


@lru_cache(maxsize=5_000)
def substituent(smiles: str) -> SubstituentConstants:
    """Return a group on every electronegativity scale, with its inductive and resonance constants.

    Parameters
    ----------
    smiles : str
        SMILES with one '*' where the group is attached, such as '*OC(C)=O'. Groups that are drawn with charges but are
        neutral as a whole (nitro, azide, isocyanide, diazo) are fine.

    Returns
    -------
    SubstituentConstants
        What cannot be had is listed in `undefined` with its reason.

    Raises
    ------
    StructureError
        If the text cannot be read or an atom has an impossible valence.
    NotApplicable
        If there is not exactly one '*', or the group is charged, a radical or organometallic and in no table.

    Examples
    --------
    >>> nitro = substituent("*[N+](=O)[O-]")
    >>> nitro.get("sigma_para").value, nitro.get("sigma_para").origin
    (0.78, 'published')
    """
    group = parse_group(smiles)
    rows = find_published_rows(group.smiles)
    obstacle = _find_obstacle(group)
    if obstacle and not rows:
        raise NotApplicable(
            f"group {quote(smiles)}",
            obstacle,
            "a neutral group without unpaired electrons or metals, or a charged one that a published table has",
            "the group in the protonation state in which it is neutral"
            if group.charge
            else "the group with its bonds complete"
            if group.radicals
            else "the organic part alone",
        )
    values, undefined = [], []
    for item in (*_compute_electronegativities(group), *_find_constants(group, rows, obstacle)):
        (undefined if isinstance(item, UndefinedConstant) else values).append(item)
    resonance = _compute_sigma_r(values, obstacle)
    (undefined if isinstance(resonance, UndefinedConstant) else values).append(resonance)
    names = list(dict.fromkeys(value.name for value in values))
    values.sort(key=lambda value: names.index(value.name))  # stable: keeps the order within a name
    return SubstituentConstants(group.smiles, tuple(values), tuple(undefined))


def _find_obstacle(group: GroupGraph) -> str:
    if group.radicals:
        return "a radical: an unpaired electron besides the point of attachment"
    if group.charge:
        return f"a group of charge {group.charge:+d}: its effect depends on solvent and counter-ion"
    if group.metals:
        return f"an organometallic group ({', '.join(group.metals)}): the methods were made for non-metals"
    return ""


def _compute_electronegativities(group: GroupGraph) -> Iterator[SourcedConstant | UndefinedConstant]:
    here = group.attached
    symbol, hybrid, oxo = group.symbols[here], group.hybrids[here], group.oxos[here]
    for row in load_rows("elements"):
        if row["symbol"] == symbol and row["scale"] == "Pauling (Allred 1961)":
            yield SourcedConstant(
                "electronegativity of the attached atom",
                row["scale"],
                float(row["value"]),
                row["unit"],
                row["source"],
                "published",
                row["verified"],
                symbol,
            )
    yield from _published_electronegativities(group)
    orbital = ("Hinze-Jaffé orbital value", "Pauling units", f"0.336 (a − 0.615), a of {symbol} {hybrid} in eV (from memory)")
    pauling = "Allred's (1961) values"
    for name, (scale, unit, source), value in (
        ("electronegativity of the attached atom", orbital, lambda: compute_hinze_jaffe(symbol, hybrid, oxo)),
        (
            "group electronegativity",
            ("Bratsch harmonic mean", "Pauling units", f"(N + charge)/Σ(1/χ) over all atoms, {pauling}"),
            lambda: methods.compute_harmonic_mean(group),
        ),
        (
            "group electronegativity",
            ("Sanderson geometric mean", "Sanderson units", "geometric mean over all atoms, Sanderson's values (from memory)"),
            lambda: nan if group.charge else methods.compute_geometric_mean(group),
        ),
        (
            "group electronegativity",
            ("partial equalisation", "eV", "a + bQ + cQ² of the attached atom in the group (Gasteiger & Marsili 1980)"),
            lambda: methods.compute_group_orbital(group),
        ),
        (
            "group electronegativity",
            (
                "attached-atom-weighted valence value",
                "Pauling units",
                f"(vχ + Σnχ')/(v + Σn), {pauling} moved by hybridisation (form after Wilmshurst; Inamoto & Masuda)",
            ),
            lambda: methods.compute_attached_weighted(group),
        ),
        (
            "group electronegativity",
            ("Mullay, bond by bond", "Pauling units", f"χ(1 + 1.5 δ) of the attached atom, {pauling} moved by hybridisation"),
            lambda: methods.compute_group_mullay(group),
        ),
        (
            "partial charge of the attached atom",
            (
                "partial equalisation on a methyl carbon",
                "e",
                "six rounds, Gasteiger & Marsili 1980 (parameters from memory)",
            ),
            lambda: methods.compute_partial_charges(group, on_carbon=True)[here],
        ),
    ):
        number = value()
        if isfinite(number):
            yield SourcedConstant(name, scale, number, unit, source, "computed", "computed")
        else:
            charged = group.charge and scale == "Sanderson geometric mean"
            reason = "this mean is for neutral groups" if charged else f"no value on this scale for {_missing(group, scale)}"
            yield UndefinedConstant(name, scale, reason)


def _missing(group: GroupGraph, scale: str) -> str:
    elements = sorted(set(group.symbols) - {"H", "C"}) or ["this group"]
    return f"an atom of the group ({', '.join(elements)})" if "orbital" not in scale else group.symbols[group.attached]


def _published_electronegativities(group: GroupGraph) -> Iterator[SourcedConstant]:
    for row in find_published_rows(group.smiles, "group_electronegativity"):
        yield SourcedConstant(
            "group electronegativity",
            row["scale"],
            float(row["value"]),
            row["unit"],
            row["source"],
            "computed" if "applied here" in row["scale"] else "published",
            row["verified"],
            row["note"],
        )


def _find_constants(
    group: GroupGraph, rows: tuple[dict[str, str], ...], obstacle: str
) -> Iterator[SourcedConstant | UndefinedConstant]:
    for name in _PUBLISHED_NAMES:
        found = [row for row in rows if row["parameter"] == name]
        for row in found:
            yield SourcedConstant(
                name,
                _SCALES[name],
                float(row["value"]),
                "dimensionless",
                row["source"],
                "published",
                row["verified"],
                row["note"],
            )
        if name not in _MODELS:
            if not found:
                yield UndefinedConstant(name, _SCALES[name], _LOCAL_ONLY)
            continue
        scale, source = _MODELS[name]
        if obstacle:
            reason = f"{obstacle}; only published values are given"
        elif group.attached_order != 1 or len(group.starts) != 1:
            reason = "sigma constants are defined for groups with one single bond to the site"
        else:
            value = compute_resonance(group) if name == "R" else compute_topological(group, name)
            if isfinite(value):
                yield SourcedConstant(name, scale, value, "dimensionless", source, "computed", "computed")
                continue
            reason = f"the fit has no parameter for {', '.join(sorted(set(group.symbols) - {'C', 'H'})) or 'this atom'} here"
        yield UndefinedConstant(name, scale, reason)


def _compute_sigma_r(values: list[SourcedConstant], obstacle: str) -> SourcedConstant | UndefinedConstant:
    """Taft's σ_R = σ_para − σ_I where both are published; else R stands in, which it follows with slope 1."""
    if obstacle:
        return UndefinedConstant("sigma_R", "resonance, Taft type", f"{obstacle}; only published values are given")
    published = {}
    for value in values:
        if value.origin == "published":
            published.setdefault(value.name, value)
    if "sigma_para" in published and "sigma_I" in published:
        para, inductive = published["sigma_para"], published["sigma_I"]
        source = f"σ_para − σ_I of the values above, {para.value:g} − {inductive.value:g} ({_shorten(inductive.source)})"
        number = para.value - inductive.value
        return SourcedConstant("sigma_R", "resonance, Taft type", number, "dimensionless", source, "computed", "computed")
    stand_in = published.get("R") or next((value for value in values if value.name == "R"), None)
    if stand_in is None:
        return UndefinedConstant("sigma_R", "resonance, Taft type", "it needs σ_para and σ_I, or R, and there is neither")
    source = f"R as above ({stand_in.origin}); where both are published, σ_para − σ_I = 1.00 R − 0.01 (r = 0.98)"
    return SourcedConstant(
        "sigma_R", "resonance, R as stand-in", stand_in.value, "dimensionless", source, "computed", "computed"
    )


def _shorten(source: str) -> str:
    return source.split(";")[0].split(",")[0]


_SEEN = {"transcription": "published, seen quoted", "memory": "published, remembered", "computed": "computed"}


def render_substituent_text(constants: SubstituentConstants) -> str:
    """Return a group's constants as lines for a terminal: value, unit, scale, origin, source.

    Parameters
    ----------
    constants : SubstituentConstants

    Returns
    -------
    str
        One line a number, under one heading a name; what is not defined here at the end, with its reason.
    """
    lines, heading = [constants.smiles], None
    width = max((len(value.scale) for value in constants.values), default=0)
    for value in constants.values:
        if value.name != heading:
            heading = value.name
            lines.append(f"  {heading}")
        unit = "" if value.unit == "dimensionless" else value.unit
        origin = "computed" if value.origin == "computed" else _SEEN[value.verified]
        lines.append(f"    {value.value:>8.3f} {unit:<20} {value.scale:<{width}}  {origin}: {value.source}")
    for item in constants.undefined:
        lines.append(f"  {item.name} ({item.scale}): not defined here, because {item.reason}")
    return "\n".join(lines) + "\n"
