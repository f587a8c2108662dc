// SPDX-License-Identifier: Apache-2.0
"use strict";

/* The slider through the moments of an etch: one group of the drawing is shown, and beside it what
   was measured then. */
for (const slider of document.querySelectorAll(".slider[data-moments]")) {
    const moments = rille.data(slider.dataset.moments);
    const groups = slider.closest("figure").querySelectorAll("svg .moment");
    const input = slider.querySelector("input"), play = slider.querySelector(".play");
    const table = slider.closest(".sides").querySelector(".moment-values");
    let timer = 0;

    const cell = (name, text) => Object.assign(document.createElement(name), {textContent: text});
    const show = index => {
        const moment = moments[index];
        groups.forEach((group, i) => {
            if (i === index) group.removeAttribute("display");
            else group.setAttribute("display", "none");
        });
        const words = moment.time + (moment.step ? ", step " + moment.step : "");
        slider.querySelector("output").textContent = words;
        input.setAttribute("aria-valuetext", words);
        table.caption.textContent = "At " + words;
        table.tBodies[0].replaceChildren(...moment.values.map(([label, text]) => {
            const row = document.createElement("tr");
            row.append(cell("th", label), cell("td", text));
            row.firstChild.scope = "row";
            return row;
        }));
    };
    const stop = () => {
        clearInterval(timer);
        timer = 0;
        play.textContent = "Play";
    };
    const step = () => {
        if (Number(input.value) >= moments.length - 1) return stop();
        input.value = Number(input.value) + 1;
        show(Number(input.value));
    };
    input.addEventListener("input", () => {
        stop();
        show(Number(input.value));
    });
    play.addEventListener("click", () => {
        if (timer) return stop();
        if (Number(input.value) >= moments.length - 1) {
            input.value = 0;
            show(0);
        }
        play.textContent = "Pause";
        timer = setInterval(step, matchMedia("(prefers-reduced-motion: reduce)").matches ? 1200 : 350);
    });
    show(Number(input.value));
}
