// SPDX-License-Identifier: Apache-2.0
// Folders as studies leave them, with made-up results: what the tests of the pages need of them.
import {mkdirSync, writeFileSync} from 'node:fs';

const inputs = [['amplitude', 'V', 'plasmas.main.rf_bias.amplitude'], ['cd', 'nm', 'mask.openings.line.cd']];
const reason = 'the rate is not finite, at "line"; 1 < 2 & so on';

const quoted = text => /[",\n]/.test(text) ? '"' + text.replaceAll('"', '""') + '"' : text;
const column = (name, role, label, feature = '', unit = '', path = '', definition = '') =>
    `# column: ${[name, role, label, feature, unit, path, '', definition].join(' | ')}`;

const profile = (width, depth) => {
    const lines = ['x_nm,z_nm,arc_length_nm,normal_deg,length_nm,chain,material,film'];
    const add = (x, z) => lines.push(`${x},${z},0,0,2,0,Si,gate`);
    for (let x = -119; x < -width / 2; x += 2) add(x, 40);
    for (let z = 39; z > -depth; z -= 2) add(-width / 2, z);
    for (let x = 1 - width / 2; x < width / 2; x += 2) add(x, -depth);
    for (let z = 1 - depth; z < 40; z += 2) add(width / 2, z);
    for (let x = width / 2 + 1; x < 120; x += 2) add(x, 40);
    return lines.join('\n') + '\n';
};

const metric = (name, value, error) => ({name, feature: 'line', value, unit: 'nm', sampling_error: error,
                                         grid_error: 'not assessed', definition: 'of ' + name});

/* Writes a study over amplitudes and openings, each with each or, as a `hypercube`, one with one;
   `status(i)` of point i, '' for one that was not run.
   Returns its rows as {column: text}. */
export const writeStudy = (folder, {amplitudes, openings, status = () => 'done', metrics = 3,
                                    profiles = true, hypercube = false}) => {
    const names = ['bottom cd_loss', ...Array.from({length: metrics - 1}, (_, i) => 'metric ' + (i + 1))];
    const columns = [column('point', 'point', 'point'), column('status', 'status', 'status'),
        ...inputs.map(([label, unit, path]) => column(`${label}_${unit}`, 'input', label, '', unit, path)),
        ...names.flatMap(name => {
            const plain = name.replaceAll(' ', '_');
            return [column(plain + '_nm', 'metric', name, 'line', 'nm', '', 'definition of ' + name),
                    column(plain + '_error_nm', 'error', name, 'line', 'nm')];
        }),
        column('grid_error', 'grid_error', 'grid_error'),
        column('target_bottom_cd_loss', 'target', 'bottom cd_loss', 'line'),
        ...['measured', 'published', 'from_memory', 'illustrative'].map(word =>
            column('parameters_' + word, 'standing', 'parameters_' + word, '', '1')),
        column('warnings', 'warnings', 'warnings', '', '1'), column('failure', 'failure', 'failure'),
        column('seconds', 'seconds', 'seconds', '', 's')];
    const header = columns.map(line => line.slice(10).split(' | ')[0]);
    const constants = ['pressure of main stays 10 mTorr while rf_bias.amplitude changes'];
    const lines = ['# title: CD loss against rf bias', ...constants.map(text => '# constant: ' + text),
                   ...columns, header.join(',')];
    const rows = [];
    const points = amplitudes.length * (hypercube ? 1 : openings.length);
    mkdirSync(folder, {recursive: true});
    for (let i = 0; i < points; ++i) {
        const word = status(i), name = String(i + 1).padStart(4, '0');
        if (!word) continue;
        const amplitude = amplitudes[i % amplitudes.length], opening = openings[hypercube ? i : Math.floor(i / amplitudes.length)];
        const loss = 0.5 + 0.006 * amplitude + 0.02 * (opening - 30) + i * 1e-9;
        const failed = word === 'failed' || word === 'killed';
        const values = names.flatMap((_, m) => failed ? ['', ''] : [String(loss + m / 3), String(0.1 + 0.07 * m)]);
        const row = [name, word, amplitude, opening, ...values, failed ? '' : 'not assessed',
                     failed ? '' : loss < 3 ? 'met' : loss > 4 ? 'missed' : 'undecided', 0, 14, 3, 2, 0,
                     failed ? reason : '', (10 + i % 7).toFixed(1)].map(String);
        lines.push(row.map(quoted).join(','));
        rows.push(Object.fromEntries(header.map((key, at) => [key, row[at]])));
        if (failed || !profiles) continue;
        const point = `${folder}/points/${name}`;
        mkdirSync(point, {recursive: true});
        writeFileSync(point + '/profile.csv', profile(opening, 150 + amplitude / 10));
        writeFileSync(point + '/point.json', JSON.stringify({status: word}));
        writeFileSync(point + '/metrics.json', JSON.stringify({title: 'point ' + name, time_s: 60,
            metrics: names.map((one, m) => metric(one, loss + m / 3, 0.1 + 0.07 * m)), clearing: [], targets: []}));
    }
    writeFileSync(folder + '/results.csv', lines.join('\n') + '\n');
    writeFileSync(folder + '/study.json', JSON.stringify({format: 1, title: 'CD loss against rf bias',
        plan: hypercube ? 'latin hypercube' : 'full grid', points, constants, warnings: [], comparison: null,
        answer: {y: 'bottom cd_loss', feature: 'line', x: 0, line_per: hypercube ? null : 1}}));
    return rows;
};

/* Run as a script: every folder that the tests of the pages open. */
const range = (count, from, step) => Array.from({length: count}, (_, i) => from + i * step);
if (process.argv[1].endsWith('study_folder.mjs')) {
    const work = process.argv[2];
    const few = {amplitudes: range(8, 100, 100), openings: [30, 40, 60, 90, 200]};
    const rows = {
        study: writeStudy(work + '/study', {...few, status: i =>
            i === 3 ? 'failed' : i === 11 ? 'killed' : i < 2 ? 'not cleared' : i === 39 ? '' : 'done'}),
        empty: writeStudy(work + '/empty', {...few, status: () => ''}),
        one: writeStudy(work + '/one', {amplitudes: [300], openings: [60]}),
        failed: writeStudy(work + '/failed', {...few, status: i => i % 2 ? 'failed' : 'killed'}),
        spread: writeStudy(work + '/spread', {amplitudes: range(40, 100, 17.5), hypercube: true,
            openings: range(40, 0, 17).map(place => 30 + 4.25 * (place % 40))}),
        large: writeStudy(work + '/large', {amplitudes: range(100, 100, 7.3), openings: range(100, 20, 3),
                                            metrics: 16, profiles: false}),
    };
    writeFileSync(work + '/rows.json', JSON.stringify(rows));
}
