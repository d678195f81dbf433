"""The page's kinematics run by node over whole batches, as numpy arrays: every output, left-alone ones included."""

from __future__ import annotations

import json
import subprocess
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from build_checks.compile import CANARY, CANARY_BRANCH, UNWRITTEN, Kinematics
from build_checks.reference import Array, Reference
from codegen.javascript import javascript
from codegen.model import Arm
from codegen.options import Options, RealType
from codegen.pipeline import generate

_RUNNER = """\
"use strict";
const { readFileSync, writeFileSync } = require("fs");
const kinematics = KINEMATICS;
const { joints, branches, canary, branch: canaryBranch, unwritten } = JSON.parse(readFileSync(0, "utf8"));
const numbers = (file) => {
  const bytes = readFileSync(file);
  return Array.from(new Float64Array(bytes.buffer, bytes.byteOffset, bytes.length / 8));
};
const rows = (values, width) => Array.from({ length: values.length / width }, (_, i) =>
  values.slice(i * width, (i + 1) * width));
const out = [];
const list = (count, value) => Array(count).fill(value);
const pose = (row) => {
  const made = kinematics.pose();
  row.forEach((value, i) => { if (i < 9) made.r[Math.floor(i / 3)][i % 3] = value; else made.p[i - 9] = value; });
  return made;
};
for (const q of rows(numbers("joints.bin"), joints)) {
  const reached = pose(list(12, canary));
  out.push(kinematics.forward(q, reached), ...reached.r.flatMap((row) => [...row]), ...reached.p);
  const jacobian = Array.from({ length: 6 }, () => list(joints, canary));
  out.push(kinematics.jacobian(q, jacobian), ...jacobian.flat(), kinematics.branch_of(q));
}
const seeds = rows(numbers("seeds.bin"), joints);
rows(numbers("poses.bin"), 12).forEach((row, k) => {
  const wanted = pose(row);
  for (let b = 0; b <= branches; ++b) {
    const one = list(joints, canary);
    out.push(kinematics.inverse(wanted, b, seeds[k], one), ...one);
  }
  const all = Array.from({ length: branches }, () => list(joints, canary));
  const statuses = list(branches, unwritten);
  out.push(kinematics.inverse_all(wanted, seeds[k], all, statuses), ...statuses, ...all.flat());
  const nearest = list(joints, canary);
  const branch = [canaryBranch];
  out.push(kinematics.inverse_nearest(wanted, seeds[k], nearest, branch), branch[0], ...nearest);
});
const angles = numbers("angles.bin");
for (let i = 0; i < angles.length; i += 2) out.push(kinematics.atan2(angles[i], angles[i + 1]));
writeFileSync("out.bin", new Uint8Array(Float64Array.from(out).buffer));
"""
_ODD = (0.0, -0.0, 1.0, -1.0, 1e300, -1e300, 5e-324, np.inf, -np.inf, np.nan)
ANGLES = np.array([(y, x) for y in _ODD for x in _ODD])


@dataclass(frozen=True, slots=True)
class Inputs:
    """joints [M, n]; packed poses [N, 12] with their seeds [N, n]."""

    joints: Array
    poses: Array
    seeds: Array


def inputs_of(arm: Arm, c: Kinematics, count: int, seed: int) -> Inputs:
    """Reachable poses and others, singular ones, drifted rotations, and input that is none."""
    rng = np.random.default_rng(seed)
    reference = Reference(arm)
    q = reference.random_joints(rng, count)
    special = np.round(q[: count // 4] / (np.pi / 2)) * (np.pi / 2)
    bad = q[:3].copy()
    bad[np.arange(3), 0] = (np.nan, np.inf, 1e308)
    joints = np.concatenate((q, special, np.zeros((1, reference.count)), bad))
    poses = c.pack(reference.forward(joints[:-3]))
    drifted = poses[: count // 4] + rng.uniform(-2e-4, 2e-4, (count // 4, 12))
    far = poses[: count // 4].copy()
    far[:, 9:] *= rng.uniform(1, 40, (len(far), 1))
    broken = poses[:3].copy()
    broken[np.arange(3), (0, 4, 9)] = (np.nan, 3.0, np.inf)
    packed = np.concatenate((poses, drifted, far, broken))
    seeds = reference.random_joints(rng, len(packed))
    seeds[:5] = joints[:5]
    seeds[-1] = bad[1]
    return Inputs(joints, packed, seeds)


def by_c(c: Kinematics, given: Inputs) -> Array:
    """Every number that comes out, in the runner's order."""
    poses, statuses = c.forward(given.joints)
    jacobians, jacobian_statuses = c.jacobian(given.joints)
    branches = c.branch_of(given.joints)
    forward = [statuses, poses, jacobian_statuses, jacobians, branches]
    inverse: list[Array] = []
    for b in range(c.branches + 1):
        q, status = c.inverse(given.poses, np.full(len(given.poses), b), given.seeds)
        inverse += [status, q]
    found = c.inverse_all(given.poses, given.seeds)
    inverse += [found.solved, found.status, found.q]
    q, branch, status = c.inverse_nearest(given.poses, given.seeds)
    inverse += [status, branch, q]
    angles = c.atan2(np.ascontiguousarray(ANGLES[:, 0]), np.ascontiguousarray(ANGLES[:, 1]))
    return np.concatenate([_in_rows(forward), _in_rows(inverse), angles])


def _in_rows(columns: list[Array]) -> Array:
    return np.concatenate([column.reshape(len(column), -1).astype(np.float64) for column in columns], axis=1).ravel()


def by_node(arm: Arm, c: Kinematics, given: Inputs, folder: Path) -> Array:
    text = javascript(generate(arm, Options(RealType.DOUBLE)), "arm")
    (folder / "run.js").write_text(_RUNNER.replace("KINEMATICS", text), encoding="utf-8")
    for name, values in (
        ("joints", given.joints), ("seeds", given.seeds), ("poses", given.poses), ("angles", ANGLES),
    ):  # fmt: skip
        (folder / f"{name}.bin").write_bytes(np.ascontiguousarray(values, dtype="<f8").tobytes())
    constants = {"joints": c.joints, "branches": c.branches, "canary": CANARY}
    constants |= {"branch": CANARY_BRANCH, "unwritten": UNWRITTEN}
    subprocess.run(["node", "run.js"], cwd=folder, input=json.dumps(constants), text=True, check=True)
    return np.fromfile(folder / "out.bin", dtype="<f8")


def bits(values: Array) -> Array:
    """As whole numbers, every NaN the same: which NaN comes out is not fixed."""
    return np.where(np.isnan(values), np.nan, values).view(np.uint64)
