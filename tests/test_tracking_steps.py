"""The arithmetic and the steps of the prepared tables, against other libraries and the float64 reference."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from link_tables import frame, joint
from test_tracking_conditioning import CALIBRATED, DEGREES

from build_checks.reference import Poses, Reference
from build_checks.reference_task import TaskReading
from codegen.model import Arm, Convention, Frame, JointKind, Task
from codegen.tracking.batch import Batch
from codegen.tracking.lanes import LanePoses, least_squares_step, sine_cosine
from codegen.tracking.shape import shape_of

ROWS = [  # alpha, a, d of invented rows without any structure
    ("73", "0.31", "0.22"),
    ("-41", "0.52", "-0.13"),
    ("112", "-0.24", "0.33"),
    ("58", "0.41", "0.12"),
    ("-97", "0.15", "0.27"),
    ("36", "0.23", "-0.18"),
]
TOOL = frame(("0.05", "-0.07", "0.21"), ("20", "50", "-30"))
LIMITS = (Fraction(-1, 5), Fraction(3, 5))


def without_structure(task: Task, kinds: str, held: tuple[int, ...] = ()) -> Arm:
    """An arm of invented rows; `kinds` has R or P for each joint."""
    joints = []
    for i, kind in enumerate(kinds):
        row = joint(f"joint{i + 1}", *ROWS[i], kind=JointKind.REVOLUTE if kind == "R" else JointKind.PRISMATIC)
        joints.append(row if kind == "R" else replace(row, limits=LIMITS))
    names = tuple(f"joint{i + 1}" for i in held)
    return Arm("invented", Convention.STANDARD, task, tuple(joints), held=names, tool=TOOL)


def in_a_plane(task: Task, kinds: str) -> Arm:
    """Parallel axes on a tilted base."""
    joints = tuple(joint(f"joint{i + 1}", "0", f"0.{4 - i}", "0") for i, kind in enumerate(kinds) if kind == "R")
    base = Frame(xyz=TOOL.xyz, rpy=TOOL.rpy)
    return Arm("plane", Convention.STANDARD, task, joints, base=base)


ARMS = {
    "pose": without_structure(Task.POSE, "RRRRRR"),
    "pose with a slide": without_structure(Task.POSE, "RRPRRR"),
    "point_axis": without_structure(Task.POINT_AXIS, "RRRRR"),
    "point_axis with a joint held": without_structure(Task.POINT_AXIS, "RRRPRR", held=(1,)),
    "point_pitch": without_structure(Task.POINT_PITCH, "RRRR"),
    "point_pitch with a slide": without_structure(Task.POINT_PITCH, "PRRR"),
    "point_yaw": without_structure(Task.POINT_YAW, "RRRR"),
    "point": without_structure(Task.POINT, "RPR"),
    "plane_pose": in_a_plane(Task.PLANE_POSE, "RRR"),
    "plane_point": in_a_plane(Task.PLANE_POINT, "RR"),
}


def test_sine_and_cosine():
    """To 2e-16 of the values that mpmath gives with 30 digits."""
    angles = np.concatenate((np.linspace(-20.0, 20.0, 801), np.arange(-8, 9) * (np.pi / 4)))
    sine, cosine = sine_cosine(angles)
    with mpmath.workdps(30):
        assert max(abs(mpmath.sin(mpmath.mpf(float(x))) - float(s)) for x, s in zip(angles, sine, strict=True)) < 2e-16
        assert (
            max(abs(mpmath.cos(mpmath.mpf(float(x))) - float(c)) for x, c in zip(angles, cosine, strict=True)) < 2e-16
        )


def test_damped_least_squares():
    """numpy's solver on the rows with the damping below them."""
    generator = np.random.default_rng(3)
    rows, residual = generator.normal(size=(6, 5, 4)), generator.normal(size=(6, 4))
    damping = np.array([1.0, 1e-3, 1e-6, 0.3])
    found = np.array(least_squares_step([list(row) for row in rows], list(residual), damping))
    for lane in range(4):
        below = damping[lane] * np.eye(5)
        wanted, *_ = np.linalg.lstsq(
            np.vstack((rows[:, :, lane], below)), np.concatenate((residual[:, lane], np.zeros(5))), rcond=None
        )
        assert found[:, lane] == pytest.approx(wanted, rel=1e-9, abs=1e-9)


def lane_poses(poses: Poses) -> LanePoses:
    columns = [[poses.rotation[:, i, k].copy() for i in range(3)] for k in range(3)]
    return LanePoses(*columns, [poses.position[:, i].copy() for i in range(3)])


@pytest.mark.parametrize("name", ARMS)
def test_rows_are_the_derivative_of_the_residuals(name):
    """Central differences of the residuals; near a solution, where the steps must be Newton's."""
    arm = ARMS[name]
    shape, reference = shape_of(arm), Reference(arm)
    batch, generator = Batch(shape), np.random.default_rng(1)
    q = reference.random_joints(generator, 50)
    target = lane_poses(reference.forward(q))
    step = 1e-6
    rows, _, _ = batch._rows(list(q.T), target)
    for k, index in enumerate(shape.free):
        unit = 1.0 if shape.turning[index] else float(shape.slide_unit)
        ends = []
        for sign in (1.0, -1.0):
            moved = q.T.copy()
            moved[index] += sign * step * unit
            ends.append(np.array(batch._rows(list(moved), target)[1]))
        derivative = (ends[1] - ends[0]) / (2 * step)
        assert np.array([row[k] for row in rows]) == pytest.approx(derivative, abs=1e-8)


@pytest.mark.parametrize("name", ARMS)
def test_tracked_joint_values_reach_the_pose(name):
    """Judged by the reference's own reading of the task; most random starts arrive somewhere."""
    arm = ARMS[name]
    reference, batch = Reference(arm), Batch(shape_of(arm))
    generator = np.random.default_rng(2)
    q, start = (reference.random_joints(generator, 400) for _ in range(2))
    start[:, reference.held] = q[:, reference.held]
    poses = reference.forward(q)
    ends, solved, steps = batch.tracked(lane_poses(poses), list(start.T))
    position, angle = TaskReading(reference).errors(poses, reference.chain(np.array(ends).T))
    sharpness = TaskReading(reference).sharpness(poses, reference.chain(np.array(ends).T))
    assert solved.mean() > 0.5
    assert (position[solved] < 1e-9 * reference.reach).all()
    assert (angle[solved] * np.minimum(sharpness[solved], 0.01) < 2e-9).all()
    assert steps.max() <= 24


def test_calibrated_arm_needs_three_steps():
    """Seeds as far off as the nominal closed form leaves them (4 mm, 0.6 degrees) take 3 steps to 1e-9.

    Chen and Parker, Control Engineering Practice 2(2), 1994: nominal seed, then corrections with the true Jacobian.
    """
    reference, batch = Reference(CALIBRATED), Batch(shape_of(CALIBRATED))
    generator = np.random.default_rng(4)
    q = np.radians(DEGREES) + generator.uniform(-0.5, 0.5, (200, 6))
    seeds = q + generator.uniform(-0.01, 0.01, q.shape)
    ends, solved, steps = batch.tracked(lane_poses(reference.forward(q)), list(seeds.T))
    assert solved.all()
    assert steps.max() <= 3
    assert np.abs(np.array(ends).T - q).max() < 1e-6
