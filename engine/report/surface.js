// SPDX-License-Identifier: Apache-2.0
"use strict";

/* A small viewer: one mesh, one light at the eye, a box of one period around it, and a cut that opens
   it from the front. */
(() => {
    const figure = document.querySelector(".view3d");
    const canvas = figure.querySelector("canvas");
    const gl = canvas.getContext("webgl", {antialias: true, preserveDrawingBuffer: true});
    if (!gl) {
        const frame = figure.querySelector(".frame");
        canvas.hidden = true;
        frame.querySelector(".no-webgl").hidden = false;
        for (const part of figure.querySelectorAll(".slider, .tools")) part.hidden = true;
        const picture = document.querySelector("#profile svg");
        if (picture) frame.append(picture.cloneNode(true));
        return;
    }

    const mesh = rille.data(figure.dataset.mesh);
    const bytes = text => Uint8Array.from(atob(text), letter => letter.charCodeAt(0)).buffer;
    const packed = new Uint16Array(bytes(mesh.vertices));
    const triangles = new Uint16Array(bytes(mesh.triangles));
    const material = new Uint8Array(bytes(mesh.material));
    const size = mesh.high.map((high, axis) => high - mesh.low[axis]);
    const longest = Math.max(...size);
    const half = size.map(s => s / longest);
    const colours = mesh.materials.map(one => [1, 3, 5].map(
        at => parseInt(one.colour.slice(at, at + 2), 16) / 255));

    /* Positions about the middle of the mesh, its longest side 2 long. */
    const position = new Float32Array(packed.length);
    for (let i = 0; i < packed.length; ++i)
        position[i] = (2 * packed[i] / 65535 - 1) * half[i % 3];

    const normal = new Float32Array(packed.length);
    const minus = (a, b) => [0, 1, 2].map(k => position[3 * a + k] - position[3 * b + k]);
    for (let t = 0; t < triangles.length; t += 3) {
        const [a, b, c] = triangles.subarray(t, t + 3);
        const u = minus(b, a), v = minus(c, a);
        const cross = [u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2],
                       u[0] * v[1] - u[1] * v[0]];
        for (const corner of [a, b, c])
            for (let k = 0; k < 3; ++k) normal[3 * corner + k] += cross[k];
    }

    /* One vertex a corner, so that neighbours of two materials keep an edge of colour. */
    const flat = new Float32Array(triangles.length * 9);
    for (let i = 0; i < triangles.length; ++i) {
        const corner = triangles[i];
        flat.set(position.subarray(3 * corner, 3 * corner + 3), 9 * i);
        flat.set(normal.subarray(3 * corner, 3 * corner + 3), 9 * i + 3);
        flat.set(colours[material[Math.floor(i / 3)]] ?? [0.5, 0.5, 0.5], 9 * i + 6);
    }

    const shader = (kind, text) => {
        const made = gl.createShader(kind);
        gl.shaderSource(made, text);
        gl.compileShader(made);
        return made;
    };
    const program = gl.createProgram();
    gl.attachShader(program, shader(gl.VERTEX_SHADER, `
        attribute vec3 place, facing, colour;
        uniform mat4 view;
        uniform mat3 turn;
        varying vec3 shade, toward;
        varying float front;
        void main() {
            gl_Position = view * vec4(place, 1.0);
            toward = turn * facing;
            shade = colour;
            front = place.y;
        }`));
    gl.attachShader(program, shader(gl.FRAGMENT_SHADER, `
        precision mediump float;
        varying vec3 shade, toward;
        varying float front;
        uniform float cut, plain;
        void main() {
            if (plain > 0.5) { gl_FragColor = vec4(0.45, 0.48, 0.53, 1.0); return; }
            if (front < cut) discard;
            float light = abs(normalize(toward).z);
            vec3 base = gl_FrontFacing ? shade : vec3(0.72);
            gl_FragColor = vec4(base * (0.42 + 0.58 * light), 1.0);
        }`));
    gl.linkProgram(program);
    gl.useProgram(program);
    const buffer = data => {
        const made = gl.createBuffer();
        gl.bindBuffer(gl.ARRAY_BUFFER, made);
        gl.bufferData(gl.ARRAY_BUFFER, data, gl.STATIC_DRAW);
        return made;
    };
    const surface = buffer(flat);
    const box = [];
    for (let axis = 0; axis < 3; ++axis)
        for (const a of [-1, 1])
            for (const b of [-1, 1])
                for (const end of [-1, 1]) {
                    const point = [0, 0, 0];
                    point[axis] = end;
                    point[(axis + 1) % 3] = a;
                    point[(axis + 2) % 3] = b;
                    box.push(...point.map((p, k) => p * half[k]), 0, 0, 1, 0, 0, 0);
                }
    const edges = buffer(new Float32Array(box));
    const uniform = name => gl.getUniformLocation(program, name);
    const use = made => {
        gl.bindBuffer(gl.ARRAY_BUFFER, made);
        ["place", "facing", "colour"].forEach((name, at) => {
            const where = gl.getAttribLocation(program, name);
            if (where < 0) return;
            gl.enableVertexAttribArray(where);
            gl.vertexAttribPointer(where, 3, gl.FLOAT, false, 36, 12 * at);
        });
    };

    const lens = 2.6; // the view is 2 / lens high at distance 1
    const start = {around: 0.6, above: 0.45, distance: 1.12 * lens * Math.hypot(...half)};
    const eye = {...start};
    const slider = figure.querySelector(".cut");

    const draw = (width, height) => {
        const [ca, sa] = [Math.cos(eye.around), Math.sin(eye.around)];
        const [cb, sb] = [Math.cos(eye.above), Math.sin(eye.above)];
        /* x to the right, z up, seen from -y when nothing is turned. */
        const rows = [[ca, sa, 0], [-sa * sb, ca * sb, cb], [sa * cb, -ca * cb, sb]];
        const aspect = width / height, near = 0.1, far = 40;
        const wide = aspect > 1 ? lens / aspect : lens, tall = aspect > 1 ? lens : lens * aspect;
        const depth = -(far + near) / (far - near), shift = -2 * far * near / (far - near);
        const view = new Float32Array(16);
        for (let k = 0; k < 3; ++k)
            view.set([wide * rows[0][k], tall * rows[1][k], depth * rows[2][k], -rows[2][k]], 4 * k);
        view.set([0, 0, -depth * eye.distance + shift, eye.distance], 12);
        gl.viewport(0, 0, width, height);
        gl.clearColor(1, 1, 1, 1);
        gl.clear(gl.COLOR_BUFFER_BIT | gl.DEPTH_BUFFER_BIT);
        gl.enable(gl.DEPTH_TEST);
        gl.uniformMatrix4fv(uniform("view"), false, view);
        gl.uniformMatrix3fv(uniform("turn"), false, new Float32Array(
            [0, 1, 2].flatMap(k => [rows[0][k], rows[1][k], rows[2][k]])));
        gl.uniform1f(uniform("cut"), half[1] * (2 * slider.value / 100 - 1) - 1e-4);
        gl.uniform1f(uniform("plain"), 0);
        use(surface);
        gl.drawArrays(gl.TRIANGLES, 0, triangles.length);
        gl.uniform1f(uniform("plain"), 1);
        use(edges);
        gl.drawArrays(gl.LINES, 0, box.length / 9);
    };
    const show = () => {
        const scale = devicePixelRatio || 1;
        canvas.width = Math.round(canvas.clientWidth * scale);
        canvas.height = Math.round(canvas.clientHeight * scale);
        draw(canvas.width, canvas.height);
    };
    let due = false;
    const later = () => {
        if (due) return;
        due = true;
        requestAnimationFrame(() => { due = false; show(); });
    };
    const turn = (right, up) => {
        eye.around += right;
        eye.above = Math.max(-1.55, Math.min(1.55, eye.above + up));
        later();
    };
    const zoom = factor => {
        eye.distance = Math.max(1.2, Math.min(15, eye.distance * factor));
        later();
    };

    canvas.addEventListener("pointerdown", event => canvas.setPointerCapture(event.pointerId));
    canvas.addEventListener("pointermove", event => {
        if (event.buttons & 1) turn(-event.movementX / 150, event.movementY / 150);
    });
    canvas.addEventListener("wheel", event => {
        if (document.activeElement !== canvas) return; // the page scrolls until it is chosen
        event.preventDefault();
        zoom(Math.exp(event.deltaY / 600));
    }, {passive: false});
    const keys = {
        ArrowLeft: () => turn(-0.12, 0), ArrowRight: () => turn(0.12, 0),
        ArrowUp: () => turn(0, 0.12), ArrowDown: () => turn(0, -0.12),
        "+": () => zoom(1 / 1.15), "=": () => zoom(1 / 1.15), "-": () => zoom(1.15),
    };
    canvas.addEventListener("keydown", event => {
        if (!keys[event.key] || event.ctrlKey || event.metaKey) return;
        event.preventDefault();
        keys[event.key]();
    });
    slider.addEventListener("input", later);
    figure.querySelector(".reset").addEventListener("click", () => {
        Object.assign(eye, start);
        slider.value = 50;
        later();
    });
    figure.querySelector(".legend").append(...mesh.materials.filter(one => one.used).map(one => {
        const item = document.createElement("li"), swatch = document.createElement("span");
        swatch.style.background = one.colour;
        item.append(swatch, one.name);
        return item;
    }));
    figure.querySelector(".shot").addEventListener("click", () => {
        const page = document.createElement("canvas");
        page.width = 1920;
        page.height = 1080;
        canvas.width = 1920;
        canvas.height = 940;
        draw(canvas.width, canvas.height);
        const context = page.getContext("2d");
        context.fillStyle = "#fff";
        context.fillRect(0, 0, 1920, 1080);
        context.drawImage(canvas, 0, 80);
        context.fillStyle = "#111";
        context.font = "bold 34px DejaVu Sans, Verdana, sans-serif";
        context.fillText(mesh.title, 40, 56, 1840);
        context.font = "20px DejaVu Sans, Verdana, sans-serif";
        context.fillText("model prediction, not a released recipe · errors shown are numerical only",
                         40, 1056, 1840);
        show();
        page.toBlob(blob => rille.save(figure.id + ".png", blob), "image/png");
    });
    addEventListener("resize", later);
    addEventListener("beforeprint", show);
    show();
})();
