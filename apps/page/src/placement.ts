// SPDX-License-Identifier: Apache-2.0
// Where the fibre lies and how well the tie points fit: residuals, slack and position error along the fibre.
import { chart } from './charts';
import { data, el, findings, list, metres, num, Row } from './data';
import { facts, panel, table } from './parts';

const shown = (rows: Row[], keep: (row: Row) => boolean, key: string) => rows.map(r => (keep(r) ? (r[key] ?? null) : null));
function residuals(ties: Row[]): HTMLElement {
    const used = (r: Row) => r.used !== false, twice = ties.map(r => (r.sd_m == null ? null : 2 * r.sd_m));
    return chart({ id: 'h-residuals', title: 'Residuals of the tie points: surveyed minus expected from the others', x: ties.map(r => r.fibre_m), unit: 'm', link: 'fibre',
        lines: [{ label: 'used', values: shown(ties, used, 'residual_m'), dots: true }, { label: 'set aside', values: shown(ties, r => !used(r), 'residual_m'), dots: true, colour: '--line2' },
            { label: '2 sd of the survey', values: twice, dash: [6, 4], colour: '--line3' }, { label: '\u2212 2 sd', values: twice.map(v => (v == null ? null : -v)), dash: [6, 4], colour: '--line3' }] });
}
/// Slack holds from a tie point to the next used one: drawn as steps.
function slack(ties: Row[]): HTMLElement | false {
    const rows = ties.filter(r => r.used !== false), x: number[] = [], y: (number | null)[] = [];
    rows.forEach((r, k) => { if (r.slack != null && k + 1 < rows.length) { x.push(r.fibre_m, rows[k + 1].fibre_m - 1e-3); y.push(r.slack, r.slack); } });
    return x.length > 0 && chart({ id: 'h-slack', title: 'Slack: fibre metres per ground metre', x, unit: '1', link: 'fibre', lines: [{ label: 'slack', values: y }] });
}
export function placement(): HTMLElement[] {
    const p = findings.placement, c = data.channels;
    if (!p) return [];
    const ties = [...list(p.tie_points)].filter(r => r.fibre_m != null).sort((a, b) => a.fibre_m - b.fibre_m);
    return [panel('h-placement', 'Placement', facts([['System', `${p.crs_name ?? ''} (${p.crs ?? ''})`], ['To WGS 84', `${p.operation_to_wgs84 ?? ''}, accuracy ${metres(p.operation_accuracy_m)}`], ['Slack', num(p.slack, 3)], ['Residual, rms', metres(p.residual_rms_m)]]),
        ties.some(r => r.residual_m != null) && residuals(ties), slack(ties),
        !!c.position_sd_m && chart({ id: 'h-position-sd', title: 'Position error of each channel (1 sd)', x: c.fibre_m, unit: 'm', link: 'fibre', lines: [{ label: 'horizontal', values: c.position_sd_m },
            ...(c.along_sd_m ? [{ label: 'along the line', values: c.along_sd_m, dash: [6, 4] }] : []), ...(c.across_sd_m ? [{ label: 'across it', values: c.across_sd_m, dash: [2, 3] }] : [])] }),
        ties.length > 0 && table(['Tie point', 'Fibre', 'sd', 'Residual', 'Slack to the next', 'Used'], ties.map(t => [String(t.label ?? ''), metres(t.fibre_m), metres(t.sd_m), metres(t.residual_m), num(t.slack, 3), t.used === false ? `no: ${t.reason ?? ''}` : 'yes']), 'Tie points'))];
}
