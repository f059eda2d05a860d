// SPDX-License-Identifier: Apache-2.0
// The flux of water through a streambed: over time with its band, by every method, and what the depths saw.
import { chart } from './charts';
import { el, isolated, list, num, pm, Row } from './data';
import { facts, folded, panel, sentence, table, texts } from './parts';

const day = 86400;
const seconds = (rows: Row[]) => rows.map(r => Date.parse(r.time) / 1000);
const perDay = (rows: Row[], key: string) => rows.map(r => (r[key] == null ? null : r[key] * day));
const words: Record<string, string> = { fit: 'fit through all depths', joint: 'daily wave, amplitude and phase', amplitude: 'daily wave, amplitude', phase: 'daily wave, phase (size only)', steady: 'mean profile' };

/// Flux with two standard deviations either side.
function flux(n: number, rows: Row[]): HTMLElement {
    const v = perDay(rows, 'flux_ms'), s = perDay(rows, 'flux_sd_ms');
    const side = (k: number) => v.map((x, i) => (x == null || s[i] == null ? null : x + k * s[i]!));
    return chart({ id: 'h-flux' + n, title: 'Flux of water, positive down, \u00b1 2 sd', x: seconds(rows), unit: 'm/day', time: true, link: 'time', band: [3, 2], lines: [{ label: 'flux', values: v }, { label: '\u2212 2 sd', values: side(-2), colour: '--line3' }, { label: '+ 2 sd', values: side(2), colour: '--line3' }] });
}
/// The methods of the daily wave beside the best one, on their own times.
function others(n: number, b: Row): HTMLElement | false {
    const rows = list(b.methods).filter(r => ['joint', 'amplitude', 'phase'].includes(r.method));
    const times = [...new Set(rows.map(r => String(r.time)))].sort();
    if (!times.length) return false;
    const of = (method: string) => times.map(t => { const r = rows.find(x => x.time === t && x.method === method); return r?.flux_ms == null ? null : r.flux_ms * day; });
    return chart({ id: 'h-methods' + n, title: 'Flux by the daily wave at two depths (windows of two days)', x: times.map(t => Date.parse(t) / 1000), unit: 'm/day', time: true, link: 'time', lines: ['joint', 'amplitude', 'phase'].map((m, k) => ({ label: words[m], values: of(m), dash: k === 2 ? [4, 4] : undefined })) });
}
export function bed(b: Row, n: number): HTMLElement {
    const rows = list(b.series), depths = list(b.depths), inBed = depths.filter(d => d.depth_m >= 0);
    const mean = b.flux_md == null ? 'No method tells a flux here.' : `Mean flux ${pm(b.flux_md, b.flux_sd_md, 3, 'm/day')}, ${b.flux_md > 0 ? 'down into the bed' : b.flux_md < 0 ? 'up out of the bed' : 'none'}.`;
    return panel('h-bed' + n, `Streambed: ${isolated(b.name)}`, el('p', {}, mean),
        rows.length > 0 && flux(n, rows), others(n, b),
        facts([['Method', words[b.method] ?? '\u2013'], ['Each row is the mean over', `${num(b.window_h, 0)} h`], ['Diffusivity found', b.diffusivity_m2s == null ? '\u2013' : pm(1e6 * b.diffusivity_m2s, 1e6 * b.diffusivity_sd_m2s, 3, 'mm\u00b2/s')], ['Diffusivity stated', num(1e6 * b.stated?.thermal_conductivity_wmk / b.stated?.heat_capacity_jm3k, 3, 'mm\u00b2/s')], ['Height that one channel averages', b.averaging_height_m ? num(100 * b.averaging_height_m, 1, 'cm') : 'not wound']]),
        inBed.length > 0 && chart({ id: 'h-damping' + n, title: 'Amplitude of the daily wave by depth', x: inBed.map(d => d.depth_m), unit: '\u00b0C', xUnit: 'depth in the bed (m)', lines: [{ label: 'amplitude', values: inBed.map(d => d.amplitude_c ?? null) }] }),
        depths.length > 0 && folded('Every depth', table(['Depth', 'Mean', 'Daily amplitude', 'Peak after midnight UTC', 'Noise', 'Use'], depths.map(d => [num(d.depth_m, 3, 'm'), num(d.mean_c, 2, '\u00b0C'), pm(d.amplitude_c, d.amplitude_sd_c, 3, '\u00b0C'), d.phase_rad == null ? '\u2013' : num(d.phase_rad * 12 / Math.PI, 1, 'h'), num(d.noise_c, 3, '\u00b0C'), String(d.use ?? '')]), 'The daily wave by depth')),
        list(b.evidence).length > 0 && texts(list(b.evidence).map(sentence)), list(b.warnings).length > 0 && texts(list(b.warnings).map(sentence)),
        b.explanation && el('p', { class: 'method' }, String(b.explanation)));
}
