"use strict";
(() => {
const $ = id => document.getElementById(id);
const D = JSON.parse($("data").textContent);
const nex = (D.ex || []).length, nem = (D.em || []).length, cells = nex * nem;
const table = $("table"), body = table.tBodies[0], detail = $("detail");
const rows = [...body.rows];
const mapCanvases = [...document.querySelectorAll(".maps canvas")];

// numbers
const mark = s => (D.comma ? s.replace(".", ",") : s).replace("-", "−");
function sig(v, d) {
  if (v === null || !isFinite(v)) return "–";
  if (v === 0) return "0";
  const e = Math.floor(Math.log10(Math.abs(v)));
  if (e < -4 || e >= 6) {
    const [m, p] = v.toExponential(d - 1).split("e");
    return mark(m) + " · 10" + p.replace(/[-+0-9]/g, c => c === "+" ? "" : "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"["-0123456789".indexOf(c)]);
  }
  return mark(v.toFixed(Math.max(0, d - 1 - e)));
}
const nm = v => mark(String(Math.round(v * 10) / 10));
function ticks(lo, hi, n) {
  if (!(hi > lo)) return [lo];
  const raw = (hi - lo) / n, p = 10 ** Math.floor(Math.log10(raw));
  const step = [1, 2, 5, 10].map(m => m * p).find(s => s >= raw * (1 - 1e-9));
  const out = [];
  for (let k = Math.ceil(lo / step - 1e-9); k * step <= hi + step * 1e-9; k++) out.push(k * step);
  out.step = step;
  return out;
}
function tickText(v, step) {
  if (Math.abs(v) >= 1e5 || (step < 1e-4 && v !== 0)) return sig(v, 2);
  return mark(v.toFixed(Math.max(0, -Math.floor(Math.log10(step) + 1e-9))));
}

// table: sort, filter
const text = (row, c) => row.cells[c].textContent.trim();
const value = (row, c) => { const v = row.cells[c].dataset.v; return v === undefined ? null : +v; };
let sorted = { col: -1, down: false };
function sortBy(col) {
  sorted = { col, down: sorted.col === col ? !sorted.down : false };
  const numeric = rows.some(r => value(r, col) !== null);
  const key = rows.map(r => numeric ? value(r, col) : text(r, col));
  const order = rows.map((_, i) => i).sort((a, b) => {
    const x = key[a], y = key[b], ex = x === null || x === "", ey = y === null || y === "";
    if (ex || ey) return ex - ey || a - b; // what is empty stays last
    const c = numeric ? x - y : String(x).localeCompare(String(y), undefined, { numeric: true });
    return (sorted.down ? -c : c) || a - b;
  });
  body.append(...order.map(i => rows[i]));
  [...table.tHead.rows[0].cells].forEach((th, i) =>
    th.setAttribute("aria-sort", i !== col ? "none" : sorted.down ? "descending" : "ascending"));
  filter();
}
table.tHead.rows[0].addEventListener("click", e => {
  const b = e.target.closest("button");
  if (b) sortBy(+b.dataset.col);
});
function matcher(q) {
  q = q.trim();
  const num = s => parseFloat(s.replace(",", ".").replace("−", "-"));
  let m = /^(<=|>=|≤|≥|<|>|=)\s*(-?[\d.,]+(?:e-?\d+)?)$/i.exec(q);
  if (m) {
    const n = num(m[2]);
    const f = { "<": v => v < n, ">": v => v > n, "=": v => v === n, "<=": v => v <= n, "≤": v => v <= n, ">=": v => v >= n, "≥": v => v >= n }[m[1]];
    return (t, v) => v !== null && f(v);
  }
  m = /^(-?[\d.,]+?)\s*\.\.\s*(-?[\d.,]+)$/.exec(q);
  if (m) { const a = num(m[1]), b = num(m[2]); return (t, v) => v !== null && v >= a && v <= b; }
  q = q.toLowerCase();
  return t => t.toLowerCase().includes(q);
}
const filters = $("filters");
let room = 250; // rows laid out at once; the others follow when the browser has time
function filter() {
  const verdicts = new Set([...filters.querySelectorAll("[name=verdict]:checked")].map(i => i.value));
  const kind = $("kind").value, test = $("test").value, q = $("search").value.trim().toLowerCase();
  const cols = [...table.querySelectorAll(".filter input")].filter(i => i.value.trim() !== "").map(i => [+i.dataset.col, matcher(i.value)]);
  let n = 0;
  for (const r of body.rows) {
    const b = D.bottles[r.dataset.i];
    const show = verdicts.has(r.dataset.verdict) && (!kind || (kind === "*" ? r.dataset.other === undefined : r.dataset.kind === kind)) && (!test || r.dataset.tests.includes(" " + test + " ")) &&
      (!q || r.textContent.toLowerCase().includes(q) || b.note.toLowerCase().includes(q)) && cols.every(([c, f]) => f(text(r, c), value(r, c)));
    n += show;
    if (r.hidden !== (!show || n > room)) r.hidden = !r.hidden;
  }
  $("count").textContent = n + " of " + rows.length + " shown";
}
filters.addEventListener("input", filter);
filters.addEventListener("submit", e => e.preventDefault());
$("all").addEventListener("click", () => {
  table.querySelectorAll(".filter input").forEach(i => i.value = "");
  filters.querySelectorAll("[name=verdict]").forEach(i => i.checked = true);
  $("kind").value = $("test").value = $("search").value = "";
  filter();
});
table.tHead.addEventListener("input", filter);
filter();
const later = window.requestIdleCallback || (f => setTimeout(f, 50));
function grow() {
  if (room >= rows.length) return;
  room += 250;
  filter();
  later(grow);
}
later(grow);
window.addEventListener("beforeprint", () => { room = rows.length; filter(); });

// figures of the same numbers: one view at a time
for (const v of document.querySelectorAll(".views"))
  v.addEventListener("change", e => v.querySelectorAll("figure").forEach((f, i) => { f.hidden = i !== +e.target.value; }));

// maps: unpack
const colours = hex => { const out = []; for (let i = 0; i < hex.length; i += 6) out.push([0, 2, 4].map(k => parseInt(hex.substr(i + k, 2), 16))); return out; };
const SEQ = colours(D.seq), DIV = colours(D.div), MISSING = colours(D.missing)[0], HATCH = colours(D.hatch)[0];
const wholePage = document.readyState !== "loading" ? null : new Promise(done => document.addEventListener("DOMContentLoaded", done, { once: true }));
let packedMaps = null; // a line a bottle, behind this script
async function packedMap(i) {
  await wholePage;
  if (!packedMaps) packedMaps = ($("packed") ? $("packed").textContent : "").split("\n");
  return packedMaps[i] || "";
}
async function unpack(i) {
  const text = await packedMap(i);
  if (!text) return null;
  const bin = atob(text), packed = new Uint8Array(bin.length);
  for (let k = 0; k < bin.length; k++) packed[k] = bin.charCodeAt(k);
  const stream = new Blob([packed]).stream().pipeThrough(new DecompressionStream("gzip"));
  const raw = new Uint8Array(await new Response(stream).arrayBuffer());
  const view = new DataView(raw.buffer), layers = 1 + D.methods.length, out = { why: raw.subarray(raw.length - cells), layer: [] };
  for (let l = 0; l < layers; l++) {
    const lo = view.getFloat64(16 * l, true), step = view.getFloat64(16 * l + 8, true), at = 16 * layers + 2 * cells * l;
    const v = new Float64Array(cells);
    for (let k = 0, q = 0; k < cells; k++) {
      const z = raw[at + k] | raw[at + cells + k] << 8;
      q += z & 1 ? -((z + 1) >> 1) : z >> 1;
      v[k] = out.why[k] & 128 ? NaN : lo + q * step;
    }
    out.layer.push(v);
  }
  return out;
}

// maps: draw
const S = { i: -1, data: null, method: 0, j: -1, k: -1 };
const scaleOf = () => document.querySelector("[name=scale]:checked").value;
function edges(a) {
  const n = a.length;
  if (n === 1) return [a[0] - 2.5, a[0] + 2.5];
  return [a[0] - (a[1] - a[0]) / 2, a[n - 1] + (a[n - 1] - a[n - 2]) / 2];
}
function nearest(a, v) {
  let lo = 0, hi = a.length - 1;
  while (hi - lo > 1) { const m = (lo + hi) >> 1; if (a[m] <= v) lo = m; else hi = m; }
  return v - a[lo] <= a[hi] - v ? lo : hi;
}
function layerOf(name) {
  const d = S.data, res = d.layer[1 + S.method];
  if (name === "measured") return d.layer[0];
  if (!res) return null;
  if (name === "residual") return res;
  return d.layer[0].map((v, i) => v - res[i]);
}
function topOf(name) {
  const own = D.bottles[S.i].own || [], from = scaleOf() === "own" && own.length ? own : D.common;
  return from[name === "residual" ? 1 + S.method : 0] || 1;
}
function sharp(c) {
  const r = c.getBoundingClientRect(), dpr = window.devicePixelRatio || 1;
  const w = Math.round(r.width * dpr), h = Math.round(r.height * dpr);
  if (c.width !== w || c.height !== h) { c.width = w; c.height = h; }
  const g = c.getContext("2d");
  g.setTransform(1, 0, 0, 1, 0, 0);
  g.fillStyle = "#fff";
  g.fillRect(0, 0, w, h);
  g.setTransform(dpr, 0, 0, dpr, 0, 0);
  g.font = "11px Arial, 'Liberation Sans', sans-serif";
  g.lineWidth = 1;
  return [g, r.width, r.height, dpr];
}
const box = (w, h) => ({ x: 40, y: 6, w: w - 40 - 58, h: h - 6 - 36 });
function axes(g, b, x, y, xt, yt) {
  g.strokeStyle = g.fillStyle = "#20242c";
  g.strokeRect(b.x - .5, b.y - .5, b.w + 1, b.h + 1);
  g.textAlign = "center"; g.textBaseline = "top";
  const tx = ticks(x[0], x[1], Math.max(2, Math.floor(b.w / 30)));
  for (const v of tx) { const p = b.x + (v - x[0]) / (x[1] - x[0]) * b.w; g.fillRect(p, b.y + b.h, 1, 4); g.fillText(tickText(v, tx.step || 1), p, b.y + b.h + 6); }
  g.fillText(xt, b.x + b.w / 2, b.y + b.h + 21);
  g.textAlign = "right"; g.textBaseline = "middle";
  const ty = ticks(y[0], y[1], Math.max(2, Math.floor(b.h / 28)));
  for (const v of ty) { const p = b.y + b.h - (v - y[0]) / (y[1] - y[0]) * b.h; g.fillRect(b.x - 4, p, 4, 1); g.fillText(tickText(v, ty.step || 1), b.x - 6, p); }
  g.save(); g.translate(9, b.y + b.h / 2); g.rotate(-Math.PI / 2); g.textAlign = "center"; g.fillText(yt, 0, 0); g.restore();
}
// A scan of one excitation is a line, with zero and the place of the reading.
function drawLine(c) {
  const name = c.dataset.layer, v = layerOf(name), top = topOf(name), div = name === "residual";
  const [g, w, h] = sharp(c), b = box(w, h), X = edges(D.em), Y = [div ? -top : 0, top];
  axes(g, b, X, Y, "emission (nm)", D.unit);
  const px = x => b.x + (x - X[0]) / (X[1] - X[0]) * b.w, py = y => b.y + b.h - (Math.min(Y[1], Math.max(Y[0], y)) - Y[0]) / (Y[1] - Y[0]) * b.h;
  g.strokeStyle = "#9aa4b1"; g.beginPath(); g.moveTo(b.x, py(0)); g.lineTo(b.x + b.w, py(0)); g.moveTo(px(D.em[S.k]), b.y); g.lineTo(px(D.em[S.k]), b.y + b.h); g.stroke();
  g.strokeStyle = { measured: "#1f4fa8", model: "#c05a00", residual: "#901818" }[name]; g.lineWidth = 1.4; g.beginPath();
  let pen = false, at = -1;
  if (v) v.forEach((y, n) => { if (y !== y) { pen = false; return; } if (at < 0 || Math.abs(y) > Math.abs(v[at])) at = n; g[pen ? "lineTo" : "moveTo"](px(D.em[n]), py(y)); pen = true; });
  g.stroke();
  c.setAttribute("aria-label", at < 0 ? name + ": no numbers" :
    `${name} spectrum of ${D.bottles[S.i].shown}: largest ${sig(v[at], 3)} ${D.unit} at emission ${nm(D.em[at])} nm; arrow keys move the reading`);
}
function drawMap(c) {
  if (nex === 1) { drawLine(c); return; }
  const name = c.dataset.layer, v = layerOf(name), top = topOf(name), div = name === "residual", map = div ? DIV : SEQ;
  const [g, w, h, dpr] = sharp(c), b = box(w, h), X = edges(D.em), Y = edges(D.ex);
  const pw = Math.round(b.w * dpr), ph = Math.round(b.h * dpr), img = g.createImageData(pw, ph);
  const col = Int32Array.from({ length: pw }, (_, x) => nearest(D.em, X[0] + (x + .5) / pw * (X[1] - X[0])));
  let hi = -Infinity, at = -1;
  if (v) for (let k = 0; k < cells; k++) if (!isNaN(v[k]) && (div ? Math.abs(v[k]) : v[k]) > hi) { hi = div ? Math.abs(v[k]) : v[k]; at = k; }
  for (let y = 0, o = 0; y < ph; y++) {
    const j = nearest(D.ex, Y[1] - (y + .5) / ph * (Y[1] - Y[0]));
    for (let x = 0; x < pw; x++, o += 4) {
      const q = v ? v[j * nem + col[x]] : NaN;
      let rgb = (x + y) % 7 ? MISSING : HATCH;
      if (q === q) rgb = map[Math.round(Math.min(1, Math.max(0, div ? .5 + .5 * q / top : q / top)) * (map.length - 1))];
      img.data[o] = rgb[0]; img.data[o + 1] = rgb[1]; img.data[o + 2] = rgb[2]; img.data[o + 3] = 255;
    }
  }
  g.putImageData(img, Math.round(b.x * dpr), Math.round(b.y * dpr));
  axes(g, b, X, Y, "emission (nm)", "excitation (nm)");
  const bx = b.x + b.w + 8;
  for (let y = 0; y < b.h; y++) { const rgb = map[Math.round((1 - (y + .5) / b.h) * (map.length - 1))]; g.fillStyle = `rgb(${rgb})`; g.fillRect(bx, b.y + y, 10, 1.5); }
  g.strokeStyle = g.fillStyle = "#20242c"; g.strokeRect(bx - .5, b.y - .5, 11, b.h + 1);
  g.textAlign = "left"; g.textBaseline = "middle";
  const lo = div ? -top : 0, t = ticks(lo, top, 5);
  for (const q of t) { const p = b.y + b.h - (q - lo) / (top - lo) * b.h; g.fillRect(bx + 10, p, 3, 1); g.fillText(tickText(q, t.step), bx + 15, p); }
  g.textBaseline = "top"; g.fillText(D.unit, bx - 2, b.y + b.h + 21);
  if (S.j >= 0) {
    const px = b.x + (D.em[S.k] - X[0]) / (X[1] - X[0]) * b.w, py = b.y + b.h - (D.ex[S.j] - Y[0]) / (Y[1] - Y[0]) * b.h;
    for (const [style, lw] of [["rgba(255,255,255,.85)", 3], ["#20242c", 1]]) {
      g.strokeStyle = style; g.lineWidth = lw; g.beginPath();
      g.moveTo(b.x, py); g.lineTo(px - 5, py); g.moveTo(px + 5, py); g.lineTo(b.x + b.w, py);
      g.moveTo(px, b.y); g.lineTo(px, py - 5); g.moveTo(px, py + 5); g.lineTo(px, b.y + b.h); g.stroke();
    }
  }
  c.setAttribute("aria-label", at < 0 ? name + ": no numbers" :
    `${name} map of ${D.bottles[S.i].shown}: largest ${sig(v[at], 3)} ${D.unit} at excitation ${nm(D.ex[Math.floor(at / nem)])}, emission ${nm(D.em[at % nem])} nm; arrow keys move the reading`);
}
function drawSlice(c, alongEm) {
  const [g, w, h] = sharp(c), b = box(w, h);
  b.w += 40; b.y += 12; b.h -= 12; // the key stands above
  const x = alongEm ? D.em : D.ex, m = layerOf("measured"), f = layerOf("model");
  const pick = v => x.map((_, n) => v[alongEm ? S.j * nem + n : n * nem + S.k]);
  const ym = pick(m), yf = f ? pick(f) : [];
  const nums = ym.concat(yf).filter(v => v === v);
  const X = edges(x), Y = nums.length ? [Math.min(0, ...nums), Math.max(...nums)] : [0, 1];
  if (!(Y[1] > Y[0])) Y[1] = Y[0] + 1;
  Y[1] += (Y[1] - Y[0]) * .05;
  axes(g, b, X, Y, alongEm ? "emission (nm)" : "excitation (nm)", D.unit);
  const px = v => b.x + (v - X[0]) / (X[1] - X[0]) * b.w, py = v => b.y + b.h - (v - Y[0]) / (Y[1] - Y[0]) * b.h;
  g.strokeStyle = "#9aa4b1"; g.beginPath(); g.moveTo(px(alongEm ? D.em[S.k] : D.ex[S.j]), b.y); g.lineTo(px(alongEm ? D.em[S.k] : D.ex[S.j]), b.y + b.h); g.stroke();
  g.fillStyle = "#1f4fa8";
  ym.forEach((v, n) => { if (v === v) { g.beginPath(); g.arc(px(x[n]), py(v), 1.8, 0, 7); g.fill(); } });
  g.strokeStyle = "#c05a00"; g.lineWidth = 1.6; g.beginPath();
  let pen = false;
  yf.forEach((v, n) => { if (v !== v) { pen = false; return; } g[pen ? "lineTo" : "moveTo"](px(x[n]), py(v)); pen = true; });
  g.stroke();
  g.textAlign = "right"; g.textBaseline = "top";
  g.fillStyle = "#c05a00"; if (f) g.fillText("— model", b.x + b.w, 2);
  g.fillStyle = "#1f4fa8"; g.fillText("• measured", b.x + b.w - (f ? 56 : 0), 2);
}
let pending = 0;
function draw() {
  if (!pending) pending = requestAnimationFrame(() => {
    pending = 0;
    if (!S.data) return;
    mapCanvases.forEach(drawMap);
    drawSlice($("slice-em"), true);
    if (nex > 1) drawSlice($("slice-ex"), false);
    readout();
  });
}
function readout() {
  const at = S.j * nem + S.k, why = S.data.why[at], m = S.data.layer[0][at], r = S.data.layer[1 + S.method];
  let s = `ex ${nm(D.ex[S.j])} nm, em ${nm(D.em[S.k])} nm: `;
  if (why & 128) s += "no number – " + D.reasons[why & 127];
  else {
    s += `measured ${sig(m, 5)} ${D.unit}`;
    if (r) s += `, model ${sig(m - r[at], 5)}, residual ${sig(r[at], 3)}`;
    if (why) s += ` (filled – ${D.reasons[why]})`;
  }
  const out = $("readout");
  out.textContent = s;
  out.dataset.measured = m; out.dataset.residual = r ? r[at] : ""; out.dataset.ex = D.ex[S.j]; out.dataset.em = D.em[S.k];
}
for (const c of mapCanvases) {
  c.addEventListener("pointermove", e => {
    if (!S.data) return;
    const r = c.getBoundingClientRect(), b = box(r.width, r.height), x = (e.clientX - r.left - b.x) / b.w, y = 1 - (e.clientY - r.top - b.y) / b.h;
    if (x < 0 || x > 1 || y < 0 || y > 1) return;
    const X = edges(D.em), Y = edges(D.ex);
    S.k = nearest(D.em, X[0] + x * (X[1] - X[0])); S.j = nearest(D.ex, Y[0] + y * (Y[1] - Y[0]));
    draw();
  });
  c.addEventListener("keydown", e => {
    const step = { ArrowLeft: [0, -1], ArrowRight: [0, 1], ArrowUp: [1, 0], ArrowDown: [-1, 0] }[e.key];
    if (!step || !S.data) return;
    e.preventDefault();
    const by = e.shiftKey ? 5 : 1;
    S.j = Math.min(nex - 1, Math.max(0, S.j + by * step[0])); S.k = Math.min(nem - 1, Math.max(0, S.k + by * step[1]));
    draw();
  });
}

// one bottle
const el = (tag, t) => { const e = document.createElement(tag); e.textContent = t; return e; };
function finding(f) {
  const li = el("li", f[0] + ": " + f[1]);
  if (f[2]) {
    const d = document.createElement("details");
    d.append(el("summary", "in detail"), el("span", f[2]));
    li.append(" ", d);
  }
  return li;
}
let opening = 0;
async function open(row, focus) {
  const i = +row.dataset.i, b = D.bottles[i], turn = ++opening;
  body.querySelectorAll(".current").forEach(r => r.classList.remove("current"));
  row.classList.add("current");
  $("split").classList.add("open");
  detail.hidden = false;
  row.scrollIntoView({ block: "nearest" });
  $("detail-h").replaceChildren(el("bdi", b.shown));
  $("note").textContent = b.note;
  $("parts").tBodies[0].replaceChildren(...b.parts.map((p, n) => {
    const tr = document.createElement("tr");
    tr.append(el("td", D.columns[n].name), el("td", p[0]), el("td", p[1]), el("td", p[2]), el("td", D.columns[n].unit), el("td", p[3]));
    tr.cells[1].className = tr.cells[2].className = tr.cells[3].className = "n";
    return tr;
  }));
  $("flags").replaceChildren(...(b.flags.length ? b.flags.map(finding) : [el("li", "none")]));
  $("facts").replaceChildren(...b.facts.map(f => { const d = document.createElement("div"); d.append(el("dt", f[0]), el("dd", f[1])); return d; }));
  const pic = $("picture");
  pic.hidden = !b.file;
  if (b.file) pic.href = "maps/" + encodeURIComponent(b.file);
  showMark(b.id);
  if (focus) detail.focus({ preventScroll: matchMedia("(min-width: 1101px)").matches });
  S.i = i; S.data = null;
  if (!mapCanvases.length) return;
  let data = null, why = "No map: nothing was measured, or the survey is too large for the page.";
  try { data = await unpack(i); } catch (e) { why = "This browser cannot unpack the maps; open the picture instead."; }
  if (turn !== opening) return;
  document.querySelector(".maps").hidden = document.querySelector(".slices").hidden = !data;
  if (!data) { $("readout").textContent = why; return; }
  S.data = data;
  if (S.j < 0) {
    const r = data.layer[1 + S.method] || data.layer[0];
    let top = -1, at = 0;
    r.forEach((v, k) => { if (Math.abs(v) > top) { top = Math.abs(v); at = k; } });
    S.j = Math.floor(at / nem); S.k = at % nem;
  }
  draw();
}
function shut() {
  const row = body.querySelector(".current");
  $("split").classList.remove("open");
  detail.hidden = true; S.data = null;
  if (row) { row.classList.remove("current"); row.querySelector(".open").focus(); }
}
function go(by) {
  const shown = [...body.rows].filter(r => !r.hidden), at = shown.findIndex(r => r.classList.contains("current"));
  const to = shown[at < 0 ? 0 : at + by];
  if (to) open(to, false);
}
body.addEventListener("click", e => { if (e.target.closest(".open")) open(e.target.closest("tr"), true); });
$("previous").addEventListener("click", () => go(-1));
$("next").addEventListener("click", () => go(1));
$("close").addEventListener("click", shut);
document.addEventListener("keydown", e => {
  if (/^(INPUT|SELECT|TEXTAREA)$/.test(e.target.tagName) || e.ctrlKey || e.metaKey || e.altKey) return;
  if (e.key === "Escape" && !detail.hidden) shut();
  else if (e.key === "j") go(1);
  else if (e.key === "k") go(-1);
});
document.querySelectorAll("[name=scale]").forEach(r => r.addEventListener("change", draw));
if ($("method")) $("method").addEventListener("change", e => { S.method = Math.max(0, D.methods.indexOf(e.target.value)); draw(); });
window.addEventListener("resize", draw);

// marks by eye
const marks = new Map();
let saved = true;
function showMark(id) {
  $("reason").value = marks.get(id) || "";
  $("unmark").hidden = !marks.has(id);
  $("marks").hidden = !marks.size;
  $("marked").textContent = marks.size + (marks.size === 1 ? " bottle marked" : " bottles marked");
  rows.forEach(r => r.classList.toggle("marked", marks.has(D.bottles[r.dataset.i].id)));
}
$("mark").addEventListener("submit", e => {
  e.preventDefault();
  const id = D.bottles[S.i].id, why = $("reason").value.trim();
  if (!why) { $("reason").focus(); return; }
  marks.set(id, why); saved = false; showMark(id);
});
$("unmark").addEventListener("click", () => { const id = D.bottles[S.i].id; marks.delete(id); showMark(id); });
$("marks").addEventListener("submit", e => {
  e.preventDefault();
  const q = s => /[",\r\n]/.test(s) ? '"' + s.replaceAll('"', '""') + '"' : s, by = $("by").value.trim();
  const csv = "id,reason,by\n" + D.bottles.filter(b => marks.has(b.id)).map(b => [b.id, marks.get(b.id), by].map(q).join(",") + "\n").join("");
  const a = document.createElement("a"), url = URL.createObjectURL(new Blob([csv], { type: "text/csv" }));
  a.href = url; a.download = "exclusions.csv"; a.click();
  setTimeout(() => URL.revokeObjectURL(url), 1000);
  saved = true;
});
window.addEventListener("beforeunload", e => { if (!saved && marks.size) e.preventDefault(); });
})();
