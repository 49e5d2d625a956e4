// Asks the service that served this page; a problem comes back as an Error that carries it.

export class Refused extends Error {
  constructor(problem) {
    super(problem.detail || problem.title);
    this.problem = problem;
  }
}

async function read(response) {
  const body = await response.json();
  if (!response.ok) throw new Refused(body);
  return body;
}

export async function get(path, query = {}, signal) {
  const given = Object.entries(query).filter(([, value]) => value !== "" && value !== undefined);
  const text = new URLSearchParams(given).toString();
  return read(await fetch(text ? `${path}?${text}` : path, { headers: { Accept: "application/json" }, signal }));
}

export async function post(path, body, signal) {
  const headers = { "Content-Type": "application/json", Accept: "application/json" };
  return read(await fetch(path, { method: "POST", headers, body: JSON.stringify(body), signal }));
}

export function atomPath(atom, question) {
  return `v1/atoms/${encodeURIComponent(atom)}/${question}`;
}
