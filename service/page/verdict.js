// Shows a checked scheme: findings in words, shares as bars with their numbers, tables of what is driven.

import { element, half, label, shortest, table } from "./write.js";

const SVG = "http://www.w3.org/2000/svg";
const KIND = { "sigma+": "q-plus", pi: "q-none", "sigma-": "q-minus" };
const percent = (share) => `${share === 0 || share >= 1e-4 ? (100 * share).toFixed(2) : (100 * share).toExponential(1)} %`;

function shape(tag, attributes) {
  const node = document.createElementNS(SVG, tag);
  for (const [name, value] of Object.entries(attributes)) node.setAttribute(name, value);
  return node;
}

function bar(share, kind = "share", attainable = null) {
  const drawing = shape("svg", { viewBox: "0 0 100 8", preserveAspectRatio: "none", "aria-hidden": "true" });
  drawing.append(shape("rect", { width: 100, height: 8, class: "whole" }), shape("rect", { width: 100 * share, height: 8, class: kind }));
  if (attainable !== null) drawing.append(shape("line", { x1: 100 * attainable, x2: 100 * attainable, y1: 0, y2: 8, class: "attainable", "vector-effect": "non-scaling-stroke" }));
  return drawing;
}

function rowsOf(columns) {
  const names = Object.keys(columns);
  return columns[names[0]].map((_, k) => Object.fromEntries(names.map((name) => [name, columns[name][k]])));
}

function scalar({ value, unit, reason }, digits = 5) {
  if (value === null) return reason;
  return `${shortest(value, digits)}${unit === "1" ? "" : ` ${unit}`}`;
}

export function findings(answer, list, verdict) {
  const problems = answer.findings.filter(({ severity }) => severity === "problem").length;
  verdict.textContent = answer.works ? "No problem found." : `${problems} ${problems === 1 ? "problem" : "problems"} found.`;
  list.replaceChildren(...answer.findings.map(({ code, severity, text, change }) => element("li", [
    element("span", severity, { class: "severity" }), text, element("a", element("code", code), { href: `findings#${code}` }), ...(change ? [element("span", `What would change it: ${change}`, { class: "change" })] : []),
  ], { class: severity })));
}

export function numbers(answer) {
  const pairs = [
    ["scattering", `${answer.scattering.value.toExponential(2).replace("e+", "e")} photons per second and atom`], ["model", `${answer.model === "bloch" ? "optical Bloch equations" : "rate equations"}: ${answer.model_reason}`],
  ];
  if (answer.lost.value) pairs.push(["lost for good", scalar(answer.lost)]);
  if (answer.pumping.asked) {
    pairs.push(["ends in the target", percent(answer.pumping.purity.value)], ["pumping time (mean)", scalar(answer.pumping.mean_time)], ["photons to pump", scalar(answer.pumping.photons, 4)], ["heating", scalar(answer.pumping.heating, 3)]);
  } else {
    pairs.push(["best target of these beams", `${answer.pumping.fullest}, ${percent(answer.pumping.fullest_share.value)}`], ["photons before loss", scalar(answer.cycling.photons, 4)]);
  }
  return pairs.flatMap(([name, text]) => [element("dt", name), element("dd", text)]);
}

export function polarisations(answer) {
  return table([
    { title: "beam", show: (r) => r.beam, text: true }, { title: "drives", show: (r) => r.polarisation, text: true },
    { title: "", show: (r) => bar(r.fraction, KIND[r.polarisation] || "share", r.attainable), text: true },
    { title: "share", show: (r) => percent(r.fraction) }, { title: "attainable", show: (r) => percent(r.attainable) },
    { title: "half-wave (deg)", show: (r) => (r.half_wave_deg === null ? "\u2013" : r.half_wave_deg.toFixed(1)) },
    { title: "quarter-wave (deg)", show: (r) => (r.quarter_wave_deg === null ? "\u2013" : r.quarter_wave_deg.toFixed(1)) },
  ], rowsOf(answer.polarisations), "The mark on a bar is what this direction can attain; the plates' fast axes after a polariser along the first transverse axis reach it.");
}

export function populations(answer) {
  const rows = rowsOf(answer.populations);
  return table([
    { title: "level", show: (r) => r.level, text: true }, { title: "F", show: (r) => half(r.F) }, { title: "m", show: (r) => half(r.m) },
    { title: "", show: (r) => bar(r.population), text: true }, { title: "share", show: (r) => percent(r.population) },
  ], rows, "Steady state of the atoms still there; F is J without a nuclear spin");
}

export function dark(answer) {
  if (!answer.dark_states.length) return element("p", "None in the levels that the beams address.", { class: "help" });
  return table([
    { title: "level", show: (r) => r.manifold, text: true }, { title: "state", show: (r) => r.text, text: true }, { title: "holds", show: (r) => percent(r.held.value) },
    { title: "turned at (MHz)", show: (r) => shortest(r.mixing.value, 3) }, { title: "still excited at (1/s)", show: (r) => shortest(r.residual.value, 3) },
  ], answer.dark_states, "Combinations of sublevels that do not absorb; the field turns them into others");
}

export function components(answer) {
  const order = rowsOf(answer.components).sort((a, b) => b.scattering_per_s - a.scattering_per_s);
  return table([
    { title: "beam", show: (r) => r.beam, text: true }, { title: "lower F,m", show: (r) => label(r.lower_F, r.lower_m) }, { title: "upper F,m", show: (r) => label(r.upper_F, r.upper_m) },
    { title: "drives", show: (r) => r.polarisation, text: true }, { title: "detuning (MHz)", show: (r) => r.detuning_MHz.toFixed(2) }, { title: "Rabi (MHz)", show: (r) => shortest(r.rabi_MHz, 4) },
    { title: "scattering (1/s)", show: (r) => shortest(r.scattering_per_s, 4) }, { title: "meant", show: (r) => (r.wanted ? "yes" : r.near ? "no, and near" : "no"), text: true },
  ], order, "Scattering at low saturation of an atom in the lower sublevel");
}

export function otherLines(answer) {
  const rows = rowsOf(answer.other_lines);
  if (!rows.length) return element("p", "None within reach.", { class: "help" });
  return table([
    { title: "beam", show: (r) => r.beam, text: true }, { title: "line", show: (r) => `${r.line}  ${r.lower_level} \u2013 ${r.upper_level}`, text: true },
    { title: "detuning (GHz)", show: (r) => r.detuning_GHz.toFixed(1) }, { title: "scattering up to (1/s)", show: (r) => shortest(r.scattering_per_s, 3) },
  ], rows, "Far off resonance, for a component of strength 1");
}
