// SPDX-License-Identifier: Apache-2.0
// The few forms that every panel is made of.
import { el } from './data';

export function table(heads: string[], rows: (string | HTMLElement)[][], caption: string): HTMLElement {
    return el('div', { class: 'scroll', tabindex: '0', role: 'region', 'aria-label': caption }, el('table', {}, el('caption', {}, caption),
        el('thead', {}, el('tr', {}, ...heads.map(h => el('th', { scope: 'col' }, h)))),
        el('tbody', {}, ...rows.map(r => el('tr', {}, ...r.map(c => el('td', {}, c)))))));
}
export function panel(id: string, title: string, ...kids: (Node | null | false | undefined)[]): HTMLElement {
    return el('section', { 'aria-labelledby': id, class: 'wide' }, el('h2', { id }, title), ...(kids.filter(Boolean) as Node[]));
}
export const facts = (pairs: [string, string][]) => el('dl', {}, ...pairs.flatMap(([k, v]) => [el('dt', {}, k), el('dd', {}, v)]));
export const folded = (title: string, ...kids: (Node | string)[]) => el('details', {}, el('summary', {}, title), ...kids);
export const texts = (items: string[]) => el('ul', {}, ...items.map(t => el('li', {}, t)));
export const sentence = (w: any) => (typeof w === 'string' ? w : String(w?.text ?? ''));
