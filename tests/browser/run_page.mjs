// SPDX-License-Identifier: Apache-2.0
import {readFileSync, writeFileSync} from 'node:fs';
import {check, conclude, equal, isClean, launch, open, overflow, pngSize, saved, until} from './browser.mjs';

const work = process.argv[2];
const browser = await launch();
const file = name => `${work}/${name}/report.html`;

/* What a table shows, as {name: {copied, shown}} by its row labels. */
const rows = (page, table, column) => page.evaluate(([id, column]) => Object.fromEntries(
    [...document.querySelectorAll(`#${id} tbody tr`)].map(row => {
        const label = row.querySelector('th'), cell = row.cells[column];
        return [label.dataset.value ?? label.textContent,
                {copied: cell.dataset.value, shown: cell.textContent}];
    })), [table, column]);

/* Metrics whose value in the table is another, or is not what it rounds to. */
const wrongMetrics = (shown, metrics) => metrics.filter(metric => {
    const row = shown[metric.name];
    if (!row) return true;
    if (metric.value === null) return row.shown !== 'none';
    const decimals = (row.shown.split('.')[1] ?? '').length;
    return Number(row.copied) !== metric.value ||
        Math.abs(Number(row.shown) - metric.value) > 0.5001 * 10 ** -decimals;
}).map(metric => metric.name);

{ // Numbers of the page are those of metrics.json.
    const opened = await open(browser, file('done'));
    const {page} = opened;
    const json = JSON.parse(readFileSync(`${work}/done/metrics.json`));
    const shown = await rows(page, 'metrics', 1);
    equal(wrongMetrics(shown, json.metrics).join(), '', 'metrics that differ from metrics.json');
    equal(Object.keys(shown).length, json.metrics.length, 'rows of metrics');
    const faulty = json.metrics.map(m => ({...m, value: m.value === null ? 1 : m.value * 1.02 + 0.1}));
    equal(wrongMetrics(shown, faulty).length, faulty.length, 'seeded faults of 2 % that are found');
    const key = await rows(page, 'key-results', 1);
    const depth = json.metrics.find(m => m.name === 'depth centre');
    equal(Number(key['depth centre'].copied), depth.value, 'depth on the first screen');
    const verdicts = await page.locator('#targets .verdict').allTextContents();
    equal(verdicts.join(), json.targets.map(t => t.verdict).join(), 'verdicts');
    const record = JSON.parse(readFileSync(`${work}/done/run.json`));
    const counts = (await page.locator('#standing b').allTextContents()).join();
    const {measured, published, from_memory, illustrative} = record.parameter_standing;
    equal(counts, [measured, published, from_memory, illustrative].join(), 'standing of parameters');
    equal(await page.locator('#case-text').textContent(), readFileSync(`${work}/done/case.yaml`, 'utf8'),
          'the case on the page');
    isClean(opened, 'done');
    await page.close();
}

{ // The slider, by keyboard and by mouse; play and pause.
    const opened = await open(browser, file('done'));
    const {page} = opened;
    const moments = await page.evaluate(() => rille.data('moments'));
    check(moments.length >= 5, `${moments.length} moments`);
    const shown = () => page.evaluate(() => [...document.querySelectorAll('#profile-over-time .moment')]
        .map((group, at) => getComputedStyle(group).display === 'none' ? -1 : at)
        .filter(at => at >= 0).join());
    const words = () => page.locator('.slider output').textContent();
    const input = page.locator('.slider input');
    const last = moments.length - 1;
    equal(await shown(), String(last), 'moment at first');
    await input.focus();
    await page.keyboard.press('ArrowLeft');
    equal(await shown(), String(last - 1), 'moment after the left arrow');
    check((await words()).startsWith(moments[last - 1].time), 'time beside the slider');
    await page.keyboard.press('Home');
    equal(await shown(), '0', 'moment after Home');
    const box = await input.boundingBox();
    await input.click({position: {x: 0.5 * box.width, y: 0.5 * box.height}});
    const middle = Number(await shown());
    check(Math.abs(middle - last / 2) <= 1, `moment after a click in the middle: ${middle} of ${last}`);
    const depth = await page.locator('.moment-values td').first().textContent();
    equal(depth, moments[middle].values[0][1], 'depth beside the slider');
    await page.clock.install(); // time goes on when it is told to, however busy the machine is
    await page.locator('.play').click();
    await page.clock.runFor(400);
    equal(await shown(), String(middle + 1), 'moment after the first step of play');
    await page.locator('.play').click();
    await page.clock.runFor(5000);
    equal(await shown(), String(middle + 1), 'moment while paused');
    await page.locator('.play').click();
    await page.clock.runFor(400 * moments.length);
    equal(await shown(), String(last), 'moment at the end of play');
    equal(await page.locator('.play').textContent(), 'Play', 'button at the end of play');
    isClean(opened, 'slider');
    await page.close();
}

{ // What is saved: pictures with their caution, tables with whole numbers.
    const opened = await open(browser, file('done'));
    const {page} = opened;
    for (const id of ['profile', 'profile-over-time', 'depth-against-time']) {
        const png = await saved(page, `#${id} [data-save=png]`);
        equal(png.name, id + '.png', 'name of a picture');
        equal(pngSize(png.content), '1920 x 1080', id);
        check(png.content.length > 20000, `${id}.png has ${png.content.length} bytes`);
        const svg = (await saved(page, `#${id} [data-save=svg]`)).content.toString();
        check(svg.includes('model prediction, not a released recipe'), `${id}.svg lacks its caution`);
        writeFileSync(`${work}/saved.svg`, svg);
        const alone = await open(browser, `${work}/saved.svg`);
        isClean(alone, id + '.svg');
        await alone.page.close();
    }
    const slide = await page.evaluate(() => document.querySelector('#profile template').innerHTML);
    check(slide.includes('model prediction, not a released recipe'), 'the slide lacks its caution');
    const tsv = (await saved(page, '#metrics [data-save=tsv]')).content.toString();
    const json = JSON.parse(readFileSync(`${work}/done/metrics.json`));
    const line = tsv.split('\n').find(text => text.startsWith('depth centre\t'));
    equal(Number(line?.split('\t')[1]), json.metrics.find(m => m.name === 'depth centre').value,
          'depth in the TSV');
    isClean(opened, 'saving');
    await page.close();
}

{ // Keyboard, reduced motion, paper.
    const opened = await open(browser, file('done'));
    const {page} = opened;
    await page.keyboard.press('Tab');
    equal(await page.evaluate(() => document.activeElement.textContent), 'To the content', 'first stop');
    const nameless = await page.evaluate(() => [...document.querySelectorAll('button, input, canvas')]
        .filter(part => !(part.textContent.trim() || part.ariaLabel || part.closest('label'))).length);
    equal(nameless, 0, 'controls without a name');
    const twice = await page.evaluate(() => {
        const ids = [...document.querySelectorAll('[id]')].map(part => part.id);
        return ids.filter((id, at) => ids.indexOf(id) !== at).join();
    });
    equal(twice, '', 'ids that are given twice');
    await page.emulateMedia({reducedMotion: 'reduce'});
    equal(await page.evaluate(() => getComputedStyle(document.documentElement).scrollBehavior), 'auto',
          'scrolling with reduced motion');
    await page.emulateMedia({media: 'print'});
    equal(await page.evaluate(() => getComputedStyle(document.querySelector('nav')).display), 'none',
          'navigation on paper');
    equal(await page.evaluate(() => [...document.querySelectorAll('button')]
        .filter(button => button.getClientRects().length).length), 0, 'buttons on paper');
    await page.evaluate(() => dispatchEvent(new Event('beforeprint')));
    check(await page.locator('#case-text').isVisible(), 'the folded case stays folded on paper');
    const pdf = (await page.pdf({format: 'A4'})).toString('latin1');
    const sheets = (pdf.match(/\/Type\s*\/Page\b/g) ?? []).length;
    check(sheets >= 2 && sheets <= 14, `${sheets} sheets of paper`);
    isClean(opened, 'paper');
    await page.close();
}

// Every page at both widths; runs that failed or are there only in part.
const expected = {done: 'Not cleared.', failed: 'Failed.', killed: 'Not finished.', kept: 'Not cleared.',
                  hole: 'Done.', stopped: 'Interrupted', alive: 'is still going on, or was killed'};
for (const [name, outcome] of Object.entries(expected))
    for (const width of [1280, 400]) {
        const opened = await open(browser, file(name), width, 900);
        check(await overflow(opened.page) <= 0, `${name} is wider than ${width} px`);
        check((await opened.page.locator('.outcome').first().textContent()).includes(outcome) ||
                  name === 'kept', `${name} does not say "${outcome}"`);
        check(await opened.page.locator('main .caution').isVisible(), `${name}: no caution`);
        const broken = await opened.page.evaluate(() => /NaN|undefined|null nm/.test(document.body.innerText));
        check(!broken, `${name}: a value that is none is shown as one`);
        isClean(opened, `${name} at ${width} px`);
        await opened.page.close();
    }

for (const name of ['stopped', 'alive']) { // What is there of a run that has not ended, and how to go on.
    const opened = await open(browser, file(name));
    const {page} = opened;
    check((await page.locator('.outcome code').textContent()).endsWith(`resume ${work}/${name}`),
          `${name}: how to go on`);
    check((await page.locator('.kind').textContent()).includes('not at its end'), `${name}: heading`);
    check(await page.locator('#curves figure').count() >= 3, `${name}: no curves`);
    equal((await page.locator('#targets .verdict').allTextContents()).join(), 'undecided,undecided,undecided',
          `${name}: verdicts`);
    check((await page.locator('#profile svg').first().textContent()).includes('stopped before its end'),
          `${name}: the picture could be taken for the end`);
    const slide = await page.evaluate(() => document.querySelector('#profile template').innerHTML);
    check(slide.includes('stopped before its end'), `${name}: the slide could be taken for the end`);
    isClean(opened, name);
    await page.close();
}

{ // The surface in three dimensions turns by keyboard and mouse and opens up.
    const opened = await open(browser, file('hole'));
    const {page} = opened;
    const canvas = page.locator('.view3d canvas');
    const look = async () => {
        await page.evaluate(() => new Promise(done => requestAnimationFrame(() =>
            requestAnimationFrame(done))));
        return canvas.evaluate(one => one.toDataURL());
    };
    const before = await look();
    check(before.length > 8000, `the view is empty: ${before.length} letters`);
    await canvas.focus();
    await page.keyboard.press('ArrowLeft');
    const turned = await look();
    check(turned !== before, 'the left arrow does not turn the surface');
    await canvas.evaluate(one => one.scrollIntoView({block: 'center', behavior: 'instant'}));
    const box = await canvas.boundingBox();
    await page.mouse.move(box.x + 300, box.y + 200);
    await page.mouse.down();
    await page.mouse.move(box.x + 380, box.y + 240, {steps: 4});
    await page.mouse.up();
    const dragged = await look();
    check(dragged !== turned, 'the mouse does not turn the surface');
    await page.locator('.cut').fill('0');
    check(await look() !== dragged, 'the cut does not open the surface');
    await page.locator('.reset').click();
    equal(await look(), before, 'the start view');
    equal(pngSize((await saved(page, '.view3d .shot')).content), '1920 x 1080', 'picture of the view');
    isClean(opened, 'surface');
    await page.close();
}

{ // Without WebGL the page says so and shows the cross-section.
    const opened = await open(browser, file('hole'), 1280, 900, () => {
        const get = HTMLCanvasElement.prototype.getContext;
        HTMLCanvasElement.prototype.getContext = function(kind, ...rest) {
            return kind.startsWith('webgl') ? null : get.call(this, kind, ...rest);
        };
    });
    check(await opened.page.locator('.no-webgl').isVisible(), 'nothing is said without WebGL');
    check(await opened.page.locator('.view3d svg').isVisible(), 'no picture without WebGL');
    isClean(opened, 'without WebGL');
    await opened.page.close();
}

{ // The checks themselves find what they look for.
    writeFileSync(`${work}/bad.html`, '<!DOCTYPE html><img src="http://127.0.0.1:9/x.png" alt="">' +
        '<div style="width: 3000px">wide</div><script>nothing.there()</script>');
    const bad = await open(browser, `${work}/bad.html`, 400, 900);
    await until(() => bad.requests.length > 0 && bad.errors.length > 0);
    check(bad.requests.length === 1, 'a request is not seen');
    check(bad.errors.length >= 1, 'an error is not seen');
    check(await overflow(bad.page) > 0, 'overflow is not seen');
    // A picture from elsewhere that gets into a report is held back by its policy.
    writeFileSync(`${work}/leak.html`, readFileSync(file('done'), 'utf8').replace('<main',
        '<img src="http://127.0.0.1:9/x.png" alt=""><script>window.leaked = 1</script><main'));
    const leak = await open(browser, `${work}/leak.html`);
    equal(await leak.page.evaluate(() => window.leaked), undefined, 'a foreign script');
    await until(() => leak.errors.some(text => text.includes('Content Security Policy')));
    check(leak.errors.some(text => text.includes('Content Security Policy')), 'the policy is silent');
}

await browser.close();
conclude();
