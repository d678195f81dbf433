/* The picture: the chain from the link table, in three views. Lengths in metres, x to the right, y up on paper. */

const multiplied = (a, b) => a.map((row) => [0, 1, 2, 3].map((j) => row.reduce((sum, x, k) => sum + x * b[k][j], 0)));
const aboutZ = (angle, along) => {
  const c = Math.cos(angle), s = Math.sin(angle);
  return [[c, -s, 0, 0], [s, c, 0, 0], [0, 0, 1, along], [0, 0, 0, 1]];
};
const aboutX = (angle, along) => {
  const c = Math.cos(angle), s = Math.sin(angle);
  return [[1, 0, 0, along], [0, c, -s, 0], [0, s, c, 0], [0, 0, 0, 1]];
};
const column = (pose, j) => [pose[0][j], pose[1][j], pose[2][j]];
const plus = (a, b, factor = 1) => a.map((x, i) => x + factor * b[i]);
const dot = (a, b) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
const cross = (a, b) => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];
const size = (a) => Math.sqrt(dot(a, a));
const unit = (a) => a.map((x) => x / size(a));

/* Everything to draw at joint values q: segments of the chain, joints, the tool frame. */
function sceneAt(q) {
  let pose = arm.base;
  const standard = arm.convention === "standard";
  const segments = [{ from: [0, 0, 0], to: column(pose, 3), fixed: true }];
  const joints = [];
  arm.joints.forEach((joint, i) => {
    const z = aboutZ(joint.theta + (joint.turns ? q[i] : 0), joint.d + (joint.turns ? 0 : q[i]));
    const x = aboutX(joint.alpha, joint.a);
    const middle = multiplied(pose, standard ? z : x);
    const end = multiplied(middle, standard ? x : z);
    const [onAxis, frame] = standard ? [column(pose, 3), pose] : [column(middle, 3), end];
    const axisEnd = standard ? column(middle, 3) : column(end, 3);
    segments.push({ from: column(pose, 3), to: column(middle, 3) }, { from: column(middle, 3), to: column(end, 3) });
    const axis = column(frame, 2);
    const centre = plus(onAxis.map((x, k) => (x + axisEnd[k]) / 2), axis, joint.shift);
    const past = joint.limits !== null && (q[i] < joint.limits[0] - 1e-9 || q[i] > joint.limits[1] + 1e-9);
    joints.push({ number: i + 1, centre, axis, turns: joint.turns, past });
    pose = end;
  });
  const tool = multiplied(pose, arm.tool);
  segments.push({ from: column(pose, 3), to: column(tool, 3), fixed: true });
  return { segments, joints, tool };
}

function obliqueView(azimuth) {
  const a = (azimuth * Math.PI) / 180, e = (24 * Math.PI) / 180;
  const level = [Math.cos(a), Math.sin(a), 0];
  const up = [-Math.sin(e) * level[0], -Math.sin(e) * level[1], Math.cos(e)];
  const toward = [Math.cos(e) * level[0], Math.cos(e) * level[1], Math.sin(e)];
  return { rows: [[-Math.sin(a), Math.cos(a), 0], up], toward, right: "", up: "", oblique: true };
}

const extent = [...arm.extent, [0, 0, 0]];
const [lowest, highest] = [Math.min, Math.max].map((most) => [0, 1, 2].map((i) => most(...extent.map((point) => point[i]))));

/* From metres to pixels of a picture of the given width and height, so that every posture fits. */
function paperOf(view, width, height) {
  const flat = extent.map((point) => view.rows.map((row) => dot(row, point)));
  const low = [0, 1].map((i) => Math.min(...flat.map((point) => point[i])));
  const high = [0, 1].map((i) => Math.max(...flat.map((point) => point[i])));
  const margin = 26;
  const scale = Math.min((width - 2 * margin) / (high[0] - low[0] || 1), (height - 2 * margin) / (high[1] - low[1] || 1));
  const place = (point) => {
    const [x, y] = view.rows.map((row) => dot(row, point));
    return [width / 2 + (x - (low[0] + high[0]) / 2) * scale, height / 2 - (y - (low[1] + high[1]) / 2) * scale];
  };
  return { place, scale, width, height, symbol: Math.max(arm.mark, Math.min(22, width / 22, height / 16) / scale) };
}

const path = (points, closed) => "M" + points.map((p) => `${p[0].toFixed(1)} ${p[1].toFixed(1)}`).join("L") + (closed ? "Z" : "");
const line = (name, points, closed = false) => `<path class="${name}" d="${path(points, closed)}"/>`;

/* Convex hull (Andrew's monotone chain, Information Processing Letters 9(5), 1979). */
function hull(points) {
  const sorted = points.slice().sort((a, b) => a[0] - b[0] || a[1] - b[1]);
  const half = (list) => {
    const chain = [];
    for (const p of list) {
      while (chain.length > 1) {
        const a = chain[chain.length - 2], b = chain[chain.length - 1];
        if ((b[0] - a[0]) * (p[1] - a[1]) - (b[1] - a[1]) * (p[0] - a[0]) > 0) break;
        chain.pop();
      }
      chain.push(p);
    }
    return chain.slice(0, -1);
  };
  return [...half(sorted), ...half(sorted.reverse())];
}

function jointShape(joint, view, paper) {
  const least = [0, 1, 2].reduce((best, i) => (Math.abs(joint.axis[i]) < Math.abs(joint.axis[best]) - 1e-6 ? i : best), 0);
  const first = unit(cross(joint.axis, [0, 1, 2].map((i) => (i === least ? 1 : 0))));
  const second = cross(joint.axis, first);
  const count = joint.turns ? 28 : 4;
  const length = paper.symbol;
  const end = (side) => Array.from({ length: count }, (_, k) => {
    const angle = (2 * Math.PI * (k + 0.5)) / count;
    const rim = plus(plus(joint.centre, first, 0.36 * length * Math.cos(angle)), second, 0.36 * length * Math.sin(angle));
    return paper.place(plus(rim, joint.axis, (side * length) / 2));
  });
  const near = end(dot(joint.axis, view.toward) >= 0 ? 1 : -1);
  const name = `joint${joint.turns ? "" : " slide"}${joint.past ? " past" : ""}`;
  return line(name, hull([...near, ...end(dot(joint.axis, view.toward) >= 0 ? -1 : 1)]), true) + line(name, near, true);
}

function groundLines(view, paper) {
  const [low, high] = [lowest, highest];
  const widest = Math.max(high[0] - low[0], high[1] - low[1]) || 1;
  if (!view.oblique) {
    const reach = 2 * widest + 2 * Math.abs(high[2]) + 2 * Math.abs(low[2]);
    const across = [[-reach, 0, 0], [reach, 0, 0]], along = [[0, -reach, 0], [0, reach, 0]];
    return [across, along].map((ends) => line("ground", ends.map(paper.place))).join("");
  }
  const step = roundLength(widest / 6);
  const [x0, x1, y0, y1] = [[low[0], -1], [high[0], 1], [low[1], -1], [high[1], 1]].map(([x, side]) =>
    step * (side < 0 ? Math.floor(Math.min(x, 0) / step) : Math.ceil(Math.max(x, 0) / step)));
  const lines = [];
  for (let x = x0; x <= x1 + step / 2; x += step) lines.push([[x, y0, 0], [x, y1, 0]]);
  for (let y = y0; y <= y1 + step / 2; y += step) lines.push([[x0, y, 0], [x1, y, 0]]);
  return lines.map((ends) => line("ground", ends.map(paper.place))).join("");
}

/* The largest 1, 2 or 5 times a power of ten that is no longer. */
function roundLength(length) {
  const power = 10 ** Math.floor(Math.log10(length));
  return [5, 2, 1].map((factor) => factor * power).find((rounded) => rounded <= length * 1.000001);
}

function frameArrows(pose, paper) {
  const origin = column(pose, 3), reach = 1.7 * paper.symbol;
  return ["x", "y", "z"].map((name, j) => {
    const from = paper.place(origin), to = paper.place(plus(origin, column(pose, j), reach));
    const step = [to[0] - from[0], to[1] - from[1]], seen = Math.hypot(...step);
    if (seen < 7) return "";
    const [u, v] = [step[0] / seen, step[1] / seen];
    const head = [[-7, 4], [0, 0], [-7, -4]].map(([a, b]) => [to[0] + a * u - b * v, to[1] + a * v + b * u]);
    const text = `<text class="label small" x="${(to[0] + 9 * u).toFixed(1)}" y="${(to[1] + 9 * v + 4).toFixed(1)}" text-anchor="middle">${name}</text>`;
    return line(`arrow ${name}`, [from, to]) + `<path class="arrow ${name}" style="stroke-dasharray:none" d="${path(head)}"/>` + text;
  }).join("");
}

function targetMark(target, paper) {
  const [x, y] = paper.place(target.p);
  if (!Number.isFinite(x + y)) return "";
  const cross = `M${x - 13} ${y}h8M${x + 5} ${y}h8M${x} ${y - 13}v8M${x} ${y + 5}v8`;
  return `<circle class="target" cx="${x}" cy="${y}" r="9"/><path class="target" d="${cross}"/>`;
}

function scaleBar(paper) {
  const length = roundLength(Math.min(paper.width / 4, 90) / paper.scale);
  const x = 12, y = paper.height - 12, long = length * paper.scale;
  const text = `${Number((length / arm.lengthUnit.size).toPrecision(6))} ${arm.lengthUnit.name}`;
  return `<path class="scale" d="M${x} ${y - 4}v8m0 -4h${long}m0 -4v8"/><text class="small" x="${x}" y="${y - 8}">${text}</text>`;
}

function directions(view, paper) {
  const x = paper.width - 56, y = paper.height - 16;
  if (!view.oblique) {
    const right = view.right.length < 3 ? `x="${x + 28}" y="${y + 4}"` : `text-anchor="end" x="${paper.width - 8}" y="${y + 14}"`;
    return `<path class="scale" d="M${x} ${y}h24m-5 -3l5 3l-5 3M${x} ${y}v-24m-3 5l3 -5l3 5"/>`
      + `<text class="small" ${right}>${view.right}</text><text class="small" x="${x - 4}" y="${y - 28}">${view.up}</text>`;
  }
  const centre = [paper.width - 36, paper.height - 34];
  return ["x", "y", "z"].map((name, j) => {
    const [u, v] = view.rows.map((row) => 22 * row[j]);
    return `<path class="scale" d="M${centre[0]} ${centre[1]}l${u.toFixed(1)} ${(-v).toFixed(1)}"/>`
      + `<text class="small" text-anchor="middle" x="${(centre[0] + 1.4 * u).toFixed(1)}" y="${(centre[1] - 1.4 * v + 4).toFixed(1)}">${name}</text>`;
  }).join("");
}

function drawView(svg, view, scene, target) {
  const width = svg.clientWidth || 400, height = svg.clientHeight || 300;
  const paper = paperOf(view, width, height);
  const depth = (point) => dot(point, view.toward);
  const items = [];
  for (const { from, to, fixed } of scene.segments) {
    if (size(plus(from, to, -1)) < 1e-9) continue;
    items.push([depth(plus(from, to)) / 2, line(fixed ? "fixed" : "link", [paper.place(from), paper.place(to)])]);
  }
  const labels = [], taken = [];
  for (const joint of scene.joints) {
    const reach = 1.25 * paper.symbol;
    const ends = [-reach, reach].map((along) => paper.place(plus(joint.centre, joint.axis, along)));
    items.push([depth(joint.centre) + 1e-6, line("axis", ends) + jointShape(joint, view, paper)]);
    labels.push(labelOf(joint, paper, taken));
  }
  items.sort((a, b) => a[0] - b[0]);
  const tool = column(scene.tool, 3);
  const drop = view.oblique ? line("drop", [paper.place(tool), paper.place([tool[0], tool[1], 0])]) : "";
  svg.setAttribute("viewBox", `0 0 ${width} ${height}`);
  svg.innerHTML = groundLines(view, paper) + drop + items.map((item) => item[1]).join("") + labels.join("")
    + frameArrows(scene.tool, paper) + targetMark(target, paper) + scaleBar(paper) + directions(view, paper);
}

/* A joint's number beside it, moved on where another number stands. */
function labelOf(joint, paper, taken) {
  const [x, y] = paper.place(joint.centre);
  const around = [0, 1, 2, 3, 4, 5, 6, 7].map((k) => [x + 21 * Math.cos((k * Math.PI) / 4 - 0.6), y + 21 * Math.sin((k * Math.PI) / 4 - 0.6)]);
  const free = around.find((place) => taken.every((other) => Math.hypot(place[0] - other[0], place[1] - other[1]) > 15)) || around[0];
  taken.push(free);
  return `<text class="label" text-anchor="middle" x="${free[0].toFixed(1)}" y="${(free[1] + 4).toFixed(1)}">${joint.number}${joint.past ? "!" : ""}</text>`;
}
