"""Peak lists as publishers, spreadsheets and tired people write them, and what no one would write.

python tests/fuzzing/fuzz_peak_text.py --minutes 10
"""

from __future__ import annotations

import random
import tempfile
from pathlib import Path

from fuzz_running import run_from_command_line
from grammars import alter_text, write_text

from shiftpred.peaks import parse_peaks

RULES = {
    "start": ["<list>", "<heading> <list>", "<heading>\n<list>", "<table>", "<paragraph>", "<lines>", "<pairs>"],
    "heading": [
        "δ", "<nucleus> NMR (<mhz>, <solvent>) δ", "<nucleus> NMR (<solvent>, <mhz>): δ =", "<nucleus>{1H} NMR (<mhz>, <solvent>)",
        "δ<nucleus> (<mhz>; <solvent>; Me4Si)", "**<nucleus>-NMR** <mhz> in <solvent>, ppm:", "NMR", "# <solvent> <mhz>",
    ],
    "nucleus": ["13C", "1H", "¹³C", "<sup>13</sup>C", "^1H", "DEPT-135", "HSQC", "19F", "31P", "C", "H"],
    "mhz": ["101 MHz", "400 MHz"] * 6 + ["101 MHz", "400 MHz", "400.13MHz", "0 MHz", "1e9 MHz", "MHz", "100,6 MHz", "-5 MHz"],
    "solvent": ["CDCl3", "CDCl₃", "DMSO-d6", "d6-DMSO", "(CD3)2SO", "CD3OD", "D2O", "acetone-d6", "C6D6", "CDCl3/CD3OD 9:1", "beer", ""],
    "list": ["<peak>", "<peak>, <list>", "<peak>; <list>", "<peak>,<list>", "<peak> <list>", "<peak> and <list>", "<peak>\n<list>"],
    "peak": [
        "<shift>", "<shift> (<notes>)", "<shift>–<shift> (<notes>)", "<shift>-<shift>", "<shift>/<count>", "<shift> [<notes>]",
        "<shift> × 2", "<shift> (<count>C)", "<shift>, <shift> (each <mult>)", "(<shift>)", "<shift>*", "~<shift>", "<shift> br",
    ],
    "shift": ["7.42", "166.6", "4.38", "21.0", "1.26", "128.4"] * 12 + [
        "166.6", "7.26", "-0.01", "132,8", "1.2", "77.16", "0", "1e3", "999999", "−3.2", "+4", "7.", ".9",
        "128.4a", "1.2.3", "１２.３"],
    "notes": ["<note>", "<note>, <notes>", "<note>; <notes>", "<note> <notes>"],
    "note": [
        *["<mult>", "<mult>, <count>H", "<count>H"] * 6,
        "<mult>", "<count>H", "<count>C", "J = <hz> Hz", "J=<hz>, <hz> Hz", "3JHH <hz>", "<label>", "J<label> = <hz>", "CH<count>",
        "<count> × CH<count>", "br", "overlapped", "minor", "exchangeable", "ratio 3:1", "(<notes>)",
    ],
    "mult": ["s", "d", "t", "q", "m", "dd"] * 3 + ["s", "d", "t", "q", "quint", "sept", "m", "dd", "ddt", "br s", "bs",
        "app t", "AB q", "dddddddd", "AA'BB'", "d × d"],
    "count": ["1", "2", "3"] * 8 + ["1", "2", "3", "0", "1.5", "99", "-1", "½", "1000000"],
    "hz": ["7.1", "8.0", "1.2"] * 8 + ["7.1", "254", "0", "8.0", "-3", "1e5", "7,1", "ca. 7", "7.1 and 8.2"],
    "label": ["H-3", "C-1'", "C1 and C2", "H3a", "12", "1,2,3", "ArH", "OMe", "a", "3,5", "H-3/H-5", "C-99999"],
    "lines": ["<shift>\n<shift>", "<shift>\n<lines>", "<shift>\t<count>\n<lines>", "# <heading>\n<lines>", "\n\n<lines>"],
    "pairs": ["<shift>/<shift>", "<shift>/<shift>, <pairs>", "<shift>/<shift>\n<pairs>"],
    "column": ["shift", "shift_ppm", "δ (ppm)", "ppm", "integral", "multiplicity", "J (Hz)", "assignment", "attached_h", "13C", "1H",
        "pair", "carbons", "note", ""],
    "sep": [",", ";", "\t", " "],
    "table": [
        "shift_ppm,integral\n<rows>", "<column>,<column>\n<rows>", "<column>;<column>;<column>\n<rows>",
        "<column>\t<column>\n<tabs>", "# <heading>\nshift_ppm,multiplicity,j_hz,assignment\n<rows>",
    ],
    "rows": ["<shift>,<count>", "<shift>,<count>\n<rows>", "<shift>,<mult>,<hz>,<label>\n<rows>", '<shift>,"<label>"\n<rows>',
             "<shift>;<count>;<mult>\n<rows>"],
    "tabs": ["<shift>\t<count>", "<shift>\t<mult>\n<tabs>"],
    "paragraph": [
        "To a solution of the acid (1.0 g, 5.2 mmol) was added amine. Yield 78 %, mp 121–123 °C. <heading> <list>. <heading> <list>. "
        "IR (film) 1718, 1602 cm-1; HRMS (ESI) m/z calcd for C9H10O2 151.0754, found 151.0752.",
        "<heading> <list>.\n<heading> <list>.",
    ],
}  # fmt: skip


def build_peak_text(chance: random.Random) -> str:
    text = write_text(RULES, chance)
    return alter_text(text, chance) if chance.random() < 0.4 else text


def use_peak_text(text: str) -> None:
    """Read it as both nuclei, and as a file; all that does not raise must be a list with finite shifts."""
    refusals = []
    for nucleus in ("13C", "1H"):
        try:
            found = parse_peaks(text, nucleus)
            assert found.peaks and all(p.lower_ppm <= p.shift_ppm <= p.upper_ppm for p in found.peaks), found
            assert all(abs(p.shift_ppm) < 10_000 for p in found.peaks), found
        except ValueError as error:
            refusals.append(error)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "list.txt"
        path.write_bytes(text.encode("utf-8", "surrogatepass"))
        try:
            parse_peaks(path, "13C")
        except ValueError as error:
            refusals.append(error)
    for error in refusals:
        if not hasattr(error, "try_next"):  # not one of ours
            raise error
    if len(refusals) == 3:
        raise refusals[0]


if __name__ == "__main__":
    run_from_command_line("peak-text", build_peak_text, use_peak_text)
