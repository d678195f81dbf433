/* The controls. `state` holds everything: joint values and target in SI units, and the branches of the target. */

const OK = 0, BAD_INPUT = 1, OUT_OF_REACH = 3, OVER_LIMIT = 4, SINGULAR = 5;
const STATES = {
  [OK]: ["good", "within limits"],
  [SINGULAR]: ["free", "singular: a joint is free"],
  [OVER_LIMIT]: ["over", "over a limit"],
  [OUT_OF_REACH]: ["none", "out of reach"],
};
const SAME = 1e-6; // rad or m: joint values nearer than this are one posture
const PATIENCE = arm.numeric ? 160 : 0; // ms before the branches of a moving target are found: tracking takes its time

const element = (id) => document.getElementById(id);
const count = arm.joints.length;
const unitOf = (joint) => (joint.turns ? arm.angleUnit : arm.lengthUnit);
const DIGITS = { m: 5, mm: 2, rad: 4, deg: 2 };
const shown = (value, unit, more = 0) => {
  const text = (value / unit.size).toFixed(DIGITS[unit.name] + more);
  return /^-0\.?0*$/.test(text) ? text.slice(1) : text;
};
const views = [obliqueView(-58), ...arm.views];
const state = { q: arm.opening.slice(), pose: kinematics.pose(), target: kinematics.pose(), found: [], chosen: -1 };

/* Fixed axes: Rz(yaw) Ry(pitch) Rx(roll); where the pitch is a right angle the roll counts as 0. */
function anglesOf(r) {
  const level = Math.hypot(r[0][0], r[1][0]);
  const pitch = Math.atan2(-r[2][0], level);
  if (level < 1e-9) return [0, pitch, Math.atan2(-r[0][1], r[1][1])];
  return [Math.atan2(r[2][1], r[2][2]), pitch, Math.atan2(r[1][0], r[0][0])];
}
function turnBy([roll, pitch, yaw]) {
  const [a, b, c] = [yaw, pitch, roll].map(Math.cos), [d, e, f] = [yaw, pitch, roll].map(Math.sin);
  return [[a * b, a * e * f - d * c, a * e * c + d * f], [d * b, d * e * f + a * c, d * e * c - a * f], [-e, b * f, b * c]];
}

const TARGET = ["x", "y", "z", "roll", "pitch", "yaw"];
const unitOfEntry = (i) => (i < 3 ? arm.lengthUnit : arm.angleUnit);

/* All but the field of the joint whose value is being typed. */
function showJoints(typed = -1) {
  arm.joints.forEach((joint, i) => {
    const unit = unitOf(joint), slider = element(`slider-${i}`);
    slider.value = state.q[i] / unit.size;
    slider.setAttribute("aria-valuetext", `${shown(state.q[i], unit)} ${unit.name}`);
    if (i !== typed) element(`value-${i}`).value = shown(state.q[i], unit);
    const past = joint.limits !== null && (state.q[i] < joint.limits[0] - 1e-9 || state.q[i] > joint.limits[1] + 1e-9);
    element(`row-${i}`).classList.toggle("over", past);
  });
}

function showPose() {
  const { r, p } = state.pose;
  [...p, ...anglesOf(r)].forEach((value, i) => {
    element(`tool-${TARGET[i]}`).textContent = shown(value, unitOfEntry(i), 1);
  });
  r.forEach((row, i) => row.forEach((value, j) => {
    element(`tool-r${i}${j}`).textContent = value.toFixed(5).replace(/^-(0\.0*)$/, "$1");
  }));
  const gap = Math.hypot(...[0, 1, 2].map((i) => p[i] - state.target.p[i]));
  element("gap").textContent = Number((gap / arm.lengthUnit.size).toPrecision(3));
}

function showTarget() {
  [...state.target.p, ...anglesOf(state.target.r)].forEach((value, i) => {
    element(`target-${TARGET[i]}`).value = shown(value, unitOfEntry(i), 1);
  });
}

function draw() {
  const scene = sceneAt(state.q);
  views.forEach((view, k) => drawView(element(`view-${k}`), view, scene, state.target));
}

let waiting = 0; // the timer of branches that are still to be found

/* Every branch of the target, from where the joints are now. */
function solve() {
  clearTimeout(waiting);
  const q = Array.from({ length: arm.branches }, () => Array(count).fill(NaN));
  const statuses = Array(arm.branches).fill(OUT_OF_REACH);
  kinematics.inverse_all(state.target, state.q, q, statuses);
  state.found = q.map((values, b) => ({ q: values, status: statuses[b] }));
  markChosen();
  listPostures();
}

/* The branch that the joints are on: of those that coincide here, the one that branch_of names. */
function markChosen() {
  const here = state.found.map(({ q, status }) => status !== OUT_OF_REACH && q.every((value, i) => Math.abs(value - state.q[i]) < SAME));
  const named = kinematics.branch_of(state.q);
  state.chosen = here[named] ? named : here.indexOf(true);
}

function listPostures() {
  const reached = state.found.filter(({ status }) => status in STATES && status !== OUT_OF_REACH);
  const within = reached.filter(({ status }) => status !== OVER_LIMIT);
  element("status").textContent = statusText(reached.length, within.length);
  const list = element("posture-list"), focused = document.activeElement;
  const kept = list.contains(focused) ? focused.value : null;
  list.replaceChildren(...state.found.map(postureRow));
  showChosen();
  if (kept !== null) list.querySelector(`input[value="${kept}"]`)?.focus();
}

function statusText(reached, within) {
  if (state.found.every(({ status }) => status === BAD_INPUT)) return "The target is no pose that can be read.";
  if (reached === 0) return "No branch reaches this target.";
  return `${reached} of ${arm.branches} ${arm.branches === 1 ? "branch reaches" : "branches reach"} this target, ${within} within the limits.`;
}

function made(tag, name, text = "") {
  const node = document.createElement(tag);
  if (name) node.className = name;
  node.textContent = text;
  return node;
}

function postureRow({ q, status }, branch) {
  const there = status in STATES && status !== OUT_OF_REACH;
  const [name, text] = STATES[status] ?? ["none", "bad input"];
  const row = made("label", `posture${there ? "" : " none"}`);
  const choice = made("input");
  Object.assign(choice, { type: "radio", name: "posture", value: branch, disabled: !there });
  choice.addEventListener("change", () => moveTo(q, branch));
  const values = made("span", "values");
  if (there) values.append(...q.map((value, i) => jointValue(value, arm.joints[i])));
  row.append(choice, made("span", "", String(branch)), made("span", `state ${name}`, text), values);
  return row;
}

function jointValue(value, joint) {
  const past = joint.limits !== null && (value < joint.limits[0] - 1e-9 || value > joint.limits[1] + 1e-9);
  const cell = made("span");
  cell.append(made("small", "", joint.name), made("span", past ? "past" : "", shown(value, unitOf(joint))));
  return cell;
}

function showChosen() {
  element("posture-list").querySelectorAll("label").forEach((row, b) => {
    row.classList.toggle("chosen", b === state.chosen);
    row.firstChild.checked = b === state.chosen;
  });
}

function reach(q) {
  state.q = q.slice();
  kinematics.forward(state.q, state.pose);
}

function showArm(typed) {
  showJoints(typed);
  showPose();
  draw();
}

function moveTo(q, branch) {
  reach(q);
  state.chosen = branch;
  showChosen();
  showArm();
}

/* At once where that is quick; else when the target rests, and until then no posture of the target before can be picked. */
function solveSoon() {
  clearTimeout(waiting);
  if (PATIENCE === 0) {
    solve();
    return;
  }
  element("status").textContent = "Finding the postures ...";
  element("posture-list").querySelectorAll("input").forEach((choice) => {
    choice.disabled = true;
  });
  waiting = setTimeout(solve, PATIENCE);
}

/* The joints were moved: the target goes along. */
function jointsMoved(typed) {
  reach(state.q);
  takeTarget(typed);
}

function takeTarget(typed) {
  state.target.become(state.pose);
  showTarget();
  showArm(typed);
  solveSoon();
}

function targetTyped() {
  const entries = TARGET.map((name, i) => (element(`target-${name}`).value === "" ? NaN : Number(element(`target-${name}`).value)) * unitOfEntry(i).size);
  const r = turnBy(entries.slice(3));
  for (let i = 0; i < 3; ++i) {
    state.target.p[i] = entries[i];
    for (let j = 0; j < 3; ++j) state.target.r[i][j] = arm.readsRotation ? r[i][j] : state.pose.r[i][j];
  }
  showPose();
  draw();
  solveSoon();
}

function moveToNearest() {
  const q = state.q.slice(), branch = [0];
  const status = kinematics.inverse_nearest(state.target, state.q, q, branch);
  if (status === OUT_OF_REACH || status === BAD_INPUT) return solve();
  reach(q);
  showArm();
  solve();
}

arm.joints.forEach((joint, i) => {
  const unit = unitOf(joint);
  element(`slider-${i}`).addEventListener("input", (event) => {
    state.q[i] = Number(event.target.value) * unit.size;
    jointsMoved();
  });
  element(`value-${i}`).addEventListener("input", (event) => {
    if (event.target.value === "" || !Number.isFinite(event.target.valueAsNumber)) return;
    state.q[i] = event.target.valueAsNumber * unit.size;
    jointsMoved(i);
  });
  element(`value-${i}`).addEventListener("blur", () => showJoints());
});
TARGET.forEach((name, i) => {
  const box = element(`target-${name}`);
  box.disabled = i >= 3 && !arm.readsRotation;
  box.addEventListener("input", targetTyped);
});
element("rest").addEventListener("click", () => {
  state.q = arm.rest.slice();
  jointsMoved();
});
element("nearest").addEventListener("click", moveToNearest);
element("follow").addEventListener("click", () => takeTarget());
element("azimuth").addEventListener("input", (event) => {
  views[0] = obliqueView(Number(event.target.value));
  draw();
});
document.documentElement.style.setProperty("--joints", count);
new ResizeObserver(draw).observe(element("view-0"));
jointsMoved();
