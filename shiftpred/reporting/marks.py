"""Signs and colours, each with a shape and a word, so that none rests on colour alone.

Colours are from the palette of Okabe and Ito (Color Universal Design, 2008; https://jfly.uni-koeln.de/color/), which
people with any of the common kinds of colour vision can tell apart.
"""

from __future__ import annotations

JUDGEMENT_SIGN = {"supported": "●", "open": "◐", "contradicted": "◆"}
"""In text: full disc, half disc, lozenge."""

OKABE_ITO = {
    "black": "#000000",
    "orange": "#E69F00",
    "sky blue": "#56B4E9",
    "bluish green": "#009E73",
    "yellow": "#F0E442",
    "blue": "#0072B2",
    "vermilion": "#D55E00",
    "reddish purple": "#CC79A7",
}

JUDGEMENT_COLOUR = {
    "supported": OKABE_ITO["blue"],
    "open": OKABE_ITO["orange"],
    "contradicted": OKABE_ITO["reddish purple"],
}
"""Always beside the shape and the word, and always with an outline in the colour of the text."""
