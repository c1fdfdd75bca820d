"""Numbers and judgements as people read them; the same words in text, page and picture."""

from __future__ import annotations

import math

JUDGEMENT_SENTENCE = {
    "supported": "The peaks bear this structure out, and its nearest rivals clearly worse.",
    "open": "The peaks do not settle it.",
    "contradicted": "The peaks speak against this structure.",
}
REASON_CODE_SENTENCE = {
    "too_little_evidence": "Too little evidence: there are not enough peaks to tell.",
    "rival_fits": "A rival fits as well.",
    "mixture_or_salt": "More than one compound seems to be in the tube, or a salt.",
    "outside_training_data": "The structure lies outside what the model was trained on.",
}


def format_shift(ppm: float | None, nucleus: str) -> str:
    """Return a predicted shift: one decimal for 13C, two for 1H, as the trade prints them.

    Examples
    --------
    >>> format_shift(128.34, "13C"), format_shift(7.2649, "1H"), format_shift(None, "13C")
    ('128.3', '7.26', '–')
    """
    if ppm is None or not math.isfinite(ppm):
        return "–"
    return f"{ppm:.{1 if nucleus == '13C' else 2}f}".replace("-", "−")


def format_observed(ppm: float, nucleus: str) -> str:
    """Return an observed shift with the decimals it came with, one (13C) or two (1H) at least, three at most."""
    text = f"{ppm:.3f}"
    keep = 1 if nucleus == "13C" else 2
    while len(text.split(".")[1]) > keep and text.endswith("0"):
        text = text[:-1]
    return text.replace("-", "−")


def format_interval(lower: float | None, upper: float | None, nucleus: str) -> str:
    """Return an interval in words that need no key: '126.1 to 131.9', 'above 12.00', 'unbounded'."""
    if lower is None and upper is None:
        return "unbounded"
    if lower is None:
        return f"below {format_shift(upper, nucleus)}"
    if upper is None:
        return f"above {format_shift(lower, nucleus)}"
    return f"{format_shift(lower, nucleus)} to {format_shift(upper, nucleus)}"


def format_signed(ppm: float, nucleus: str) -> str:
    """Return a difference with its sign: '+0.42', '−1.3'."""
    text = f"{abs(ppm):.{1 if nucleus == '13C' else 2}f}"
    if not text.strip("0."):
        return text
    return ("+" if ppm > 0 else "−") + text


def format_probability(probability: float | None) -> str:
    """Return a probability with two decimals, never rounded to certainty.

    Examples
    --------
    >>> [format_probability(p) for p in (0.5, 0.9999, 0.0001, None)]
    ['0.50', '> 0.99', '< 0.01', '–']
    """
    if probability is None:
        return "–"
    if probability > 0.99:
        return "> 0.99"
    if probability < 0.01:
        return "< 0.01"
    return f"{probability:.2f}"


def format_likelihood_ratio(ratio: float | None) -> str:
    """Return the likelihood ratio to the nearest rival as a phrase; '' where there is none."""
    if ratio is None or ratio <= 0:
        return ""
    if ratio >= 1e6:
        return "fits more than a million times better than the nearest rival"
    if ratio <= 1e-6:
        return "the nearest rival fits more than a million times better"
    if 0.5 <= ratio <= 2:
        return "fits about as well as the nearest rival"
    if ratio > 1:
        return f"fits {_format_times(ratio)} times better than the nearest rival"
    return f"the nearest rival fits {_format_times(1 / ratio)} times better"


def _format_times(ratio: float) -> str:
    return f"{ratio:.1f}" if ratio < 9.95 else f"{float(f'{ratio:.2g}'):,.0f}"


def format_atoms(atoms: list[int], hydrogen: str = "") -> str:
    """Return atom numbers as one cell: '7, 11', or '4a' for one of two non-equivalent hydrogens.

    Examples
    --------
    >>> format_atoms([11, 7]), format_atoms([4], "a")
    ('7, 11', '4a')
    """
    return ", ".join(f"{atom}{hydrogen}" for atom in sorted(atoms))


def format_site(nucleus: str, attached_h: int, n_atoms: int = 1, hydrogen: str = "") -> str:
    """Return what a row stands for: 'C', 'CH', 'CH2', 'CH3' for 13C, the hydrogens of the whole set for 1H.

    Examples
    --------
    >>> format_site("13C", 2), format_site("1H", 1, 2), format_site("1H", 2, 1, "a")
    ('CH2', '2 H', '1 H')
    """
    if nucleus == "1H":
        return f"{n_atoms * (1 if hydrogen else attached_h)} H"
    return "C" if attached_h == 0 else "CH" if attached_h == 1 else f"CH{attached_h}"


def format_count(value: float) -> str:
    """Return a count, without decimals where it is whole."""
    return f"{value:.0f}" if abs(value - round(value)) < 0.005 else f"{value:.1f}"


def build_setting_lines(settings: dict) -> list[tuple[str, str]]:
    """Return every setting as name and value in words, in their fixed order."""
    names = {
        "solvent": ("solvent", "not given"),
        "nucleus": ("nucleus", ""),
        "coverage": ("coverage", ""),
        "frequency_mhz": ("1H frequency", "not given"),
        "rivals": ("rivals, at most", ""),
        "mass_confirmed": ("mass confirmed", ""),
        "prior": ("prior", ""),
        "expected": ("expected beside it", "nothing"),
    }
    lines = []
    for key, value in settings.items():
        name, blank = names.get(key, (key.replace("_", " "), "not given"))
        if value is None or value == [] or value == "":
            shown = blank
        elif isinstance(value, bool):
            shown = "yes" if value else "no"
        elif isinstance(value, list):
            shown = ", ".join(map(str, value))
        elif key == "frequency_mhz":
            shown = f"{value:g} MHz"
        else:
            shown = f"{value:g}" if isinstance(value, float) else str(value)
        lines.append((name, shown))
    return lines
