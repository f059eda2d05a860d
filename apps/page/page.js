"use strict";
// SPDX-License-Identifier: Apache-2.0
// All texts of the campaign reach the page through textContent: nothing in them is markup.
const data = JSON.parse(document.getElementById("data").textContent);
const F = data.findings;
const $ = (id) => document.getElementById(id);

function el(name, attributes = {}, ...children) {
  const node = document.createElement(name);
  for (const [key, value] of Object.entries(attributes)) node.setAttribute(key, value);
  node.append(...children.map((c) => (c instanceof Node ? c : String(c))));
  return node;
}
function svg(name, attributes = {}, text) {
  const node = document.createElementNS("http://www.w3.org/2000/svg", name);
  for (const [key, value] of Object.entries(attributes)) node.setAttribute(key, value);
  if (text !== undefined) node.textContent = text;
  return node;
}
const known = (v) => v !== null && v !== undefined && Number.isFinite(v);
const fixed = (v, digits) => (known(v) ? v.toFixed(digits) : "–");
const pm = (v, sd, digits, unit) => (known(v) ? `${fixed(v, digits)} ± ${fixed(sd, digits)} ${unit}` : "not resolvable");
const stamp = (s) => new Date(s * 1000).toISOString().slice(0, 16).replace("T", " ") + " UTC";

// A ramp that is even in lightness and told apart by colour-blind eyes: straight in CIE L*a*b*.
function lab(L, a, b) {
  const fy = (L + 16) / 116, f = [fy + a / 500, fy, fy - b / 200];
  const [x, y, z] = f.map((t, i) => [0.95047, 1, 1.08883][i] * (t > 6 / 29 ? t ** 3 : (3 * (6 / 29) ** 2) * (t - 4 / 29)));
  return [3.2406 * x - 1.5372 * y - 0.4986 * z, -0.9689 * x + 1.8758 * y + 0.0415 * z, 0.0557 * x - 0.204 * y + 1.057 * z]
    .map((c) => Math.round(255 * Math.min(1, Math.max(0, c <= 0.0031308 ? 12.92 * c : 1.055 * c ** (1 / 2.4) - 0.055))));
}
const ramp = Array.from({ length: 256 }, (_, i) => {
  const t = i / 255;
  return lab(18 + 72 * t, 8 * (1 - t) - 2 * t, -42 + 92 * t);
});
const colour = (v, low, high) => {
  const t = high > low ? Math.min(1, Math.max(0, (v - low) / (high - low))) : 0.5;
  return ramp[Math.round(255 * t)];
};
const css = (c) => `rgb(${c[0]},${c[1]},${c[2]})`;

function niceTicks(low, high, count) {
  const raw = (high - low) / count, power = 10 ** Math.floor(Math.log10(raw || 1));
  const step = [1, 2, 5, 10].map((m) => m * power).find((s) => s >= raw) || 1;
  const ticks = [];
  for (let t = Math.ceil(low / step) * step; t <= high + step * 1e-9; t += step) ticks.push(Math.round(t / step) * step);
  return { ticks, digits: Math.max(0, -Math.floor(Math.log10(step))) };
}
function range(...lists) {
  let low = Infinity, high = -Infinity;
  for (const list of lists) for (const v of list) if (known(v)) { low = Math.min(low, v); high = Math.max(high, v); }
  return low <= high ? [low, high] : [0, 1];
}

// --- Headlines ------------------------------------------------------------------------------
const C = data.channels;
$("span").textContent = `${F.record.channels} channels from ${fixed(F.record.from_m, 1)} to ${fixed(F.record.to_m, 1)} m of fibre, `
  + `${F.record.traces} traces from ${F.record.first.replace("T", " ").replace("Z", "")} to ${F.record.last.replace("T", " ").replace("Z", " UTC")}`;
function headline(big, small) { $("headlines").append(el("li", {}, el("b", {}, big), el("span", {}, small))); }
for (const reach of F.stream) {
  const steps = reach.inflows.filter((i) => i.kind === "step" && !i.known);
  const total = steps.length;
  headline(total === 1 ? "1 inflow" : `${total} inflows`, `that change the stream in '${reach.stretch}'; `
    + `${reach.inflows.filter((i) => i.kind === "diffuse").length} gaining stretches, ${reach.inflows.filter((i) => i.kind === "spot").length} spots`);
  headline(reach.resolvable ? `${fixed(100 * reach.detection_limit_fraction, 2)} %` : "not resolvable",
    "smallest share of flow that would have been seen (median)");
  if (known(reach.inflow_temperature_c)) headline(pm(reach.inflow_temperature_c, reach.inflow_temperature_sd_c, 1, "°C"),
    reach.inflow_temperature_given ? "groundwater, as given" : "groundwater, estimated from the record");
}
if (F.placement) headline(`± ${fixed(F.placement.position_sd_m, 1)} m`, "position of a channel (median)");
headline(`± ${fixed(F.quality.noise_c, 3)} K`, "noise of one sample (median)");

// --- Findings -------------------------------------------------------------------------------
function table(headers, rows) {
  const head = el("tr", {}, ...headers.map(([text, n]) => el("th", n ? { class: "n", scope: "col" } : { scope: "col" }, text)));
  const body = rows.map((cells) => el("tr", {}, ...cells.map((c, i) => el("td", headers[i][1] ? { class: "n" } : {}, c))));
  return el("div", { class: "scroll" }, el("table", {}, el("thead", {}, head), el("tbody", {}, ...body)));
}
const box = $("findings");
if (F.stream.length === 0) box.append(el("p", {}, "This campaign asks for no interpretation; the record, the tables and the layers are beside this page."));
for (const reach of F.stream) {
  box.append(el("h3", {}, `Stream '${reach.stretch}'`));
  const limit = reach.resolvable ? `The smallest share that would have been found with 95 % power is ${fixed(100 * reach.detection_limit_fraction, 2)} % of the flow (median of the reach).`
    : "Inflows are not resolvable here: the contrast is too small for the noise.";
  if (reach.inflows.length === 0) box.append(el("p", {}, `Nothing found. ${limit}`));
  else {
    box.append(table([["Where on the fibre", true], ["Kind"], ["Share of flow below", true], ["Temperature", true], ["Discharge", true], ["Contrast", true], ["Score", true]],
      reach.inflows.map((i) => [
        i.kind === "diffuse" ? `${fixed(i.fibre_from_m, 0)} – ${fixed(i.fibre_to_m, 0)} m` : `${fixed(i.fibre_m, 1)} ± ${fixed(i.fibre_sd_m, 1)} m`,
        el("span", { class: "tag" }, i.known ? `${i.kind}: ${i.label}` : i.kind),
        known(i.fraction) ? `${fixed(100 * i.fraction, 2)} ± ${fixed(100 * i.fraction_sd, 2)} %` : (i.kind === "spot" ? "not measurable" : "not resolvable"),
        pm(i.temperature_c, i.temperature_sd_c, 1, "°C"),
        known(i.discharge_m3s) ? `${fixed(1000 * i.discharge_m3s, 2)} ± ${fixed(1000 * i.discharge_sd_m3s, 2)} L/s` : "no gauging",
        `${fixed(i.contrast_c, 1)} K`, fixed(i.score, 1)])));
    box.append(el("p", { class: "note" }, limit + " Score: standard deviations from nothing."));
    const evidence = reach.inflows.filter((i) => i.evidence);
    if (evidence.length > 0) box.append(el("details", {}, el("summary", {}, "Evidence for each"),
      ...evidence.map((i) => el("p", {}, el("b", {}, `${fixed(i.fibre_m, 1)} m, ${i.kind}: `), i.evidence))));
  }
  if (reach.not_inflows.length > 0) box.append(el("details", {}, el("summary", {}, `${reach.not_inflows.length} places that are no inflow`),
    el("ul", {}, ...reach.not_inflows.map((a) => el("li", {}, `${fixed(a.fibre_from_m, 0)}–${fixed(a.fibre_to_m, 0)} m, ${a.kind}: ${a.text}`)))));
  for (const caution of reach.cautions) box.append(el("p", { class: "warning" }, caution));
}

// --- Cursor that all views share --------------------------------------------------------------
const P = data.picture;
const raw = atob(P.codes);
const code = (i, j) => { const k = 2 * (i * P.columns + j); return raw.charCodeAt(k) | (raw.charCodeAt(k + 1) << 8); };
const valueAt = (i, j) => { const c = code(i, j); return c === 65535 ? null : P.low_c + (c / 65534) * (P.high_c - P.low_c); };
const cursor = { row: Math.floor(P.rows / 2), column: Math.floor(P.columns / 2) };
const followers = [];
function moveTo(row, column) {
  cursor.row = Math.min(P.rows - 1, Math.max(0, row));
  cursor.column = Math.min(P.columns - 1, Math.max(0, column));
  for (const follow of followers) follow();
}
const columnOf = (fibre) => {
  let best = 0;
  for (let j = 0; j < P.columns; j++) if (Math.abs(P.fibre_m[j] - fibre) < Math.abs(P.fibre_m[best] - fibre)) best = j;
  return best;
};
const channelOf = (fibre) => {
  let low = 0, high = C.fibre_m.length - 1;
  while (low < high) { const mid = (low + high) >> 1; if (C.fibre_m[mid] < fibre) low = mid + 1; else high = mid; }
  return low;
};

// --- Picture ----------------------------------------------------------------------------------
const canvas = $("picture");
const still = document.createElement("canvas");
still.width = P.columns; still.height = P.rows;
{
  const context = still.getContext("2d"), image = context.createImageData(P.columns, P.rows);
  // The colours span the middle 99 %: a few dry channels do not drown the stream.
  const codes = [];
  for (let k = 0; k < P.rows * P.columns; k += Math.max(1, Math.floor(P.rows * P.columns / 20000))) { const c = code(Math.floor(k / P.columns), k % P.columns); if (c !== 65535) codes.push(c); }
  codes.sort((a, b) => a - b);
  P.lowShown = codes.length ? codes[Math.floor(codes.length * 0.005)] : 0;
  P.highShown = codes.length ? codes[Math.floor((codes.length - 1) * 0.995)] : 65534;
  for (let i = 0; i < P.rows; i++) for (let j = 0; j < P.columns; j++) {
    const c = code(i, j), k = 4 * (i * P.columns + j);
    if (c === 65535) { image.data[k + 3] = 0; continue; }
    const rgb = colour(c, P.lowShown, P.highShown);
    image.data[k] = rgb[0]; image.data[k + 1] = rgb[1]; image.data[k + 2] = rgb[2]; image.data[k + 3] = 255;
  }
  context.putImageData(image, 0, 0);
}
const M = { left: 110, right: 10, top: 8, bottom: 34 };
const spanX = [P.fibre_m[0], P.fibre_m[P.columns - 1]];
// Rows are spaced by time, so that gaps are visible.
const spanT = [P.time_s[0], P.time_s[P.rows - 1]];
let rowY = [];
function drawPicture() {
  const width = canvas.clientWidth, height = 380, ratio = window.devicePixelRatio || 1;
  canvas.style.height = height + "px";
  canvas.width = width * ratio; canvas.height = height * ratio;
  const g = canvas.getContext("2d");
  g.scale(ratio, ratio);
  const w = width - M.left - M.right, h = height - M.top - M.bottom;
  const style = getComputedStyle(document.body), soft = getComputedStyle($("span")).color;
  g.fillStyle = getComputedStyle(document.querySelector("section")).borderTopColor;
  g.fillRect(M.left, M.top, w, h);
  const y = (t) => M.top + h * (spanT[1] > spanT[0] ? (t - spanT[0]) / (spanT[1] - spanT[0]) : 0);
  const usual = P.rows > 1 ? [...P.time_s.slice(1).map((t, i) => t - P.time_s[i])].sort((a, b) => a - b)[Math.floor((P.rows - 1) / 2)] : 1;
  rowY = P.time_s.map(y);
  g.imageSmoothingEnabled = false;
  for (let i = 0; i < P.rows; i++) {
    const next = i + 1 < P.rows ? Math.min(P.time_s[i + 1], P.time_s[i] + 1.6 * usual) : P.time_s[i] + usual;
    g.drawImage(still, 0, i, P.columns, 1, M.left, rowY[i], w, Math.max(1, y(next) - rowY[i] + 0.5));
  }
  g.fillStyle = soft; g.font = `12px ${style.fontFamily}`; g.textBaseline = "middle";
  const day = 86400;
  g.textAlign = "right";
  let lastY = -100;
  for (let t = Math.ceil(spanT[0] / (day / 2)) * (day / 2); t <= spanT[1]; t += day / 2) {
    if (y(t) - lastY < 22) continue;
    lastY = y(t);
    g.fillText(stamp(t).slice(5, 16), M.left - 8, y(t));
    g.fillRect(M.left - 5, y(t), 5, 1);
  }
  g.textAlign = "center";
  for (const d of niceTicks(spanX[0], spanX[1], 8).ticks) {
    const x = M.left + w * (d - spanX[0]) / (spanX[1] - spanX[0] || 1);
    g.fillRect(x, height - M.bottom, 1, 5);
    g.fillText(d, x, height - M.bottom + 13);
  }
  g.fillText("fibre distance (m)", M.left + w / 2, height - 6);
  const cx = M.left + w * (cursor.column + 0.5) / P.columns, cy = rowY[cursor.row];
  g.strokeStyle = getComputedStyle($("quality-title")).color; g.setLineDash([3, 3]);
  g.beginPath(); g.moveTo(cx, M.top); g.lineTo(cx, M.top + h); g.moveTo(M.left, cy); g.lineTo(M.left + w, cy); g.stroke();
  g.setLineDash([]);
}
function tellCursor() {
  const v = valueAt(cursor.row, cursor.column), fibre = P.fibre_m[cursor.column], k = channelOf(fibre);
  $("picture-note").textContent = `${fixed(fibre, 1)} m, ${stamp(P.time_s[cursor.row])}: ${v === null ? "missing" : fixed(v, 2) + " °C"}`
    + ` (± ${fixed(C.noise_c[k], 3)} K a sample)` + (C.stretch[k] ? `, ${C.stretch[k]}` : "")
    + (C.position_sd_m && known(C.position_sd_m[k]) ? `, position ± ${fixed(C.position_sd_m[k], 1)} m` : "");
}
canvas.addEventListener("pointermove", (event) => {
  const r = canvas.getBoundingClientRect(), w = r.width - M.left - M.right;
  const column = Math.floor((event.clientX - r.left - M.left) / w * P.columns), yy = event.clientY - r.top;
  let row = 0;
  while (row + 1 < P.rows && rowY[row + 1] <= yy) row++;
  moveTo(row, column);
});
canvas.addEventListener("keydown", (event) => {
  const steps = { ArrowLeft: [0, -1], ArrowRight: [0, 1], ArrowUp: [-1, 0], ArrowDown: [1, 0] }[event.key];
  if (!steps) return;
  event.preventDefault();
  const far = event.shiftKey ? 10 : 1;
  moveTo(cursor.row + far * steps[0], cursor.column + far * steps[1]);
});
{
  const bar = svg("svg", { width: 280, height: 34, role: "img", "aria-label": "Colour scale" });
  const shown = (c) => P.low_c + (c / 65534) * (P.high_c - P.low_c);
  for (let i = 0; i < 64; i++) bar.append(svg("rect", { x: 4 + i * 4.25, y: 0, width: 4.5, height: 12, fill: css(ramp[i * 4]) }));
  bar.append(svg("text", { x: 4, y: 28 }, fixed(shown(P.lowShown), 1) + " °C"), svg("text", { x: 276, y: 28, "text-anchor": "end" }, fixed(shown(P.highShown), 1) + " °C"));
  $("scale").append(bar);
}

// --- Charts -----------------------------------------------------------------------------------
function path(xs, ys, X, Y) {
  let d = "", open = false;
  for (let i = 0; i < xs.length; i++) {
    if (!known(xs[i]) || !known(ys[i])) { open = false; continue; }
    d += `${open ? "L" : "M"}${X(xs[i]).toFixed(1)} ${Y(ys[i]).toFixed(1)}`;
    open = true;
  }
  return d;
}
function bandPath(xs, low, high, X, Y) {
  let d = "";
  for (let i = 0; i < xs.length;) {
    if (!known(low[i]) || !known(high[i])) { i++; continue; }
    let k = i;
    while (k < xs.length && known(low[k]) && known(high[k])) k++;
    for (let n = i; n < k; n++) d += `${n === i ? "M" : "L"}${X(xs[n]).toFixed(1)} ${Y(high[n]).toFixed(1)}`;
    for (let n = k - 1; n >= i; n--) d += `L${X(xs[n]).toFixed(1)} ${Y(low[n]).toFixed(1)}`;
    d += "Z";
    i = k;
  }
  return d;
}
function frame(node, height, xRange, yRange, xLabel, yLabel, time) {
  const width = node.clientWidth || 900;
  node.setAttribute("viewBox", `0 0 ${width} ${height}`);
  node.setAttribute("height", height);
  node.replaceChildren();
  const m = { left: 60, right: 10, top: 18, bottom: 36 };
  const pad = 0.04 * (yRange[1] - yRange[0] || 1), y0 = yRange[0] - pad, y1 = yRange[1] + pad;
  const X = (x) => m.left + (width - m.left - m.right) * (x - xRange[0]) / (xRange[1] - xRange[0] || 1);
  const Y = (y) => height - m.bottom - (height - m.top - m.bottom) * (y - y0) / (y1 - y0);
  const ys = niceTicks(y0, y1, 5);
  for (const t of ys.ticks) node.append(svg("line", { x1: m.left, x2: width - m.right, y1: Y(t), y2: Y(t), class: "axis" }),
    svg("text", { x: m.left - 6, y: Y(t) + 4, "text-anchor": "end" }, t.toFixed(ys.digits)));
  if (time) {
    for (let t = Math.ceil(xRange[0] / 86400) * 86400; t <= xRange[1]; t += 86400 * Math.max(1, Math.ceil((xRange[1] - xRange[0]) / 86400 / 8)))
      node.append(svg("text", { x: X(t), y: height - m.bottom + 16, "text-anchor": "middle" }, stamp(t).slice(5, 10)));
  } else for (const t of niceTicks(xRange[0], xRange[1], 8).ticks) node.append(svg("text", { x: X(t), y: height - m.bottom + 16, "text-anchor": "middle" }, t));
  node.append(svg("text", { x: (width + m.left) / 2, y: height - 4, "text-anchor": "middle" }, xLabel),
    svg("text", { x: 4, y: 12, class: "strong" }, yLabel));
  return { X, Y, top: m.top, bottom: height - m.bottom };
}
function drawProfile() {
  const node = $("profile");
  const f = frame(node, 260, spanX, range(C.p05_c, C.p95_c), "fibre distance (m)", "mean and 5–95 % band (°C)");
  node.append(svg("path", { d: bandPath(C.fibre_m, C.p05_c, C.p95_c, f.X, f.Y), class: "band" }),
    svg("path", { d: path(C.fibre_m, C.mean_c, f.X, f.Y), class: "data" }));
  const row = P.fibre_m.map((_, j) => valueAt(cursor.row, j));
  node.append(svg("path", { d: path(P.fibre_m, row, f.X, f.Y), class: "second" }));
  const x = f.X(P.fibre_m[cursor.column]);
  node.append(svg("line", { x1: x, x2: x, y1: f.top, y2: f.bottom, class: "cursor" }),
    svg("text", { x: f.X(spanX[1]), y: 12, "text-anchor": "end" }, `orange: ${stamp(P.time_s[cursor.row])}`));
  for (const i of data.inflows || []) node.append(svg("path", { d: `M${f.X(i.fibre_m)} ${f.bottom}l-4 7h8z`, fill: "currentColor" }));
}
function drawLimit() {
  if (data.streams.length === 0) return;
  $("limit-stage").hidden = false;
  const xs = [], ys = [];
  for (const s of data.streams) { xs.push(...s.fibre_m, null); ys.push(...s.detection_limit_fraction.map((v) => (known(v) ? 100 * v : null)), null); }
  const good = ys.filter(known).sort((a, b) => a - b);
  if (good.length === 0) { $("limit-stage").hidden = true; return; }
  const top = Math.min(good[good.length - 1], 4 * good[Math.floor(good.length / 2)]);
  const f = frame($("limit"), 190, spanX, [0, top], "fibre distance (m)", "smallest share that would have been seen (% of flow)");
  $("limit").append(svg("path", { d: path(xs, ys.map((v) => (known(v) ? Math.min(v, top) : null)), f.X, f.Y), class: "data" }));
  const x = f.X(P.fibre_m[cursor.column]);
  $("limit").append(svg("line", { x1: x, x2: x, y1: f.top, y2: f.bottom, class: "cursor" }));
}
function drawSeries() {
  const column = P.time_s.map((_, i) => valueAt(i, cursor.column));
  const f = frame($("series"), 200, spanT, range(column), "time (UTC)", `temperature at ${fixed(P.fibre_m[cursor.column], 1)} m (°C)`, true);
  $("series").append(svg("path", { d: path(P.time_s, column, f.X, f.Y), class: "second" }));
  const x = f.X(P.time_s[cursor.row]);
  $("series").append(svg("line", { x1: x, x2: x, y1: f.top, y2: f.bottom, class: "cursor" }));
}

// --- Map --------------------------------------------------------------------------------------
const attributes = [["mean_c", "mean temperature", "°C", 2], ["daily_range_c", "daily range", "K", 2], ["noise_c", "noise", "K", 3], ["position_sd_m", "position sd", "m", 1]];
let project = null;
function drawMap() {
  if (!C.lon || !C.lon.some(known)) return;
  $("map-panel").hidden = false;
  const node = $("map"), width = node.clientWidth || 900, height = Math.max(300, Math.min(520, width * 0.6));
  node.setAttribute("viewBox", `0 0 ${width} ${height}`); node.setAttribute("height", height);
  node.replaceChildren();
  const [w, e] = range(C.lon), [s, n] = range(C.lat), k = Math.cos((s + n) / 2 * Math.PI / 180);
  const metre = 111320, wide = Math.max(1, (e - w) * k * metre), high = Math.max(1, (n - s) * metre);
  const scale = Math.min((width - 60) / wide, (height - 80) / high);
  const ox = (width - wide * scale) / 2, oy = (height - 30 - high * scale) / 2 + 5;
  project = (lon, lat) => [ox + (lon - w) * k * metre * scale, oy + (n - lat) * metre * scale];
  const [name, words, unit, digits] = attributes.find((a) => a[0] === $("map-by").value) || attributes[0];
  const values = C[name], sorted = values.filter((v, i) => known(v) && known(C.lon[i])).sort((a, b) => a - b);
  const low = sorted[Math.floor(sorted.length * 0.02)], top = sorted[Math.floor((sorted.length - 1) * 0.98)];
  const step = Math.max(1, Math.floor(C.lon.length / 4000));
  let last = null;
  for (let i = 0; i < C.lon.length; i += step) {
    if (!known(C.lon[i])) { last = null; continue; }
    const p = project(C.lon[i], C.lat[i]);
    if (last && known(values[i])) node.append(svg("line", { x1: last[0], y1: last[1], x2: p[0], y2: p[1], stroke: css(colour(values[i], low, top)), "stroke-width": 5, "stroke-linecap": "round" }));
    last = p;
  }
  for (const t of data.tie_points || []) {
    const p = project(t.lon, t.lat);
    const mark = svg("path", { d: `M${p[0] - 3} ${p[1]}h6M${p[0]} ${p[1] - 3}v6`, stroke: "currentColor", "stroke-width": t.used ? 1 : 2 });
    mark.append(svg("title", {}, `tie point ${t.label}` + (t.used ? "" : `, set aside: ${t.reason}`)));
    node.append(mark);
  }
  for (const i of data.inflows || []) {
    if (!known(i.lon)) continue;
    const p = project(i.lon, i.lat), size = 6 + 60 * Math.sqrt(Math.max(0, i.fraction || 0)) * 0.5;
    const dot = svg("circle", { cx: p[0], cy: p[1], r: size, fill: "none", stroke: i.known ? "var(--soft)" : "var(--warm)", "stroke-width": 2.5 });
    dot.append(svg("title", {}, `${i.kind} at ${fixed(i.fibre_m, 1)} m: ` + (known(i.fraction) ? `${fixed(100 * i.fraction, 1)} ± ${fixed(100 * i.fraction_sd, 1)} % of the flow` : "no share")));
    node.append(dot, svg("text", { x: p[0] + size + 4, y: p[1] + 4, class: "strong" }, known(i.fraction) ? `${fixed(100 * i.fraction, 1)} %` : i.kind));
  }
  const nice = [10, 20, 50, 100, 200, 500, 1000, 2000, 5000].find((m) => m * scale > 70) || 10000;
  node.append(svg("path", { d: `M14 ${height - 16}h${nice * scale}`, stroke: "currentColor", "stroke-width": 3 }),
    svg("text", { x: 14, y: height - 24 }, nice >= 1000 ? `${nice / 1000} km` : `${nice} m`),
    svg("path", { d: `M${width - 24} 40V14m0 0l-5 9m5-9l5 9`, stroke: "currentColor", fill: "none" }), svg("text", { x: width - 28, y: 54 }, "N"));
  for (let i = 0; i < 64; i++) node.append(svg("rect", { x: width - 300 + i * 3, y: height - 22, width: 3.2, height: 10, fill: css(ramp[i * 4]) }));
  node.append(svg("text", { x: width - 300, y: height - 28 }, `${words} ${fixed(low, digits)} to ${fixed(top, digits)} ${unit}`));
  drawMapCursor();
}
function drawMapCursor() {
  if (!project) return;
  const node = $("map"), i = channelOf(P.fibre_m[cursor.column]);
  node.querySelectorAll(".here").forEach((x) => x.remove());
  if (known(C.lon[i])) { const p = project(C.lon[i], C.lat[i]); node.append(svg("circle", { cx: p[0], cy: p[1], r: 5, class: "here", fill: "var(--ink)", stroke: "var(--card)", "stroke-width": 2 })); }
  $("map-note").textContent = `${fixed(C.fibre_m[i], 1)} m of fibre` + (C.station_m && known(C.station_m[i]) ? `, station ${fixed(C.station_m[i], 0)} m` : "")
    + `: mean ${fixed(C.mean_c[i], 2)} °C (5–95 %: ${fixed(C.p05_c[i], 2)} to ${fixed(C.p95_c[i], 2)} °C)` + (known(C.position_sd_m[i]) ? `, position ± ${fixed(C.position_sd_m[i], 1)} m` : ", no position");
}
for (const [name, words] of attributes) if (C[name]) $("map-by").append(el("option", { value: name }, words));
$("map-by").addEventListener("change", drawMap);
$("map").addEventListener("pointermove", (event) => {
  if (!project) return;
  const r = $("map").getBoundingClientRect(), view = $("map").viewBox.baseVal;
  const x = (event.clientX - r.left) * view.width / r.width, y = (event.clientY - r.top) * view.height / r.height;
  let best = -1, least = 900;
  for (let i = 0; i < C.lon.length; i++) {
    if (!known(C.lon[i])) continue;
    const p = project(C.lon[i], C.lat[i]), d = (p[0] - x) ** 2 + (p[1] - y) ** 2;
    if (d < least) { least = d; best = i; }
  }
  if (best >= 0) moveTo(cursor.row, columnOf(C.fibre_m[best]));
});

// --- Words ------------------------------------------------------------------------------------
function terms(pairs) { return el("dl", {}, ...pairs.filter(([, v]) => v !== null && v !== "").flatMap(([k, v]) => [el("dt", {}, k), el("dd", {}, v)])); }
{
  const q = $("quality");
  if (F.quality.baths.length > 0) q.append(table([["Bath"], ["Use"], ["Bias", true], ["RMSE", true], ["Drift", true], ["Gradient inside", true]],
    F.quality.baths.map((b) => [b.name, b.use, pm(b.bias_c, b.bias_sd_c, 3, "K"), `${fixed(b.rmse_c, 3)} K`, pm(b.drift_kd, b.drift_sd_kd, 3, "K/d"), `${fixed(b.gradient_km, 4)} K/m`])));
  else q.append(el("p", {}, "No reference bath is declared: nothing says how far off the temperatures are."));
  q.append(terms([["missing samples", `${fixed(100 * F.record.missing_fraction, 2)} %`], ["gaps in time", String(F.record.gaps.length)],
    ["channels by flag", Object.entries(F.quality.flags).map(([k, v]) => `${k} ${v}`).join(", ")]]));
  for (const w of F.warnings) q.append(el("p", { class: "warning" }, w.text));
}
if (F.placement) {
  const p = F.placement;
  $("placement-panel").hidden = false;
  $("placement").append(terms([["survey in", `${p.crs_name} (${p.crs.length < 20 ? p.crs : "WKT"})`], ["layers in", p.output_crs_name],
    ["to WGS 84 by", `${p.operation_to_wgs84} (${known(p.operation_accuracy_m) ? "accuracy " + p.operation_accuracy_m + " m" : "accuracy not stated"})`],
    ["first tie point", `longitude ${fixed(p.first_tie_point.lon, 5)}, latitude ${fixed(p.first_tie_point.lat, 5)}`],
    ["lengths", p.lengths + (p.route ? ", along the route" : ", between the tie points")], ["fibre per ground metre", fixed(p.slack, 3)],
    ["channels without position", String(p.unplaced_channels)]]),
    table([["Tie point"], ["Fibre", true], ["sd", true], ["Residual", true], ["Slack to next", true], ["Used"]],
      p.tie_points.map((t) => [t.label || "", `${fixed(t.fibre_m, 1)} m`, `${fixed(t.sd_m, 1)} m`, `${fixed(t.residual_m, 1)} m`, fixed(t.slack, 3), t.used ? "yes" : `no: ${t.reason}`])));
}
for (const reach of F.stream) if (reach.method) $("method").append(el("p", {}, reach.method));
if ($("method").childNodes.length === 0) $("method").append(el("p", {}, "Statistics of every channel over all traces; no interpretation was asked for."));
for (const c of F.cautions) $("cautions").append(el("li", {}, c));
{
  const p = F.provenance;
  $("provenance").append(terms([["program", `${p.program} ${p.version}`], ["time", p.time], ["campaign file", `${p.campaign_file}, SHA-256 ${p.campaign_sha256}`], ["inputs", `${p.inputs.length} files`]]),
    el("details", {}, el("summary", {}, "Defaults that were used"), el("ul", {}, ...p.defaults.map((d) => el("li", {}, `${d.key} = ${d.value}`)))),
    el("details", {}, el("summary", {}, "Inputs and their SHA-256"), el("ul", {}, ...p.inputs.slice(0, 200).map((i) => el("li", {}, `${i.file} `, el("code", {}, i.sha256))),
      ...(p.inputs.length > 200 ? [el("li", {}, `and ${p.inputs.length - 200} more, in findings.json`)] : []))));
}
followers.push(drawPicture, tellCursor, drawProfile, drawLimit, drawSeries, drawMapCursor);
function drawAll() { drawMap(); for (const follow of followers) follow(); }
drawAll();
let waiting = 0;
window.addEventListener("resize", () => { clearTimeout(waiting); waiting = setTimeout(drawAll, 150); });
document.documentElement.dataset.ready = "yes";
