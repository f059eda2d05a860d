// SPDX-License-Identifier: Apache-2.0
// A picture of a page: node shoot.mjs report.html out.png [width]
import { chromium } from 'playwright-core';
import { resolve } from 'node:path';
import { pathToFileURL } from 'node:url';
const [report, out, width = '1280'] = process.argv.slice(2);
const browser = await chromium.launch({ executablePath: '/usr/bin/chromium', args: ['--no-sandbox', '--disable-gpu', '--disable-quic', '--no-first-run', '--disable-background-networking', '--disable-component-update', '--disable-sync'] });
const page = await browser.newPage({ viewport: { width: Number(width), height: 900 } });
await page.goto(pathToFileURL(resolve(report)).href);
await page.waitForTimeout(600);
await page.screenshot({ path: out, fullPage: true });
await browser.close();
