// Two quantities against each other, by Vega-Lite; its library is run only when the plot comes into sight.
let libraryReady = null;

function chartLibrary() {
  if (!libraryReady) {
    libraryReady = new Promise((resolve, reject) => {
      const inside = document.getElementById("chart-library"), script = document.createElement("script");
      if (inside) { script.textContent = inside.textContent; document.head.append(script); resolve(window.vegaEmbed); return; }
      script.src = "assets/charts.js";
      script.onload = () => resolve(window.vegaEmbed);
      script.onerror = () => reject(new Error("the chart library did not come"));
      document.head.append(script);
    });
  }
  return libraryReady;
}

function points(x, y) {
  if (night.mode === "live") return fetch(`points?${new URLSearchParams({ x, y })}`).then((answer) => answer.json());
  const known = night.rows.filter((row) => row.quantities[x] && row.quantities[y]);
  return Promise.resolve(known.map((row) => ({ id: row.id, candidate: row.candidate, rank: row.rank, x: row.quantities[x][0], y: row.quantities[y][0], xText: textOf(row, x), yText: textOf(row, y), kind: kindOf(row) })));
}

function kindOf(row) { return row.pick !== null ? KINDS[0] : row.pareto_front === 1 ? KINDS[1] : KINDS[2]; }
const KINDS = ["picked", "Pareto front 1", "other"];

function plotSpec(values, x, y) {
  const axis = (one, field) => ({ field, type: "quantitative", title: one.title, scale: { zero: false, nice: true } });
  const bands = [["x", x], ["y", y]].flatMap(([field, name]) => night.wants.filter((want) => want.quantity === name).map((want) => bandOf(field, want)));
  const tooltip = [{ field: "candidate", title: "candidate" }, { field: "rank", title: "rank" }, { field: "xText", title: byName.get(x).title }, { field: "yText", title: byName.get(y).title }];
  return {
    data: { values }, width: "container", height: 360, autosize: { type: "fit", contains: "padding" },
    layer: [
      ...bands,
      { mark: { type: "point", filled: true, opacity: 0.9, stroke: "#1b1f24", strokeWidth: 0.6 },
        encoding: { x: axis(byName.get(x), "x"), y: axis(byName.get(y), "y"), tooltip,
          shape: { field: "kind", type: "nominal", title: null, scale: { domain: KINDS, range: ["diamond", "square", "circle"] } },
          color: { field: "kind", type: "nominal", title: null, scale: { domain: KINDS, range: ["#e08a00", "#0b5394", "#b6bec7"] } },
          size: { condition: [{ test: `datum.kind === '${KINDS[0]}'`, value: 150 }, { test: `datum.kind === '${KINDS[1]}'`, value: 90 }], value: 45 },
          order: { field: "rank", sort: "descending" } } },
      { transform: [{ filter: "datum.kind === 'picked'" }], mark: { type: "text", dy: -11, fontSize: 11, color: "#1b1f24", limit: 110 },
        encoding: { x: axis(byName.get(x), "x"), y: axis(byName.get(y), "y"), text: { field: "candidate" } } },
    ],
  };
}

// The wanted window as a pale bar; an open side ends with the plot.
function bandOf(field, want) {
  const side = (edge, value) => (edge === null ? { value } : { datum: edge, type: "quantitative" });
  const ends = field === "x" ? [0, "width"] : ["height", 0];
  const encoding = { [field]: side(want.from, ends[0]), [`${field}2`]: want.to === null ? { value: ends[1] } : { datum: want.to } };
  return { data: { values: [{}] }, mark: { type: "rect", color: "#b7791f", opacity: 0.13 }, encoding };
}

function drawPlot() {
  const x = document.getElementById("plot-x").value, y = document.getElementById("plot-y").value;
  if (!x || !y) return Promise.resolve();
  return Promise.all([chartLibrary(), points(x, y)]).then(([embed, values]) => {
    const words = `${values.length} candidates: ${byName.get(y).title} against ${byName.get(x).title}. Pale bars: what is wanted. Diamonds are picked, squares are on Pareto front 1 of the brief.`;
    document.getElementById("plot-words").textContent = words;
    document.getElementById("plot-chart").setAttribute("aria-label", words);
    return embed("#plot-chart", plotSpec(values, x, y), { renderer: "svg", actions: false, config: night.chart });
  });
}

function startPlot() {
  const choices = night.quantities.map((one) => [one.name, one.title]);
  const second = night.wanted[1] ?? night.quantities.find((one) => one.name !== night.wanted[0])?.name;
  fillSelect("plot-x", choices, night.wanted[0]);
  fillSelect("plot-y", choices, second);
  for (const id of ["plot-x", "plot-y"]) document.getElementById(id).addEventListener("change", drawPlot);
  const watch = new IntersectionObserver((seen) => { if (seen.some((one) => one.isIntersecting)) { watch.disconnect(); drawPlot(); } }, { rootMargin: "600px" });
  watch.observe(document.getElementById("plot"));
}
