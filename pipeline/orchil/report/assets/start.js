// What every part of the page uses. Text of the library only ever becomes text, never markup.
const dataElement = document.getElementById("night");
const night = dataElement ? JSON.parse(dataElement.textContent) : null;
const byName = new Map(night ? night.quantities.map((one) => [one.name, one]) : []);

function el(tag, properties, ...children) {
  const made = document.createElement(tag);
  for (const [name, value] of Object.entries(properties || {})) {
    if (value === null || value === undefined) continue;
    if (name in made && name !== "role") made[name] = value;
    else made.setAttribute(name, value);
  }
  made.append(...children.filter((child) => child !== null && child !== undefined));
  return made;
}

const SVG = "http://www.w3.org/2000/svg";
function svg(tag, attributes, ...children) {
  const made = document.createElementNS(SVG, tag);
  for (const [name, value] of Object.entries(attributes)) made.setAttribute(name, value);
  made.append(...children);
  return made;
}

// Drawings were made safe before they came here; they are parsed as SVG and nothing else.
function picture(text, words) {
  const holder = el("div", { className: "picture-of", role: "img", "aria-label": words });
  if (!text) return holder;
  const parsed = new DOMParser().parseFromString(text, "image/svg+xml").documentElement;
  if (parsed.nodeName === "svg") holder.append(document.importNode(parsed, true));
  return holder;
}

function valueOf(row, name) {
  if (name === "candidate" || name === "medium" || name === "status") return row[name];
  if (name in row && name !== "quantities") return row[name];
  const found = row.quantities[name];
  return found ? found[0] : null;
}

function textOf(row, name) {
  const found = row.quantities[name];
  return found ? found[3] : "";
}

function later(action, milliseconds) {
  let timer = 0;
  return () => { clearTimeout(timer); timer = setTimeout(action, milliseconds); };
}
