// The scheme page: describe beams in a field, read whether they work.

import { atomPath, get, post } from "./ask.js";
import { beamForm, beamRecord } from "./beams.js";
import * as show from "./verdict.js";
import { element, table } from "./write.js";

const at = (id) => document.getElementById(id);
const along = (x, y, z) => [x, y, z].map(String);
const PRESETS = {
  ion: {
    title: "40Ca+: cooling and repump", atom: "40Ca+", field: along(1, 1, 2),
    beams: [
      { name: "cooling", line: "397", direction: along(1, 0, 0), light: "linear", lightValues: ["30"], detuning: "-10", bright: "saturation", brightValues: ["1"] },
      { name: "repump", line: "866", direction: along(1, 0, 0), light: "linear", lightValues: ["30"], detuning: "15", bright: "saturation", brightValues: ["3"] },
    ],
  },
  pumping: {
    title: "87Rb: pumping to 2,2 on D1", atom: "87Rb", field: along(0, 0, 1), target: ["5s_2S1/2", "2,2"],
    beams: [
      { name: "pump", line: "795", direction: along(0, 0, 1), light: "right", detuning: "0", component: "2-2", bright: "saturation", brightValues: ["0.3"], wanted: "sigma+" },
      { name: "back", line: "795", direction: along(0, 0, 1), light: "right", detuning: "0", component: "1-2", bright: "saturation", brightValues: ["0.3"], linewidth: "1", wanted: "sigma+" },
    ],
  },
  cooling: {
    title: "87Rb: cooling without a repumper", atom: "87Rb", field: along(0, 0, 0.5),
    beams: [{ name: "cooling", line: "780", direction: along(1, 0, 1), light: "linear", lightValues: ["0"], detuning: "-6", component: "2-3", bright: "power", brightValues: ["5", "3"] }],
  },
};
const NEXT = { name: "", direction: along(0, 0, 1), light: "right", detuning: "0", bright: "saturation", brightValues: ["1"] };
let lines = [];
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

function add(given) {
  const name = given.name || `beam ${at("beams").children.length + 1}`;
  at("beams").append(beamForm({ ...given, name }, lines, (form) => form.remove()));
}

async function chooseAtom(name) {
  at("atom").value = name;
  const [ofLines, ofLevels] = await Promise.all([get(atomPath(name, "lines")), get(atomPath(name, "levels"))]);
  lines = ofLines.lines;
  fill(at("target-level"), [["", "none: it should scatter"], ...ofLevels.levels.map((level) => [level.name, level.name])], "");
}

async function start(preset) {
  await chooseAtom(preset.atom);
  preset.field.forEach((value, k) => { at(`field-${"xyz"[k]}`).value = value; });
  [at("target-level").value, at("target-sublevel").value] = preset.target || ["", ""];
  at("beams").replaceChildren();
  preset.beams.forEach(add);
}

function request() {
  const number = (text) => (text.trim() !== "" && Number.isFinite(Number(text)) ? Number(text) : text.trim());
  const body = { atom: at("atom").value, field: [..."xyz"].map((axis) => number(at(`field-${axis}`).value)), beams: [...at("beams").children].map(beamRecord), model: at("model").value };
  if (at("target-level").value) body.target = { level: at("target-level").value, sublevel: at("target-sublevel").value };
  if (at("remedies").checked) body.remedies = true;
  return body;
}

function sources(records) {
  return table([
    { title: "used for", show: (r) => r.used_for.join(", "), text: true },
    { title: "evidence", show: (r) => element("span", r.evidence, { class: `evidence-${r.evidence}` }), text: true },
    { title: "publication", show: (r) => r.citation, text: true },
  ], records, "checked: compared with the publication; recalled: entered from memory of it; computed: by formula");
}

async function check(signal) {
  const body = request();
  at("request").textContent = JSON.stringify(body, null, 1);
  const answer = await post("v1/scheme", body, signal);
  at("release").textContent = `data ${answer.release}`;
  show.findings(answer, at("findings"), at("verdict"));
  at("numbers").replaceChildren(...show.numbers(answer));
  at("warnings").replaceChildren(...answer.warnings.map((text) => element("p", text, { class: "warning" })));
  at("model-notes").hidden = !answer.warnings.length;
  at("polarisations").replaceChildren(show.polarisations(answer));
  at("populations").replaceChildren(show.populations(answer));
  at("dark").replaceChildren(show.dark(answer));
  at("components").replaceChildren(show.components(answer));
  at("other-lines").replaceChildren(show.otherLines(answer));
  at("sources").replaceChildren(sources(answer.sources));
  at("answer").hidden = false;
}

async function guarded(work) {
  running.abort();
  running = new AbortController();
  const { signal } = running;
  document.body.classList.add("waiting");
  at("busy").textContent = "asking \u2026";
  at("problem").hidden = true;
  try {
    await work(signal);
  } catch (error) {
    complain(error);
  } finally {
    if (!signal.aborted) {
      document.body.classList.remove("waiting");
      at("busy").textContent = "";
    }
  }
}

at("ask").addEventListener("submit", (event) => { event.preventDefault(); guarded(check); });
at("add").addEventListener("click", () => add({ ...NEXT, line: lines[0].name }));
at("preset").addEventListener("change", () => guarded(async (signal) => { await start(PRESETS[at("preset").value]); await check(signal); }));
at("atom").addEventListener("change", () => guarded(async () => {
  await chooseAtom(at("atom").value);
  at("beams").replaceChildren();
  add({ ...NEXT, line: lines[0].name });
  at("answer").hidden = true;
}));
guarded(async (signal) => {
  const { atoms } = await get("v1/atoms");
  fill(at("atom"), atoms.map(({ name }) => [name, name]));
  fill(at("preset"), Object.entries(PRESETS).map(([key, { title }]) => [key, title]), "ion");
  await start(PRESETS.ion);
  await check(signal);
});
