// SPDX-License-Identifier: Apache-2.0
import 'leaflet/dist/leaflet.css';
import 'uplot/dist/uPlot.min.css';
import './page.css';
import { profiles } from './charts';
import { moveTo } from './data';
import { map } from './map';
import { picture } from './picture';
import { header, others, stream, trust } from './sections';
import { snow } from './snow';

document.getElementById('head')!.append(...header());
const main = document.getElementById('main')!;
main.append(...([map(), picture(), ...profiles(), ...stream(), ...snow(), ...others(), ...trust()].filter(Boolean) as Node[]));
moveTo({});
