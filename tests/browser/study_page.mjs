// SPDX-License-Identifier: Apache-2.0
import {readFileSync} from 'node:fs';
import {check, conclude, equal, isClean, launch, open, overflow, pngSize, saved} from './browser.mjs';

const work = process.argv[2];
const rows = JSON.parse(readFileSync(`${work}/rows.json`));
const browser = await launch();
const file = name => `${work}/${name}/report.html`;

/* A text as it is copied, by what results.csv has: the same number, or the same words. */
const same = (seen, text) => text === '' ? seen === ''
    : Number.isNaN(Number(text)) ? seen === text : Number(seen) === Number(text);
/* Cells of a table of points, saved as TSV, that are not those of results.csv. */
const differing = (tsv, wanted, names) => {
    const lines = tsv.trimEnd().split('\n').slice(1).map(line => line.split('\t'));
    if (lines.length !== wanted.length) return wanted.length * names.length;
    return lines.flatMap((line, r) => names.filter((name, c) => !same(line[c], wanted[r][name]))).length;
};
const shownNames = ['point', 'status', 'amplitude_V', 'cd_nm', 'bottom_cd_loss_nm', 'bottom_cd_loss_error_nm',
                    'target_bottom_cd_loss', 'seconds'];
const panel = page => page.locator('#chosen');
const chosenName = async page => (await panel(page).locator('h2').textContent()).replace('Point ', '');
/* Rows out of view are drawn once they are scrolled to: waits until the focus is on that row. */
const focusOn = (page, row) => page.waitForFunction(index =>
    document.activeElement.closest('tr')?.getAttribute('aria-rowindex') === String(index), row + 1);
const firstColumn = page => page.locator('#points-table tbody .choose').allTextContents();

{ // The numbers of the table are those of results.csv.
    const opened = await open(browser, file('study'));
    const {page} = opened;
    const tsv = (await saved(page, '#points-table .tsv')).content.toString();
    equal(differing(tsv, rows.study, shownNames), 0, 'cells that differ from results.csv');
    const faulty = rows.study.map(row => ({...row, amplitude_V: String(row.amplitude_V * 1.02)}));
    equal(differing(tsv, faulty, shownNames), rows.study.length, 'seeded faults of 2 % that are found');
    const seen = await page.evaluate(() => [...document.querySelectorAll('#points-table tbody tr[data-row]')]
        .map(line => ({row: Number(line.dataset.row), loss: line.cells[4].dataset.value, text: line.cells[4].textContent})));
    check(seen.length > 10, `${seen.length} rows are drawn`);
    const wrong = seen.filter(({row, loss, text}) => {
        const value = rows.study[row].bottom_cd_loss_nm;
        return value === '' ? text !== '' : Number(loss) !== Number(value) ||
            Math.abs(Number(text.split(' ')[0]) - Number(value)) > 0.00501;
    });
    equal(wrong.length, 0, 'shown values that are not what results.csv rounds to');
    isClean(opened, 'table');
    await page.close();
}

{ // A point by mouse: in the curve, the map, the profiles, the table; its values are its own.
    const opened = await open(browser, file('study'));
    const {page} = opened;
    for (const [place, row] of [['#answer', 17], ['#map-bottom-cd-loss-nm', 20], ['#profiles', 5], ['#window', 9]]) {
        await page.locator(`${place} > .frame:not(.narrow) [data-point="${row}"]`).click();
        check(await panel(page).isVisible(), `${place} shows no point`);
        equal(await chosenName(page), rows.study[row].point, `point chosen in ${place}`);
        const loss = await panel(page).locator('[data-column=bottom_cd_loss_nm]').getAttribute('data-value');
        equal(Number(loss), Number(rows.study[row].bottom_cd_loss_nm), `value of the point chosen in ${place}`);
        check(await panel(page).locator('svg path').count() >= 3, 'no profile is drawn');
        await page.keyboard.press('Escape');
        check(await panel(page).isHidden(), 'Escape does not close the panel');
    }
    await page.locator('#points-table .choose', {hasText: rows.study[3].point}).click();
    check((await panel(page).locator('.state').textContent()).includes('not finite, at "line"'),
          'no reason of a failed point');
    await panel(page).getByText('Next', {exact: true}).click();
    equal(await chosenName(page), rows.study[4].point, 'the next point');
    await panel(page).getByText('Hold to compare').click();
    await panel(page).getByText('Next', {exact: true}).click();
    equal(await panel(page).locator('svg path[stroke-dasharray]').count(), 1, 'outlines held to compare');
    isClean(opened, 'mouse');
    await page.close();
}

{ // Points that do not line up: each against each input, as a marker that shows its profile.
    const opened = await open(browser, file('spread'));
    const {page} = opened;
    for (const chart of ['#scatter-bottom-cd-loss-nm-1', '#scatter-bottom-cd-loss-nm-2']) {
        const frame = page.locator(`${chart} > .frame:not(.narrow)`);
        equal(await frame.locator('[data-point]').count(), rows.spread.length, `markers of ${chart}`);
        await frame.locator('[data-point="21"]').click();
        equal(await chosenName(page), rows.spread[21].point, `point chosen in ${chart}`);
        const loss = await panel(page).locator('[data-column=bottom_cd_loss_nm]').getAttribute('data-value');
        equal(Number(loss), Number(rows.spread[21].bottom_cd_loss_nm), `value of the point chosen in ${chart}`);
        await page.keyboard.press('Escape');
    }
    isClean(opened, 'scatter');
    await page.close();
}

{ // The same by keyboard, and back to where one came from.
    const opened = await open(browser, file('study'));
    const {page} = opened;
    const mark = () => page.evaluate(() => document.activeElement.dataset.point);
    await page.locator('#answer > .frame:not(.narrow) .point[tabindex="0"]').focus();
    equal(await mark(), '0', 'first mark');
    await page.keyboard.press('ArrowRight');
    await page.keyboard.press('ArrowRight');
    equal(await mark(), '2', 'mark after two arrows');
    await page.keyboard.press('Enter');
    equal(await chosenName(page), rows.study[2].point, 'point chosen by Enter');
    equal(await page.evaluate(() => document.activeElement.textContent), 'Point ' + rows.study[2].point,
          'focus in the panel');
    await page.keyboard.press('Escape');
    equal(await mark(), '2', 'focus after Escape');
    equal(await page.locator('#answer > .frame:not(.narrow) .point[tabindex="0"]').count(), 1, 'stops in a drawing');
    await page.locator('#points-table .choose').first().focus();
    await page.keyboard.press('End');
    await focusOn(page, rows.study.length);
    equal(await page.evaluate(() => document.activeElement.textContent), rows.study.at(-1).point, 'row after End');
    await page.keyboard.press('ArrowUp');
    await focusOn(page, rows.study.length - 1);
    await page.keyboard.press('Enter');
    equal(await chosenName(page), rows.study.at(-2).point, 'row chosen by Enter');
    isClean(opened, 'keyboard');
    await page.close();
}

{ // Sorting, filters, columns.
    const opened = await open(browser, file('study'));
    const {page} = opened;
    const sorted = sign => rows.study.filter(row => row.bottom_cd_loss_nm)
        .sort((a, b) => sign * (a.bottom_cd_loss_nm - b.bottom_cd_loss_nm)).map(row => row.point);
    const head = page.locator('#points-table thead button', {hasText: 'bottom CD loss (nm)'});
    for (const sign of [1, -1]) {
        await head.click();
        equal((await firstColumn(page)).slice(0, 12).join(), sorted(sign).slice(0, 12).join(), 'order ' + sign);
    }
    equal(await page.locator('#points-table th[aria-sort=descending]').count(), 1, 'columns said to be sorted');
    await page.locator('#points-table .words').fill('amplitude>300 cd<=40');
    const bound = rows.study.filter(row => Number(row.amplitude_V) > 300 && Number(row.cd_nm) <= 40).length;
    equal(await page.locator('#points-table .count').textContent(), `${bound} of ${rows.study.length} points`, 'bounds');
    await page.locator('#points-table .words').fill('');
    await page.locator('#points-table select.status').selectOption('failed');
    equal((await firstColumn(page)).join(), rows.study[3].point, 'failed points');
    await page.locator('#points-table .columns summary').click();
    await page.locator('#points-table .columns label', {hasText: 'failure'}).click();
    check((await page.locator('#points-table tbody').textContent()).includes('not finite'), 'column of reasons');
    await page.locator('#profiles-choice').selectOption('2');
    check(await page.locator('#profiles-3').isVisible() && await page.locator('#profiles').isHidden(), 'choice of profiles');
    isClean(opened, 'sorting');
    await page.close();
}

{ // What is saved.
    const opened = await open(browser, file('study'));
    const {page} = opened;
    equal(pngSize((await saved(page, '#answer [data-save=png]')).content), '1920 x 1080', 'the curve as PNG');
    const svg = (await saved(page, '#answer [data-save=svg]')).content.toString();
    for (const part of ['not a released recipe', 'Stays constant: pressure of main'])
        check(svg.includes(part), `the curve as SVG lacks "${part}"`);
    equal(pngSize(readFileSync(`${work}/study/answer.png`)), '1920 x 1080', 'answer.png');
    isClean(opened, 'saving');
    await page.close();
}

{ // Ten thousand rows: the page says itself how long it takes to open.
    const opened = await open(browser, file('large'));
    const {page} = opened;
    const taken = await page.evaluate(() => performance.getEntriesByType('navigation')[0].loadEventEnd);
    console.log(`10,000 rows: open after ${Math.round(taken)} ms; ${readFileSync(file('large')).length >> 20} MB`);
    check(taken < 15000, `10,000 rows take ${taken} ms`);
    check(await page.locator('#points-table tbody tr').count() < 100, 'rows out of view are in the document');
    const started = Date.now();
    await page.locator('#points-table thead button', {hasText: 'bottom CD loss (nm)'}).click();
    await page.locator('#points-table thead button', {hasText: 'bottom CD loss (nm)'}).click();
    const largest = rows.large.reduce((a, b) => Number(a.bottom_cd_loss_nm) > Number(b.bottom_cd_loss_nm) ? a : b);
    equal((await firstColumn(page))[0], largest.point, 'largest of 10,000');
    console.log(`sorted twice in ${Date.now() - started} ms`);
    await page.locator('#points-table .choose').first().focus();
    await page.keyboard.press('End');
    await focusOn(page, rows.large.length);
    const tsv = (await saved(page, '#points-table .tsv')).content.toString();
    equal(tsv.trimEnd().split('\n').length, rows.large.length + 1, 'lines of the TSV');
    isClean(opened, 'large');
    await page.close();
}

// Every page at both widths.
const said = {study: '39 of 40 points finished', empty: 'No point of this study has been run yet',
              one: '1 of 1 points finished', spread: 'do not line up', failed: 'No point has a value', large: '10000 of 10000',
              compare: '3 runs side by side'};
for (const [name, words] of Object.entries(said))
    for (const width of [1280, 400]) {
        const opened = await open(browser, file(name), width, 900);
        check(await overflow(opened.page) <= 0, `${name} is wider than ${width} px`);
        const text = await opened.page.evaluate(() => document.body.innerText);
        check(text.includes(words), `${name} does not say "${words}"`);
        check(!/NaN|undefined|\[object/.test(text), `${name}: a value that is none is shown as one`);
        const twice = await opened.page.evaluate(() => {
            const ids = [...document.querySelectorAll('[id]')].map(part => part.id);
            return ids.filter((id, at) => ids.indexOf(id) !== at).join();
        });
        equal(twice, '', `ids that ${name} gives twice`);
        isClean(opened, `${name} at ${width} px`);
        await opened.page.close();
    }

{ // Side by side: difference and combined error.
    const opened = await open(browser, file('compare'));
    const {page} = opened;
    const metric = point => JSON.parse(readFileSync(`${work}/study/points/${point}/metrics.json`)).metrics[0];
    const line = page.locator('#differences-table tbody tr').first();
    const cell = line.locator('.difference').first();
    const difference = metric('0008').value - metric('0005').value;
    check(Math.abs(Number(await cell.getAttribute('data-value')) - difference) < 1e-12, 'difference of two points');
    equal(await cell.textContent(), `+${difference.toFixed(2)} ± ${Math.hypot(0.1, 0.1).toFixed(2)} nm`, 'its error');
    isClean(opened, 'side by side');
    await page.close();
}

{ // Paper: every row of a small study, no controls.
    const opened = await open(browser, file('study'));
    const {page} = opened;
    await page.emulateMedia({media: 'print'});
    await page.evaluate(() => dispatchEvent(new Event('beforeprint')));
    equal((await firstColumn(page)).length, rows.study.length, 'rows on paper');
    check(await page.locator('#profiles-3').isVisible(), 'profiles of one line only on paper');
    isClean(opened, 'paper');
    await page.close();
}

await browser.close();
conclude();
