// SPDX-License-Identifier: Apache-2.0
// The map of the cable: Leaflet without tiles, in longitude and latitude scaled to true shape.
import L from 'leaflet';
import { cursor, data, el, findings, list, metres, moveTo, nearest, num, percent, pm, rampCss, span, watch } from './data';

export function map(): HTMLElement | null {
    const c = data.channels, lon = c.lon, lat = c.lat;
    const placed = lon && lat ? c.fibre_m.map((_, k) => k).filter(k => lon[k] != null && lat[k] != null) : [];
    if (!placed.length) return null;
    const lat0 = lat![placed[0]]!, lon0 = lon![placed[0]]!, my = 111132.9, mx = 111412.8 * Math.cos((lat0 * Math.PI) / 180);
    const at = (k: number): L.LatLngTuple => [(lat![k]! - lat0) * my, (lon![k]! - lon0) * mx];
    const attributes: [string, string, (number | null)[] | undefined, string][] = [['mean_c', 'Mean temperature', c.mean_c, '\u00b0C'], ['daily_range_c', 'Daily range', c.daily_range_c, '\u00b0C'], ['noise_c', 'Noise', c.noise_c, '\u00b0C'], ['position_sd_m', 'Position sd', c.position_sd_m, 'm']];
    const box = el('div', { id: 'map', role: 'application', 'aria-label': 'Map of the cable; arrow keys move it' });
    const read = el('output', { class: 'read', id: 'map-read' }), legend = el('span', { class: 'legend' });
    const choice = el('select', { id: 'map-by' }) as HTMLSelectElement;
    attributes.forEach(([key, title, values]) => { if (values?.some(v => v != null)) choice.append(el('option', { value: key }, title)); });
    const section = el('section', { 'aria-labelledby': 'h-map', class: 'wide' }, el('h2', { id: 'h-map' }, 'Map of the cable'),
        el('div', { class: 'tools' }, el('label', { for: 'map-by' }, 'Colour by '), choice, legend, read), box,
        el('p', { class: 'help' }, 'North is up. Metres on the ground. Rings mark inflows; click one for its numbers.'));
    requestAnimationFrame(() => {
        const m = L.map(box, { crs: L.CRS.Simple, preferCanvas: true, attributionControl: false, minZoom: -8, maxZoom: 8, zoomSnap: 0.25 });
        L.control.scale({ imperial: false }).addTo(m);
        const north = new L.Control({ position: 'topright' });
        north.onAdd = () => el('div', { class: 'north', role: 'img', 'aria-label': 'North is up' }, '\u2191 N');
        north.addTo(m);
        const b = data.background;
        if (b) L.imageOverlay('data:image/webp;base64,' + b.webp, [[(b.south - lat0) * my, (b.west - lon0) * mx], [(b.north - lat0) * my, (b.east - lon0) * mx]], { alt: 'Background picture' }).addTo(m);
        const dots = placed.map(k => L.circleMarker(at(k), { radius: 4, weight: 0, fillOpacity: 1 }).on('mouseover click', () => moveTo({ fibre: c.fibre_m[k] })).addTo(m));
        const colour = () => {
            const [, , values, unit] = attributes.find(a => a[0] === choice.value) ?? attributes[0], [low, high] = span(placed.map(k => values![k]));
            dots.forEach((d, i) => { const v = values![placed[i]]; d.setStyle({ fillColor: v == null ? '#999' : rampCss((v - low) / (high - low)) }); });
            const bar = el('span', { class: 'bar' }); bar.style.background = `linear-gradient(90deg, ${[0, 1, 2, 3, 4, 5, 6].map(k => rampCss(k / 6)).join(',')})`;
            legend.replaceChildren(num(low, 2, unit), bar, num(high, 2, unit));
        };
        choice.addEventListener('change', colour); colour();
        const fibres = placed.map(k => c.fibre_m[k]);
        for (const f of list(data.inflows)) {
            const k = placed[nearest(fibres, f.fibre_m)];
            const text = el('span', {}, `${f.kind ?? 'inflow'} at ${metres(f.fibre_m)}: ${percent(f.fraction, f.fraction_sd)} of the discharge`);
            L.circleMarker(at(k), { radius: 10, weight: 3, color: '#b3261e', fill: false }).bindPopup(text).addTo(m);
        }
        const here = L.circleMarker(at(placed[0]), { radius: 7, weight: 3, color: '#111', fillColor: '#fff', fillOpacity: 0.6, interactive: false }).addTo(m);
        const fit = () => m.fitBounds(L.latLngBounds(placed.map(at)), { padding: [24, 24], animate: false });
        fit();
        new ResizeObserver(() => { m.invalidateSize(); }).observe(box);
        watch(() => {
            const k = placed[nearest(fibres, cursor.fibre)];
            here.setLatLng(at(k));
            read.textContent = `${metres(c.fibre_m[k])} on the fibre${c.station_m?.[k] != null ? ` \u00b7 station ${metres(c.station_m[k])}` : ''} \u00b7 mean ${pm(c.mean_c[k], c.noise_c[k], 2, '\u00b0C')} \u00b7 position \u00b1 ${metres(c.position_sd_m?.[k])}`;
        });
        moveTo({});
    });
    return section;
}
