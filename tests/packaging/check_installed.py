"""The main jobs with an installed shiftpred; run by another interpreter, outside the source tree, without pytest."""

import csv
import json
import os
import subprocess
import sys
import sysconfig
from pathlib import Path

import shiftpred

ESTER = "CCOC(=O)c1ccccc1"
C13 = [166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3]


def require(condition: bool, what: object) -> None:
    if not condition:
        sys.exit(f"wrong: {what}")


def run(*words: str, code: int = 0) -> str:
    # As on a system whose own encoding is not UTF-8: every file must say which one it is in.
    surroundings = os.environ | dict(LC_ALL="C", PYTHONCOERCECLOCALE="0")
    command = [sys.executable, "-X", "utf8=0", "-m", "shiftpred", *words]
    done = subprocess.run(command, capture_output=True, encoding="utf-8", env=surroundings)
    require(done.returncode == code, (words, done.returncode, done.stdout[-2000:], done.stderr[-2000:]))
    return done.stdout


def check_everything(folder: Path) -> None:
    require(Path(shiftpred.__file__).is_relative_to(sys.prefix), shiftpred.__file__)
    table = shiftpred.predict(["CCO", ESTER])
    require(len(table) > 10 and (table.lower_ppm < table.upper_ppm).all(), table)
    found = shiftpred.compare(ESTER, c13=C13, solvent="CDCl3")
    require(found.judgement == "supported", (found.judgement, found.reasons))
    ranked = shiftpred.rank(["CCC(=O)Oc1ccccc1", ESTER], c13=C13)
    require(list(ranked.candidate)[0] == 1, ranked)
    why = shiftpred.explain("CCO", 1)
    require(abs(sum(c.contribution_ppm for c in why.contributions) - why.shift_ppm) < 1e-6, why)
    shiftpred.substituent("*OC")
    require(not {"torch", "sklearn", "matplotlib"} & set(sys.modules), "a heavy package was imported")

    script = Path(sysconfig.get_path("scripts")) / ("shiftpred.exe" if sys.platform == "win32" else "shiftpred")
    versions = subprocess.run([script, "--version"], capture_output=True, encoding="utf-8", check=True).stdout
    for word in ("shiftpred", "model", "python", "rdkit", "numpy", "scipy", "pandas", "click", "jinja2", "tqdm", "system"):
        require(any(line.split()[0] == word for line in versions.splitlines()), versions)
    rows = list(csv.DictReader(run("predict", ESTER, "--format", "csv").splitlines()))
    require(len(rows) > 10, rows)
    peaks = ", ".join(map(str, C13))
    require(json.loads(run("compare", ESTER, "--c13", peaks, "--format", "json"))["judgement"] == "supported", "compare")
    run("compare", ESTER, "--c13", peaks, "--output", str(folder / "bericht é.html"))
    require("</html>" in (folder / "bericht é.html").read_text(encoding="utf-8"), "report")
    samples = folder / "samples.csv"
    samples.write_text(f'sample,smiles,c13\r\nöl,{ESTER},"{peaks}"\r\n2,CCO,"58.4, 18.3"\r\n', encoding="utf-8", newline="")
    run("triage", str(samples), "--output", str(folder / "night"))
    require(len(list((folder / "night" / "reports").glob("*.html"))) == 2, "triage")
    run("predict", "C(", code=3)
    run("predict", "nothing-there.sdf", code=2)


if __name__ == "__main__":
    check_everything(Path(sys.argv[1]))
    print(sys.version.split()[0], "fine")
