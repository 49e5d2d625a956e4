// Sends the question that a form of the documentation holds and shows the answer below it.
const filled = (form) => [...new FormData(form)].map(([name, value]) => [name, value.trim()]).filter(([, value]) => value);

function request(form) {
  const values = filled(form);
  let path = form.dataset.path;
  for (const [name, value] of values) path = path.replace(`{${name}}`, encodeURIComponent(value));
  if (form.dataset.method === "POST") {
    const body = Object.fromEntries(values).body;
    return [path, { method: "POST", headers: { "Content-Type": "application/json" }, body }];
  }
  const query = values.filter(([name]) => !form.dataset.path.includes(`{${name}}`));
  const text = query.map((pair) => pair.map(encodeURIComponent).join("=")).join("&");
  return [text ? `${path}?${text}` : path, {}];
}

function shown(text, type) {
  if (!type.includes("json") || type.includes("ndjson")) return text;
  return JSON.stringify(JSON.parse(text), null, 1);
}

async function ask(event) {
  event.preventDefault();
  const form = event.target;
  const output = form.parentElement.querySelector("pre.answer");
  const [url, options] = request(form);
  output.textContent = "…";
  try {
    const answer = await fetch(url, options);
    const text = await answer.text();
    output.textContent = `${options.method ?? "GET"} ${url}\n${answer.status}\n\n${shown(text, answer.headers.get("Content-Type") ?? "")}`;
  } catch (error) {
    output.textContent = `${url}\n${error}`;
  }
}

for (const form of document.querySelectorAll("form[data-path]")) form.addEventListener("submit", ask);
