// The table of candidates. Rows come from the file itself, or page by page from the server.
const PAGE = 25;
const FIXED = [
  { name: "rank", title: "rank", number: true },
  { name: "pick", title: "pick", number: true },
  { name: "candidate", title: "candidate", number: false },
  { name: "medium", title: "medium", number: false },
  { name: "score", title: "score", number: true },
  { name: "hit_probability", title: "meets every want", number: true },
];
const state = { text: "", only: "", quantity: "", low: null, high: null, sort: "rank", descending: false, page: 0, extra: new Set(), chosen: new Map() };

// Where rows come from

function fromFile(wish) {
  const words = wish.text.toLowerCase().split(/\s+/).filter(Boolean);
  const holds = (row) => {
    const text = [row.candidate, row.smiles, row.medium, row.cautions, row.reason].join(" ").toLowerCase();
    if (!words.every((word) => text.includes(word))) return false;
    if (wish.only === "picked" ? row.pick === null : wish.only && row.status !== wish.only) return false;
    if (!wish.quantity || (wish.low === null && wish.high === null)) return true;
    const value = valueOf(row, wish.quantity);
    return value !== null && (wish.low === null || value >= wish.low) && (wish.high === null || value <= wish.high);
  };
  const kept = night.rows.filter(holds).sort(order(wish.sort, wish.descending));
  return Promise.resolve({ rows: kept.slice(wish.page * PAGE, (wish.page + 1) * PAGE), total: kept.length });
}

function order(name, descending) {
  const sign = descending ? -1 : 1;
  return (a, b) => {
    const x = valueOf(a, name), y = valueOf(b, name);
    if (x === null || y === null) { if ((x === null) !== (y === null)) return x === null ? 1 : -1; }
    else if (x !== y) return sign * (typeof x === "string" ? x.localeCompare(y, "en") : x - y);
    return (a.rank ?? Infinity) - (b.rank ?? Infinity) || a.row_number - b.row_number;
  };
}

function fromServer(wish) {
  const asked = new URLSearchParams({ text: wish.text, only: wish.only, sort: wish.sort, way: wish.descending ? "down" : "up", page: wish.page });
  if (wish.quantity && (wish.low !== null || wish.high !== null)) {
    asked.set("quantity", wish.quantity);
    if (wish.low !== null) asked.set("low", wish.low);
    if (wish.high !== null) asked.set("high", wish.high);
  }
  return fetch(`rows?${asked}`).then((answer) => { if (!answer.ok) throw new Error(`the server answered ${answer.status}`); return answer.json(); });
}

// The table itself

function columns() {
  const quantities = [...night.wanted, ...night.quantities.map((one) => one.name).filter((name) => state.extra.has(name) && !night.wanted.includes(name))];
  return [...FIXED, ...quantities.filter((name) => byName.has(name)).map((name) => ({ name, title: byName.get(name).title, number: true, meaning: byName.get(name).meaning }))];
}

function drawHead() {
  const cells = columns().map((column) => {
    const sorted = state.sort === column.name;
    const arrow = sorted ? (state.descending ? " ▼" : " ▲") : "";
    const button = el("button", { type: "button", title: column.meaning || "", onclick: () => sortBy(column.name) }, column.title + arrow);
    return el("th", { scope: "col", className: column.number ? "num" : "", "aria-sort": sorted ? (state.descending ? "descending" : "ascending") : "none" }, button);
  });
  document.querySelector("#rows thead").replaceChildren(
    el("tr", {}, el("th", { scope: "col" }, el("span", { className: "away" }, "compare")), ...cells, el("th", { scope: "col" }, "status and cautions")));
}

function rowOf(row) {
  const tick = el("input", { type: "checkbox", checked: state.chosen.has(row.id), "aria-label": `Compare ${row.candidate}`, onchange: (event) => choose(row, event.target) });
  const cells = columns().map((column) => cellOf(row, column));
  const said = [row.status === "done" ? "" : row.status, row.reason || "", row.duplicate_of ? `same as ${row.duplicate_of}` : "", row.trust && row.trust !== "inside" ? `${row.trust} of the trained range` : "", row.cautions || ""].filter(Boolean).join("; ");
  const why = el("td", { className: said ? "why" : "why empty", "data-label": "status and cautions" }, el("div", { className: "clamp", title: said }, said));
  return el("tr", {}, el("td", { "data-label": "compare" }, tick), ...cells, why);
}

function cellOf(row, column) {
  if (column.name === "candidate") return el("td", { className: "mol", "data-label": "" }, opener(row), picture(row.svg, `structure of ${row.candidate}`));
  const text = column.name === "score" ? row.score_text : column.name === "hit_probability" ? row.hit_text : byName.has(column.name) ? textOf(row, column.name) : String(row[column.name] ?? "");
  return el("td", { className: (column.number ? "num" : "") + (text === "" ? " empty" : ""), "data-label": column.title }, text);
}

// A candidate with a page of its own is a link, any other opens a card.
function opener(row) {
  if (night.mode === "live") return el("a", { href: `candidate/${row.id}`, className: "open" }, row.candidate);
  if (night.pages.includes(row.id)) return el("a", { href: `#candidate-${row.id}`, className: "open" }, row.candidate);
  return el("button", { type: "button", className: "open", onclick: () => openCard(row) }, row.candidate);
}

let asked = 0;
function refresh() {
  const turn = ++asked;
  const source = night.mode === "live" ? fromServer : fromFile;
  return source(state).then((found) => {
    if (turn !== asked) return;
    drawHead();
    document.querySelector("#rows tbody").replaceChildren(...found.rows.map(rowOf));
    const pages = Math.max(1, Math.ceil(found.total / PAGE));
    document.getElementById("found").textContent = `${found.total.toLocaleString("en")} candidates`;
    document.getElementById("p-at").textContent = `page ${state.page + 1} of ${pages}`;
    document.getElementById("p-back").disabled = state.page === 0;
    document.getElementById("p-on").disabled = state.page + 1 >= pages;
  }).catch((error) => { document.getElementById("found").textContent = `The rows could not be read: ${error.message}`; });
}

function sortBy(name) {
  state.descending = state.sort === name ? !state.descending : false;
  state.sort = name;
  document.getElementById("f-sort").value = name;
  document.getElementById("f-way").value = state.descending ? "down" : "up";
  again();
}

function again() {
  state.page = 0;
  return refresh();
}

// Filters

function fillSelect(id, choices, chosen) {
  document.getElementById(id).replaceChildren(...choices.map(([value, text]) => el("option", { value, selected: value === chosen }, text)));
}

function readFilters() {
  const value = (id) => document.getElementById(id).value;
  const numeric = (id) => (value(id) === "" ? null : Number(value(id)));
  Object.assign(state, { text: value("f-text"), only: value("f-only"), quantity: value("f-quantity"), low: numeric("f-low"), high: numeric("f-high"), sort: value("f-sort"), descending: value("f-way") === "down" });
}

function startTable() {
  const quantities = night.quantities.map((one) => [one.name, one.title]);
  fillSelect("f-quantity", [["", "any quantity"], ...quantities], "");
  fillSelect("f-sort", [...FIXED.map((one) => [one.name, one.title]), ...quantities], "rank");
  const boxes = night.quantities.filter((one) => !night.wanted.includes(one.name)).map((one) => el("label", { title: one.meaning },
    el("input", { type: "checkbox", onchange: (event) => { event.target.checked ? state.extra.add(one.name) : state.extra.delete(one.name); refresh(); } }), ` ${one.title}`));
  document.getElementById("f-columns").append(...boxes);
  const form = document.getElementById("filters");
  const changed = later(() => { readFilters(); again(); }, 120);
  form.addEventListener("input", changed);
  form.addEventListener("submit", (event) => event.preventDefault());
  form.addEventListener("reset", () => setTimeout(() => { document.getElementById("f-sort").value = "rank"; readFilters(); again(); }));
  document.getElementById("p-back").addEventListener("click", () => { state.page -= 1; refresh(); });
  document.getElementById("p-on").addEventListener("click", () => { state.page += 1; refresh(); });
  return refresh();
}
