// What both pages need. Every text goes in as text, never as HTML.
export const $ = (id) => document.getElementById(id);
export const FIELDS = ["structure", "c13", "h1", "solvent", "frequency_mhz", "coverage", "rivals", "prior", "mass_confirmed", "expected", "sample", "candidates"];
export const BLANK = { structure: "", c13: "", h1: "", solvent: "", frequency_mhz: "", coverage: "0.9", rivals: "9", prior: "0.5", mass_confirmed: false, expected: "", sample: "", candidates: "" };
export const SIGN = { supported: "●", open: "◐", contradicted: "◆" };
export const LONGEST = 200000; // characters of one field; the server refuses more
export function make(tag, attributes = {}, ...children) {
  const node = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes)) {
    if (name.startsWith("on")) node.addEventListener(name.slice(2), value);
    else if (value !== null && value !== undefined && value !== false) node.setAttribute(name, value === true ? "" : value);
  }
  node.append(...children.filter((c) => c !== null && c !== undefined));
  return node;
}
export async function ask(route, body, signal) {
  let answer;
  try {
    answer = await fetch(`/api/${route}`, { method: "POST", headers: { "content-type": "application/json" }, body: JSON.stringify(body), signal });
  } catch (error) {
    if (error.name === "AbortError") throw error;
    throw Object.assign(new Error("the server does not answer; is `shiftpred serve` still running?"), { parts: null });
  }
  if (route === "report" && answer.ok) return answer.text();
  const found = await answer.json();
  if (!answer.ok) throw Object.assign(new Error(found.error.message), { parts: found.error });
  return found;
}
export function formatProbability(p) { return p === null ? "" : p > 0.999 ? "> 0.999" : p < 0.001 ? "< 0.001" : p.toFixed(3); }
export function buildFault(error) {
  const parts = error.parts;
  if (!parts) return make("p", { class: "fault" }, error.message);
  return make("p", { class: "fault" }, make("strong", {}, `${parts.where}: `), `got ${parts.came}; expected ${parts.would_do}. Try: ${parts.try_next}`);
}

export function encode(input) {
  const kept = Object.fromEntries(Object.entries(input).filter(([k, v]) => v !== BLANK[k]));
  const bytes = new TextEncoder().encode(JSON.stringify(kept));
  return btoa(Array.from(bytes, (b) => String.fromCharCode(b)).join("")).replaceAll("+", "-").replaceAll("/", "_").replace(/=+$/, "");
}
export function buildTable(label, heads, rows) {
  return make("div", { class: "scroll" }, make("table", { class: "stack", "aria-label": label }, make("thead", {}, make("tr", {}, ...heads.map((h) => make("th", { scope: "col" }, h)))),
    make("tbody", {}, ...rows.map((cells) => make("tr", {}, ...cells.map((c, i) => make("td", { "data-name": i ? heads[i].toLowerCase() : null, class: heads[i] === "SMILES" ? "smiles" : null }, c)))))));
}
