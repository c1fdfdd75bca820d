"""Pictures whose parts know their atoms, so that the page can link structure, lane and table."""

from __future__ import annotations

import re

from rdkit.Chem.Draw import rdMolDraw2D

from shiftpred.reporting import render_structure_svg
from shiftpred.reporting.pictures.lane import build_lane_entries
from shiftpred.reporting.pictures.structure import build_drawable_mol
from shiftpred.reporting.pictures.svg_elements import STYLE, render_element, render_picture

__all__ = ["link_lane", "render_linked_structure"]


def render_linked_structure(structure: dict, labels: dict[int, str] | None = None, marks: dict[int, str] | None = None) -> str:
    """Draw a structure with shifts beside the atoms and a disc over each atom that can be pointed at.

    Parameters
    ----------
    structure : dict
        With `smiles`, `smiles_atoms` and `coordinates`.
    labels : dict of int to str, optional
        By the user's atom number; default the number itself.
    marks : dict of int to {'outside', 'missing'}, optional

    Returns
    -------
    str
        One `svg` element; the discs carry `class="site"` and `data-atom`.
    """
    mol = build_drawable_mol(structure)
    if mol is None:
        return render_structure_svg(structure)
    numbers = structure["smiles_atoms"]
    for atom, number in zip(mol.GetAtoms(), numbers, strict=True):
        text = str(number) if labels is None else labels.get(number, "")
        if text:
            atom.SetProp("atomNote", text)
    drawer = rdMolDraw2D.MolDraw2DSVG(-1, -1)
    options = drawer.drawOptions()
    options.useBWAtomPalette()
    options.clearBackground = False
    options.scalingFactor = 46.0
    options.bondLineWidth = 1.6
    options.scaleBondWidth = False
    options.padding = 0.08
    options.annotationFontScale = 0.75
    options.minFontSize, options.maxFontSize = 12, 18
    options.setAtomNoteColour((0.0, 114 / 255, 178 / 255))
    drawer.DrawMolecule(mol)
    points = [drawer.GetDrawCoords(i) for i in range(mol.GetNumAtoms())]
    drawer.FinishDrawing()
    text = drawer.GetDrawingText()
    width, height = map(float, re.search(r"viewBox='0 0 ([\d.]+) ([\d.]+)'", text).groups())
    drawing = text[text.index("<!-- END OF HEADER -->") + 22 : text.rindex("</svg>")]
    drawing = re.sub(r"\sclass='[^']*'", "", drawing).replace("#000000", STYLE["ink"])
    drawing = re.sub("#0072B2", STYLE["number"], drawing, flags=re.IGNORECASE)
    discs, frames = [], []
    for number, point in zip(numbers, points, strict=True):
        discs.append(
            render_element(
                "circle",
                render_element("title", f"atom {number}"),
                class_="site",
                data_atom=number,
                cx=point.x,
                cy=point.y,
                r=13,
                fill="transparent",
            )
        )
        kind = (marks or {}).get(number)
        if kind:
            dash = "4 3" if kind == "missing" else None
            colour = STYLE["quiet"] if kind == "missing" else STYLE["against"]
            frames.append(
                render_element(
                    "circle", cx=point.x, cy=point.y, r=12, fill="none", stroke=colour, stroke_width=2, stroke_dasharray=dash
                )
            )
    title = f"Structure {structure['smiles']}" + (", predicted shifts beside the atoms" if labels else ", atoms numbered")
    return render_picture(width, height, title, [*frames, drawing, *discs], class_="structure")


def link_lane(svg: str, document: dict, nucleus: str) -> str:
    """Say in a lane's picture which atoms each bar stands for (`class="bar"`, `data-atoms`).

    Bars are drawn in the order of `build_lane_entries`, each with one rectangle, and nothing else in a lane is a rectangle.
    """
    bars, _ = build_lane_entries(document, nucleus)
    pieces = svg.split("<rect ")
    if len(pieces) != len(bars) + 1:
        return svg
    labels = [re.sub(r"[^0-9,–\- ]", "", bar.label) for bar in bars]
    atoms = {}
    for entry in [*document["assignments"], *document["missing"]]:
        if entry["nucleus"] == nucleus:
            atoms[round(entry["shift_ppm"], 4), len(entry["equivalent_atoms"]), entry["equivalent_atoms"][0]] = entry[
                "equivalent_atoms"
            ]
    linked = [pieces[0]]
    for bar, label, piece in zip(bars, labels, pieces[1:]):
        first = int(re.match(r"\s*(\d+)", label)[1]) if re.match(r"\s*(\d+)", label) else 0
        found = next((v for (shift, _, one), v in atoms.items() if shift == round(bar.shift, 4) and one == first), [first])
        linked.append(f'class="bar" data-atoms="{" ".join(map(str, found))}" {piece}')
    return "<rect ".join(linked)
