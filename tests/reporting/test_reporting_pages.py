"""The pages load nothing, run nothing, escape everything, and hold what has to be in a report."""

from __future__ import annotations

import re
from dataclasses import replace
from html.parser import HTMLParser

import pytest
import report_builders as build

from shiftpred.errors import StructureError
from shiftpred.records import RecordFailure, Unexplained
from shiftpred.reporting import (
    render_comparison_html,
    render_explanation_html,
    render_prediction_html,
    render_ranking_html,
)

EVIL = "<img src=x onerror=alert(1)>\"'&</style><script>alert(2)</script>"
_VOID = {"meta", "br", "hr", "img", "input", "link"}
_LOADING = {"src", "href", "xlink:href", "srcset", "action", "data", "poster", "background", "formaction", "cite", "ping"}


def _failure(name="3"):
    return RecordFailure(name, StructureError("structure 3", "'C(('", "a SMILES", "check the brackets"))


def _poison(comparison):
    """Put an attack into every text that comes from outside."""
    return replace(
        comparison,
        structure=build.build_structure(name=EVIL, notes=(EVIL,)),
        reasons=(EVIL,),
        cautions=(EVIL,),
        steps=(EVIL,),
        input_hash=EVIL,
        unexplained=(Unexplained("13C", 77.16, EVIL, EVIL),),
        rivals=tuple(replace(r, how=EVIL, kind=EVIL, decided_by=EVIL) for r in comparison.rivals),
        assignments=tuple(replace(a, note=EVIL) for a in comparison.assignments),
        settings=replace(comparison.settings, solvent=EVIL, expected=(EVIL,)),
        peaks={n: replace(p, text=EVIL, notes=(EVIL,), solvent=EVIL) for n, p in comparison.peaks.items()},
    )


PAGES = {
    "supported": lambda: render_comparison_html(build.build_supported(), "EB-1", "2025-03-31", "A. Name"),
    "contradicted": lambda: render_comparison_html(build.build_contradicted()),
    "open": lambda: render_comparison_html(build.build_open()),
    "poisoned": lambda: render_comparison_html(_poison(build.build_open()), EVIL, EVIL, EVIL),
    "prediction": lambda: render_prediction_html([build.build_prediction(), _failure(EVIL)]),
    "explanation": lambda: render_explanation_html([build.build_explanation(), build.build_explanation("1H")]),
    "ranking": lambda: render_ranking_html(replace(build.build_ranking(), failures=(_failure(EVIL),)), EVIL),
}


class _Reader(HTMLParser):
    """Collects tags, attributes and text; complains where tags do not close in order."""

    def __init__(self, page):
        super().__init__(convert_charrefs=True)
        self.stack, self.tags, self.attributes, self.words, self.disorder = [], [], [], [], []
        self.feed(page)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.tags.append(tag)
        self.attributes += [(tag, name, value or "") for name, value in attrs]
        if tag not in _VOID:
            self.stack.append(tag)

    def handle_startendtag(self, tag, attrs):
        self.tags.append(tag)
        self.attributes += [(tag, name, value or "") for name, value in attrs]

    def handle_endtag(self, tag):
        if not self.stack or self.stack.pop() != tag:
            self.disorder.append(tag)

    def handle_data(self, data):
        if not self.stack or self.stack[-1] != "style":
            self.words.append(data)

    @property
    def text(self):
        return " ".join(" ".join(self.words).split())


@pytest.fixture(scope="module")
def pages():
    return {name: render() for name, render in PAGES.items()}


@pytest.mark.parametrize("name", PAGES)
def test_nothing_is_loaded_from_outside(pages, name):
    reader = _Reader(pages[name])
    for tag, attribute, value in reader.attributes:
        if attribute in _LOADING or attribute.endswith(":href"):
            assert value.startswith(("#", "data:")), f"<{tag} {attribute}={value}>"
        if tag != "meta":
            assert not re.search(r"url\(|@import", value), f"<{tag} {attribute}={value}>"
    assert not set(reader.tags) & {
        "script",
        "iframe",
        "object",
        "embed",
        "link",
        "base",
        "img",
        "form",
        "audio",
        "video",
        "use",
    }
    for style in re.findall(r"<style>(.*?)</style>", pages[name], flags=re.DOTALL):
        assert "@import" not in style and all(u.startswith(("#", "data:")) for u in re.findall(r"url\(['\"]?([^)]*)", style))
    if name != "poisoned":
        assert "http://" not in pages[name] and "https://" not in pages[name]


@pytest.mark.parametrize("name", PAGES)
def test_nothing_runs(pages, name):
    reader = _Reader(pages[name])
    assert "script" not in reader.tags
    assert [a for _, a, _ in reader.attributes if a.startswith("on")] == []
    assert "default-src 'none'" in pages[name]


@pytest.mark.parametrize("name", PAGES)
def test_tags_close_in_order_and_ids_are_unique(pages, name):
    reader = _Reader(pages[name])
    assert reader.disorder == [] and reader.stack == []
    ids = [value for _, attribute, value in reader.attributes if attribute == "id"]
    assert len(ids) == len(set(ids))
    assert reader.tags.count("h1") == 1 and reader.tags.count("title") >= 1


def test_hostile_names_stay_text(pages):
    for name in ("poisoned", "prediction", "ranking"):
        assert "<img" not in pages[name] and "<script" not in pages[name]
        assert EVIL in _Reader(pages[name]).text.replace("\xa0", " ") or name == "prediction"
    assert _Reader(pages["poisoned"]).text.count("onerror=alert(1)") > 15


@pytest.mark.parametrize(
    ("name", "wanted"),
    [
        (
            "supported",
            [
                "supported",
                "EB-1",
                "2025-03-31",
                "A. Name",
                "5f" * 32,
                "2025-edition-1",
                "reviewed by",
                "signature",
                "evidence, not proof of identity",
                "ethyl acetate",
                "phenyl propanoate",
                "What would decide:",
                "0.97",
                "coverage",
                "prior",
                "mass confirmed",
                "1H frequency",
                "400 MHz",
                "rivals, at most",
                "expected beside it",
                "166.6",
                "164.1 to 168.3",
                "carbons",
                "hydrogens",
                "in excess",
                "Tried 3 rivals",
                "C9H10O2",
                "7.58–7.50 (m, 1H)",
                "13C +0.02 ppm",
            ],
        ),  # fmt: skip
        ("contradicted", ["contradicted", "outside", "nothing known fits", "nothing excuses it", "150.8"]),
        ("open", ["open", "A rival fits as well.", "quaternary: may be too weak to see", "above 4.15"]),
        ("prediction", ["166.2", "aromatic CH", "not predicted", "2025-edition-1", "90 % intervals"]),
        ("explanation", ["alpha benzoyloxy", "+38.70", "sigma_I 0.36", "large remainder", "60.80", "4.256"]),
        ("ranking", ["none of these", "0.96", "What would decide:", "line by line", "nothing takes it", "Not read"]),
    ],
)
def test_a_page_holds_what_a_report_needs(pages, name, wanted):
    text = _Reader(pages[name]).text
    assert [words for words in wanted if words not in text] == []


def test_judgements_differ_in_shape_and_word_not_only_in_colour(pages):
    signs = {}
    for name in ("supported", "open", "contradicted"):
        sign = re.search(r'<svg[^>]*class="sign".*?</svg>', pages[name], flags=re.DOTALL)[0]
        signs[name] = re.sub(r"#[0-9A-Fa-f]{6}", "", sign)
        assert f'<div class="word">{name}</div>' in pages[name]
    assert len(set(signs.values())) == 3


def test_colours_come_from_one_colour_blind_safe_palette(pages):
    from shiftpred.reporting.marks import OKABE_ITO

    safe = {c.lower() for c in OKABE_ITO.values()}
    for name in PAGES:
        for colour in re.findall(r'(?:fill|stroke)="(#[0-9A-Fa-f]{6})"', pages[name]):
            red, green, blue = (int(colour[i : i + 2], 16) for i in (1, 3, 5))
            assert colour.lower() in safe or max(red, green, blue) - min(red, green, blue) < 12, colour


def _luminance(colour):
    parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    red, green, blue = (p / 12.92 if p <= 0.03928 else ((p + 0.055) / 1.055) ** 2.4 for p in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def _contrast(one, other):
    bright, dark = sorted((_luminance(one), _luminance(other)), reverse=True)
    return (bright + 0.05) / (dark + 0.05)


def test_text_stands_out_from_its_ground_in_light_dark_and_print(pages):
    blocks = re.findall(r":root \{(.*?)\}", pages["open"], flags=re.DOTALL)
    assert len(blocks) == 3
    for block in blocks:
        colours = dict(re.findall(r"--(\w+): (#[0-9a-f]{6})", block))
        for ground in ("paper", "wash"):
            for role in ("ink", "quiet", "number"):
                assert _contrast(colours[role], colours[ground]) >= 4.5, (role, ground)
        for role in ("predicted", "centre", "line"):  # large marks; each also has a shape of its own
            assert _contrast(colours[role], colours["paper"]) >= 2.2, role


def test_the_same_input_gives_the_same_page():
    assert render_comparison_html(build.build_open()) == render_comparison_html(build.build_open())


def test_the_record_shows_itself():
    comparison = build.build_supported()
    assert comparison.to_html() == render_comparison_html(comparison)
    assert comparison.to_dict()["judgement"] == "supported"


def test_a_page_without_peaks_rivals_reasons_or_carbons_still_renders():
    bare = replace(
        build.build_supported(), reasons=(), assignments=(), unexplained=(), rivals=(), balance=(), peaks={}, steps=(),
        reference_offset_ppm={}, missing=(), input_hash="", structure=build.build_structure("[Na+].[Cl-]", "1"),
    )  # fmt: skip
    text = _Reader(render_comparison_html(bare)).text
    assert "No rival was tried." in text and "not computed" in text and "[Na+].[Cl-]" in text
