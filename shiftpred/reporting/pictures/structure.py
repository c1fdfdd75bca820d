"""Draw a structure with the user's own atom numbers."""

from __future__ import annotations

import math
import re
from html import escape

from rdkit import Chem
from rdkit.Chem import rdDepictor
from rdkit.Chem.Draw import rdMolDraw2D
from rdkit.Geometry import Point3D

from shiftpred.reporting.pictures.svg_elements import STYLE, render_element, render_label, render_picture

__all__ = ["build_drawable_mol", "render_structure_svg"]

_NUMBER_COLOUR = (0.0, 114 / 255, 178 / 255)
_NUMBER_HEX = "#0072B2"
_LARGEST = 300
"""Heavy atoms; beyond that a drawing tells nothing."""


def render_structure_svg(
    structure: dict, marks: dict[int, str] | None = None, numbers: bool = True, scale: float = 38.0
) -> str:
    """Draw a structure.

    Parameters
    ----------
    structure : dict
        With `smiles`, `smiles_atoms` and `coordinates` (see `schemas/comparison-1.json`); the user's own drawing is
        kept where there is one.
    marks : dict of int to {'outside', 'missing'}, optional
        Atoms, by the user's number, that get a frame: a lozenge (observed outside the interval) or a dashed ring
        (expected, but no line).
    numbers : bool, default True
        Whether atom numbers are written.
    scale : float, default 38
        Length of a bond, about, in the picture's units.

    Returns
    -------
    str
        One `svg` element without ids and without anything from outside. A structure that cannot be drawn gives its
        SMILES as text.

    Notes
    -----
    The same structure gives the same picture with the same RDKit release.
    """
    mol = build_drawable_mol(structure)
    name = structure.get("name") or structure["smiles"]
    if mol is None:
        return _render_text_instead(structure["smiles"], name)
    drawer = rdMolDraw2D.MolDraw2DSVG(-1, -1)
    options = drawer.drawOptions()
    options.useBWAtomPalette()
    options.clearBackground = False
    options.scalingFactor = scale
    options.fixedBondLength = -1.0
    options.bondLineWidth = 1.6
    options.scaleBondWidth = False
    options.padding = 0.06
    options.annotationFontScale = 0.8
    options.minFontSize = 12
    options.maxFontSize = 18
    if hasattr(options, "setAtomNoteColour"):  # not in the oldest RDKit that is supported: numbers in black there
        options.setAtomNoteColour(_NUMBER_COLOUR)
    options.addStereoAnnotation = False
    options.simplifiedStereoGroupLabel = False
    if numbers:
        for atom, number in zip(mol.GetAtoms(), structure["smiles_atoms"], strict=True):
            atom.SetProp("atomNote", str(number))
    drawer.DrawMolecule(mol)
    points = [drawer.GetDrawCoords(i) for i in range(mol.GetNumAtoms())]
    drawer.FinishDrawing()
    text = drawer.GetDrawingText()
    width, height = map(float, re.search(r"viewBox='0 0 ([\d.]+) ([\d.]+)'", text).groups())
    body = [_adopt_colours(text[text.index("<!-- END OF HEADER -->") + 22 : text.rindex("</svg>")])]
    position = {number: (p.x, p.y) for number, p in zip(structure["smiles_atoms"], points, strict=True)}
    for number, kind in sorted((marks or {}).items()):
        if number in position:
            body.insert(0, _render_mark(*position[number], kind))
    title = f"Structure of {name}: {structure['smiles']}" + (", atoms numbered" if numbers else "")
    return render_picture(width, height, title, body, class_="structure")


def build_drawable_mol(structure: dict) -> Chem.Mol | None:
    """Return a molecule with coordinates, its atoms in the order of `smiles_atoms`; None if it cannot be drawn.

    Parameters
    ----------
    structure : dict
        As for `render_structure_svg`.
    """
    mol = Chem.MolFromSmiles(structure["smiles"])
    if mol is None or not 0 < mol.GetNumAtoms() <= _LARGEST or len(structure["smiles_atoms"]) != mol.GetNumAtoms():
        return None
    coordinates = structure.get("coordinates")
    if coordinates:
        conformer = Chem.Conformer(mol.GetNumAtoms())
        conformer.Set3D(False)
        for i, (x, y) in enumerate(coordinates):
            conformer.SetAtomPosition(i, Point3D(x, y, 0.0))
        mol.AddConformer(conformer, assignId=True)
        rdDepictor.NormalizeDepiction(mol, canonicalize=0)
    else:
        rdDepictor.Compute2DCoords(mol, canonOrient=True)
        rdDepictor.StraightenDepiction(mol)
    try:
        return rdMolDraw2D.PrepareMolForDrawing(mol, kekulize=True, addChiralHs=False)
    except ValueError:
        return rdMolDraw2D.PrepareMolForDrawing(mol, kekulize=False, addChiralHs=False)


def _adopt_colours(drawing: str) -> str:
    """Let the page decide about ink and number colour, and drop what only the drawing library needs."""
    drawing = re.sub(r"\sclass='[^']*'", "", drawing)
    drawing = re.sub(r"<(/?)rdkit:[^>]*>", "", drawing)
    drawing = re.sub(r"#000000", STYLE["ink"], drawing)
    drawing = re.sub(_NUMBER_HEX, STYLE["number"], drawing, flags=re.IGNORECASE)
    for plain in ("fill-rule:evenodd;", "stroke-opacity:1;", ";stroke-opacity:1", "fill-opacity:1;"):
        drawing = drawing.replace(plain, "")
    return re.sub(r"\n\s*", "", drawing)


def _render_mark(x: float, y: float, kind: str) -> str:
    if kind == "outside":
        r = 15.0
        corners = " ".join(f"{x + dx:.1f},{y + dy:.1f}" for dx, dy in ((0, -r), (r, 0), (0, r), (-r, 0)))
        return render_element(
            "polygon", points=corners, fill=STYLE["against"], fill_opacity=0.22, stroke=STYLE["against"], stroke_width=2
        )
    return render_element(
        "circle", cx=x, cy=y, r=12.5, fill="none", stroke=STYLE["quiet"], stroke_width=1.6, stroke_dasharray="4 3"
    )


def _render_text_instead(smiles: str, name: str) -> str:
    size = 30
    chunks = [smiles[i : i + size] for i in range(0, min(len(smiles), 12 * size), size)] or [""]
    body = [render_label(chunk, 6, 18 + 16 * i) for i, chunk in enumerate(chunks)]
    return render_picture(240, math.ceil(26 + 16 * len(chunks)), f"{escape(name)}, not drawn", body, class_="structure")
