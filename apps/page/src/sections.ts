// SPDX-License-Identifier: Apache-2.0
// What was found and how sure it is, in words and tables; panels without data are absent.
import { bed } from './bed';
import { chart } from './charts';
import { columns } from './column';
import { data, el, findings, isolated, list, metres, moveTo, num, percent, pm, Row } from './data';
import { facts, folded, panel, sentence, table, texts } from './parts';
import { placement } from './placement';

export function header(): HTMLElement[] {
    const r = findings.record ?? {}, key: HTMLElement[] = [];
    const card = (big: string, small: string) => key.push(el('div', { class: 'card' }, el('strong', {}, big), el('span', {}, small)));
    for (const s of list(findings.stream)) {
        const found = list(s.inflows);
        const limit = s.detection_limit_fraction == null ? 'not resolvable here: too little contrast' : `smallest share that would show: ${percent(s.detection_limit_fraction)}`;
        card(found.length ? counted(found) : 'Nothing found', `${isolated(s.stretch)} \u00b7 ${found.some(f => f.fraction != null) ? 'largest ' + largest(found) + ' \u00b7 ' : ''}${limit}`);
    }
    for (const s of list(findings.snow)) card('Snow', `${isolated(s.stretch)} \u00b7 ${list(s.channels).length} channels, ${list(s.cover).length} days`);
    for (const s of list(findings.column)) card('Water column', isolated(s.name));
    for (const s of list(findings.bed)) card(s.flux_md == null ? 'Streambed' : pm(s.flux_md, s.flux_sd_md, 3, 'm/day'), `${isolated(s.name)} \u00b7 mean flux through the bed, positive down`);
    if (findings.placement) card('\u00b1\u202f' + metres(findings.placement.position_sd_m), 'position, middle channel (1 sd)');
    card('\u00b1\u202f' + num(findings.quality?.noise_c, 3, '\u00b0C'), 'noise, middle channel (1 sd)');
    const when = r.first ? `${String(r.first).slice(0, 16).replace('T', ' ')} to ${String(r.last).slice(0, 16).replace('T', ' ')} UTC \u00b7 ${r.traces} traces \u00d7 ${r.channels} channels` : '';
    return [el('p', { class: 'over' }, 'Fibre temperatures: what was found, where, how sure'), el('h1', { dir: 'auto' }, String(findings.campaign?.name || 'Campaign')),
        ...(findings.campaign?.summary ? [el('p', { dir: 'auto' }, String(findings.campaign.summary))] : []), el('p', { class: 'when' }, when), el('div', { class: 'cards' }, ...key)];
}
/// What came in, by kind: only water that nobody declared counts as an inflow found.
function counted(found: Row[]): string {
    const own = found.filter(f => !f.known);
    const part = (kind: string, one: string, many: string) => { const n = own.filter(f => f.kind === kind).length; return n ? [`${n} ${n > 1 ? many : one}`] : []; };
    const words = [...part('step', 'inflow', 'inflows'), ...part('diffuse', 'gaining stretch', 'gaining stretches'), ...part('spot', 'spot', 'spots')];
    const known = found.length - own.length;
    return [...words, ...(known ? [`${known} known water${known > 1 ? 's' : ''}`] : [])].join(', ');
}
function largest(found: Row[]): string {
    const f = [...found].sort((a, b) => (b.fraction ?? 0) - (a.fraction ?? 0))[0];
    return `${percent(f.fraction, f.fraction_sd)} at ${metres(f.fibre_m)}`;
}

export function stream(): HTMLElement[] {
    return list(findings.stream).map((s, n) => {
        const go = (f: Row) => { const b = el('button', { type: 'button', 'aria-label': `Show the inflow at ${metres(f.fibre_m)}` }, metres(f.fibre_m)); b.addEventListener('click', () => moveTo({ fibre: f.fibre_m })); return b; };
        const own = list(data.streams).find(c => c.stretch === s.stretch);
        const found = list(s.inflows);
        const limit = s.detection_limit_fraction == null ? 'Too little contrast between groundwater and stream: not resolvable here.' : `An inflow under about ${percent(s.detection_limit_fraction)} of the discharge could not have been seen.`;
        return panel('h-stream' + n, `Inflows: ${isolated(s.stretch)}`, el('p', {}, (found.length ? '' : 'Nothing found. ') + limit),
            found.length > 0 && table(['Fibre', 'Kind', 'Share \u00b1 sd', 'Inflow temperature', 'Discharge', 'Contrast', 'Score', 'Position sd'],
                found.map(f => [go(f), f.known ? `${f.kind}: ${isolated(f.label)}` : String(f.kind ?? ''), f.fraction == null ? (f.kind === 'spot' ? 'not measurable' : 'not resolvable') : percent(f.fraction, f.fraction_sd), pm(f.temperature_c, f.temperature_sd_c, 2, '\u00b0C'), f.discharge_m3s == null ? '\u2013' : pm(1000 * f.discharge_m3s, f.discharge_sd_m3s == null ? null : 1000 * f.discharge_sd_m3s, 2, 'L/s'), num(f.contrast_c, 2, '\u00b0C'), num(f.score, 1), metres(f.position_sd_m)]), 'Inflows, share of the discharge just below'),
            found.some(f => f.evidence) && folded('Evidence for each', ...found.filter(f => f.evidence).map(f => el('p', {}, `${metres(f.fibre_m)}, ${f.kind}: ${f.evidence}`))),
            own && chart({ id: 'h-anomaly' + n, title: 'Temperature against its surroundings', x: own.fibre_m, unit: '\u00b0C', link: 'fibre', lines: [{ label: 'anomaly', values: own.anomaly_c }] }),
            own && chart({ id: 'h-limit' + n, title: 'Smallest share of discharge that would show', x: own.fibre_m, unit: '%', link: 'fibre', lines: [{ label: 'detection limit', values: list(own.detection_limit_fraction).map((v: any) => (v == null ? null : 100 * v)), dash: [6, 4], colour: '--line2' }] }),
            list(s.not_inflows).length > 0 && el('h3', {}, 'Looked like an inflow, and is none'), list(s.not_inflows).length > 0 && texts(list(s.not_inflows).map(sentence)),
            list(s.evidence).length > 0 && el('h3', {}, 'Evidence'), list(s.evidence).length > 0 && texts(list(s.evidence).map(sentence)),
            list(s.cautions).length > 0 && texts(list(s.cautions).map(sentence)), s.method && el('p', { class: 'method' }, String(s.method)));
    });
}

export function others(): HTMLElement[] {
    const out: HTMLElement[] = [];
    out.push(...columns());
    list(findings.bed).forEach((b, n) => out.push(bed(b, n)));
    return out;
}

export function trust(): HTMLElement[] {
    const q = findings.quality ?? {}, r = findings.record ?? {}, out: HTMLElement[] = [];
    out.push(panel('h-quality', 'Quality', facts([['Noise, middle channel', num(q.noise_c, 3, '\u00b0C')], ['Spatial response', metres(q.spatial_response_m)], ['Missing', percent(r.missing_fraction)], ['Gaps', String(list(r.gaps).length)], ...((q.legs ? [['Second leg minus first', `${num(q.legs.difference_c, 3, 'K')}, rmse ${num(q.legs.rmse_c, 3, 'K')}; they part most at ${metres(q.legs.parts_most_fibre_m)} (${num(q.legs.parts_most_c, 2, 'K')})`]] : []) as [string, string][])]),
        q.adjustment && facts([['Adjusted by', String(q.adjustment.method) + (q.adjustment.double_ended ? ', both ways' : '')], ['What the baths leave open', num(q.adjustment.temperature_sd_c, 3, 'K') + ' at most (1 sd)'],
            ...((q.adjustment.gamma_k != null ? [['Gamma', pm(q.adjustment.gamma_k, q.adjustment.gamma_sd_k, 1, 'K')]] : []) as [string, string][]),
            ...(list(q.adjustment.steps).map(s => ['Loss at ' + metres(s.fibre_m), 'taken out: ' + num(s.apparent_c, 2, 'K') + ' beyond it']) as [string, string][])]),
        list(q.baths).length > 0 ? table(['Bath', 'Use', 'Bias', 'RMSE', 'Drift', 'Gradient inside'], list(q.baths).map(b => [String(b.name ?? ''), String(b.use ?? ''), pm(b.bias_c, b.bias_sd_c, 3, 'K'), num(b.rmse_c, 3, 'K'), pm(b.drift_kd, b.drift_sd_kd, 3, 'K/d'), num(b.gradient_km, 4, 'K/m')]), 'Baths against their references') : el('p', {}, 'No reference bath is declared: nothing says how far off the temperatures are.'),
        list(q.events).length > 0 ? table(['Fault', 'Where', 'When', 'Size', 'Evidence', 'Done'], list(q.events).slice(0, 40).map(e => [String(e.kind ?? ''), e.fibre_from_m == null ? 'whole trace' : `${metres(e.fibre_from_m)} to ${metres(e.fibre_to_m)}`, e.from == null ? 'whole record' : String(e.from), num(e.size_c, 2, 'K'), String(e.evidence ?? ''), String(e.done ?? '')]), `Faults of the record${list(q.events).length > 40 ? ': the first 40 of ' + list(q.events).length : ''}`) : el('p', {}, 'No fault of the record was found.'),
        list(findings.warnings).length > 0 && el('h3', {}, 'Warnings'), list(findings.warnings).length > 0 && texts(list(findings.warnings).map(sentence))));
    out.push(...placement());
    if (list(findings.cautions).length) out.push(panel('h-cautions', 'Cautions', texts(list(findings.cautions).map(sentence))));
    const v = findings.provenance ?? {};
    out.push(panel('h-provenance', 'Provenance', facts([['Made by', `${v.program ?? 'rillstrand'} ${v.version ?? ''}, ${v.time ?? ''}`], ['Campaign file', `${v.campaign_file ?? ''} (SHA-256 ${v.campaign_sha256 ?? ''})`]]),
        list(v.inputs).length > 0 && folded(`${list(v.inputs).length} inputs and their SHA-256`, table(['Input', 'SHA-256'], list(v.inputs).slice(0, 500).map(i => [String(i.file ?? ''), String(i.sha256 ?? '')]), list(v.inputs).length > 500 ? 'The first 500 inputs; all stand in findings.json' : 'Inputs')),
        list(v.defaults).length > 0 && folded(`${list(v.defaults).length} defaults that were used`, table(['Default used', 'Value'], list(v.defaults).map(d => [String(d.key ?? ''), String(d.value ?? '')]), 'Defaults'))));
    return out;
}
