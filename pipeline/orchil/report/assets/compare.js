// Candidates side by side, and the card of one that has no page.
function choose(row, box) {
  if (box.checked && state.chosen.size >= 4) { box.checked = false; say("Four are chosen already: untick one first."); return; }
  if (box.checked) state.chosen.set(row.id, row); else state.chosen.delete(row.id);
  drawComparison();
}

function say(text) { document.getElementById("compare-hint").textContent = text; }

function drawComparison() {
  const rows = [...state.chosen.values()], holder = document.getElementById("compare-table");
  holder.hidden = rows.length === 0;
  say(rows.length ? `${rows.length} chosen: ${rows.map((row) => row.candidate).join(", ")}.` : "Tick up to four candidates in the table to compare them.");
  if (!rows.length) { holder.replaceChildren(); return; }
  const head = el("tr", {}, el("th", { scope: "col" }, "quantity"), ...rows.map((row) => el("th", { scope: "col" }, row.candidate, picture(row.svg, `structure of ${row.candidate}`))));
  holder.replaceChildren(el("table", {}, el("thead", {}, head), el("tbody", {}, ...lines(rows))));
}

function lines(rows) {
  const line = (title, cell, meaning) => el("tr", {}, el("th", { scope: "row" }, title, meaning ? el("small", {}, meaning) : null), ...rows.map((row, at) => el("td", {}, ...[cell(row, at)].flat().filter(Boolean))));
  const wanted = night.wants.map((want, place) => line(byName.get(want.quantity)?.title ?? want.quantity, (row) => [textOf(row, want.quantity) || "not known", strip(stripOf(row, want)), el("small", {}, row.wants[place] ? `met with ${percent(row.wants[place][0])}` : "")], ""));
  const others = night.quantities.filter((one) => !night.wanted.includes(one.name) && rows.some((row) => row.quantities[one.name])).map((one) => line(one.title, (row) => textOf(row, one.name), ""));
  return [
    line("rank", (row) => String(row.rank ?? "")), line("medium", (row) => row.medium ?? ""), line("score", (row) => row.score_text),
    line("meets every want", (row) => row.hit_text), ...wanted, ...others, line("cautions", (row) => row.cautions || "none"), line("SMILES", (row) => row.smiles ?? ""),
  ];
}

function stripOf(row, want) {
  const found = row.quantities[want.quantity];
  return found ? { value: found[0], low: found[1], high: found[2], from: want.from, to: want.to } : { value: null };
}

function percent(share) {
  const value = 100 * share;
  return `${value >= 0.95 || value === 0 ? value.toFixed(0) : value.toFixed(1)}\u202f%`;
}

function openCard(row) {
  document.getElementById("card-h").textContent = row.candidate;
  const facts = [["rank", row.rank ?? ""], ["medium", row.medium ?? ""], ["score", row.score_text], ["meets every want", row.hit_text], ["status", row.status]];
  const numbers = night.quantities.filter((one) => row.quantities[one.name]).map((one) => [one.label, `${textOf(row, one.name)} ${one.unit}`]);
  const said = [row.reason, row.cautions, row.duplicate_of ? `the same species as ${row.duplicate_of}` : null].filter(Boolean);
  const drawn = picture(row.svg, `structure of ${row.candidate}`);
  drawn.classList.add("big");
  document.getElementById("card-body").replaceChildren(drawn, el("p", { className: "smiles" }, row.smiles ?? ""), ...said.map((text) => el("p", { className: "caution" }, text)),
    el("table", { className: "facts" }, el("tbody", {}, ...[...facts, ...numbers].map(([name, value]) => el("tr", {}, el("th", { scope: "row" }, name), el("td", {}, String(value)))))));
  document.getElementById("card").showModal();
}

function startCards() {
  document.getElementById("card-close").addEventListener("click", () => document.getElementById("card").close());
  document.addEventListener("click", (event) => {
    const link = event.target.closest ? event.target.closest("[data-open]") : null;
    if (!link || night.mode !== "file") return;
    const key = Number(link.dataset.open), row = night.rows.find((one) => one.id === key);
    if (night.pages.includes(key) || !row) return;
    event.preventDefault();
    openCard(row);
  });
}
