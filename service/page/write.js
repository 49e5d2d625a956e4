// Writes numbers and tables the way the trade prints them.

export function half(value) {
  return Number.isInteger(value) ? String(value) : `${Math.round(2 * value)}/2`;
}

export function label(F, m) {
  return `${half(F)},${half(m)}`;
}

// A value with its standard uncertainty in the last two digits, as 384.228119696(10).
export function measured(value, uncertainty) {
  if (value === null || value === undefined) return "not published";
  if (!uncertainty) return shortest(value);
  const place = Math.floor(Math.log10(uncertainty)) - 1;
  const digits = Math.max(0, -place);
  if (digits > 15) return shortest(value);
  const scale = 10 ** Math.min(place, 0);
  const inLast = Math.round(uncertainty / (place > 0 ? 1 : scale));
  return `${value.toFixed(digits)}(${inLast})`.replace("-", "\u2212");
}

export function shortest(value, digits = 9) {
  if (value === 0) return "0";
  const size = Math.abs(value);
  const text = size >= 1e-4 && size < 1e9 ? String(Number(value.toPrecision(digits))) : value.toExponential(digits - 3);
  return text.replace(/^-/, "\u2212");
}

export function element(tag, content = "", attributes = {}) {
  const node = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes)) node.setAttribute(name, value);
  for (const part of [content].flat()) node.append(part);
  return node;
}

export function table(columns, rows, caption) {
  const head = element("tr", columns.map((c) => element("th", c.title, { scope: "col", class: c.text ? "text" : "" })));
  const body = rows.map((row) => element("tr", columns.map((c) => element("td", c.show(row), { class: c.text ? "text" : "" }))));
  return element("table", [element("caption", caption, { class: "help" }), element("thead", head), element("tbody", body)]);
}
