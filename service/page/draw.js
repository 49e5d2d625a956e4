// Draws the components of a line as upright strokes, and sublevels as curves.

import uPlot from "./vendor/uplot/uPlot.esm.js";
import { label, shortest } from "./write.js";

const SVG = "http://www.w3.org/2000/svg";
const KIND = { "sigma+": "q-plus", pi: "q-none", "sigma-": "q-minus" };

function shape(tag, attributes, text) {
  const node = document.createElementNS(SVG, tag);
  for (const [name, value] of Object.entries(attributes)) node.setAttribute(name, value);
  if (text !== undefined) node.textContent = text;
  return node;
}

// Where nothing lies for more than a quarter of the whole span the drawing is cut, so that each group has its own axis.
function groups(offsets, shown) {
  const order = shown.sort((a, b) => offsets[a] - offsets[b]);
  const span = offsets[order.at(-1)] - offsets[order[0]];
  const cut = [[]];
  order.forEach((k, n) => {
    if (n && offsets[k] - offsets[order[n - 1]] > span / 4) cut.push([]);
    cut.at(-1).push(k);
  });
  return cut;
}

function stroke(columns, k, x, floor, tall) {
  const group = shape("g", { class: KIND[columns.polarisation[k]] || "q-none" });
  const strength = columns.strength[k];
  group.append(shape("line", { x1: x, x2: x, y1: floor, y2: floor - tall, "stroke-width": 2 }));
  const ends = `${label(columns.lower_F[k], columns.lower_m[k])} to ${label(columns.upper_F[k], columns.upper_m[k])}`;
  const said = `${ends}, ${columns.polarisation[k]}: ${shortest(columns.offset_MHz[k])} MHz, strength ${shortest(strength, 4)}`;
  group.append(shape("title", {}, said));
  return group;
}

function panel(columns, members, [left, right], strongest) {
  const [floor, tallest] = [180, 160];
  const offsets = members.map((k) => columns.offset_MHz[k]);
  const [low, high] = [Math.min(...offsets), Math.max(...offsets)];
  const x = (offset) => (high > low ? left + 12 + ((offset - low) / (high - low)) * (right - left - 24) : (left + right) / 2);
  const group = shape("g", {});
  group.append(shape("line", { x1: left, x2: right, y1: floor, y2: floor, class: "axis" }));
  for (const k of members) group.append(stroke(columns, k, x(columns.offset_MHz[k]), floor, tallest * (columns.strength[k] / strongest)));
  const marks = high > low ? [low, (low + high) / 2, high] : [low];
  marks.forEach((offset, n) => {
    const anchor = marks.length === 1 ? "middle" : ["start", "middle", "end"][n];
    group.append(shape("line", { x1: x(offset), x2: x(offset), y1: floor, y2: floor + 6, class: "axis" }));
    group.append(shape("text", { x: x(offset), y: floor + 22, "text-anchor": anchor }, `${shortest(offset, 6)} MHz`));
  });
  return group;
}

export function strokes(columns) {
  const [width, height, gap] = [900, 235, 28];
  const strongest = Math.max(...columns.strength.map((s) => s || 0)) || 1;
  const drawing = shape("svg", { viewBox: `0 0 ${width} ${height}`, role: "img", "aria-labelledby": "sticks-text" });
  const shown = columns.offset_MHz.map((_, k) => k).filter((k) => columns.strength[k] > 1e-6);
  if (!shown.length) return document.createTextNode("No component has a strength in this model.");
  const cut = groups(columns.offset_MHz, shown);
  const wide = (width - gap * (cut.length - 1)) / cut.length;
  cut.forEach((members, n) => drawing.append(panel(columns, members, [n * (wide + gap), n * (wide + gap) + wide], strongest)));
  ["sigma+", "pi", "sigma-"].forEach((name, k) => {
    const group = shape("g", { class: KIND[name] });
    group.append(shape("line", { x1: 12 + 120 * k, x2: 38 + 120 * k, y1: 226, y2: 226, "stroke-width": 2 }));
    group.append(shape("text", { x: 44 + 120 * k, y: 230 }, name));
    drawing.append(group);
  });
  return drawing;
}

const INKS = ["#1d5e5a", "#a33b20", "#3d4f9e", "#7a5c12", "#6a2e6e", "#2f6e2a", "#3b3b3b", "#94471b", "#1b6f94", "#8a1f4b"];

export function curves(target, columns, atom, level) {
  const fields = [...new Set(columns.field_G)];
  const states = columns.field_G.length / fields.length;
  const lines = Array.from({ length: states }, (_, s) => fields.map((_, k) => columns.energy_MHz[k * states + s]));
  const firstF = [...new Set(columns.F.slice(0, states))];
  const series = lines.map((_, s) => {
    const kind = firstF.indexOf(columns.F[s]);
    return { label: label(columns.F[s], columns.m[s]), stroke: INKS[kind % INKS.length], width: 1.4, dash: kind % 2 ? [6, 3] : [] };
  });
  target.replaceChildren();
  const width = Math.max(280, target.clientWidth || 860);
  const plot = new uPlot({
    width, height: 340, pxAlign: 0, legend: { show: states <= 16 }, scales: { x: { time: false } },
    axes: [{ label: "field (G)" }, { label: "energy (MHz)", size: 70 }],
    series: [{ label: "field (G)" }, ...series],
  }, [fields, ...lines], target);
  plot.root.setAttribute("role", "img");
  plot.root.setAttribute("aria-label", `Energies of ${atom} ${level} against the field`);
}
