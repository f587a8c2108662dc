// SPDX-License-Identifier: Apache-2.0
"use strict";

/* The table of a study's points: ten thousand rows, of which those in view are in the document.
   `points` hands out single values to the rest of the page. */
const points = (() => {
    const element = document.getElementById("points-table");
    if (!element) return null;
    const {rows, y, columns, cells} = rille.data("study-points");
    const rowHeight = 30, spare = 12, printed = 500;

    /* A value as it stands in results.csv: a number, a text, or null for nothing. */
    const value = (row, column) => {
        const held = cells[column];
        if (Array.isArray(held)) return held[row];
        const text = held.words[held.at[row]];
        return text === "" ? null : text;
    };

    /* Decimals that an error deserves, as in the program's own tables. */
    const decimals = (number, error) => {
        if (!(error > 0)) return Math.abs(number) < 1000 ? 2 : 1;
        const power = Math.floor(Math.log10(error));
        const startsWithOne = error / 10 ** power < 1.95;
        return Math.min(2, Math.max(0, -power + (startsWithOne ? 1 : 0)));
    };
    const rounded = (number, error) => number.toFixed(decimals(number, error))
        .replace(/^-(0(\.0*)?)$/, "$1");
    const plain = number => String(Number(number.toPrecision(6)));

    /* A value as it is shown: metrics with their errors. */
    const shown = (row, column) => {
        const held = value(row, column), {role, error} = columns[column];
        if (held === null) return "";
        if (typeof held === "string") return held;
        if (role !== "metric") return plain(held);
        const around = error === undefined ? null : value(row, error);
        if (!(around > 0)) return rounded(held, 0);
        if (around < 0.005) return rounded(held, 0) + " ± <0.01";
        return rounded(held, around) + " ± " + around.toFixed(decimals(held, around));
    };
    const heading = column => columns[column].label +
        (columns[column].unit ? " (" + columns[column].unit + ")" : "");

    /* What the reader has chosen: columns, order, rows. */
    const listed = columns.map((c, i) => i).filter(i => columns[i].role !== "error");
    let visible = listed.filter(i => columns[i].shown);
    let order = {column: null, sign: 1};
    let chosenRow = null;
    let found = Array.from({length: rows}, (_, i) => i);

    const frame = element.querySelector(".window"), table = frame.querySelector("table");
    const head = table.tHead, body = table.tBodies[0];
    table.setAttribute("aria-label", "All points");

    const drawHead = () => {
        const row = document.createElement("tr");
        for (const column of visible) {
            const cell = document.createElement("th"), button = document.createElement("button");
            cell.scope = "col";
            cell.setAttribute("aria-sort", order.column !== column ? "none"
                : order.sign > 0 ? "ascending" : "descending");
            button.type = "button";
            button.textContent = heading(column);
            button.dataset.column = column;
            if (Array.isArray(cells[column])) cell.className = "number";
            cell.append(button);
            row.append(cell);
        }
        head.replaceChildren(row);
    };

    const space = height => {
        const row = document.createElement("tr"), cell = document.createElement("td");
        row.className = "space";
        row.setAttribute("aria-hidden", "true");
        row.style.height = height + "px";
        cell.colSpan = visible.length;
        row.append(cell);
        return row;
    };

    const bodyRow = (row, index) => {
        const line = document.createElement("tr");
        line.setAttribute("aria-rowindex", index + 2);
        line.dataset.row = row;
        if (row === chosenRow) line.className = "chosen";
        for (const column of visible) {
            const cell = document.createElement("td"), text = shown(row, column);
            const held = value(row, column);
            if (columns[column].role === "point") {
                const button = document.createElement("button");
                button.type = "button";
                button.className = "choose";
                button.dataset.point = row;
                button.textContent = text;
                cell.append(button);
            } else {
                cell.textContent = text;
                if (typeof held === "number") cell.dataset.value = held;
            }
            const role = columns[column].role;
            if (role === "target" || role === "status") cell.className = text.replace(" ", "-");
            if (role === "failure") cell.title = text;
            if (Array.isArray(cells[column])) cell.classList.add("number");
            line.append(cell);
        }
        return line;
    };

    let drawnFrom = -1, drawnTo = -1;
    const drawBody = (all = false) => {
        const top = Math.floor(frame.scrollTop / rowHeight);
        const seen = Math.ceil((frame.clientHeight || 600) / rowHeight);
        const from = all ? 0 : Math.max(0, Math.min(top, found.length - seen) - spare);
        const to = all ? Math.min(found.length, printed) : Math.min(found.length, from + seen + 2 * spare);
        if (from === drawnFrom && to === drawnTo) return;
        [drawnFrom, drawnTo] = [from, to];
        const kept = document.activeElement?.closest?.("#points-table tbody tr")?.dataset.row;
        const lines = [];
        if (from > 0) lines.push(space(from * rowHeight));
        for (let i = from; i < to; ++i) lines.push(bodyRow(found[i], i));
        if (to < found.length && !all) lines.push(space((found.length - to) * rowHeight));
        body.replaceChildren(...lines);
        table.setAttribute("aria-rowcount", found.length + 1);
        if (kept !== undefined)
            body.querySelector(`tr[data-row="${kept}"] .choose`)?.focus({preventScroll: true});
    };
    const draw = () => {
        drawnFrom = -1;
        drawHead();
        drawBody();
    };

    /* "amplitude>300" asks for a bound, anything else for a text in the row. */
    const test = term => {
        const bound = /^(.+?)(<=|>=|<|>|=)(.*)$/.exec(term);
        if (bound) {
            const [, name, sign, limit] = bound, number = Number(limit);
            const plainName = text => text.toLowerCase().replace(/[\s_]/g, "");
            const column = [...visible, ...listed].find(i =>
                plainName(columns[i].label).includes(plainName(name)));
            if (column !== undefined && limit !== "") return row => {
                const held = value(row, column);
                if (held === null) return false;
                if (typeof held !== "number" || Number.isNaN(number))
                    return sign === "=" && String(held).toLowerCase() === limit.toLowerCase();
                return sign === "<" ? held < number : sign === ">" ? held > number
                    : sign === "<=" ? held <= number : sign === ">=" ? held >= number
                    : Math.abs(held - number) <= 1e-9 * Math.abs(number);
            };
        }
        const wanted = term.toLowerCase();
        return row => visible.some(c => shown(row, c).toLowerCase().includes(wanted));
    };

    const compare = (a, b) => {
        const p = value(a, order.column), q = value(b, order.column);
        if (p === null || q === null) return (p === null) - (q === null) || a - b; // nothing last
        const difference = typeof p === "number" && typeof q === "number" ? p - q
            : String(p).localeCompare(String(q), "en", {numeric: true});
        return order.sign * difference || a - b;
    };

    const search = element.querySelector(".words"), status = element.querySelector("select.status");
    const statusColumn = columns.findIndex(c => c.role === "status");
    const find = () => {
        const tests = search.value.trim().split(/\s+/).filter(Boolean).map(test);
        if (status.value) tests.push(row => value(row, statusColumn) === status.value);
        found = [];
        for (let row = 0; row < rows; ++row)
            if (tests.every(passes => passes(row))) found.push(row);
        if (order.column !== null) found.sort(compare);
        element.querySelector(".count").textContent = found.length === rows
            ? `${rows} points` : `${found.length} of ${rows} points`;
        frame.scrollTop = 0;
        draw();
    };

    const columnList = element.querySelector(".columns > div");
    for (const column of listed) {
        const label = document.createElement("label"), box = document.createElement("input");
        box.type = "checkbox";
        box.checked = visible.includes(column);
        box.disabled = columns[column].role === "point";
        box.addEventListener("change", () => {
            visible = listed.filter(i => i === column ? box.checked : visible.includes(i));
            draw();
        });
        label.append(box, " " + heading(column));
        columnList.append(label);
    }

    head.addEventListener("click", event => {
        const button = event.target.closest("button");
        if (!button) return;
        const column = Number(button.dataset.column);
        order = {column, sign: order.column === column ? -order.sign : 1};
        find();
        head.querySelector(`button[data-column="${column}"]`).focus();
    });

    /* Arrows walk through the rows, those out of view included. */
    const focusRow = index => {
        index = Math.max(0, Math.min(found.length - 1, index));
        const place = index * rowHeight, room = frame.clientHeight - head.offsetHeight - rowHeight;
        if (place < frame.scrollTop) frame.scrollTop = place;
        if (place > frame.scrollTop + room) frame.scrollTop = place - room;
        drawBody();
        body.querySelector(`tr[data-row="${found[index]}"] .choose`)?.focus({preventScroll: true});
    };
    body.addEventListener("keydown", event => {
        const line = event.target.closest("tr[data-row]");
        if (!line) return;
        const at = found.indexOf(Number(line.dataset.row)), page = Math.floor(frame.clientHeight / rowHeight);
        const steps = {ArrowDown: at + 1, ArrowUp: at - 1, PageDown: at + page, PageUp: at - page,
                       Home: 0, End: found.length - 1};
        if (!(event.key in steps)) return;
        event.preventDefault();
        focusRow(steps[event.key]);
    });

    /* All rows that were found, numbers with all of their digits, errors in columns of their own. */
    const tsv = () => {
        const taken = [];
        for (const column of visible) {
            taken.push(column);
            if (columns[column].error !== undefined) taken.push(columns[column].error);
        }
        const lines = [taken.map(heading).join("\t")];
        for (const row of found)
            lines.push(taken.map(c => String(value(row, c) ?? "").replace(/\s+/g, " ")).join("\t"));
        return lines.join("\n") + "\n";
    };
    element.querySelector("button.copy").addEventListener("click", () => rille.copy(tsv()));
    element.querySelector("button.tsv").addEventListener("click", () =>
        rille.save("points.tsv", new Blob([tsv()], {type: "text/tab-separated-values"})));

    search.addEventListener("input", find);
    status.addEventListener("change", find);
    frame.addEventListener("scroll", () => drawBody(), {passive: true});
    addEventListener("resize", () => drawBody());
    addEventListener("beforeprint", () => drawBody(true));
    addEventListener("afterprint", () => drawBody());
    find();

    return {
        rows, y, columns, value, shown, heading,
        /* Neighbour in the order of the table as it is now. */
        step: (row, by) => {
            const at = found.indexOf(row);
            return at < 0 ? found[0] : found[Math.max(0, Math.min(found.length - 1, at + by))];
        },
        mark: row => {
            chosenRow = row;
            drawnFrom = -1;
            drawBody();
        },
    };
})();
