// SPDX-License-Identifier: Apache-2.0
// Snow: probability by distance and day, melt-out along the line, covered share over time.
import { banded, chart, numbers } from './charts';
import { cursor, data, el, findings, isolated, list, moveTo, num, rampCss, ramp, Row, watch } from './data';
import { panel, sentence, texts } from './parts';

const css = (name: string) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();
const edge = { left: 62, right: 8, top: 6, bottom: 34 };

/// Day by channel: dark is bare, light is snow, grey is without data; the pointer moves the page's cursor.
function coverPicture(s: Row, n: number): HTMLElement {
    const bytes = atob(s.codes), image = document.createElement('canvas');
    image.width = s.columns; image.height = s.rows;
    const pen = image.getContext('2d')!, pixels = pen.createImageData(s.columns, s.rows);
    for (let k = 0; k < bytes.length; ++k) {
        const code = bytes.charCodeAt(k);
        if (code < 255) pixels.data.set([...ramp(code / 254), 255], 4 * k);
    }
    pen.putImageData(pixels, 0, 0);
    const canvas = el('canvas', { role: 'img', class: 'cover', 'aria-label': 'Probability of snow by distance and day' }) as HTMLCanvasElement;
    const read = el('output', { class: 'read', 'aria-live': 'off' });
    const dates = list(s.date) as unknown as string[], fibre = s.fibre_m as number[];
    const start = Date.parse(dates[0]) / 1000, days = dates.length;
    const column = (x: number) => Math.min(s.columns - 1, Math.max(0, Math.floor(x * s.columns)));
    function place(): [number, number] {
        let j = 0;
        fibre.forEach((m, k) => { if (Math.abs(m - cursor.fibre) < Math.abs(fibre[j] - cursor.fibre)) j = k; });
        return [j, Math.floor((cursor.time - start) / 86400)];
    }
    function draw() {
        const w = canvas.clientWidth, h = canvas.clientHeight, dpr = window.devicePixelRatio || 1;
        if (!w) return;
        canvas.width = Math.round(w * dpr); canvas.height = Math.round(h * dpr);
        const g = canvas.getContext('2d')!, iw = w - edge.left - edge.right, ih = h - edge.top - edge.bottom;
        g.setTransform(dpr, 0, 0, dpr, 0, 0);
        g.clearRect(0, 0, w, h);
        g.fillStyle = css('--gap'); g.fillRect(edge.left, edge.top, iw, ih);
        g.imageSmoothingEnabled = false;
        g.drawImage(image, edge.left, edge.top, iw, ih);
        const [j, d] = place();
        g.strokeStyle = css('--cursor'); g.lineWidth = 1.5; g.beginPath();
        const x = edge.left + ((j + 0.5) / s.columns) * iw, y = edge.top + ((d + 0.5) / days) * ih;
        g.moveTo(x, edge.top); g.lineTo(x, edge.top + ih);
        if (d >= 0 && d < days) { g.moveTo(edge.left, y); g.lineTo(edge.left + iw, y); }
        g.stroke();
        g.fillStyle = css('--ink'); g.font = '12px system-ui, sans-serif'; g.textAlign = 'center';
        const ticks = Math.max(2, Math.floor(iw / 110));
        for (let k = 0; k <= ticks; ++k) g.fillText(num(fibre[column(k / ticks)], 0), edge.left + (k / ticks) * iw * 0.98 + 4, h - 19);
        g.fillText('fibre distance (m)', edge.left + iw / 2, h - 4);
        g.textAlign = 'right';
        const every = Math.max(1, Math.ceil(days / (ih / 26)));
        for (let k = 0; k < days; k += every) g.fillText(dates[k].slice(5), edge.left - 8, edge.top + ((k + 0.5) / days) * ih + 4);
        const code = d >= 0 && d < days ? bytes.charCodeAt(Math.min(s.rows - 1, Math.floor(d / s.days_a_row)) * s.columns + j) : 255;
        read.textContent = `${num(fibre[j], 1, 'm')} \u00b7 ${dates[d] ?? 'outside'} \u00b7 ${code < 255 ? 'snow with probability ' + num(code / 254, 2) : 'no data'}`;
    }
    canvas.addEventListener('pointermove', e => {
        const iw = canvas.clientWidth - edge.left - edge.right, ih = canvas.clientHeight - edge.top - edge.bottom;
        const day = Math.min(days - 1, Math.max(0, Math.floor(((e.offsetY - edge.top) / ih) * days)));
        moveTo({ fibre: fibre[column((e.offsetX - edge.left) / iw)], time: start + (day + 0.5) * 86400 });
    });
    watch(draw);
    new ResizeObserver(draw).observe(canvas);
    matchMedia('(prefers-color-scheme: dark)').addEventListener('change', draw);
    const bar = el('div', { class: 'bar', role: 'img', 'aria-label': 'Colours from probability 0, bare, to 1, snow' });
    bar.style.background = `linear-gradient(90deg, ${[0, 1, 2, 3, 4, 5, 6].map(k => rampCss(k / 6)).join(',')})`;
    return el('section', { 'aria-labelledby': 'h-coverpicture' + n }, el('h3', { id: 'h-coverpicture' + n }, 'Snow by distance and day'),
        el('div', { class: 'tools' }, el('span', { class: 'legend' }, 'bare', bar, 'snow'), read), canvas);
}

export function snow(): HTMLElement[] {
    return list(findings.snow).map((s, n) => {
        const own = list(data.snows).find(c => c.stretch === s.stretch), channels = list(s.channels), cover = list(s.cover);
        const side = (k: number) => list(own?.melt_out_s).map((t: any, i) => { const sd = own!.melt_out_sd_d[i]; return t == null || sd == null ? null : t + k * sd * 86400; });
        const rule = cover.some(c => c.rule_fraction != null);
        return panel('h-snow' + n, `Snow: ${isolated(s.stretch)}`,
            own && coverPicture(own, n),
            own && own.melt_out_s.some((t: any) => t != null) && chart({ id: 'h-meltout' + n, title: 'Melt-out along the line', x: own.channel_m, unit: 'date', link: 'fibre', dates: true, band: [3, 2],
                lines: [{ label: 'first day without snow', values: own.melt_out_s }, { label: '\u2212 1 sd', values: side(-1), colour: '--line3' }, { label: '+ 1 sd', values: side(1), colour: '--line3' }] }),
            cover.length > 0 && banded('h-cover' + n, 'Covered share of the line', cover, 'date', 'covered_fraction', 'covered_fraction_sd', '%', 100, rule ? [{ label: 'fixed thresholds', values: numbers(cover, 'rule_fraction', 100), dash: [6, 4], colour: '--line2' }] : []),
            channels.length > 0 && chart({ id: 'h-melt' + n, title: 'Days under snow along the line', x: numbers(channels, 'fibre_m') as number[], unit: 'days', link: 'fibre', lines: [{ label: 'covered days', values: numbers(channels, 'covered_days') }] }),
            list(s.cautions).length > 0 && texts(list(s.cautions).map(sentence)), s.method_text && el('p', { class: 'method' }, String(s.method_text)));
    });
}
