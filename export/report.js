// The live view of the report: turns, zooms, colours and tells values.
// Plain WebGL 2, no library. Everything it shows is in the page.
(() => {
"use strict";
const $ = (id) => document.getElementById(id);
const data = JSON.parse($("form").textContent);
const live = $("live"), canvas = live.querySelector("canvas"), tip = $("tip"), bar = $("bar"), still = $("still");
const gl = canvas.getContext("webgl2", { antialias: true, preserveDrawingBuffer: true });
if (!gl) return; // the drawing stays

const bytes = (s) => Uint8Array.from(atob(s), (c) => c.charCodeAt(0)).buffer;
const grid = new Int16Array(bytes(data.position)), n = grid.length / 3;
const P = new Float32Array(3 * n); // relative to the middle, m
for (let i = 0; i < 3 * n; i++) P[i] = grid[i] * data.step;
const T = data.wide ? new Uint32Array(bytes(data.corners)) : new Uint16Array(bytes(data.corners));
const nt = T.length / 3;
const values = data.layers.map((l) => new Float32Array(bytes(l.values)));
const R = data.radius || 1;

// --- what is drawn -------------------------------------------------------
const program = (vs, fs) => {
  const p = gl.createProgram();
  for (const [kind, src] of [[gl.VERTEX_SHADER, vs], [gl.FRAGMENT_SHADER, fs]]) {
    const s = gl.createShader(kind);
    gl.shaderSource(s, "#version 300 es\nprecision highp float;" + src);
    gl.compileShader(s);
    if (!gl.getShaderParameter(s, gl.COMPILE_STATUS)) throw new Error(gl.getShaderInfoLog(s));
    gl.attachShader(p, s);
  }
  gl.linkProgram(p);
  return p;
};
const sheet = program(
  "in vec3 p; in vec3 c; uniform mat4 m; out vec3 v; out float z; void main(){ v=c; z=p.z; gl_Position=m*vec4(p,1.); }",
  // Contours at a round spacing; colours are not shaded.
  "in vec3 v; in float z; uniform float gap; uniform float zero; out vec4 o; void main(){ float t=(z+zero)/gap; float d=abs(t-round(t))/max(fwidth(t),1e-6); o=vec4(mix(v*.62,v,gap>0.?clamp(d-.2,0.,1.):1.),1.); }");
const stroke = program(
  "in vec3 a; in vec3 b; in vec4 k; in vec3 c; uniform mat4 m; uniform vec2 px; out vec3 v;" +
  "void main(){ v=c; vec4 A=m*vec4(a,1.),B=m*vec4(b,1.); vec2 d=(B.xy/B.w-A.xy/A.w)*px; d=length(d)>1e-4?normalize(d):vec2(1,0);" +
  "vec4 q=k.x<.5?A:B; q.xy+=(vec2(-d.y,d.x)*k.y+d*(k.x*2.-1.)*abs(k.y)*.5)/px*q.w*2.*k.z; q.z-=.0006*q.w; gl_Position=q; }",
  "in vec3 v; out vec4 o; void main(){ o=vec4(v,1.); }");

const foot = program(
  "in vec3 p; uniform mat4 m; uniform vec2 px; uniform float size; void main(){ vec4 q=m*vec4(p,1.); q.y-=size*q.w/px.y; q.z-=.0006*q.w; gl_Position=q; gl_PointSize=size; }",
  "uniform vec3 c; out vec4 o; void main(){ if(abs(gl_PointCoord.x-.5)>gl_PointCoord.y*.5) discard; o=vec4(c,1.); }");

const buffer = (list) => { const b = gl.createBuffer(); gl.bindBuffer(gl.ARRAY_BUFFER, b); gl.bufferData(gl.ARRAY_BUFFER, list, gl.STATIC_DRAW); return b; };
const attribute = (p, name, b, size, stride = 0, at = 0) => {
  const l = gl.getAttribLocation(p, name);
  if (l < 0) return;
  gl.bindBuffer(gl.ARRAY_BUFFER, b); gl.enableVertexAttribArray(l); gl.vertexAttribPointer(l, size, gl.FLOAT, false, stride, at);
};
const hex = (s) => [1, 3, 5].map((i) => parseInt(s.slice(i, i + 2), 16) / 255);

const corners = new Float32Array(9 * nt);
for (let i = 0; i < 3 * nt; i++) for (let k = 0; k < 3; k++) corners[3 * i + k] = P[3 * T[i] + k];
const sheetPoints = buffer(corners);
let sheetColours = null;
const sheetArray = gl.createVertexArray();
let shown = 0;
const colourOf = (l, v) => {
  if (!(v === v)) return [0.5, 0.5, 0.5];
  const list = l.centred ? data.twoHues : data.oneHue;
  const t = l.centred ? (v - 1 + l.reach) / (2 * l.reach) : v / l.reach;
  return list[Math.max(0, Math.min(list.length - 1, Math.floor(t * list.length)))];
};
data.twoHues = data.twoHues.map(hex); data.oneHue = data.oneHue.map(hex);
const show = (i) => {
  shown = i;
  const l = data.layers[i], c = new Float32Array(9 * nt);
  if (l) for (let t = 0; t < nt; t++) { const v = colourOf(l, values[i][t]); for (let k = 0; k < 9; k++) c[9 * t + k] = v[k % 3]; }
  if (sheetColours) gl.deleteBuffer(sheetColours);
  sheetColours = buffer(c);
  gl.bindVertexArray(sheetArray);
  attribute(sheet, "p", sheetPoints, 3); attribute(sheet, "c", sheetColours, 3);
  for (const b of bar.querySelectorAll("button[data-layer]")) b.setAttribute("aria-pressed", String(+b.dataset.layer === i));
  if (l) {
    const list = l.centred ? data.twoHues : data.oneHue, lo = l.centred ? 1 - l.reach : 0, hi = l.centred ? 1 + l.reach : l.reach;
    $("scale").innerHTML = "";
    const round = (x) => document.createTextNode(String(+x.toPrecision(4)));
    const box = document.createElement("i");
    box.style.background = "linear-gradient(90deg," + list.filter((_, k) => k % 4 === 0 || k === list.length - 1).map((x) => "rgb(" + x.map((y) => Math.round(255 * y)) + ")") + ")";
    $("scale").append(round(lo), box, round(hi));
    $("scale").title = l.title;
  }
  draw();
};

// Lines: each a quad that faces the viewer, of a width in pixels.
const segments = []; // {a, b, part}
data.parts.forEach((part) => { for (let i = 1; i < part.nodes.length; i++) segments.push({ a: part.nodes[i - 1], b: part.nodes[i], part }); });
const lineArray = gl.createVertexArray(), lineCount = 6 * segments.length;
const dark = matchMedia("(prefers-color-scheme: dark)");
const inkOf = (part) => part.kind === "fixed" ? [0.62, 0.48, 0.18] : part.pushes ? (dark.matches ? [0.62, 0.67, 0.71] : [0.33, 0.37, 0.4]) : dark.matches ? [0.88, 0.91, 0.93] : [0.12, 0.15, 0.18];
const lines = () => {
  const f = new Float32Array(13 * lineCount);
  let o = 0;
  for (const s of segments) for (const [end, side] of [[0, -1], [1, -1], [1, 1], [0, -1], [1, 1], [0, 1]]) {
    for (const i of [s.a, s.b]) for (let k = 0; k < 3; k++) f[o++] = P[3 * i + k];
    f[o++] = end; f[o++] = side; f[o++] = s.part.width / 2; f[o++] = 0;
    for (const c of inkOf(s.part)) f[o++] = c;
  }
  const b = buffer(f);
  gl.bindVertexArray(lineArray);
  attribute(stroke, "a", b, 3, 52, 0); attribute(stroke, "b", b, 3, 52, 12); attribute(stroke, "k", b, 4, 52, 24); attribute(stroke, "c", b, 3, 52, 40);
};
const feet = data.points.filter((p) => p.foot), footArray = gl.createVertexArray();
gl.bindVertexArray(footArray);
attribute(foot, "p", buffer(new Float32Array(feet.flatMap((p) => [0, 1, 2].map((k) => P[3 * p.node + k])))), 3);
dark.addEventListener("change", () => { lines(); draw(); });

// --- the camera ----------------------------------------------------------
const home = { az: -60, el: 26, zoom: innerWidth < 600 ? 1.05 : 1.3, x: 0, y: 0 };
const cam = { ...home };
let M = new Float32Array(16), eye = [0, 0, 0], axes = null;
const sub = (a, b) => [a[0] - b[0], a[1] - b[1], a[2] - b[2]], dot = (a, b) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const cross = (a, b) => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
const matrix = (w, h) => {
  const a = cam.az * Math.PI / 180, e = cam.el * Math.PI / 180;
  const to = [Math.cos(e) * Math.cos(a), Math.cos(e) * Math.sin(a), Math.sin(e)], right = [-Math.sin(a), Math.cos(a), 0], up = cross(to, right);
  axes = { to, right, up };
  const fov = 0.5, ratio = w / h, reach = R / Math.sin(Math.atan(Math.tan(fov / 2) * Math.min(1, ratio))) / cam.zoom;
  const mid = [0, 1, 2].map((k) => cam.x * right[k] + cam.y * up[k]);
  eye = [0, 1, 2].map((k) => mid[k] + reach * to[k]);
  const near = Math.max(reach - 2.5 * R, reach / 100), far = reach + 2.5 * R, f = 1 / Math.tan(fov / 2);
  const A = (far + near) / (near - far), B = 2 * far * near / (near - far);
  const view = [right, up, to], m = new Float32Array(16);
  const proj = [f / ratio, f];
  for (let c = 0; c < 3; c++) {
    m[4 * c] = proj[0] * right[c]; m[4 * c + 1] = proj[1] * up[c]; m[4 * c + 2] = A * to[c]; m[4 * c + 3] = -to[c];
  }
  m[12] = -proj[0] * dot(view[0], eye); m[13] = -proj[1] * dot(view[1], eye); m[14] = -A * dot(view[2], eye) + B; m[15] = dot(view[2], eye);
  return m;
};
const project = (i, w, h) => { // pixels of the page and depth
  const x = P[3 * i], y = P[3 * i + 1], z = P[3 * i + 2], v = (r) => M[r] * x + M[4 + r] * y + M[8 + r] * z + M[12 + r];
  const q = v(3);
  return [(v(0) / q + 1) / 2 * w, (1 - v(1) / q) / 2 * h, q];
};

let waiting = false;
const draw = () => { if (!waiting) { waiting = true; requestAnimationFrame(paint); } };
const paint = () => {
  waiting = false;
  const scale = Math.min(devicePixelRatio || 1, 2), w = canvas.clientWidth, h = canvas.clientHeight;
  if (!w || !h) return;
  if (canvas.width !== Math.round(w * scale) || canvas.height !== Math.round(h * scale)) { canvas.width = Math.round(w * scale); canvas.height = Math.round(h * scale); }
  M = matrix(w, h);
  gl.viewport(0, 0, canvas.width, canvas.height);
  gl.clearColor(0, 0, 0, 0); gl.clear(gl.COLOR_BUFFER_BIT | gl.DEPTH_BUFFER_BIT); gl.enable(gl.DEPTH_TEST);
  if (nt) {
    gl.useProgram(sheet); gl.bindVertexArray(sheetArray);
    gl.uniformMatrix4fv(gl.getUniformLocation(sheet, "m"), false, M);
    gl.uniform1f(gl.getUniformLocation(sheet, "gap"), data.contour); gl.uniform1f(gl.getUniformLocation(sheet, "zero"), data.zero);
    gl.drawArrays(gl.TRIANGLES, 0, 3 * nt);
  }
  gl.useProgram(stroke); gl.bindVertexArray(lineArray);
  gl.uniformMatrix4fv(gl.getUniformLocation(stroke, "m"), false, M);
  gl.uniform2f(gl.getUniformLocation(stroke, "px"), w, h);
  gl.drawArrays(gl.TRIANGLES, 0, lineCount);
  gl.useProgram(foot); gl.bindVertexArray(footArray);
  gl.uniformMatrix4fv(gl.getUniformLocation(foot, "m"), false, M);
  gl.uniform2f(gl.getUniformLocation(foot, "px"), canvas.width, canvas.height);
  gl.uniform1f(gl.getUniformLocation(foot, "size"), 11 * scale);
  gl.uniform3f(gl.getUniformLocation(foot, "c"), 0.62, 0.48, 0.18);
  gl.drawArrays(gl.POINTS, 0, feet.length);
};

// --- what is under the pointer -------------------------------------------
const under = (x, y) => {
  const w = canvas.clientWidth, h = canvas.clientHeight;
  let best = null;
  // The fabric first: the ray from the eye.
  const u = 2 * x / w - 1, v = 1 - 2 * y / h, f = Math.tan(0.25);
  const d = [0, 1, 2].map((k) => -axes.to[k] + f * (u * w / h * axes.right[k] + v * axes.up[k]));
  let hit = Infinity, tri = -1;
  for (let t = 0; t < nt; t++) {
    const o = 9 * t, ax = corners[o], ay = corners[o + 1], az = corners[o + 2];
    const e1x = corners[o + 3] - ax, e1y = corners[o + 4] - ay, e1z = corners[o + 5] - az, e2x = corners[o + 6] - ax, e2y = corners[o + 7] - ay, e2z = corners[o + 8] - az;
    const px = d[1] * e2z - d[2] * e2y, py = d[2] * e2x - d[0] * e2z, pz = d[0] * e2y - d[1] * e2x, det = e1x * px + e1y * py + e1z * pz;
    if (Math.abs(det) < 1e-12) continue;
    const sx = eye[0] - ax, sy = eye[1] - ay, sz = eye[2] - az, b = (sx * px + sy * py + sz * pz) / det;
    if (b < 0 || b > 1) continue;
    const qx = sy * e1z - sz * e1y, qy = sz * e1x - sx * e1z, qz = sx * e1y - sy * e1x, c = (d[0] * qx + d[1] * qy + d[2] * qz) / det;
    if (c < 0 || b + c > 1) continue;
    const k = (e2x * qx + e2y * qy + e2z * qz) / det;
    if (k > 0 && k < hit) { hit = k; tri = t; }
  }
  if (tri >= 0) best = { tri, depth: hit };
  const behind = (q) => best && best.tri !== undefined && q > hit + 0.02 * R;
  let near = 7;
  for (const s of segments) {
    const a = project(s.a, w, h), b = project(s.b, w, h), dx = b[0] - a[0], dy = b[1] - a[1], l = dx * dx + dy * dy;
    const k = l ? Math.max(0, Math.min(1, ((x - a[0]) * dx + (y - a[1]) * dy) / l)) : 0;
    const far = Math.hypot(x - a[0] - k * dx, y - a[1] - k * dy) - s.part.width / 2;
    if (far < near && !behind(a[2] + k * (b[2] - a[2]))) { near = far; best = { part: s.part, depth: 0 }; }
  }
  near = 9;
  for (const p of data.points) {
    const a = project(p.node, w, h), far = Math.hypot(x - a[0], y - a[1]);
    if (far < near && !behind(a[2])) { near = far; best = { point: p, depth: 0 }; }
  }
  return best;
};
const figure = (v) => !(v === v) ? "–" : (+v.toPrecision(4)).toString();
const words = (u) => {
  if (u.point) return u.point.text;
  if (u.part) return u.part.text;
  const lines = ["triangle " + u.tri + ", " + data.fabrics[data.fabricOf[Math.max(0, data.fabricOf.findIndex((r) => u.tri < r[1]))][0]]];
  data.layers.forEach((l, k) => { if (l.short) lines.push(l.short + " " + figure(values[k][u.tri]) + (l.unit || "")); });
  return lines.join("\n");
};
const tell = (x, y) => {
  const u = x === undefined ? null : under(x, y);
  tip.style.display = u ? "block" : "none";
  if (!u) return;
  tip.textContent = words(u);
  tip.style.left = Math.min(x + 14, canvas.clientWidth - tip.offsetWidth - 4) + "px";
  tip.style.top = Math.min(y + 14, canvas.clientHeight - tip.offsetHeight - 4) + "px";
};

// --- hands ---------------------------------------------------------------
const fingers = new Map();
const place = (e) => { const b = canvas.getBoundingClientRect(); return [e.clientX - b.left, e.clientY - b.top]; };
const shift = (dx, dy) => { const k = 2 * R / canvas.clientHeight / cam.zoom; cam.x -= dx * k; cam.y += dy * k; };
const zoom = (k) => { cam.zoom = Math.max(0.3, Math.min(60, cam.zoom * k)); };
const turn = (dx, dy) => { cam.az -= 0.4 * dx; cam.el = Math.max(-89.9, Math.min(89.9, cam.el + 0.4 * dy)); };
canvas.addEventListener("pointerdown", (e) => { canvas.setPointerCapture(e.pointerId); fingers.set(e.pointerId, place(e)); tell(); });
canvas.addEventListener("pointermove", (e) => {
  const p = place(e), old = fingers.get(e.pointerId);
  if (!old) { tell(...p); return; }
  const dx = p[0] - old[0], dy = p[1] - old[1];
  if (fingers.size === 2) {
    const other = [...fingers].find(([id]) => id !== e.pointerId)[1];
    const was = Math.hypot(old[0] - other[0], old[1] - other[1]), is = Math.hypot(p[0] - other[0], p[1] - other[1]);
    if (was > 0) zoom(is / was);
    shift(dx / 2, dy / 2);
  } else if (e.shiftKey || e.buttons & 6) shift(dx, dy); else turn(dx, dy);
  fingers.set(e.pointerId, p);
  draw();
});
for (const kind of ["pointerup", "pointercancel"]) canvas.addEventListener(kind, (e) => { fingers.delete(e.pointerId); if (e.pointerType === "touch" && kind === "pointerup") tell(...place(e)); });
canvas.addEventListener("pointerleave", () => tell());
canvas.addEventListener("wheel", (e) => { e.preventDefault(); zoom(Math.exp(-0.0012 * e.deltaY)); draw(); }, { passive: false });
canvas.addEventListener("contextmenu", (e) => e.preventDefault());
canvas.addEventListener("keydown", (e) => {
  const step = { ArrowLeft: [-12, 0], ArrowRight: [12, 0], ArrowUp: [0, -12], ArrowDown: [0, 12] }[e.key];
  if (step) e.shiftKey ? shift(...step) : turn(...step);
  else if (e.key === "+" || e.key === "=") zoom(1.15);
  else if (e.key === "-") zoom(1 / 1.15);
  else if (e.key === "Home" || e.key === "0") Object.assign(cam, home);
  else if (e.key >= "1" && e.key <= "9" && data.layers[e.key - 1]) show(e.key - 1);
  else return;
  e.preventDefault();
  draw();
});
for (const b of bar.querySelectorAll("button")) b.addEventListener("click", () => {
  if (b.dataset.layer !== undefined) show(+b.dataset.layer);
  else { const [az, el] = b.dataset.view.split(","); Object.assign(cam, home, { az: +az, el: +el }); draw(); }
});

lines();
live.hidden = false; bar.hidden = false; still.hidden = true;
show(0);
new ResizeObserver(draw).observe(canvas);
})();
