// The page: state → questions to this server → pictures and tables. Every text goes in as text, never as HTML.
import { $, BLANK, FIELDS, LONGEST, SIGN, ask, buildFault, buildTable, encode, formatProbability, make } from "/static/shared.js";
const EXAMPLE = { ...BLANK, structure: "CCOC(=O)c1ccccc1", solvent: "CDCl3",
  c13: "13C NMR (101 MHz, CDCl3) δ 166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 14.3",
  h1: "1H NMR (400 MHz, CDCl3) δ 8.04 (m, 2H), 7.55 (m, 1H), 7.43 (m, 2H), 4.38 (q, J = 7.1 Hz, 2H), 1.39 (t, J = 7.1 Hz, 3H)" };
const KEY = "shiftpred-input";
const NUMBERS = new Set(["Predicted", "Interval", "Observed", "Deviation", "Certain"]);
const checked = new Map(); // what the server said about a peak list
let past = [], future = [], current = { ...BLANK }, last = null, shown = "13C", timer = 0, running = null, whyAsked = null;

// ---- small tools
function readPicture(text) {
  const found = new DOMParser().parseFromString(text, "image/svg+xml").documentElement;
  return found.nodeName === "svg" ? document.importNode(found, true) : make("p", {}, "no picture");
}
function save(name, text, kind) {
  const address = URL.createObjectURL(new Blob([text], { type: kind }));
  make("a", { href: address, download: name }).click();
  setTimeout(() => URL.revokeObjectURL(address), 10000);
}
async function savePng(name, svg) {
  const image = new Image(), address = URL.createObjectURL(new Blob([svg], { type: "image/svg+xml" }));
  image.src = address; await image.decode();
  const sheet = make("canvas", { width: image.naturalWidth * 3, height: image.naturalHeight * 3 }), pen = sheet.getContext("2d");
  pen.fillStyle = "#ffffff"; pen.fillRect(0, 0, sheet.width, sheet.height); pen.drawImage(image, 0, 0, sheet.width, sheet.height);
  URL.revokeObjectURL(address);
  sheet.toBlob((blob) => save(name, blob, "image/png"), "image/png");
}
const format = (value, nucleus) => (value === null || value === undefined ? "" : value.toFixed(nucleus === "13C" ? 1 : 2));
function buildLengthFault(text) {
  return make("p", { class: "fault" }, `${text.length.toLocaleString("en")} characters; expected at most ${LONGEST.toLocaleString("en")}. Try: one structure, and the picked peaks of one spectrum.`);
}

// ---- input, its past, its places to stay
function readInput() {
  return Object.fromEntries(FIELDS.map((f) => [f, $(f).type === "checkbox" ? $(f).checked : $(f).value]));
}
function writeInput(input) {
  for (const f of FIELDS) {
    const value = input[f] ?? BLANK[f];
    if ($(f).type === "checkbox") $(f).checked = Boolean(value); else $(f).value = String(value);
  }
}
function remember(input) {
  if (JSON.stringify(input) === JSON.stringify(current)) return false;
  past.push(current); past = past.slice(-100); future = []; current = input;
  return true;
}
function keepInput() {
  try { localStorage.setItem(KEY, JSON.stringify(current)); } catch { /* private window: it lives as long as the page */ }
  $("step-back").disabled = !past.length; $("step-forward").disabled = !future.length;
}
function setInput(input, isStep = false) {
  const whole = { ...BLANK, ...input };
  writeInput(whole);
  if (isStep) current = whole; else remember(whole);
  keepInput(); answer();
}
function decode(hash) {
  try {
    const bytes = Uint8Array.from(atob(hash.replaceAll("-", "+").replaceAll("_", "/")), (c) => c.charCodeAt(0));
    const found = JSON.parse(new TextDecoder().decode(bytes));
    return Object.fromEntries(FIELDS.filter((f) => typeof found[f] === typeof BLANK[f]).map((f) => [f, found[f]]));
  } catch { return null; }
}
function loadInput() {
  if (location.hash.startsWith("#i=")) { const found = decode(location.hash.slice(3)); if (found) return found; }
  try { return JSON.parse(localStorage.getItem(KEY)) ?? {}; } catch { return {}; }
}

// ---- questions
function buildSettings(input) {
  const number = (text, other) => (text === "" || Number.isNaN(Number(text)) ? other : Number(text));
  return { c13: input.c13, h1: input.h1, solvent: input.solvent, coverage: number(input.coverage, 0.9), frequency_mhz: number(input.frequency_mhz, null),
    prior: number(input.prior, 0.5), expected: input.expected.split(/\s+/).filter(Boolean), sample: input.sample };
}
function buildQuestion(input) {
  const width = Math.round(Math.max(300, Math.min(1400, $("answer").clientWidth - 36)));
  return { ...buildSettings(input), structure: input.structure, rivals: Math.round(Number(input.rivals) || 0), mass_confirmed: input.mass_confirmed, width };
}
async function answer() {
  running?.abort();
  const mine = (running = new AbortController()), input = current, fine = {};
  if (!input.structure.trim() && !input.c13.trim() && !input.h1.trim()) { $("busy").textContent = ""; }
  else $("busy").textContent = "Working …";
  try {
    const checks = [["c13", "13C"], ["h1", "1H"]].map(async ([field, nucleus]) => { fine[field] = await checkPeaks(field, nucleus, input[field], mine.signal); });
    await Promise.all(checks);
    if (!input.structure.trim()) { $("structure-said").textContent = ""; showNothing(); return; }
    if (input.structure.length > LONGEST) { $("structure-said").replaceChildren(buildLengthFault(input.structure)); showNothing(); return; }
    const asked = buildQuestion(input);
    if (!fine.c13) asked.c13 = ""; if (!fine.h1) asked.h1 = "";
    if (asked.c13.trim() || asked.h1.trim()) {
      const found = await ask("compare", asked, mine.signal);
      last = { asked, document: found.comparison, pictures: found.pictures, nuclei: found.comparison.predicted, structure: found.comparison.structure, compared: true };
    } else {
      const { structure, solvent, coverage } = asked;
      const found = await ask("predict", { structure, solvent, coverage }, mine.signal);
      const molecule = found.prediction.molecules[0];
      last = { asked, document: found.prediction, pictures: { ...found.pictures, lanes: {} }, nuclei: molecule.nuclei, structure: molecule.structure, notes: molecule.notes, compared: false };
    }
    $("structure-said").replaceChildren([last.structure.formula, ...new Set([...last.structure.notes, ...(last.notes ?? [])])].join("; "));
    show();
  } catch (error) {
    if (error.name === "AbortError") return;
    $("structure-said").replaceChildren(buildFault(error)); showNothing();
  } finally { if (running === mine) $("busy").textContent = ""; }
}
async function checkPeaks(field, nucleus, text, signal) {
  const place = $(`${field}-said`), box = $(field);
  box.removeAttribute("aria-invalid");
  if (!text.trim()) { place.replaceChildren(); return true; }
  if (text.length > LONGEST) { box.setAttribute("aria-invalid", "true"); place.replaceChildren(buildLengthFault(text)); return false; }
  let found;
  try { found = checked.get(`${nucleus} ${text}`) ?? await ask("peaks", { nucleus, text }, signal); if (checked.size > 50) checked.clear(); checked.set(`${nucleus} ${text}`, found); } catch (error) {
    if (error.name === "AbortError") throw error;
    found = { error: error.parts ?? { message: error.message, problems: [] } };
  }
  if (found.understood) {
    const lines = found.understood.lines.length, said = `${lines} ${lines === 1 ? "peak" : "peaks"} understood`;
    place.replaceChildren([said, found.understood.solvent, ...found.understood.notes].filter(Boolean).join("; "));
    return true;
  }
  box.setAttribute("aria-invalid", "true");
  const parts = [make("p", { class: "fault" }, found.error.message)];
  const problems = found.error.problems ?? [];
  if (problems.length > 1) parts.push(make("ul", {}, ...problems.slice(0, 20).map((p) => make("li", {}, `${p.place}: ${p.text} — ${p.reason}`))));
  if (problems.some((p) => p.text)) parts.push(markText(text.slice(0, 5000), problems.map((p) => p.text).filter(Boolean)));
  place.replaceChildren(...parts);
  return false;
}
function markText(text, snippets) {
  const box = make("div", { class: "echo", tabindex: "0", role: "group", "aria-label": "What was typed, with what was not understood marked" });
  let at = 0;
  for (const snippet of snippets) {
    const found = text.indexOf(snippet, at);
    if (found < 0) continue;
    box.append(text.slice(at, found), make("mark", {}, snippet)); at = found + snippet.length;
  }
  box.append(text.slice(at));
  return box;
}

// ---- the answer
const CARDS = ["judgement", "picture", "lanes", "assignment", "why", "leftovers", "rivals-card", "keep"];
function showNothing() { last = null; for (const id of CARDS) $(id).hidden = true; }
function show() {
  const { document: d, compared } = last;
  for (const id of ["judgement", "lanes", "leftovers", "rivals-card"]) $(id).hidden = !compared;
  for (const id of ["picture", "assignment", "keep"]) $(id).hidden = false;
  for (const id of ["save-html", "save-csv", "save-lanes", "save-lanes-png"]) $(id).hidden = !compared;
  $("assignment-heading").textContent = compared ? "Assignment" : "Predicted shifts";
  showStructure(); showTables();
  if (compared) { showJudgement(d); showLanes(); showLeftovers(d); showRivals(d); }
  if (whyAsked && last.nuclei.some((n) => n.atom === whyAsked.atom && n.nucleus === whyAsked.nucleus)) explain(whyAsked.atom, whyAsked.nucleus, false);
  else $("why").hidden = true;
}
function showJudgement(d) {
  const words = d.reason_code ? ` (${d.reason_code.replaceAll("_", " ")})` : "";
  $("judgement-body").replaceChildren(
    make("p", { class: `verdict ${d.judgement}` }, make("span", { "aria-hidden": "true" }, SIGN[d.judgement]), `${d.judgement}${words}, probability ${formatProbability(d.probability)}`),
    make("ul", {}, ...d.reasons.map((r) => make("li", {}, r))),
    make("p", { class: "hint" }, d.balance.map((b) => `${b.nucleus}: expected ${b.expected}, found ${b.found}, missing ${b.missing}, in excess ${b.excess}`).join("; ")),
    ...d.cautions.slice(0, -1).map((c) => make("p", { class: "hint" }, c)));
}
function showStructure() {
  const pictures = last.pictures.structure;
  if (!pictures[shown]) shown = Object.keys(pictures)[0] ?? "13C";
  for (const n of ["13C", "1H"]) { $(`show-${n}`).setAttribute("aria-pressed", String(n === shown)); $(`show-${n}`).disabled = !pictures[n]; }
  const box = $("structure-picture");
  box.replaceChildren(pictures[shown] ? readPicture(pictures[shown]) : "");
  for (const disc of box.querySelectorAll(".site")) {
    const atom = Number(disc.dataset.atom);
    disc.addEventListener("pointerenter", () => light([atom])); disc.addEventListener("pointerleave", () => light([]));
    disc.addEventListener("click", () => explain(atom, shown, true));
  }
}
function showLanes() {
  const lanes = Object.entries(last.pictures.lanes).filter(([, svg]) => svg);
  $("lane-pictures").replaceChildren(...lanes.map(([, svg]) => readPicture(svg)));
  for (const bar of $("lane-pictures").querySelectorAll(".bar")) {
    const atoms = bar.dataset.atoms.split(" ").map(Number);
    bar.addEventListener("pointerenter", () => light(atoms)); bar.addEventListener("pointerleave", () => light([]));
  }
}
function light(atoms) {
  const wanted = new Set(atoms.map(Number));
  for (const node of document.querySelectorAll("[data-atom], [data-atoms]")) {
    const own = (node.dataset.atoms ?? node.dataset.atom).split(" ").map(Number);
    node.classList.toggle("lit", own.some((a) => wanted.has(a)));
  }
}
function showTables() {
  const d = last.document, parts = [];
  for (const nucleus of ["13C", "1H"]) {
    const seen = new Map();
    for (const n of last.nuclei) if (n.nucleus === nucleus) { const key = `${n.equivalent_atoms}|${n.hydrogen}`; if (!seen.has(key)) seen.set(key, n); }
    if (!seen.size) continue;
    const rows = [...seen.entries()].sort((a, b) => b[1].shift_ppm - a[1].shift_ppm).map(([key, n]) => buildRow(n, nucleus,
      last.compared ? d.assignments.filter((a) => a.nucleus === nucleus && `${a.equivalent_atoms}|${a.hydrogen}` === key) : [],
      last.compared ? d.missing.find((m) => m.nucleus === nucleus && `${m.equivalent_atoms}|${m.hydrogen}` === key) : null));
    const heads = ["Atom", "Group", "Predicted", "Interval", ...(last.compared ? ["Observed", "Deviation", "Certain", "Remarks"] : ["Remarks"])];
    parts.push(make("h3", {}, `${nucleus}, ppm`), make("div", { class: "scroll" }, make("table", { class: "stack", "aria-label": `${nucleus} sites` },
      make("thead", {}, make("tr", {}, ...heads.map((h) => make("th", { scope: "col", class: NUMBERS.has(h) ? "number" : null }, h)))), make("tbody", {}, ...rows))));
  }
  $("assignment-tables").replaceChildren(...parts);
}
function buildRow(n, nucleus, found, missing) {
  const atoms = n.equivalent_atoms.join(", ") + (n.hydrogen ? ` ${n.hydrogen}` : "");
  const cell = (name, text, number = true) => make("td", { "data-name": name, class: number ? "number" : null }, text);
  const row = make("tr", { "data-atoms": n.equivalent_atoms.join(" ") },
    make("td", {}, make("button", { type: "button", "aria-label": `Why is the ${nucleus} shift of atom ${atoms} where it is`, onclick: () => explain(n.atom, nucleus, true) }, atoms)),
    make("td", {}, n.attached_h === 0 ? "" : n.attached_h === 1 ? "H" : `H${n.attached_h}`), cell("predicted", format(n.shift_ppm, nucleus)),
    cell("from to", n.lower_ppm === null ? "anywhere" : `${format(n.lower_ppm, nucleus)} – ${format(n.upper_ppm, nucleus)}`));
  const remarks = [n.note];
  if (last.compared) {
    row.append(cell("observed", found.map((a) => format(a.observed_ppm, nucleus)).join(", ") || (missing ? "no line" : "")),
      cell("deviation", found.map((a) => `${a.deviation_ppm > 0 ? "+" : ""}${a.deviation_ppm.toFixed(nucleus === "13C" ? 2 : 3)}${a.within_interval ? "" : " ◆"}`).join(", ")),
      cell("certain", found.map((a) => formatProbability(a.probability)).join(", ")));
    for (const a of found) {
      if (!a.within_interval) remarks.push("outside the interval");
      if (a.interchangeable_atoms.length) remarks.push(`could change places with ${a.interchangeable_atoms.join(", ")}`);
      remarks.push(a.note);
    }
    if (missing) remarks.push(missing.note || "expected, but no line");
  }
  row.append(cell("", [...new Set(remarks.filter(Boolean))].join("; "), false));
  row.addEventListener("pointerenter", () => light(n.equivalent_atoms)); row.addEventListener("pointerleave", () => light([]));
  row.addEventListener("focusin", () => light(n.equivalent_atoms)); row.addEventListener("focusout", () => light([]));
  return row;
}
function showLeftovers(d) {
  $("leftovers-body").replaceChildren(d.unexplained.length
    ? buildTable("Leftover lines", ["Line, ppm", "Nucleus", "Probably", "Remarks"], d.unexplained.map((u) => [format(u.observed_ppm, u.nucleus), u.nucleus, u.likely ?? "nothing known fits", u.note]))
    : make("p", { class: "hint" }, "None: every line has a place."));
}
function showRivals(d) {
  const build = (label, rivals) => buildTable(label, ["SMILES", "How", "Probability", "Decided by", "Change over"], rivals.map((r) => [r.smiles, r.how, formatProbability(r.probability), r.decided_by,
      make("button", { type: "button", "aria-label": `Propose ${r.smiles} instead`, onclick: () => setInput({ ...readInput(), structure: r.smiles }) }, "Propose")]));
  const far = d.rivals.slice(3);
  $("rivals-body").replaceChildren(d.rivals.length ? build("Nearest rivals", d.rivals.slice(0, 3)) : make("p", { class: "hint" }, "None was tried."),
    far.length ? make("details", {}, make("summary", {}, `${far.length} more that fit less well`), build("Further rivals", far)) : "");
}
async function explain(atom, nucleus, isAsked) {
  if (!last) return;
  whyAsked = { atom, nucleus };
  const { structure, solvent, coverage, width } = last.asked;
  $("why").hidden = false;
  $("why-heading").textContent = `Why this shift: ${nucleus} of atom ${atom}`;
  if (isAsked) { $("why-heading").focus({ preventScroll: true }); $("why").scrollIntoView({ block: "nearest" }); }
  try {
    const found = await ask("explain", { structure, atom, nucleus, solvent, coverage, width });
    if (whyAsked.atom !== atom || whyAsked.nucleus !== nucleus) return;
    const one = found.explanation.explanations[0];
    $("why-body").replaceChildren(readPicture(found.picture), make("details", {}, make("summary", {}, "In figures, with the constants"),
      buildTable("Contributions", ["Part", "ppm", "Constants"], one.contributions.map((c) => [`${c.label}${c.flag ? ` (${c.flag})` : ""}`, `${c.contribution_ppm > 0 ? "+" : ""}${c.contribution_ppm.toFixed(nucleus === "13C" ? 2 : 3)}`,
        Object.entries(c.constants).map(([k, v]) => `${k} ${v}`).join(", ")]))));
    if (isAsked) $("why").scrollIntoView({ block: "nearest" });
  } catch (error) { $("why-body").replaceChildren(buildFault(error)); }
}
async function rank() {
  const input = readInput(), box = $("ranking");
  box.replaceChildren("Working …");
  try {
    const { ranking: r } = await ask("rank", { ...buildSettings(input), structures: input.candidates });
    const rows = r.candidates.map((c) => [c.structure.smiles, formatProbability(c.probability), c.misfit.toFixed(1),
      make("button", { type: "button", "aria-label": `Open ${c.structure.smiles}`, onclick: () => setInput({ ...readInput(), structure: c.structure.smiles }) }, "Open")]);
    box.replaceChildren(buildTable("Candidates in order", ["SMILES", "Probability", "Misfit", "See"], rows), make("p", { class: "hint" }, `None of these: ${formatProbability(r.none_of_these)}`),
      ...r.failures.map((f) => make("p", { class: "fault" }, `${f.name}: ${f.note}`)));
  } catch (error) { box.replaceChildren(buildFault(error)); }
}

// ---- files, drawing
async function takeFile(file, field) {
  if (!file) return;
  if (file.size > 200000) { $(`${field}-said`).replaceChildren(make("p", { class: "fault" }, `${file.name}: ${file.size} bytes; at most 200,000. Try: one record.`)); return; }
  setInput({ ...readInput(), [field]: await file.text() });
}
function acceptDrops(node, field) {
  for (const kind of ["dragenter", "dragover"]) node.addEventListener(kind, (e) => { if (e.dataTransfer?.types.includes("Files")) { e.preventDefault(); node.classList.add("dropping"); } });
  node.addEventListener("dragleave", () => node.classList.remove("dropping"));
  node.addEventListener("drop", (e) => { node.classList.remove("dropping"); if (e.dataTransfer.files.length) { e.preventDefault(); takeFile(e.dataTransfer.files[0], field); } });
}
let editor = null, chemistry = null;
async function openDrawing() {
  chemistry ??= await import("/static/vendor/openchemlib/openchemlib.js");
  $("drawing").showModal();
  editor ??= new chemistry.CanvasEditor($("canvas"), { initialMode: "molecule" });
  const text = current.structure.trim();
  try { editor.setMolecule(text.includes("M  END") ? chemistry.Molecule.fromMolfile(current.structure) : chemistry.Molecule.fromSmiles(text.split(/\s/)[0] || "")); }
  catch { editor.clearAll(); }
}
function takeDrawing() {
  setInput({ ...readInput(), structure: editor.getMolecule().toMolfile() });
  $("drawing").close();
}

// ---- wiring
$("input").addEventListener("submit", (e) => e.preventDefault());
$("input").addEventListener("input", (e) => {
  if (e.target.type === "file") return;
  clearTimeout(timer);
  timer = setTimeout(() => { const before = current; if (remember(readInput())) { keepInput(); if (before.candidates === current.candidates) answer(); } }, 250);
});
$("step-back").addEventListener("click", () => { if (past.length) { future.push(current); setInput(past.pop(), true); } });
$("step-forward").addEventListener("click", () => { if (future.length) { past.push(current); setInput(future.pop(), true); } });
$("example").addEventListener("click", () => setInput(EXAMPLE));
$("clear").addEventListener("click", () => setInput({}));
$("copy-link").addEventListener("click", async () => {
  history.replaceState(null, "", `#i=${encode(readInput())}`);
  try { await navigator.clipboard.writeText(location.href); $("busy").textContent = "Link copied."; } catch { $("busy").textContent = "The link is in the address bar."; }
});
for (const n of ["13C", "1H"]) $(`show-${n}`).addEventListener("click", () => { shown = n; if (last) showStructure(); });
$("rank").addEventListener("click", rank);
$("structure-file").addEventListener("change", (e) => { takeFile(e.target.files[0], "structure"); e.target.value = ""; });
acceptDrops($("structure-card"), "structure"); acceptDrops($("c13"), "c13"); acceptDrops($("h1"), "h1");
$("draw").addEventListener("click", openDrawing); $("take-drawing").addEventListener("click", takeDrawing); $("leave-drawing").addEventListener("click", () => $("drawing").close());
async function saveReport(format_, name, kind) {
  try { save(name, await ask("report", { ...last.asked, format: format_ }), kind); } catch (error) { $("busy").replaceChildren(buildFault(error)); }
}
$("save-html").addEventListener("click", () => saveReport("html", "shiftpred-report.html", "text/html"));
$("save-csv").addEventListener("click", () => saveReport("csv", "shiftpred-shifts.csv", "text/csv"));
$("save-json").addEventListener("click", () => save("shiftpred.json", JSON.stringify(last.document, null, 1), "application/json"));
$("save-structure").addEventListener("click", () => save("shiftpred-structure.svg", last.pictures.structure[shown], "image/svg+xml"));
$("save-lanes").addEventListener("click", () => { for (const [n, svg] of Object.entries(last.pictures.lanes)) save(`shiftpred-lane-${n}.svg`, svg, "image/svg+xml"); });
$("save-structure-png").addEventListener("click", () => savePng("shiftpred-structure.png", last.pictures.structure[shown]));
$("save-lanes-png").addEventListener("click", async () => { for (const [n, svg] of Object.entries(last.pictures.lanes)) await savePng(`shiftpred-lane-${n}.png`, svg); });
window.addEventListener("hashchange", () => { const found = location.hash.startsWith("#i=") ? decode(location.hash.slice(3)) : null; if (found) setInput(found); });
current = { ...BLANK, ...loadInput() };
writeInput(current); keepInput(); answer();
