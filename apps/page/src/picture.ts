// SPDX-License-Identifier: Apache-2.0
// The distance-time picture: canvas, zoom by wheel or keys, pan by drag, cursor by pointer.
import { cursor, data, el, findings, grid, list, moveTo, nearest, num, ramp, rampCss, span, utc, watch } from './data';

const p = data.picture, edge = { left: 62, right: 8, top: 20, bottom: 34 };
const css = (name: string) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();

/// The whole grid painted once; gaps in time keep their width because rows are drawn at their times.
function paint(low: number, high: number): HTMLCanvasElement {
    const c = document.createElement('canvas');
    c.width = p.columns; c.height = p.rows;
    const g = c.getContext('2d')!, image = g.createImageData(p.columns, p.rows);
    for (let k = 0; k < grid.length; ++k) {
        if (Number.isNaN(grid[k])) continue;
        const [r, gr, b] = ramp((grid[k] - low) / (high - low));
        image.data.set([r, gr, b, 255], 4 * k);
    }
    g.putImageData(image, 0, 0);
    return c;
}

/// Runs of rows without a gap in time: each is drawn as one block.
function blocks(): [number, number][] {
    const step = medianStep(), out: [number, number][] = [];
    let first = 0;
    for (let i = 1; i <= p.rows; ++i)
        if (i === p.rows || p.time_s[i] - p.time_s[i - 1] > 1.8 * step) { out.push([first, i]); first = i; }
    return out;
}
function medianStep(): number {
    const d = p.time_s.slice(1).map((t, i) => t - p.time_s[i]).sort((a, b) => a - b);
    return d.length ? d[d.length >> 1] : 60;
}

/// Height of the sun over the horizon is under 0 at this time (low-precision solar position).
function night(t: number, lon: number, lat: number): boolean {
    const d = t / 86400 - 10957.5, r = Math.PI / 180, g = r * (357.529 + 0.98560028 * d);
    const L = r * (280.459 + 0.98564736 * d + 1.915 * Math.sin(g) + 0.02 * Math.sin(2 * g)), e = r * 23.439;
    const ra = Math.atan2(Math.cos(e) * Math.sin(L), Math.cos(L)), dec = Math.asin(Math.sin(e) * Math.sin(L));
    const h = r * (280.46062 + 360.98564737 * d + lon) - ra;
    return Math.sin(r * lat) * Math.sin(dec) + Math.cos(r * lat) * Math.cos(dec) * Math.cos(h) < -0.0145;
}

export function picture(): HTMLElement {
    const [low, high] = span(grid), image = paint(low, high), runs = blocks(), step = medianStep();
    const full = { x0: p.fibre_m[0], x1: Math.max(p.fibre_m[p.columns - 1], p.fibre_m[0] + 0.1), t0: p.time_s[0] - step / 2, t1: p.time_s[p.rows - 1] + step / 2 };
    let view = { ...full };
    const canvas = el('canvas', { tabindex: '0', role: 'img', id: 'picture', 'aria-describedby': 'picture-help', 'aria-label': 'Temperature by distance and time' }) as HTMLCanvasElement;
    const read = el('output', { class: 'read', id: 'picture-read', 'aria-live': 'off' });
    const lon = data.channels.lon?.find(v => v != null), lat = data.channels.lat?.find(v => v != null);
    const px = (x: number) => edge.left + ((x - view.x0) / (view.x1 - view.x0)) * (canvas.clientWidth - edge.left - edge.right);
    const py = (t: number) => edge.top + ((t - view.t0) / (view.t1 - view.t0)) * (canvas.clientHeight - edge.top - edge.bottom);
    const ix = (x: number) => view.x0 + ((x - edge.left) / (canvas.clientWidth - edge.left - edge.right)) * (view.x1 - view.x0);
    const it = (y: number) => view.t0 + ((y - edge.top) / (canvas.clientHeight - edge.top - edge.bottom)) * (view.t1 - view.t0);

    function nice(range: number, n: number): number {
        const raw = range / n, ten = 10 ** Math.floor(Math.log10(raw));
        return [1, 2, 5, 10].map(m => m * ten).find(s => s >= raw)!;
    }
    function draw() {
        const w = canvas.clientWidth, h = canvas.clientHeight, dpr = window.devicePixelRatio || 1;
        if (!w) return;
        if (canvas.width !== Math.round(w * dpr) || canvas.height !== Math.round(h * dpr)) { canvas.width = Math.round(w * dpr); canvas.height = Math.round(h * dpr); }
        const g = canvas.getContext('2d')!;
        g.setTransform(dpr, 0, 0, dpr, 0, 0);
        g.clearRect(0, 0, w, h);
        g.save();
        g.beginPath(); g.rect(edge.left, edge.top, w - edge.left - edge.right, h - edge.top - edge.bottom); g.clip();
        g.fillStyle = css('--gap'); g.fillRect(0, 0, w, h);
        g.imageSmoothingEnabled = false;
        const half = (full.x1 - full.x0) / Math.max(1, p.columns - 1) / 2;
        for (const [a, b] of runs) {
            const y0 = py(p.time_s[a] - step / 2), y1 = py(p.time_s[b - 1] + step / 2), x0 = px(full.x0 - half);
            if (y1 > 0 && y0 < h) g.drawImage(image, 0, a, p.columns, b - a, x0, y0, px(full.x1 + half) - x0, y1 - y0);
        }
        g.strokeStyle = css('--cursor'); g.lineWidth = 1.5;
        g.beginPath(); g.moveTo(px(cursor.fibre), 0); g.lineTo(px(cursor.fibre), h); g.moveTo(0, py(cursor.time)); g.lineTo(w, py(cursor.time)); g.stroke();
        g.restore();
        if (lon != null && lat != null)
            for (let y = edge.top; y < h - edge.bottom; ++y) { g.fillStyle = night(it(y), lon, lat) ? css('--night') : css('--day'); g.fillRect(edge.left - 6, y, 5, 1.2); }
        g.fillStyle = css('--ink'); g.font = '12px system-ui, sans-serif'; g.textAlign = 'center';
        const sx = nice(view.x1 - view.x0, Math.max(2, w / 110));
        for (let x = Math.ceil(view.x0 / sx) * sx; x <= view.x1; x += sx) g.fillText(num(x, sx < 1 ? 1 : 0), px(x), h - 19);
        g.fillText('fibre distance (m)', edge.left + (w - edge.left) / 2, h - 4);
        const steps = [60, 300, 900, 3600, 10800, 21600, 43200, 86400, 172800, 604800, 2592000, 7776000];
        const st = steps.find(s => (view.t1 - view.t0) / s <= h / 40) ?? 31536000;
        g.textAlign = 'right';
        for (let t = Math.ceil(view.t0 / st) * st; t <= view.t1; t += st) { const iso = new Date(1000 * t).toISOString(); g.fillText(st >= 86400 || t % 86400 === 0 ? iso.slice(5, 10) : iso.slice(11, 16), edge.left - 9, py(t) + 4); }
        for (const f of list(data.inflows)) { const x = px(f.fibre_m); if (x >= edge.left && x <= w - edge.right) { g.fillStyle = css('--mark'); g.beginPath(); g.moveTo(x, edge.top - 2); g.lineTo(x - 5, edge.top - 12); g.lineTo(x + 5, edge.top - 12); g.fill(); } }
        const i = nearest(p.time_s, cursor.time), j = nearest(p.fibre_m, cursor.fibre);
        const n = p.traces_a_row * p.channels_a_column;
        const gap = Math.abs(p.time_s[i] - cursor.time) > step;
        read.textContent = `${num(p.fibre_m[j], 2, 'm')} \u00b7 ${utc(cursor.time)} \u00b7 ${gap ? 'no trace (gap)' : num(grid[i * p.columns + j], 2, '\u00b0C')}${n > 1 ? ` (mean of ${p.traces_a_row} traces \u00d7 ${p.channels_a_column} channels)` : ' (single sample)'}`;
    }
    function clampView() {
        const keep = (a: number, b: number, lo: number, hi: number): [number, number] => { const r = Math.min(b - a, hi - lo), s = Math.min(Math.max(a, lo), hi - r); return [s, s + r]; };
        [view.x0, view.x1] = keep(view.x0, view.x1, full.x0, full.x1);
        [view.t0, view.t1] = keep(view.t0, view.t1, full.t0, full.t1);
    }
    function zoom(factor: number, x: number, t: number) {
        const dx = Math.max((view.x1 - view.x0) * factor, 4 * (full.x1 - full.x0) / p.columns), dt = Math.max((view.t1 - view.t0) * factor, 4 * step);
        const fx = (x - view.x0) / (view.x1 - view.x0), ft = (t - view.t0) / (view.t1 - view.t0);
        view = { x0: x - fx * dx, x1: x + (1 - fx) * dx, t0: t - ft * dt, t1: t + (1 - ft) * dt };
        clampView(); draw();
    }
    let drag: { x: number; y: number; view: typeof view } | null = null;
    canvas.addEventListener('wheel', e => { e.preventDefault(); zoom(e.deltaY > 0 ? 1.25 : 0.8, ix(e.offsetX), it(e.offsetY)); }, { passive: false });
    canvas.addEventListener('pointerdown', e => { drag = { x: e.offsetX, y: e.offsetY, view: { ...view } }; canvas.setPointerCapture(e.pointerId); });
    canvas.addEventListener('pointerup', () => { drag = null; });
    canvas.addEventListener('pointermove', e => {
        if (drag) {
            const dx = ix(e.offsetX) - ix(drag.x), dt = it(e.offsetY) - it(drag.y), v = drag.view;
            view = { x0: v.x0 - dx, x1: v.x1 - dx, t0: v.t0 - dt, t1: v.t1 - dt }; clampView(); draw(); return;
        }
        moveTo({ fibre: p.fibre_m[nearest(p.fibre_m, ix(e.offsetX))], time: Math.min(full.t1, Math.max(full.t0, it(e.offsetY))) });
    });
    canvas.addEventListener('dblclick', () => { view = { ...full }; draw(); });
    canvas.addEventListener('keydown', e => {
        const i = nearest(p.time_s, cursor.time), j = nearest(p.fibre_m, cursor.fibre), n = e.shiftKey ? 10 : 1;
        const go = (di: number, dj: number) => moveTo({ time: p.time_s[Math.min(p.rows - 1, Math.max(0, i + di * n))], fibre: p.fibre_m[Math.min(p.columns - 1, Math.max(0, j + dj * n))] });
        if (e.key === 'ArrowLeft') go(0, -1); else if (e.key === 'ArrowRight') go(0, 1); else if (e.key === 'ArrowUp') go(-1, 0); else if (e.key === 'ArrowDown') go(1, 0);
        else if (e.key === '+' || e.key === '=') zoom(0.7, cursor.fibre, cursor.time); else if (e.key === '-') zoom(1.4, cursor.fibre, cursor.time); else if (e.key === '0') { view = { ...full }; draw(); } else return;
        e.preventDefault();
    });
    const button = (text: string, name: string, act: () => void) => { const b = el('button', { type: 'button', 'aria-label': name }, text); b.addEventListener('click', act); return b; };
    watch(draw);
    new ResizeObserver(draw).observe(canvas);
    matchMedia('(prefers-color-scheme: dark)').addEventListener('change', draw);
    const bar = el('div', { class: 'bar', role: 'img', 'aria-label': `Colours from ${num(low, 1)} to ${num(high, 1)} degrees Celsius` });
    bar.style.background = `linear-gradient(90deg, ${[0, 1, 2, 3, 4, 5, 6].map(k => rampCss(k / 6)).join(',')})`;
    return el('section', { 'aria-labelledby': 'h-picture', class: 'wide' }, el('h2', { id: 'h-picture' }, 'The record: distance and time'),
        el('div', { class: 'tools' }, button('+', 'Zoom in', () => zoom(0.7, cursor.fibre, cursor.time)), button('\u2212', 'Zoom out', () => zoom(1.4, cursor.fibre, cursor.time)), button('All', 'Show all', () => { view = { ...full }; draw(); }), el('span', { class: 'legend' }, num(low, 1, '\u00b0C'), bar, num(high, 1, '\u00b0C')), read),
        canvas, el('p', { class: 'help', id: 'picture-help' }, `Arrow keys move the cursor (Shift: ten steps), + and \u2212 zoom, 0 shows all; drag pans. Times are UTC. Left strip: night dark, day light. Grey: no data. ${list(findings.record?.gaps).length} gaps in the record.`));
}
