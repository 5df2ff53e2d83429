// A strip: pale bar for what is wanted, line for the interval, dot for the value.
function strip(data) {
  if (data.value === null || data.value === undefined) return null;
  const low = data.low ?? data.value, high = data.high ?? data.value;
  const marks = [low, high, data.value, data.from ?? data.value, data.to ?? data.value];
  let left = Math.min(...marks), right = Math.max(...marks);
  const room = (right - left || Math.abs(right) || 1) * 0.12;
  left -= room; right += room;
  const at = (value) => ((value - left) / (right - left)) * 160;
  const from = data.from === null || data.from === undefined ? 0 : at(data.from);
  const to = data.to === null || data.to === undefined ? 160 : at(data.to);
  const made = svg("svg", { viewBox: "0 0 160 16", "aria-hidden": "true" },
    svg("rect", { x: 0, y: 3, width: 160, height: 10, fill: "#e6eaee" }),
    svg("rect", { x: from, y: 3, width: Math.max(to - from, 1), height: 10, fill: "#f1c877" }));
  if (high > low) made.append(svg("line", { x1: at(low), x2: at(high), y1: 8, y2: 8, stroke: "#0b5394", "stroke-width": 2.5 }));
  made.append(svg("circle", { cx: at(data.value), cy: 8, r: 4, fill: "#0b5394", stroke: "#fff" }));
  return made;
}

function fillStrips(root) {
  for (const holder of root.querySelectorAll("[data-strip]")) {
    const made = strip(JSON.parse(holder.dataset.strip));
    if (made) holder.replaceChildren(made);
  }
}
