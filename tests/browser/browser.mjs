// SPDX-License-Identifier: Apache-2.0
// What all browser tests share: a browser without network, checks that say what they saw.
import {chromium} from 'playwright-core';

let checks = 0;
const faults = [];

export const check = (holds, what) => {
    ++checks;
    if (!holds) faults.push(what);
};
export const equal = (seen, wanted, what) =>
    check(Object.is(seen, wanted), `${what}: ${seen}, wanted ${wanted}`);

/* Ends the test: status 1 if a check failed. */
export const conclude = () => {
    for (const fault of faults) console.log('FAILED: ' + fault);
    console.log(`${checks} checks, ${faults.length} failed`);
    process.exit(faults.length ? 1 : 0);
};

export const launch = () => chromium.launch({
    executablePath: process.env.CHROMIUM,
    args: ['--no-sandbox', '--disable-gpu', '--disable-quic', '--no-first-run',
           '--disable-background-networking', '--disable-component-update', '--disable-sync',
           '--use-gl=angle', '--use-angle=swiftshader', '--enable-unsafe-swiftshader'],
});

/* How long [ms] anything may take that a busy machine delays. */
const patience = 120000;

/* Waits for what the browser tells on its own; the check that follows says if it never came. */
export const until = async holds => {
    for (const end = Date.now() + 20000; !holds() && Date.now() < end;)
        await new Promise(done => setTimeout(done, 50));
};

const isLocal = url => /^(file|data|blob):/.test(url);

/* A page with what went wrong in it: errors of its scripts, violations of its policy, and requests to
   anywhere else. */
export const open = async (browser, file, width = 1280, height = 900, prepare = null) => {
    const page = await browser.newPage({viewport: {width, height}, acceptDownloads: true});
    const errors = [], requests = [];
    page.setDefaultTimeout(patience);
    page.on('pageerror', error => errors.push(String(error)));
    page.on('console', message => {
        if (message.type() === 'error') errors.push(message.text());
    });
    page.on('request', request => {
        if (!isLocal(request.url())) requests.push(request.url());
    });
    if (prepare) await page.addInitScript(prepare);
    await page.goto('file://' + file);
    await page.waitForLoadState('load');
    return {page, errors, requests};
};

export const isClean = ({errors, requests}, name) => {
    check(errors.length === 0, `${name}: errors on the page: ${errors.join(' | ')}`);
    check(requests.length === 0, `${name}: requests: ${requests.join(' ')}`);
};

/* Nothing on the page is wider than the window. */
export const overflow = page => page.evaluate(
    () => document.documentElement.scrollWidth - document.documentElement.clientWidth);

/* The content of what a click saves. */
export const saved = async (page, selector) => {
    const [download] = await Promise.all([
        page.waitForEvent('download', {timeout: patience}), page.locator(selector).click()]);
    const parts = [];
    for await (const part of await download.createReadStream()) parts.push(part);
    return {name: download.suggestedFilename(), content: Buffer.concat(parts)};
};

export const pngSize = content => content.toString('latin1', 1, 4) === 'PNG'
    ? `${content.readUInt32BE(16)} x ${content.readUInt32BE(20)}` : 'no PNG';
