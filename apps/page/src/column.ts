// SPDX-License-Identifier: Apache-2.0
// The water column: temperature by depth and time with isotherms and the thermocline, and its figures through time.
import { chart } from './charts';
import { cursor, data, el, findings, isolated, list, moveTo, nearest, num, ramp, rampCss, Row, span, utc, watch } from './data';
import { panel, texts } from './parts';

const css = (name: string) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();
const seconds = (rows: Row[]) => rows.map(r => Date.parse(r.time) / 1000);
const numbers = (rows: Row[], key: string, scale = 1) => rows.map(r => (r[key] == null ? null : r[key] * scale));
const edge = { left: 56, right: 8, top: 8, bottom: 34 };

/// Points of one list as lines, broken where the next one is far in time.
function trace(g: CanvasRenderingContext2D, t: number[], z: (number | null)[], px: (t: number) => number, py: (z: number) => number, far: number) {
    g.beginPath();
    let last = NaN;
    for (let i = 0; i < t.length; ++i) {
        if (z[i] == null) { last = NaN; continue; }
        if (t[i] - last <= far) g.lineTo(px(t[i]), py(z[i]!)); else g.moveTo(px(t[i]), py(z[i]!));
        last = t[i];
    }
    g.stroke();
}
function picture(p: Row, series: Row[], n: number): HTMLElement {
    const times = [...new Set(p.time_s as number[])], depths = [...new Set(p.depth_m as number[])].sort((a, b) => a - b);
    const [low, high] = span(p.temperature_c), step = times.length > 1 ? (times[times.length - 1] - times[0]) / (times.length - 1) : 1800;
    const image = document.createElement('canvas'), row = new Map(depths.map((z, k) => [z, k])), column = new Map(times.map((t, k) => [t, k]));
    image.width = times.length; image.height = depths.length;
    const g0 = image.getContext('2d')!, pixels = g0.createImageData(image.width, image.height);
    (p.temperature_c as (number | null)[]).forEach((v, i) => {
        if (v != null) pixels.data.set([...ramp((v - low) / (high - low)), 255], 4 * (row.get(p.depth_m[i])! * image.width + column.get(p.time_s[i])!));
    });
    g0.putImageData(pixels, 0, 0);
    const t0 = times[0] - step / 2, t1 = times[times.length - 1] + step / 2, bottom = depths[depths.length - 1] + (depths[1] - depths[0]) / 2;
    const canvas = el('canvas', { class: 'depths', role: 'img', 'aria-label': 'Temperature by depth and time, with isotherms and the thermocline' }) as HTMLCanvasElement;
    const levels = [...new Set(p.isotherms.temperature_c as number[])], when = seconds(series), thermocline = numbers(series, 'thermocline_depth_m');
    const px = (t: number) => edge.left + ((t - t0) / (t1 - t0)) * (canvas.clientWidth - edge.left - edge.right);
    const py = (z: number) => edge.top + (z / bottom) * (canvas.clientHeight - edge.top - edge.bottom);
    function draw() {
        const w = canvas.clientWidth, h = canvas.clientHeight, dpr = window.devicePixelRatio || 1;
        if (!w) return;
        canvas.width = Math.round(w * dpr); canvas.height = Math.round(h * dpr);
        const g = canvas.getContext('2d')!;
        g.setTransform(dpr, 0, 0, dpr, 0, 0);
        g.fillStyle = css('--gap'); g.fillRect(edge.left, edge.top, w - edge.left - edge.right, h - edge.top - edge.bottom);
        g.drawImage(image, px(t0), py(0), px(t1) - px(t0), py(bottom) - py(0));
        g.lineWidth = 1; g.strokeStyle = 'rgba(255,255,255,.75)';
        for (const level of levels) {
            const at = (p.isotherms.temperature_c as number[]).map((v, i) => (v === level ? i : -1)).filter(i => i >= 0);
            trace(g, at.map(i => p.isotherms.time_s[i]), at.map(i => p.isotherms.depth_m[i]), px, py, 4 * step);
        }
        g.lineWidth = 2.5; g.strokeStyle = '#d81b60';
        trace(g, when, thermocline, px, py, 4 * step);
        g.lineWidth = 1.5; g.strokeStyle = css('--cursor');
        g.beginPath(); g.moveTo(px(cursor.time), edge.top); g.lineTo(px(cursor.time), h - edge.bottom); g.stroke();
        g.fillStyle = css('--ink'); g.font = '12px system-ui, sans-serif'; g.textAlign = 'right';
        const dz = [0.5, 1, 2, 5, 10, 20, 50].find(s => bottom / s <= 8) ?? 100;
        for (let z = 0; z <= bottom; z += dz) g.fillText(num(z, dz < 1 ? 1 : 0), edge.left - 6, py(z) + 4);
        g.save(); g.translate(12, edge.top + (h - edge.top - edge.bottom) / 2); g.rotate(-Math.PI / 2); g.textAlign = 'center'; g.fillText('depth (m)', 0, 0); g.restore();
        g.textAlign = 'center';
        const dt = [3600, 10800, 21600, 43200, 86400, 172800, 604800, 2592000, 7776000].find(s => (t1 - t0) / s <= w / 90) ?? 31536000;
        for (let t = Math.ceil(t0 / dt) * dt; t <= t1; t += dt) { const iso = new Date(1000 * t).toISOString(); g.fillText(dt >= 86400 ? iso.slice(5, 10) : iso.slice(5, 16).replace('T', ' '), px(t), h - 18); }
    }
    const read = el('output', { class: 'read' });
    canvas.addEventListener('pointermove', e => {
        const t = t0 + ((e.offsetX - edge.left) / (canvas.clientWidth - edge.left - edge.right)) * (t1 - t0), z = ((e.offsetY - edge.top) / (canvas.clientHeight - edge.top - edge.bottom)) * bottom;
        const at = times[nearest(times, t)], deep = depths[nearest(depths, z)], i = (p.time_s as number[]).findIndex((v, k) => v === at && p.depth_m[k] === deep);
        read.textContent = i < 0 ? '' : `${utc(at)} \u00b7 ${num(deep, 2, 'm')} \u00b7 ${num(p.temperature_c[i], 2, '\u00b0C')}`;
        moveTo({ time: at });
    });
    watch(draw);
    new ResizeObserver(draw).observe(canvas);
    matchMedia('(prefers-color-scheme: dark)').addEventListener('change', draw);
    const bar = el('span', { class: 'bar' });
    bar.style.background = `linear-gradient(90deg, ${[0, 1, 2, 3, 4, 5, 6].map(k => rampCss(k / 6)).join(',')})`;
    return el('section', { 'aria-labelledby': 'h-depths' + n }, el('h3', { id: 'h-depths' + n }, 'Temperature by depth and time'),
        el('div', { class: 'tools' }, el('span', { class: 'legend' }, num(low, 1, '\u00b0C'), bar, num(high, 1, '\u00b0C')), read), canvas,
        el('p', { class: 'help' }, `White lines: isotherms${levels.length > 1 ? ` every ${num(Math.abs(levels[1] - levels[0]), 0, '\u00b0C')}` : ''}. Red: the thermocline, where there is one. The numbers stand in the tables.`));
}
function banded(id: string, title: string, rows: Row[], key: string, sd: string, unit: string, scale = 1): HTMLElement {
    const v = numbers(rows, key, scale), s = numbers(rows, sd, scale), side = (k: number) => v.map((x, i) => (x == null || s[i] == null ? null : x + k * s[i]!));
    return chart({ id, title, x: seconds(rows), unit, time: true, link: 'time', band: [3, 2], lines: [{ label: 'value', values: v }, { label: '\u2212 2 sd', values: side(-2), colour: '--line3' }, { label: '+ 2 sd', values: side(2), colour: '--line3' }] });
}
export function columns(): HTMLElement[] {
    return list(findings.column).map((s, n) => {
        const r = list(s.series), p = list(data.columns).find(c => c.name === s.name), has = (key: string) => r.some(row => row[key] != null);
        const facts: string[] = [];
        const layered = r.filter(row => row.thermocline_depth_m != null).length, known = r.filter(row => row.surface_c != null).length;
        facts.push(`A thermocline stands in ${known ? num((100 * layered) / known, 0, '%') : '\u2013'} of the time; where none is shown the water is mixed or too little is known.`);
        if (s.internal_wave_period_h != null) facts.push(`It heaves with a period of ${num(s.internal_wave_period_h, 1, 'h')}.`);
        for (const when of list(s.overturns)) facts.push(`Mixed to the bottom from ${String(when).slice(0, 16).replace('T', ' ')} UTC.`);
        facts.push(`Stability and heat content: ${s.stability_and_heat ?? ''}.`);
        return panel('h-column' + n, `Water column: ${isolated(s.name)}`, texts(facts), p && p.time_s.length > 1 && picture(p, r, n),
            has('thermocline_depth_m') && banded('h-thermo' + n, 'Thermocline depth', r, 'thermocline_depth_m', 'thermocline_depth_sd_m', 'm'),
            has('mixed_layer_depth_m') && banded('h-mixed' + n, 'Mixed layer depth', r, 'mixed_layer_depth_m', 'mixed_layer_depth_sd_m', 'm'),
            has('schmidt_stability_jm2') && banded('h-schmidt' + n, 'Schmidt stability', r, 'schmidt_stability_jm2', 'schmidt_stability_sd_jm2', 'J/m\u00b2'),
            has('heat_content_jm2') && banded('h-heat' + n, 'Heat content', r, 'heat_content_jm2', 'heat_content_sd_jm2', 'MJ/m\u00b2', 1e-6),
            has('lake_number') && chart({ id: 'h-lake' + n, title: 'Lake Number', x: seconds(r), unit: '1', time: true, link: 'time', lines: [{ label: 'Lake Number', values: numbers(r, 'lake_number') }] }),
            s.method && el('p', { class: 'method' }, String(s.method)));
    });
}
