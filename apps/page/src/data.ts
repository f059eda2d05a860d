// SPDX-License-Identifier: Apache-2.0
// The data that the program put into the page, and the few forms in which numbers are shown.
export type Row = Record<string, any>;
export interface Channels {
    fibre_m: number[]; mean_c: (number | null)[]; p05_c: (number | null)[]; p95_c: (number | null)[];
    daily_range_c: (number | null)[]; noise_c: (number | null)[]; stretch: string[]; flag: string[];
    lon?: (number | null)[]; lat?: (number | null)[]; position_sd_m?: (number | null)[];
    along_sd_m?: (number | null)[]; across_sd_m?: (number | null)[];
    station_m?: (number | null)[];
}
export interface Picture {
    rows: number; columns: number; low_c: number; high_c: number; time_s: number[];
    fibre_m: number[]; traces_a_row: number; channels_a_column: number; codes: string;
}
export interface PageData {
    channels: Channels; streams: Row[]; findings: Row; picture: Picture; inflows?: Row[];
    background?: { webp: string; west: number; south: number; east: number; north: number };
    tie_points?: Row[]; columns?: Row[]; snows?: Row[];
}
export const data: PageData = JSON.parse(document.getElementById('data')!.textContent!);
export const findings: Row = data.findings ?? {};
export const list = (value: any): Row[] => (Array.isArray(value) ? value : []);

/// Temperatures of the picture by row (time) and column (place); NaN where missing.
export const grid: Float32Array = (() => {
    const p = data.picture, bytes = atob(p.codes), out = new Float32Array(p.rows * p.columns);
    for (let k = 0; k < out.length; ++k) {
        const code = bytes.charCodeAt(2 * k) | (bytes.charCodeAt(2 * k + 1) << 8);
        out[k] = code === 65535 ? NaN : p.low_c + (code * (p.high_c - p.low_c)) / 65534;
    }
    return out;
})();

/// Index of the entry of an increasing list that is nearest to a value.
export function nearest(sorted: number[], value: number): number {
    let low = 0, high = sorted.length - 1;
    while (high - low > 1) {
        const middle = (low + high) >> 1;
        if (sorted[middle] <= value) low = middle; else high = middle;
    }
    return Math.abs(sorted[low] - value) <= Math.abs(sorted[high] - value) ? low : high;
}

const finite = (v: any): v is number => typeof v === 'number' && Number.isFinite(v);
const minus = (text: string) => text.replace('-', '\u2212');
/// A number with unit, an en dash where it is missing.
export function num(v: any, digits: number, unit = ''): string {
    return finite(v) ? minus(v.toFixed(digits)) + (unit ? '\u202f' + unit : '') : '\u2013';
}
export function pm(v: any, sd: any, digits: number, unit = ''): string {
    if (!finite(v)) return '\u2013';
    const end = unit ? '\u202f' + unit : '';
    return finite(sd) ? `${minus(v.toFixed(digits))} \u00b1 ${sd.toFixed(digits)}${end}` : num(v, digits, unit);
}
export const percent = (v: any, sd?: any) =>
    pm(finite(v) ? 100 * v : v, finite(sd) ? 100 * sd : sd, 1, '%');
export const metres = (v: any) => num(v, 1, 'm');
export const utc = (s: number) => new Date(1000 * s).toISOString().slice(0, 16).replace('T', ' ') + ' UTC';
export const day = (s: number) => new Date(1000 * s).toISOString().slice(0, 10);

/// An element with text; text from inputs only ever goes in through here, never as markup.
export function el(tag: string, props: Record<string, string> = {}, ...kids: (Node | string)[]): HTMLElement {
    const e = document.createElement(tag);
    for (const [key, value] of Object.entries(props)) e.setAttribute(key, value);
    e.append(...kids);
    return e;
}

/// Perceptually even ramp, dark blue to yellow, safe for colour-blind eyes.
const stops = [[0, 32, 81], [33, 62, 107], [84, 93, 110], [122, 121, 117], [158, 148, 118], [203, 178, 104], [253, 234, 69]];
export function ramp(u: number): [number, number, number] {
    const x = Math.min(1, Math.max(0, u)) * (stops.length - 1), k = Math.min(stops.length - 2, Math.floor(x)), f = x - k;
    return [0, 1, 2].map(c => Math.round(stops[k][c] + f * (stops[k + 1][c] - stops[k][c]))) as any;
}
export const rampCss = (u: number) => `rgb(${ramp(u).join(',')})`;
/// The 2 % and 98 % quantiles, so that a few outliers take no contrast away.
export function span(values: ArrayLike<number | null>): [number, number] {
    const v = Array.from(values).filter(finite).sort((a, b) => a - b);
    if (!v.length) return [0, 1];
    const at = (q: number) => v[Math.round(q * (v.length - 1))];
    return at(0.98) > at(0.02) ? [at(0.02), at(0.98)] : [at(0.02) - 0.5, at(0.02) + 0.5];
}

/// The one cursor: a place and a time that every view shows.
export const cursor = { fibre: data.channels.fibre_m[data.channels.fibre_m.length >> 1], time: data.picture.time_s[data.picture.rows >> 1] };
const watchers: (() => void)[] = [];
let pending = false;
export const watch = (f: () => void) => { watchers.push(f); };
export function moveTo(change: Partial<typeof cursor>) {
    Object.assign(cursor, change);
    if (pending) return;
    pending = true;
    requestAnimationFrame(() => { pending = false; watchers.forEach(f => f()); });
}
/// A name from an input amid our words: its direction marks end with it.
export const isolated = (text: any) => '\u2068' + String(text ?? '') + '\u2069';
