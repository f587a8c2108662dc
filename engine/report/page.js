// SPDX-License-Identifier: Apache-2.0
"use strict";

/* What every page can do: hand out its data, save drawings and tables. Further scripts of a page
   come after this one and use `rille`. */
const rille = (() => {
    const slide = {width: 1920, height: 1080};

    const data = id => JSON.parse(document.getElementById(id).textContent);

    let silence = 0;
    const say = text => {
        document.getElementById("said").textContent = text;
        clearTimeout(silence);
        silence = setTimeout(() => { document.getElementById("said").textContent = ""; }, 4000);
    };

    const save = (name, blob) => {
        const link = document.createElement("a");
        link.href = URL.createObjectURL(blob);
        link.download = name;
        link.click();
        setTimeout(() => URL.revokeObjectURL(link.href), 10000);
        say(name + " saved");
    };

    /* The drawing that a slide takes: made for it, or as it is shown. */
    const slideOf = figure =>
        (figure.querySelector("template")?.content ?? figure).querySelector("svg");

    /* A drawing as it is shown now, as a document of its own. */
    const svgText = (drawing, width, height) => {
        const svg = drawing.cloneNode(true);
        svg.setAttribute("xmlns", "http://www.w3.org/2000/svg");
        for (const hidden of svg.querySelectorAll('[display="none"]')) hidden.remove();
        if (width) {
            svg.setAttribute("width", width);
            svg.setAttribute("height", height);
        }
        return new XMLSerializer().serializeToString(svg);
    };

    const savePng = figure => {
        const drawing = slideOf(figure);
        const [, , boxWidth, boxHeight] = drawing.getAttribute("viewBox").split(/[ ,]+/).map(Number);
        const scale = Math.min(slide.width / boxWidth, slide.height / boxHeight);
        const width = boxWidth * scale, height = boxHeight * scale;
        const image = new Image();
        image.onload = () => {
            const canvas = document.createElement("canvas");
            canvas.width = slide.width;
            canvas.height = slide.height;
            const context = canvas.getContext("2d");
            context.fillStyle = "#fff";
            context.fillRect(0, 0, slide.width, slide.height);
            context.drawImage(image, (slide.width - width) / 2, (slide.height - height) / 2, width,
                              height);
            canvas.toBlob(blob => save(figure.id + ".png", blob), "image/png");
        };
        image.onerror = () => say("this browser cannot draw the picture; save it as SVG");
        image.src = "data:image/svg+xml;charset=utf-8," +
            encodeURIComponent(svgText(drawing, width, height));
    };

    /* Numbers at full precision where a cell has them. */
    const tsvText = table => [...table.querySelectorAll("tr")]
        .filter(row => !row.hidden)
        .map(row => [...row.cells]
            .map(cell => (cell.dataset.value ?? cell.textContent).trim().replace(/\s+/g, " "))
            .join("\t"))
        .join("\n") + "\n";

    const copy = async text => {
        try {
            await navigator.clipboard.writeText(text);
        } catch {
            const area = document.createElement("textarea");
            area.value = text;
            document.body.append(area);
            area.select();
            const copied = document.execCommand("copy");
            area.remove();
            if (!copied) return say("this browser does not let the page copy; save it as TSV");
        }
        say("copied: paste it into a spreadsheet");
    };

    document.addEventListener("click", event => {
        const button = event.target.closest("button[data-save]");
        if (!button) return;
        const figure = button.closest("figure"), table = button.closest(".table");
        switch (button.dataset.save) {
        case "svg":
            return save(figure.id + ".svg", new Blob([svgText(figure.querySelector("svg"))],
                                                     {type: "image/svg+xml"}));
        case "png":
            return savePng(figure);
        case "copy":
            return copy(tsvText(table.querySelector("table")));
        case "tsv":
            return save(table.id + ".tsv", new Blob([tsvText(table.querySelector("table"))],
                                                    {type: "text/tab-separated-values"}));
        }
    });

    /* Paper shows everything; a link into a folded part opens it. */
    const folded = () => document.querySelectorAll("details:not([open])");
    let opened = [];
    addEventListener("beforeprint", () => {
        opened = [...folded()];
        for (const part of opened) part.open = true;
    });
    addEventListener("afterprint", () => { for (const part of opened) part.open = false; });
    const openTarget = () => {
        const target = location.hash && document.getElementById(location.hash.slice(1));
        const part = target && target.querySelector("details");
        if (part) part.open = true;
    };
    addEventListener("hashchange", openTarget);
    openTarget();

    return {data, say, save, copy, svgText, tsvText};
})();
