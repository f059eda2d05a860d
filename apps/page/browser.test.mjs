// SPDX-License-Identifier: Apache-2.0
// node browser.test.mjs page.html: the page in a browser, of the campaign in tests/page/make_page.cpp.
import assert from 'node:assert/strict';
import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { resolve } from 'node:path';
import { pathToFileURL } from 'node:url';
import { chromium } from 'playwright-core';
const browser = await chromium.launch({ executablePath: '/usr/bin/chromium', args: ['--no-sandbox', '--disable-gpu', '--disable-quic', '--no-first-run', '--disable-background-networking', '--disable-component-update', '--disable-sync'] });
try {
    const page = await browser.newPage({ viewport: { width: 1280, height: 900 } });
    const errors = [], requests = [];
    page.on('pageerror', e => errors.push(String(e)));
    page.on('console', m => { if (m.type() === 'error') errors.push(m.text()); });
    page.on('request', r => { if (!/^(file|data|blob):/.test(r.url())) requests.push(r.url()); });
    await page.goto(pathToFileURL(resolve(process.argv[2])).href);
    await page.waitForTimeout(500);
    for (const id of ['h-map', 'h-picture', 'h-profile', 'h-at-time', 'h-at-place', 'h-stream0', 'h-quality', 'h-placement', 'h-position-sd']) assert.equal(await page.locator('#' + id).count(), 1, id);
    assert.equal(await page.locator('#h-snow0').count(), 0, 'no panel without data');
    assert.match(await page.locator('#h-stream1 ~ p').first().textContent(), /Nothing found.*2\.1.*%/);
    assert.equal(await page.evaluate(() => window.hit), undefined);
    assert.match(await page.locator('h1').textContent(), /^<script>window\.hit=1<\/script>"'& /);
    // The cursor: middle column 150 (250 m) of row 144, then one to the right; the map follows.
    const truth = (i, j) => 12 + 3 * Math.sin(2 * Math.PI * i / 144) - (j > 180 ? 0.12 * (2.4 + 3 * Math.sin(2 * Math.PI * i / 144)) : 0);
    await page.focus('#picture');
    await page.keyboard.press('ArrowRight');
    for (let k = 0; k < 7; ++k) await page.keyboard.press('ArrowDown');
    await page.waitForTimeout(200);
    const read = await page.locator('#picture-read').textContent();
    assert.ok(read.includes('251.00') && read.includes(truth(151, 151).toFixed(2)) && read.includes('single sample'), read);
    assert.match(await page.locator('#map-read').textContent(), /^251\.0/);
    await page.evaluate(readFileSync(createRequire(import.meta.url).resolve('axe-core'), 'utf8'));
    for (const colorScheme of ['light', 'dark']) {
        await page.emulateMedia({ colorScheme });
        const found = await page.evaluate(() => window.axe.run());
        assert.deepEqual(found.violations.map(v => `${v.id}: ${v.nodes[0].html.slice(0, 150)}`), [], colorScheme);
    }
    await page.setViewportSize({ width: 380, height: 800 });
    await page.waitForTimeout(200);
    assert.ok(await page.evaluate(() => document.documentElement.scrollWidth <= 380), 'no sideways scroll on a phone');
    assert.deepEqual(errors, []);
    assert.deepEqual(requests, []);
} finally { await browser.close(); }
