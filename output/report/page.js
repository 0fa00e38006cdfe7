(() => {
"use strict";
const root = document.documentElement;
root.classList.add("live");
const charts = JSON.parse(document.getElementById("data").textContent) || [];
for (const c of charts) for (const v of c.views) for (const s of v.series) s.x ??= v.series[0].x || [];
const group = document.getElementById("group");
const ns = "http://www.w3.org/2000/svg";
const pick = (tag, attributes, parent) => {
  const e = document.createElementNS(ns, tag);
  for (const k in attributes) e.setAttribute(k, attributes[k]);
  return parent.appendChild(e);
};

// show writes a value of an axis with four digits.
const show = (x, axis) => {
  if (x === null || x === undefined) return "–";
  const v = axis.share ? 100 * x : x;
  const size = Math.abs(v);
  const digits = size >= 1000 || Number.isInteger(v) ? 0 : size >= 100 ? 1 : size >= 1 ? 2 : 4;
  return v.toLocaleString("en", {minimumFractionDigits: 0, maximumFractionDigits: digits}).replace("-", "−") + (axis.share ? " %" : "");
};

const places = view => [...new Set(view.series.flatMap(s => s.x))].sort((a, b) => a - b);
const x = (view, v) => view.box[2] + (v - view.box[0]) / (view.box[1] - view.box[0]) * (view.box[3] - view.box[2]);
const y = (view, v) => view.box[6] + (v - view.box[4]) / (view.box[5] - view.box[4]) * (view.box[7] - view.box[6]);

// heads and cells of a series in tables and files.
const heads = s => !s.y ? [s.name + ", from", s.name + ", to"] : !s.lower ? [s.name] : [s.name, s.name + ", 95 % from", s.name + ", to"];
const cells = (s, at) => {
  const k = s.x.indexOf(at);
  return [s.y, s.lower, s.upper].filter(c => c).map(c => k < 0 ? null : c[k]);
};

class Figure {
  constructor(chart) {
    this.chart = chart;
    this.figure = document.getElementById(chart.id);
    this.plot = this.figure.querySelector(".plot");
    this.elements = [...this.plot.querySelectorAll(".view")];
    this.option = document.getElementById(chart.id + "-option");
    this.read = this.figure.querySelector(".read");
    this.at = -1;
    this.plot.tabIndex = 0;
    this.plot.setAttribute("role", "slider");
    this.plot.setAttribute("aria-label", this.figure.querySelector("h3").textContent + ". Read values with the arrow keys.");
    this.plot.addEventListener("pointermove", e => this.point(e));
    this.plot.addEventListener("pointerdown", e => this.point(e));
    this.plot.addEventListener("pointerleave", () => document.activeElement === this.plot || this.move(-1));
    this.plot.addEventListener("blur", () => this.move(-1));
    this.plot.addEventListener("focus", () => this.at < 0 && this.move(0));
    this.plot.addEventListener("keydown", e => this.key(e));
    if (this.option) this.option.addEventListener("change", () => this.update());
    this.figure.querySelector(".csv").addEventListener("click", e => this.save(e));
    this.figure.querySelector("details").addEventListener("toggle", () => this.fill());
    this.update();
  }

  // update shows the view that answers the reader's choices.
  update() {
    const of = v => (!v.group || !group || v.group === group.value);
    const views = this.chart.views;
    let i = views.findIndex(v => of(v) && (!this.option || v.option === this.option.value));
    this.figure.hidden = i < 0;
    if (i < 0) return;
    this.view = views[i];
    this.elements.forEach((e, k) => e.hidden = k !== i);
    this.places = places(this.view);
    this.cursor = this.elements[i].querySelector(".cursor");
    this.plot.setAttribute("aria-valuemin", 0);
    this.plot.setAttribute("aria-valuemax", this.places.length - 1);
    this.move(-1);
    this.fill();
  }

  point(e) {
    const picture = this.elements.find(e => !e.hidden).querySelector("svg");
    const r = picture.getBoundingClientRect();
    const at = (e.clientX - r.left) / r.width * picture.viewBox.baseVal.width;
    let best = 0;
    this.places.forEach((p, k) => { if (Math.abs(x(this.view, p) - at) < Math.abs(x(this.view, this.places[best]) - at)) best = k; });
    this.move(best);
  }

  key(e) {
    const last = this.places.length - 1, step = {ArrowRight: 1, ArrowUp: 1, ArrowLeft: -1, ArrowDown: -1, PageUp: 10, PageDown: -10}[e.key];
    let to;
    if (step) to = Math.min(last, Math.max(0, Math.max(0, this.at) + step));
    else if (e.key === "Home") to = 0;
    else if (e.key === "End") to = last;
    else return;
    e.preventDefault();
    this.move(to);
  }

  // move reads the values at place k; −1: none.
  move(k) {
    this.at = k;
    if (this.cursor) this.cursor.replaceChildren();
    if (k < 0) {
      this.read.textContent = "";
      this.plot.setAttribute("aria-valuenow", 0);
      this.plot.removeAttribute("aria-valuetext");
      return;
    }
    const v = this.view, at = this.places[k], px = x(v, at);
    pick("path", {d: `M${px} ${v.box[6]}L${px} ${v.box[7]}`}, this.cursor);
    const words = [];
    for (const s of v.series) {
      const i = s.x.indexOf(at);
      if (i < 0) continue;
      const value = s.y ? s.y[i] : null;
      if (s.y && value === null) continue;
      if (s.y) pick("circle", {cx: px, cy: y(v, value), r: 4, class: "f" + s.style}, this.cursor);
      const range = s.lower && s.lower[i] !== null ? show(s.lower[i], this.chart.y) + " to " + show(s.upper[i], this.chart.y) : "";
      words.push(s.name + " " + (s.y ? show(value, this.chart.y) + (range ? " (95 % interval " + range + ")" : "") : range));
    }
    const text = this.chart.x.label + " " + show(at, this.chart.x) + ": " + words.join("; ");
    this.read.textContent = text;
    this.plot.setAttribute("aria-valuenow", k);
    this.plot.setAttribute("aria-valuetext", text);
  }

  rows() {
    const v = this.view;
    return [[this.chart.x.label, ...v.series.flatMap(heads)], ...this.places.map(p => [p, ...v.series.flatMap(s => cells(s, p))])];
  }

  // fill puts the numbers of the view into the table, if it is open.
  fill() {
    if (!this.figure.querySelector("details").open) return;
    const [head, ...rows] = this.rows();
    const table = this.figure.querySelector("table");
    const row = (cells, heading) => {
      const tr = document.createElement("tr");
      cells.forEach((c, i) => {
        const e = document.createElement(heading || i === 0 ? "th" : "td");
        e.scope = heading ? "col" : i === 0 ? "row" : "";
        e.className = "n";
        e.textContent = typeof c === "string" ? c : show(c, i === 0 ? this.chart.x : this.chart.y);
        tr.append(e);
      });
      return tr;
    };
    table.tHead.replaceChildren(row(head, true));
    table.tBodies[0].replaceChildren(...rows.map(r => row(r, false)));
  }

  save(e) {
    const field = c => c === null ? "" : typeof c === "number" ? String(c) : '"' + c.replaceAll('"', '""') + '"';
    const text = this.rows().map(r => r.map(field).join(",")).join("\n") + "\n";
    e.currentTarget.href = URL.createObjectURL(new Blob([text], {type: "text/csv"}));
    const v = this.view;
    const name = [this.chart.id, v.group, v.option].filter(s => s).join("-").replace(/[^\p{L}\p{N}-]+/gu, "-");
    e.currentTarget.download = name + ".csv";
  }
}

const figures = charts.map(c => new Figure(c));
const tables = [...document.querySelectorAll(".table")].map(e => ({e, option: document.getElementById(e.parentElement.id + "-option")}));
const showTables = () => {
  for (const {e, option} of tables) {
    e.hidden = "group" in e.dataset && !!group && e.dataset.group !== group.value ||
      "option" in e.dataset && !!option && e.dataset.option !== option.value;
  }
};
const choose = () => {
  showTables();
  for (const f of figures) f.update();
};
for (const option of new Set(tables.map(t => t.option))) if (option) option.addEventListener("change", showTables);
if (group) group.addEventListener("change", () => {
  choose();
  document.getElementById("said").textContent = "Charts and tables show " + group.selectedOptions[0].textContent;
});
choose();
})();
