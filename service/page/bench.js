// The bench page: pick a line and a field, read off frequencies, strengths, curves and field-insensitive pairs.

import { atomPath, get, post } from "./ask.js";
import { curves, strokes } from "./draw.js";
import { element, label, measured, shortest, table } from "./write.js";

const at = (id) => document.getElementById(id);
const CURVE_POINTS = 201;
let running = new AbortController();

function fill(select, choices, chosen) {
  select.replaceChildren(...choices.map(([value, text]) => element("option", text, { value })));
  if (choices.some(([value]) => value === chosen)) select.value = chosen;
}

function complain(error) {
  if (error.name === "AbortError") return;
  const problem = error.problem || {};
  const near = (problem.nearest || []).length ? ` Nearest: ${problem.nearest.join(", ")}.` : "";
  at("problem").replaceChildren(element("strong", problem.title || "The service did not answer"), ` ${error.message}${near}`);
  at("problem").hidden = false;
}

async function atoms() {
  const answer = await get("v1/atoms");
  at("release").textContent = `data ${answer.release}`;
  fill(at("atom"), answer.atoms.map(({ name }) => [name, name]), "87Rb");
}

async function lines() {
  const atom = at("atom").value;
  const [linesAnswer, levelsAnswer] = await Promise.all([get(atomPath(atom, "lines")), get(atomPath(atom, "levels"))]);
  const spoken = ({ name, aliases, lower, upper }) => `${name}${aliases.length ? ` (${aliases[0]})` : ""}  ${lower} \u2013 ${upper}`;
  fill(at("line"), linesAnswer.lines.map((line) => [line.name, spoken(line)]), "780");
  fill(at("level"), levelsAnswer.levels.map(({ name }) => [name, name]), linesAnswer.lines[0]?.lower);
  at("line").dataset.lower = JSON.stringify(Object.fromEntries(linesAnswer.lines.map((line) => [line.name, line.lower])));
}

function chooseEnds(columns) {
  const strongest = columns.strength.reduce((best, s, k) => ((s || 0) >= (columns.strength[best] || 0) ? k : best), 0);
  const lowers = [...new Set(columns.lower_F.map((F, k) => label(F, columns.lower_m[k])))];
  const uppers = [...new Set(columns.upper_F.map((F, k) => label(F, columns.upper_m[k])))];
  const keep = (select, wanted, options) => fill(select, options.map((o) => [o, o]), options.includes(select.value) ? select.value : wanted);
  keep(at("lower"), label(columns.lower_F[strongest], columns.lower_m[strongest]), lowers);
  keep(at("upper"), label(columns.upper_F[strongest], columns.upper_m[strongest]), uppers);
}

function number(name, scalar, first = false) {
  const unit = scalar.unit === "1" ? "" : ` ${scalar.unit.replace(/2$/, "\u00b2")}`;
  const text = [measured(scalar.value, scalar.uncertainty), element("span", unit, { class: "unit" })];
  if (scalar.reason) {
    const said = scalar.value === null || scalar.reason.length < 40 ? ` (${scalar.reason})` : " (uncertainty unknown)";
    text.push(element("span", said, { class: "unit", title: scalar.reason }));
  }
  return [element("dt", name), element("dd", text, { class: first ? "first" : "" })];
}

function notes(answer) {
  return (answer.warnings || []).map((text) => element("p", text, { class: "warning" }));
}

async function one(signal) {
  const query = { line: at("line").value, lower: at("lower").value, upper: at("upper").value, field: at("field").value };
  const answer = await get(atomPath(at("atom").value, "shift"), query, signal);
  const list = element("dl", [
    number("frequency", answer.frequency, true), number("offset from the centroid", answer.offset),
    number("shift from zero field", answer.shift), number("slope", answer.slope), number("quadratic coefficient", answer.quadratic),
    number("strength", answer.strength), [element("dt", "polarisation"), element("dd", answer.polarisation)],
  ].flat());
  const excluded = answer.uncertainty_excludes.join(", ");
  const without = excluded ? `No uncertainty is stated for ${excluded}: it is left out, and where it could outweigh the rest the uncertainty is unknown.` : "";
  at("one").replaceChildren(list, element("p", without, { class: "help" }), ...notes(answer));
  return answer.sources;
}

async function all(signal) {
  const query = { line: at("line").value, field: at("field").value, polarisation: at("polarisation").value };
  const { columns } = await get(atomPath(at("atom").value, "components"), query, signal);
  chooseEnds(columns);
  const shown = columns.offset_MHz.map((_, k) => k).sort((a, b) => columns.offset_MHz[a] - columns.offset_MHz[b]);
  at("sticks").replaceChildren(strokes(columns));
  const open = columns.strength.filter((s) => s > 1e-6).length;
  at("sticks-text").textContent = `${open} components with strength, by offset from the centroid; height is strength, stroke is polarisation.`;
  const fixed = (name, digits) => (k) => (columns[name][k] === null ? "" : columns[name][k].toFixed(digits));
  at("components").replaceChildren(table([
    { title: "lower F,m", show: (k) => label(columns.lower_F[k], columns.lower_m[k]) },
    { title: "upper F,m", show: (k) => label(columns.upper_F[k], columns.upper_m[k]) },
    { title: "polarisation", show: (k) => columns.polarisation[k], text: true },
    { title: "offset (MHz)", show: fixed("offset_MHz", 3) }, { title: "shift (MHz)", show: fixed("shift_MHz", 4) },
    { title: "slope (MHz/G)", show: fixed("slope_MHz_per_G", 5) }, { title: "strength", show: fixed("strength", 5) },
    { title: "at zero field", show: (k) => columns.strength_at_zero_field[k] },
  ], shown, "Components by offset"));
}

async function against(signal) {
  const [atom, level, stop] = [at("atom").value, at("level").value, `${at("max-field").value}`];
  const body = { atom, level, fields: { start: "0", stop, points: CURVE_POINTS }, columns: ["energy_MHz"] };
  const { columns } = await post("v1/sweep", body, signal);
  curves(at("curves"), columns, atom, level);
  const last = columns.energy_MHz.slice(-columns.energy_MHz.length / CURVE_POINTS);
  at("curves-text").textContent = `${last.length} sublevels from 0 to ${stop} G; at the end from ${shortest(Math.min(...last), 6)} to ${shortest(Math.max(...last), 6)} MHz. Stroke and dash tell F.`;
}

async function still(signal) {
  const query = { level: at("level").value, max_field: at("max-field").value };
  const { columns } = await get(atomPath(at("atom").value, "insensitive"), query, signal);
  const rows = columns.field_G.map((_, k) => k);
  at("insensitive").replaceChildren(rows.length ? table([
    { title: "lower F,m", show: (k) => label(columns.lower_F[k], columns.lower_m[k]) },
    { title: "upper F,m", show: (k) => label(columns.upper_F[k], columns.upper_m[k]) },
    { title: "field (G)", show: (k) => measured(columns.field_G[k], columns.field_uncertainty_G[k]) },
    { title: "frequency (MHz)", show: (k) => measured(columns.frequency_MHz[k], columns.frequency_uncertainty_MHz[k]) },
    { title: "quadratic (Hz/G\u00b2)", show: (k) => measured(columns.quadratic_Hz_per_G2[k], columns.quadratic_uncertainty_Hz_per_G2[k]) },
  ], rows, "Pairs whose difference does not move, m differing by 2 at most") : element("p", "None in this range.", { class: "help" }));
}

function sources(records) {
  at("sources").replaceChildren(table([
    { title: "used for", show: (r) => r.used_for.join(", "), text: true },
    { title: "evidence", show: (r) => element("span", r.evidence, { class: `evidence-${r.evidence}` }), text: true },
    { title: "publication", show: (r) => r.citation, text: true },
  ], records, "checked: compared with the publication; recalled: entered from memory of it; computed: by formula"));
}

async function guarded(work) {
  running.abort();
  running = new AbortController();
  const { signal } = running;
  document.body.classList.add("waiting");
  at("problem").hidden = true;
  try {
    await work(signal);
  } catch (error) {
    complain(error);
  } finally {
    if (!signal.aborted) document.body.classList.remove("waiting");
  }
}

const ofComponent = async (signal) => sources(await one(signal));
const ofLevel = (signal) => Promise.all([against(signal), still(signal)]);
const ofLine = async (signal) => {
  at("level").value = JSON.parse(at("line").dataset.lower)[at("line").value] || at("level").value;
  await all(signal);
  await Promise.all([ofComponent(signal), ofLevel(signal)]);
};
const everything = async (signal) => { await lines(); await ofLine(signal); };
const ofField = async (signal) => { await all(signal); await ofComponent(signal); };

at("ask").addEventListener("submit", (event) => event.preventDefault());
at("atom").addEventListener("change", () => guarded(everything));
at("line").addEventListener("change", () => guarded(ofLine));
for (const id of ["field", "polarisation"]) at(id).addEventListener("change", () => guarded(ofField));
for (const id of ["lower", "upper"]) at(id).addEventListener("change", () => guarded(ofComponent));
for (const id of ["level", "max-field"]) at(id).addEventListener("change", () => guarded(ofLevel));
guarded(async (signal) => { await atoms(); await everything(signal); });
