// SPDX-License-Identifier: Apache-2.0
"use strict";

/* Choosing a point in any drawing or table shows its profile, values and status. */
(() => {
    /* Of several drawings of the same for different slices, one is shown. */
    for (const choice of document.querySelectorAll("select[data-choose]")) {
        const figures = [...document.getElementById(choice.dataset.choose).children];
        const show = () => figures.forEach((figure, i) => { figure.hidden = i !== choice.selectedIndex; });
        choice.addEventListener("change", show);
        addEventListener("beforeprint", () => figures.forEach(figure => { figure.hidden = false; }));
        addEventListener("afterprint", show);
        show();
    }
    if (!points) return;

    const {outlines, stride, folder} = rille.data("study-profiles");
    const svgName = "http://www.w3.org/2000/svg";
    const panel = document.createElement("aside");
    panel.id = "chosen";
    panel.hidden = true;
    panel.setAttribute("aria-label", "The chosen point");
    document.body.append(panel);
    let chosen = null, held = null, from = null;

    const make = (name, text, classes) => {
        const element = document.createElement(name);
        if (text !== undefined) element.textContent = text;
        if (classes) element.className = classes;
        return element;
    };
    const drawn = (name, attributes) => {
        const element = document.createElementNS(svgName, name);
        for (const [key, value] of Object.entries(attributes)) element.setAttribute(key, value);
        return element;
    };
    const column = role => points.columns.findIndex(c => c.role === role);
    const pointName = row => points.value(row, column("point"));

    const pathOf = parts => parts.map(part => {
        let path = "";
        for (let i = 0; i < part.length; i += 2)
            path += (i ? "L" : "M") + part[i] + " " + -part[i + 1];
        return path;
    }).join("");

    /* The 1-2-5 number nearest below. */
    const roundLength = value => {
        const power = 10 ** Math.floor(Math.log10(value));
        return [5, 2, 1].find(step => value / power >= step) * power;
    };

    /* The outline of a point, over that of the point that is held. */
    const drawing = row => {
        const parts = outlines[row];
        if (!parts) return null;
        const all = [...parts, ...(held !== null && outlines[held] || [])];
        let [left, right, low, high] = [Infinity, -Infinity, Infinity, -Infinity];
        for (const part of all)
            for (let i = 0; i < part.length; i += 2) {
                left = Math.min(left, part[i]);
                right = Math.max(right, part[i]);
                low = Math.min(low, part[i + 1]);
                high = Math.max(high, part[i + 1]);
            }
        const air = 0.06 * Math.max(high - low, right - left) || 1;
        const [width, height] = [right - left, high - low + 2 * air];
        const svg = drawn("svg", {viewBox: `${left} ${-high - air} ${width} ${height}`, role: "img",
                                  "aria-label": "profile of point " + pointName(row)});
        const solid = parts.map(part => {
            const closed = Math.hypot(part[0] - part.at(-2), part[1] - part.at(-1)) < 1e-6;
            return pathOf([part]) + (closed ? "Z" : `L${part.at(-2)} ${-low + air}L${part[0]} ${-low + air}Z`);
        }).join("");
        const line = {fill: "none", "vector-effect": "non-scaling-stroke", "stroke-linejoin": "round"};
        svg.append(drawn("path", {d: solid, fill: "#d5dde8", "fill-rule": "evenodd"}));
        if (held !== null && held !== row && outlines[held])
            svg.append(drawn("path", {...line, d: pathOf(outlines[held]), stroke: "#c8662a",
                                      "stroke-width": 2, "stroke-dasharray": "7 4"}));
        svg.append(drawn("path", {...line, d: pathOf(parts), stroke: "#102460", "stroke-width": 2}));
        const bar = roundLength(0.4 * width), at = low - 0.5 * air;
        svg.append(drawn("path", {...line, d: `M${left + 0.04 * width} ${-at}h${bar}`, stroke: "#000",
                                  "stroke-width": 3}));
        const box = make("div");
        box.append(svg, make("p", `bar: ${bar} nm` + (held !== null && held !== row
            ? `; dashed: point ${pointName(held)}` : ""), "soft"));
        return box;
    };

    const noDrawing = row => {
        const [name] = [pointName(row)], text = make("p", "", "soft");
        if (row % stride !== 0) text.textContent = "The profile of this point is not in this page. ";
        else text.textContent = "This point left no profile. ";
        const link = make("a", "Its folder: " + folder + name);
        link.href = folder + name + "/";
        text.append(link);
        return text;
    };

    const valuesTable = row => {
        const table = make("table"), body = table.createTBody();
        points.columns.forEach((c, i) => {
            if (["point", "status", "error", "failure"].includes(c.role)) return;
            const text = points.shown(row, i);
            if (text === "") return;
            const line = body.insertRow(), name = make("th", points.heading(i));
            name.scope = "row";
            const cell = make("td", text, "number"), held = points.value(row, i);
            if (typeof held === "number") cell.dataset.value = held;
            cell.dataset.column = c.name;
            if (i === points.y) name.style.fontWeight = cell.style.fontWeight = "600";
            line.append(name, cell);
        });
        return table;
    };

    const act = (text, does) => {
        const button = make("button", text);
        button.type = "button";
        button.addEventListener("click", does);
        return button;
    };

    const close = () => {
        panel.hidden = true;
        markAll(null);
        points.mark(null);
        const back = from && from.isConnected ? from
            : document.querySelector(`#points-table .choose[data-point="${chosen}"]`);
        chosen = null;
        back?.focus({preventScroll: true});
    };

    const markAll = row => {
        for (const mark of document.querySelectorAll(".drawing .point.chosen"))
            mark.classList.remove("chosen");
        if (row === null) return;
        for (const mark of document.querySelectorAll(`.drawing .point[data-point="${row}"]`))
            mark.classList.add("chosen");
    };

    const show = (row, origin) => {
        chosen = row;
        if (origin) from = origin;
        const title = make("h2", "Point " + pointName(row));
        title.tabIndex = -1;
        const status = points.value(row, column("status"));
        const failure = points.value(row, column("failure"));
        const acts = make("div", undefined, "acts");
        const hold = act(held === row ? "Let go" : "Hold to compare", () => {
            held = held === row ? null : row;
            show(row);
            panel.querySelector(".hold").focus();
        });
        hold.className = "hold";
        hold.setAttribute("aria-pressed", held === row);
        const step = (by, name) => {
            show(points.step(row, by));
            [...panel.querySelectorAll(".acts button")].find(b => b.textContent === name).focus();
        };
        acts.append(act("Previous", () => step(-1, "Previous")), act("Next", () => step(1, "Next")), hold,
                    act("Close", close));
        panel.replaceChildren(title, make("p", status + (failure ? ": " + failure : ""), "state"), acts,
                              drawing(row) ?? noDrawing(row), valuesTable(row));
        panel.hidden = false;
        panel.scrollTop = 0;
        markAll(row);
        points.mark(row);
        if (origin) title.focus({preventScroll: true});
    };

    /* Marks, cells and panels: each drawing is one stop of the Tab key, arrows go from mark to mark. */
    for (const svg of document.querySelectorAll(".drawing .frame svg")) {
        const marks = [...svg.querySelectorAll(".point")];
        if (marks.length === 0) continue;
        svg.setAttribute("role", "group");
        marks.forEach((mark, i) => {
            mark.classList.add("live");
            mark.setAttribute("role", "button");
            mark.setAttribute("tabindex", i === 0 ? 0 : -1);
            mark.setAttribute("aria-label", mark.querySelector("title")?.textContent ?? "point");
        });
        const go = (mark, by) => {
            const next = marks[Math.max(0, Math.min(marks.length - 1, marks.indexOf(mark) + by))];
            mark.setAttribute("tabindex", -1);
            next.setAttribute("tabindex", 0);
            next.focus();
        };
        svg.addEventListener("keydown", event => {
            const mark = event.target.closest(".point");
            if (!mark) return;
            const steps = {ArrowRight: 1, ArrowDown: 1, ArrowLeft: -1, ArrowUp: -1,
                           Home: -marks.length, End: marks.length};
            if (event.key in steps) go(mark, steps[event.key]);
            else if (event.key === "Enter" || event.key === " ") show(Number(mark.dataset.point), mark);
            else return;
            event.preventDefault();
        });
    }
    document.addEventListener("click", event => {
        const mark = event.target.closest(".drawing .point.live, button.choose");
        if (mark) show(Number(mark.dataset.point), mark);
    });
    document.addEventListener("keydown", event => {
        if (event.key === "Escape" && !panel.hidden) close();
    });
})();
