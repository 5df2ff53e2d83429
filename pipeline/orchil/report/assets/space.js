// Structures in space on a plain canvas: no graphics hardware, prints as seen, turned by mouse, finger, keys or buttons.
const SYMBOLS = { 1: "H", 5: "B", 6: "C", 7: "N", 8: "O", 9: "F", 14: "Si", 15: "P", 16: "S", 17: "Cl", 32: "Ge", 33: "As", 34: "Se", 35: "Br", 52: "Te", 53: "I" };
const ARROW = "#b3420a";

class Scene {
  constructor(figure) {
    this.figure = figure;
    this.canvas = figure.querySelector("canvas");
    this.data = JSON.parse(figure.querySelector("script").textContent);
    this.reach = Math.max(3, ...this.data.positions.map(length), ...this.data.arrows.flatMap((one) => [length(one.start), length(one.end)]));
    this.back();
    this.listen();
    new ResizeObserver(() => this.draw()).observe(this.canvas);
    this.draw();
  }

  back() {
    this.turned = product(turnX(-0.45), turnY(0.35));
    this.near = 1;
  }

  turn(across, up) {
    this.turned = product(product(turnX(up), turnY(across)), this.turned);
    this.draw();
  }

  listen() {
    const steps = { left: [-0.2, 0], right: [0.2, 0], up: [0, -0.2], down: [0, 0.2] };
    for (const button of this.figure.querySelectorAll("[data-turn]")) {
      button.addEventListener("click", () => this.step(steps[button.dataset.turn]));
    }
    this.canvas.addEventListener("keydown", (event) => {
      const name = event.key.replace("Arrow", "").toLowerCase();
      if (name in steps) this.step(steps[name]);
      else if (event.key === "+" || event.key === "=") this.zoom(1.15);
      else if (event.key === "-") this.zoom(1 / 1.15);
      else if (event.key === "0") this.step(null);
      else return;
      event.preventDefault();
    });
    let last = null;
    this.canvas.addEventListener("pointerdown", (event) => { last = [event.clientX, event.clientY]; this.canvas.setPointerCapture(event.pointerId); });
    this.canvas.addEventListener("pointermove", (event) => {
      if (!last) return;
      this.turn((event.clientX - last[0]) / 90, (event.clientY - last[1]) / 90);
      last = [event.clientX, event.clientY];
    });
    for (const end of ["pointerup", "pointercancel"]) this.canvas.addEventListener(end, () => { last = null; });
  }

  step(by) {
    if (by) { this.turn(by[0], by[1]); return; }
    this.back();
    this.draw();
  }

  zoom(factor) {
    this.near = Math.min(4, Math.max(0.5, this.near * factor));
    this.draw();
  }

  draw() {
    const ratio = Math.max(window.devicePixelRatio || 1, 2);
    const width = this.canvas.clientWidth || 320, height = this.canvas.clientHeight || 240;
    this.canvas.width = width * ratio;
    this.canvas.height = height * ratio;
    const pen = this.canvas.getContext("2d");
    pen.setTransform(ratio, 0, 0, ratio, 0, 0);
    pen.clearRect(0, 0, width, height);
    this.fit = { width, height, scale: (Math.min(width / 2.15, height / 1.5) / this.reach) * this.near };
    for (const piece of this.pieces().sort((a, b) => a.depth - b.depth)) piece.draw(pen);
    for (const arrow of this.data.arrows) this.label(pen, arrow);
    this.canvas.dataset.turned = this.turned.flat().map((value) => value.toFixed(2)).join(" ");
  }

  seen(point) {
    const [x, y, z] = this.turned.map((row) => row[0] * point[0] + row[1] * point[1] + row[2] * point[2]);
    const grow = 1 / (1 - z / (6 * this.reach));
    const { width, height, scale } = this.fit;
    return { x: width / 2 + x * scale * grow, y: height / 2 - y * scale * grow, z, size: scale * grow };
  }

  pieces() {
    const places = this.data.positions.map((point) => this.seen(point));
    const atoms = places.map((at, index) => ({ depth: at.z, draw: (pen) => this.atom(pen, at, index) }));
    const bonds = this.data.bonds.map(([a, b]) => ({ depth: (places[a].z + places[b].z) / 2 - 0.3, draw: (pen) => this.bond(pen, places[a], places[b]) }));
    return [...atoms, ...bonds, ...this.data.arrows.flatMap((arrow) => this.arrow(arrow))];
  }

  fog(z) {
    return 0.5 + 0.5 * Math.min(1, Math.max(0, (z / this.reach + 1) / 2));
  }

  bond(pen, a, b) {
    pen.globalAlpha = this.fog((a.z + b.z) / 2);
    pen.strokeStyle = "#59626c";
    pen.lineWidth = Math.max(1.5, 0.16 * (a.size + b.size) / 2);
    pen.lineCap = "round";
    stroke(pen, a, b);
    pen.globalAlpha = 1;
  }

  atom(pen, at, index) {
    const number = this.data.atoms[index];
    const radius = Math.max(2, (number === 1 ? 0.2 : number === 6 ? 0.27 : 0.42) * at.size);
    pen.globalAlpha = this.fog(at.z);
    pen.beginPath();
    pen.arc(at.x, at.y, radius, 0, 2 * Math.PI);
    pen.fillStyle = this.tint(index) || (number === 6 ? "#59626c" : "#ffffff");
    pen.strokeStyle = "#59626c";
    pen.lineWidth = 1.2;
    pen.fill();
    pen.stroke();
    if (number !== 1 && number !== 6) {
      pen.fillStyle = "#1b1f24";
      pen.font = `600 ${Math.max(8, radius * 1.25)}px system-ui, sans-serif`;
      pen.textAlign = "center";
      pen.textBaseline = "middle";
      pen.fillText(SYMBOLS[number] || String(number), at.x, at.y + 0.5);
    }
    pen.globalAlpha = 1;
  }

  // Blue to white to orange; told apart by every kind of colour vision.
  tint(index) {
    if (!this.data.shade) return null;
    const share = Math.max(-1, Math.min(1, this.data.shade[index] || 0)), end = share < 0 ? [11, 83, 148] : [224, 123, 0];
    return `rgb(${end.map((part) => Math.round(255 + (part - 255) * Math.abs(share))).join(",")})`;
  }

  arrow(arrow) {
    const points = Array.from({ length: 13 }, (_, step) => arrow.start.map((from, axis) => from + ((arrow.end[axis] - from) * step) / 12));
    const seen = points.map((point) => this.seen(point));
    const parts = seen.slice(1).map((to, index) => ({
      depth: (to.z + seen[index].z) / 2,
      draw: (pen) => { pen.strokeStyle = ARROW; pen.lineWidth = Math.max(2, 0.13 * to.size); pen.lineCap = "round"; stroke(pen, seen[index], to); },
    }));
    const heads = [[seen[11], seen[12]], ...(arrow.both ? [[seen[1], seen[0]]] : [])];
    return [...parts, ...heads.map(([from, to]) => ({ depth: to.z + 0.05, draw: (pen) => head(pen, from, to) }))];
  }

  label(pen, arrow) {
    const at = this.seen(arrow.end);
    pen.font = "600 12px system-ui, sans-serif";
    const half = pen.measureText(arrow.label).width / 2 + 4;
    const x = Math.min(this.fit.width - half, Math.max(half, at.x)), y = Math.min(this.fit.height - 8, Math.max(16, at.y - 14));
    pen.textAlign = "center";
    pen.lineWidth = 4;
    pen.strokeStyle = "#fbfcfd";
    pen.strokeText(arrow.label, x, y);
    pen.fillStyle = ARROW;
    pen.fillText(arrow.label, x, y);
  }
}

function stroke(pen, from, to) {
  pen.beginPath();
  pen.moveTo(from.x, from.y);
  pen.lineTo(to.x, to.y);
  pen.stroke();
}

function head(pen, from, to) {
  const way = Math.atan2(to.y - from.y, to.x - from.x), size = Math.max(8, 0.55 * to.size);
  pen.fillStyle = ARROW;
  pen.beginPath();
  pen.moveTo(to.x + 0.5 * size * Math.cos(way), to.y + 0.5 * size * Math.sin(way));
  for (const side of [2.5, -2.5]) pen.lineTo(to.x + size * Math.cos(way + side), to.y + size * Math.sin(way + side));
  pen.fill();
}

function length(vector) { return Math.hypot(...vector); }
function turnX(angle) { const c = Math.cos(angle), s = Math.sin(angle); return [[1, 0, 0], [0, c, -s], [0, s, c]]; }
function turnY(angle) { const c = Math.cos(angle), s = Math.sin(angle); return [[c, 0, s], [0, 1, 0], [-s, 0, c]]; }
function product(a, b) { return a.map((row) => [0, 1, 2].map((column) => row.reduce((sum, value, at) => sum + value * b[at][column], 0))); }
