// SPDX-License-Identifier: Apache-2.0
// Line charts by uPlot in the page's colours, with the shared cursor.
import uPlot from 'uplot';
import { cursor, data, el, grid, moveTo, nearest, Row, watch } from './data';

type Line = { label: string; values: (number | null)[]; dash?: number[]; colour?: string; dots?: boolean };
/// Month, day and time of day, as in the tables.
const utc = (s: number) => new Date(s * 1000).toISOString().slice(5, 16).replace('T', ' ');
interface Options { id: string; title: string; x: number[]; lines: Line[]; band?: [number, number]; time?: boolean; unit: string; xUnit?: string; link?: 'fibre' | 'time'; dates?: boolean; update?: () => (number | null)[][] }
const css = (name: string) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();
const palette = ['--line1', '--line2', '--line3', '--line4'];

export function chart(o: Options): HTMLElement {
    const box = el('div', { class: 'plot', role: 'img', 'aria-label': o.title });
    const axis = (label: string, more: object = {}) => ({ label, labelSize: 20, stroke: () => css('--ink'), grid: { stroke: () => css('--grid'), width: 1 }, ticks: { stroke: () => css('--grid') }, font: '12px system-ui, sans-serif', labelFont: '12px system-ui, sans-serif', ...more });
    const plot = new uPlot({
        width: 300, height: 230, tzDate: ts => uPlot.tzDate(new Date(ts * 1000), 'Etc/UTC'),
        scales: { x: { time: !!o.time } }, axes: [axis(o.xUnit ?? (o.time ? 'UTC' : 'fibre distance (m)'), o.time ? { size: 34, space: 90, values: (_: unknown, at: number[]) => at.map(utc) } : { size: 34 }), axis(o.unit, { size: 54, ...(o.dates ? { values: (_: unknown, at: number[]) => at.map(s => utc(s).slice(0, 5)) } : {}) })],
        series: [o.time ? { label: 'time', value: (_: unknown, s: number | null) => (s == null ? '--' : utc(s)) } : { label: 'at' }, ...o.lines.map((l, k) => ({ label: l.label, ...(o.dates ? { value: (_: unknown, s: number | null) => (s == null ? '--' : utc(s).slice(0, 5)) } : {}), stroke: () => css(l.colour ?? palette[k % 4]), width: 1.5, dash: l.dash, paths: l.dots ? () => null : undefined, points: { show: !!l.dots || o.x.length < 3, size: l.dots ? 8 : undefined, fill: () => css(l.colour ?? palette[k % 4]) } }))],
        bands: o.band ? [{ series: o.band, fill: () => css('--band') }] : [],
        cursor: { drag: { x: true, y: false } }, legend: { live: true },
        hooks: { setCursor: [u => { if (o.link && u.cursor.left! >= 0 && u.cursor.event) moveTo({ [o.link]: u.posToVal(u.cursor.left!, 'x') }); }],
            draw: [u => { if (!o.link) return; const x = u.valToPos(cursor[o.link], 'x', true); if (x < u.bbox.left || x > u.bbox.left + u.bbox.width) return; u.ctx.save(); u.ctx.strokeStyle = css('--cursor'); u.ctx.lineWidth = 1.5; u.ctx.setLineDash([]); u.ctx.beginPath(); u.ctx.moveTo(x, u.bbox.top); u.ctx.lineTo(x, u.bbox.top + u.bbox.height); u.ctx.stroke(); u.ctx.restore(); }] },
    } as any, [o.x, ...o.lines.map(l => l.values)] as any, box);
    new ResizeObserver(() => { if (box.clientWidth > 50) plot.setSize({ width: box.clientWidth, height: 230 }); }).observe(box);
    if (o.link || o.update) watch(() => { if (o.update) plot.setData([o.x, ...o.update()] as any, false); else plot.redraw(false); });
    matchMedia('(prefers-color-scheme: dark)').addEventListener('change', () => plot.redraw());
    return el('section', { 'aria-labelledby': o.id }, el('h3', { id: o.id }, o.title), box);
}

export const seconds = (rows: Row[], key: string) => rows.map(r => Date.parse(r[key]) / 1000);
export const numbers = (rows: Row[], key: string, scale = 1) => rows.map(r => (r[key] == null ? null : r[key] * scale));
/// Value with its band of one sd either side, over time; more lines after it.
export function banded(id: string, title: string, rows: Row[], time: string, key: string, sd: string, unit: string, scale = 1, more: Line[] = []): HTMLElement {
    const v = numbers(rows, key, scale), s = numbers(rows, sd, scale), side = (k: number) => v.map((x, i) => (x == null || s[i] == null ? null : x + k * s[i]!));
    return chart({ id, title, x: seconds(rows, time), unit, time: true, band: [3, 2], lines: [{ label: 'value', values: v }, { label: '\u2212 1 sd', values: side(-1), colour: '--line3' }, { label: '+ 1 sd', values: side(1), colour: '--line3' }, ...more] });
}

export function profiles(): HTMLElement[] {
    const c = data.channels, p = data.picture, out: HTMLElement[] = [];
    out.push(chart({ id: 'h-profile', title: 'Along the fibre, over the whole record', x: c.fibre_m, unit: '\u00b0C', link: 'fibre', band: [3, 2],
        lines: [{ label: 'mean', values: c.mean_c }, { label: '5 %', values: c.p05_c, colour: '--line3' }, { label: '95 %', values: c.p95_c, colour: '--line3' }] }));
    const row = () => { const i = nearest(p.time_s, cursor.time); return [Array.from({ length: p.columns }, (_, j) => { const v = grid[i * p.columns + j]; return Number.isNaN(v) ? null : v; })]; };
    const column = () => { const j = nearest(p.fibre_m, cursor.fibre); return [Array.from({ length: p.rows }, (_, i) => { const v = grid[i * p.columns + j]; return Number.isNaN(v) ? null : v; })]; };
    out.push(chart({ id: 'h-at-time', title: 'Along the fibre, at the cursor\u2019s time', x: p.fibre_m, unit: '\u00b0C', link: 'fibre', lines: [{ label: 'temperature', values: row()[0] }], update: row }));
    out.push(chart({ id: 'h-at-place', title: 'Over time, at the cursor\u2019s place', x: p.time_s, unit: '\u00b0C', time: true, link: 'time', lines: [{ label: 'temperature', values: column()[0] }], update: column }));
    return out;
}
