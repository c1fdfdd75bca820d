// Many samples: a table is read here, each row is judged by this server, nothing is stored.
import { $, BLANK, SIGN, ask, buildTable, encode, formatProbability, make } from "/static/shared.js";

const MOST_ROWS = 2000, MOST_CHARACTERS = 3000000, AT_ONCE = 2;
let results = [], running = null;

function parseTable(text) {
  const first = text.split("\n", 1)[0], mark = [",", ";", "\t"].sort((a, b) => first.split(b).length - first.split(a).length)[0];
  const rows = [];
  let row = [], cell = "", quoted = false;
  for (let i = 0; i < text.length; i++) {
    const c = text[i];
    if (quoted) { if (c === '"') { if (text[i + 1] === '"') { cell += c; i++; } else quoted = false; } else cell += c; }
    else if (c === '"' && cell === "") quoted = true;
    else if (c === mark) { row.push(cell); cell = ""; }
    else if (c === "\n") { row.push(cell.replace(/\r$/, "")); rows.push(row); row = []; cell = ""; }
    else cell += c;
  }
  if (cell || row.length) { row.push(cell); rows.push(row); }
  return { rows: rows.filter((r) => r.some((x) => x.trim())), quoted };
}
function refuse(text) { $("said").replaceChildren(make("p", { class: "fault" }, text)); }
function readSamples(text) {
  if (text.length > MOST_CHARACTERS) return refuse(`The table has ${text.length.toLocaleString("en")} characters; expected at most ${MOST_CHARACTERS.toLocaleString("en")}. Try: shiftpred triage, on the command line.`);
  const { rows, quoted } = parseTable(text.replace(/^\uFEFF/, ""));
  if (quoted) return refuse("A quotation mark is opened and never closed; expected pairs. Try: export the table again.");
  if (rows.length < 2) return refuse("There are no rows; expected a heading and at least one sample. Try: sample,smiles,c13");
  if (rows.length - 1 > MOST_ROWS) return refuse(`The table has ${(rows.length - 1).toLocaleString("en")} rows; expected at most ${MOST_ROWS.toLocaleString("en")}. Try: shiftpred triage, on the command line.`);
  const heads = rows[0].map((h) => h.trim().toLowerCase());
  if (!heads.includes("smiles") || !(heads.includes("c13") || heads.includes("h1"))) return refuse(`The columns are ${heads.join(", ")}; expected smiles and at least one of c13 and h1. Try: sample,smiles,c13,h1,solvent`);
  const pick = (cells, name) => (heads.includes(name) ? (cells[heads.indexOf(name)] ?? "").trim() : "");
  return rows.slice(1).map((cells, k) => ({ number: k + 1, sample: pick(cells, "sample") || String(k + 1), structure: pick(cells, "smiles"), c13: pick(cells, "c13"), h1: pick(cells, "h1"), solvent: pick(cells, "solvent") }));
}
async function run() {
  const samples = readSamples($("table").value);
  if (!samples) return;
  running?.abort();
  const mine = (running = new AbortController());
  results = []; $("results").hidden = false; $("progress").hidden = false; $("progress").max = samples.length; $("stop").disabled = false;
  let next = 0, done = 0, shown = 0;
  const work = async () => {
    while (next < samples.length && !mine.signal.aborted) {
      const sample = samples[next++], { structure, c13, h1, solvent } = sample;
      let result;
      try {
        const { comparison: d } = await ask("compare", { structure, c13, h1, solvent, sample: sample.sample.slice(0, 200), pictures: false }, mine.signal);
        result = { ...sample, judgement: d.judgement, probability: d.probability, why: d.reasons[0] ?? "", leftovers: d.unexplained.length };
      } catch (error) {
        if (error.name === "AbortError") return;
        result = { ...sample, judgement: "not judged", probability: null, why: error.message, leftovers: null };
      }
      if (running !== mine) return;
      results.push(result); done++;
      $("progress").value = done; $("said").textContent = `${done} of ${samples.length} done`;
      if (performance.now() - shown > 400) { shown = performance.now(); show(); }
    }
  };
  await Promise.all(Array.from({ length: AT_ONCE }, work));
  if (running === mine) { $("stop").disabled = true; $("said").textContent = mine.signal.aborted ? `Stopped after ${done} of ${samples.length}` : `All ${done} done`; show(); }
}
function show() {
  results.sort((a, b) => a.number - b.number);
  const words = $("words").value.trim().toLowerCase(), judgement = $("judgements").value;
  const found = results.filter((r) => (!judgement || r.judgement === judgement) && (!words || `${r.sample} ${r.structure} ${r.why}`.toLowerCase().includes(words)));
  const count = (j) => results.filter((r) => r.judgement === j).length;
  $("counts").textContent = `${found.length} of ${results.length} shown; ` + ["supported", "open", "contradicted", "not judged"].map((j) => `${count(j)} ${j}`).join(", ");
  $("rows").replaceChildren(buildTable("Results", ["Sample", "Judgement", "Probability", "Leftovers", "Why", "SMILES"], found.slice(0, 500).map((r) => [
    make("a", { href: `/#i=${encode({ ...BLANK, structure: r.structure, c13: r.c13, h1: r.h1, solvent: r.solvent, sample: r.sample.slice(0, 200) })}`, target: "_blank", rel: "noopener" }, r.sample),
    `${SIGN[r.judgement] ?? "–"} ${r.judgement}`, formatProbability(r.probability), r.leftovers === null ? "" : String(r.leftovers), r.why, r.structure])),
    found.length > 500 ? make("p", { class: "hint" }, `${found.length - 500} more; narrow the choice to see them.`) : "");
}
function saveTable() {
  // A cell that a spreadsheet would take for a formula gets an apostrophe in front.
  const cell = (v) => { const t = String(v ?? ""); return `"${(/^[=+\-@\t]/.test(t) && Number.isNaN(Number(t)) ? `'${t}` : t).replaceAll('"', '""')}"`; };
  const lines = [["sample", "judgement", "probability", "leftovers", "why", "smiles"], ...results.map((r) => [r.sample, r.judgement, r.probability, r.leftovers, r.why, r.structure])];
  const address = URL.createObjectURL(new Blob([lines.map((l) => l.map(cell).join(",")).join("\r\n") + "\r\n"], { type: "text/csv" }));
  make("a", { href: address, download: "shiftpred-samples.csv" }).click();
  setTimeout(() => URL.revokeObjectURL(address), 10000);
}
async function takeFile(file) {
  if (!file) return;
  if (file.size > MOST_CHARACTERS) { refuse(`${file.name} has ${file.size.toLocaleString("en")} bytes; expected at most ${MOST_CHARACTERS.toLocaleString("en")}. Try: shiftpred triage, on the command line.`); return; }
  $("table").value = await file.text();
  run();
}
$("run").addEventListener("click", run);
$("stop").addEventListener("click", () => running?.abort());
$("judgements").addEventListener("change", show); $("words").addEventListener("input", show);
$("save-table").addEventListener("click", saveTable);
$("table-file").addEventListener("change", (e) => { takeFile(e.target.files[0]); e.target.value = ""; });
for (const kind of ["dragenter", "dragover"]) $("table-card").addEventListener(kind, (e) => { e.preventDefault(); $("table-card").classList.add("dropping"); });
$("table-card").addEventListener("dragleave", () => $("table-card").classList.remove("dropping"));
$("table-card").addEventListener("drop", (e) => { e.preventDefault(); $("table-card").classList.remove("dropping"); takeFile(e.dataTransfer.files[0]); });
