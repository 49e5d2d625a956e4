// One beam as a small form, and as the request's record.

import { element } from "./write.js";

// Each way to say a polarisation or a brightness: its name, the inputs it needs, and the members it becomes.
const LIGHT = {
  linear: { title: "linear", inputs: [["angle (deg)", "0"]], record: ([angle]) => ({ linear: angle }) },
  right: { title: "circular, right", inputs: [], record: () => ({ handedness: "right" }) },
  left: { title: "circular, left", inputs: [], record: () => ({ handedness: "left" }) },
  ellipse: { title: "elliptical", inputs: [["ellipticity (deg)", "20"], ["azimuth (deg)", "0"]], record: ([e, a]) => ({ ellipticity: e, azimuth: a }) },
  plates: {
    title: "polariser and plates", inputs: [["polariser (deg)", "0"], ["half-wave (deg)", "0"], ["quarter-wave (deg)", "45"]],
    record: ([p, h, q]) => ({ polariser: p, plates: [{ kind: "half", angle: h }, { kind: "quarter", angle: q }] }),
  },
  "sigma+": { title: "best for sigma+", inputs: [], record: () => ({ best_for: "sigma+" }) },
  pi: { title: "best for pi", inputs: [], record: () => ({ best_for: "pi" }) },
  "sigma-": { title: "best for sigma-", inputs: [], record: () => ({ best_for: "sigma-" }) },
};
const BRIGHT = {
  saturation: { title: "I/I_sat", inputs: [["I/I_sat", "1"]], record: ([s]) => ({ saturation: Number(s) }) },
  intensity: { title: "intensity", inputs: [["mW/cm\u00b2", "10"]], record: ([i]) => ({ intensity: i }) },
  power: { title: "power and waist", inputs: [["power (mW)", "1"], ["waist (mm)", "1"]], record: ([p, w]) => ({ power: p, waist: w }) },
};
const WANTED = ["", "sigma+", "pi", "sigma-"];

function labelled(text, control) {
  return element("label", [text, " ", control]);
}

function input(value, name, short = true) {
  const attributes = { value, spellcheck: "false", "data-part": name };
  return element("input", "", short ? { ...attributes, class: "short" } : attributes);
}

function choice(options, chosen, name) {
  const select = element("select", options.map(([value, text]) => element("option", text, { value })), { "data-part": name });
  if (options.some(([value]) => value === chosen)) select.value = chosen;
  return select;
}

// A select of ways and, behind it, the inputs of the way that is chosen.
function ways(table, chosen, values, title, name) {
  const select = choice(Object.entries(table).map(([key, way]) => [key, way.title]), chosen, name);
  const inputs = element("span", "", { class: "line", "data-inputs": name });
  const show = (given) => {
    const way = table[select.value];
    inputs.replaceChildren(...way.inputs.map(([text, usual], k) => labelled(text, input(given[k] ?? usual, `${name}-${k}`))));
  };
  select.addEventListener("change", () => show([]));
  show(values);
  return [labelled(title, select), inputs];
}

export function beamForm(given, lines, remove) {
  const lineOptions = lines.map(({ name, aliases, lower, upper }) => [name, `${name}${aliases.length ? ` (${aliases[0]})` : ""}  ${lower} \u2013 ${upper}`]);
  const wanted = choice(WANTED.map((name) => [name, name || "anything"]), given.wanted || "", "wanted");
  const away = element("button", "remove", { type: "button", class: "away", "aria-label": `Remove beam ${given.name}` });
  const direction = element("div", [
    element("span", "Direction x, y, z"),
    ...["x", "y", "z"].map((axis, k) => element("input", "", { value: given.direction[k], "data-part": `direction-${k}`, "aria-label": `Direction ${axis} of the beam`, spellcheck: "false" })),
  ], { class: "vector", role: "group", "aria-label": "Direction" });
  const form = element("fieldset", [
    element("legend", "Beam"),
    element("div", [
      labelled("Name", input(given.name, "name")), labelled("Line", choice(lineOptions, given.line, "line")), direction,
      ...ways(LIGHT, given.light, given.lightValues || [], "Polarisation", "light"),
    ], { class: "line" }),
    element("div", [
      labelled("Detuning (MHz)", input(given.detuning, "detuning")), labelled("from component", input(given.component || "", "component")),
      ...ways(BRIGHT, given.bright, given.brightValues || [], "Brightness", "bright"),
      labelled("Laser linewidth (MHz)", input(given.linewidth || "0", "linewidth")), labelled("Meant for", wanted), away,
    ], { class: "line" }),
  ], { class: "beam" });
  away.addEventListener("click", () => remove(form));
  return form;
}

const number = (text) => (text.trim() !== "" && Number.isFinite(Number(text)) ? Number(text) : text.trim());

export function beamRecord(form) {
  const part = (name) => form.querySelector(`[data-part="${name}"]`).value;
  const values = (name) => [...form.querySelectorAll(`[data-inputs="${name}"] input`)].map(({ value }) => number(value));
  const record = {
    name: part("name"), line: part("line"), direction: [0, 1, 2].map((k) => number(part(`direction-${k}`))),
    polarisation: LIGHT[part("light")].record(values("light")), detuning: number(part("detuning")),
    ...BRIGHT[part("bright")].record(values("bright")), linewidth: number(part("linewidth")),
  };
  if (part("component").trim()) record.component = part("component").trim();
  if (part("wanted")) record.wanted = part("wanted");
  return record;
}
