"""The float64 reference against published poses, closed forms of books, scipy's rotations, difference quotients."""

from __future__ import annotations

import dataclasses
import math
from fractions import Fraction

import numpy as np
import pytest
from link_tables import MANSEUR_0M37, PUMA_560, RAGHAVAN_ROTH, STANFORD, UR5_SERIES_3, frame, joint, turning
from scipy.spatial.transform import Rotation

from build_checks.reference import Poses, Reference, frame_matrix
from build_checks.reference_task import TaskReading, rotation_about, rotation_vector, wrap
from codegen.exact import Angle
from codegen.model import Arm, Convention, JointKind, Task

ROUNDING = 1e-14  # metres and matrix entries of arms of a few metres
STEP = 1e-6  # of the difference quotients; their error is about its square and 1e-16 / STEP
QUOTIENT = 1e-8

# joint angles in degrees, rows of the pose [R | p] in metres, tolerance of the print, source
POSES = [
    (
        PUMA_560,
        (90, 0, 90, 0, 0, 0),
        [(0, -1, 0, -0.14909), (0, 0, 1, 0.92112), (-1, 0, 0, 0.02032)],
        ROUNDING,
        "Fu, Gonzalez and Lee, Robotics (1987), section 2.2.11",
    ),
    (
        UR5_SERIES_3,
        (0, 0, 0, 0, 0, 0),
        [(1, 0, 0, -0.81725), (0, 0, -1, -0.19145), (0, 1, 0, -0.005491)],
        ROUNDING,
        "closed form at the zero pose: p = (a2 + a3, -(d4 + d6), d1 - d5)",
    ),
    (
        RAGHAVAN_ROTH,
        (14, 29.7, -45, 71, -63, 10),
        [
            (0.354937475307970, 0.461639573991743, -0.812962663562556, 6.82151837150213),
            (0.876709605247149, 0.137616185817977, 0.460914366741046, 1.46146704002829),
            (0.324653132880913, -0.876327957516839, -0.355878707125018, 5.36950521368663),
        ],
        1e-14,
        "Raghavan and Roth (1990), the pose of their example",
    ),
    (
        MANSEUR_0M37,
        (0, 0, -90, -180, 90, -180),
        [(1, 0, 0, 1), (0, 0, -1, 0.5), (0, 1, 0, -0.5)],
        ROUNDING,
        "Manseur's dissertation, equation 9.60",
    ),
]


@pytest.mark.parametrize(("arm", "angles", "rows", "tolerance", "source"), POSES)
def test_published_poses(arm, angles, rows, tolerance, source):
    """The link table's pose is the printed one."""
    poses = Reference(arm).forward(np.radians([angles]).astype(float))
    wanted = np.array(rows, dtype=float)
    np.testing.assert_allclose(poses.rotation[0], wanted[:, :3], atol=tolerance, err_msg=source)
    np.testing.assert_allclose(poses.position[0], wanted[:, 3], atol=tolerance, err_msg=source)


def test_stanford_arm_by_its_published_formula():
    """Paul, Robot Manipulators (1981), chapter 2, with d6 (Spong and Vidyasagar): the position in closed form."""
    reference = Reference(STANFORD)
    q = reference.random_joints(np.random.default_rng(3), 200)
    (c1, c2, _, c4, c5, _), (s1, s2, _, s4, s5, _) = np.cos(q).T, np.sin(q).T
    d2, d3, d6 = 0.154, q[:, 2], 0.263
    x = c1 * s2 * d3 - s1 * d2 + d6 * (c1 * c2 * c4 * s5 + c1 * c5 * s2 - s1 * s4 * s5)
    y = s1 * s2 * d3 + c1 * d2 + d6 * (c1 * s4 * s5 + c2 * c4 * s1 * s5 + c5 * s1 * s2)
    z = c2 * d3 + d6 * (c2 * c5 - c4 * s2 * s5)
    np.testing.assert_allclose(reference.forward(q).position, np.stack((x, y, z), axis=1), atol=ROUNDING)


def test_modified_rows_by_craigs_formula():
    """Craig, Introduction to Robotics, equation 3.14 (from memory): the PUMA 560 in proximal link frames."""
    a2, a3, d3, d4 = 0.4318, 0.0203, 0.0934, 0.4331
    rows = [
        ("0", "0", "0"),
        ("-90", "0", "0"),
        ("0", str(a2), str(d3)),
        ("-90", str(a3), str(d4)),
        ("90", "0", "0"),
        ("-90", "0", "0"),
    ]
    reference = Reference(turning(rows, convention=Convention.MODIFIED))
    q = reference.random_joints(np.random.default_rng(4), 200)
    c1, s1, c2, s2 = np.cos(q[:, 0]), np.sin(q[:, 0]), np.cos(q[:, 1]), np.sin(q[:, 1])
    c23, s23 = np.cos(q[:, 1] + q[:, 2]), np.sin(q[:, 1] + q[:, 2])
    out = a2 * c2 + a3 * c23 - d4 * s23
    wanted = np.stack((c1 * out - d3 * s1, s1 * out + d3 * c1, -a3 * s23 - a2 * s2 - d4 * c23), axis=1)
    np.testing.assert_allclose(reference.forward(q).position, wanted, atol=ROUNDING)


def test_frames_are_fixed_axis_roll_pitch_yaw():
    """Against scipy's extrinsic x-y-z rotations."""
    for rpy in [("10", "20", "30"), ("-170", "85", "12.5"), ("90", "-90", "180")]:
        rotation, translation = frame_matrix(frame(("1", "-2", "0.5"), rpy))
        wanted = Rotation.from_euler("xyz", [float(angle) for angle in rpy], degrees=True).as_matrix()
        np.testing.assert_allclose(rotation, wanted, atol=1e-15)
        assert translation.tolist() == [1.0, -2.0, 0.5]


def test_base_and_tool_stand_around_the_chain():
    """base T tool, with scipy's rotations and the chain alone."""
    base, tool = frame(("1", "2", "3"), ("10", "20", "30")), frame(("0.1", "-0.2", "0.3"), ("-40", "50", "60"))
    placed = Reference(dataclasses.replace(PUMA_560, base=base, tool=tool))
    q = placed.random_joints(np.random.default_rng(5), 20)
    bare = Reference(PUMA_560).forward(q)
    turn_base = Rotation.from_euler("xyz", [10, 20, 30], degrees=True).as_matrix()
    turn_tool = Rotation.from_euler("xyz", [-40, 50, 60], degrees=True).as_matrix()
    found = placed.forward(q)
    np.testing.assert_allclose(found.rotation, turn_base @ bare.rotation @ turn_tool, atol=ROUNDING)
    at_flange = bare.rotation @ [0.1, -0.2, 0.3] + bare.position
    np.testing.assert_allclose(found.position, at_flange @ turn_base.T + [1, 2, 3], atol=ROUNDING)


@pytest.mark.parametrize(
    "arm", [PUMA_560, STANFORD, dataclasses.replace(RAGHAVAN_ROTH, convention=Convention.MODIFIED)]
)
def test_jacobian_by_difference_quotients(arm):
    """Columns are velocities of the tool point and angular velocities in the world frame."""
    reference = Reference(arm)
    q = reference.random_joints(np.random.default_rng(6), 30)
    jacobian = reference.jacobian(q)
    for column in range(reference.count):
        step = np.zeros(reference.count)
        step[column] = STEP
        ahead, behind = reference.forward(q + step), reference.forward(q - step)
        linear = (ahead.position - behind.position) / (2 * STEP)
        turn = Rotation.from_matrix(ahead.rotation @ behind.rotation.swapaxes(1, 2)).as_rotvec() / (2 * STEP)
        np.testing.assert_allclose(jacobian[:, :3, column], linear, atol=QUOTIENT)
        np.testing.assert_allclose(jacobian[:, 3:, column], turn, atol=QUOTIENT)


def yaw_and_three_pitches(task: Task) -> Arm:
    """A table-top arm whose shoulder stands beside its yaw axis, on a tilted base."""
    rows = [("90", "0.05", "0.2"), ("0", "0.3", "0"), ("0", "0.25", "0"), ("0", "0.1", "0")]
    tool = frame(("0", "0", "0"), ("0", "90", "0"))
    return dataclasses.replace(turning(rows, task), base=frame(("0", "0", "0"), ("20", "10", "5")), tool=tool)


def planar(task: Task) -> Arm:
    arm = turning([("0", "0.3", "0"), ("0", "0.25", "0"), ("0", "0.1", "0")], task)
    return dataclasses.replace(arm, base=frame(("0", "0", "0"), ("30", "-50", "5")))


TASK_ARMS = [
    *(dataclasses.replace(PUMA_560, task=task) for task in (Task.POSE, Task.POINT_AXIS, Task.POINT_YAW, Task.POINT)),
    yaw_and_three_pitches(Task.POINT_PITCH),
    planar(Task.PLANE_POSE),
    planar(Task.PLANE_POINT),
]


@pytest.mark.parametrize("arm", TASK_ARMS, ids=lambda arm: arm.task.key)
def test_task_jacobian_is_the_slope_of_the_misses(arm):
    """What a task reads moves with each joint as the difference quotient of its misses says."""
    reading = TaskReading(Reference(arm))
    q = reading.reference.random_joints(np.random.default_rng(7), 40)
    far = {Task.POSE, Task.POINT_AXIS}  # their rotation vectors have the plain slope only at the target
    target = reading.reference.forward(q if arm.task in far else q + 0.2)
    chain = reading.reference.chain(q)
    jacobian = reading.jacobian(target, chain)
    sharp = np.minimum(reading.sharpness(target, chain), reading.sharpness(chain.tool, chain)) > 0.05
    for column in range(jacobian.shape[2]):
        step = np.zeros(q.shape[1])
        step[column] = STEP
        ahead, behind = (reading.misses(target, reading.reference.chain(q + sign * step)) for sign in (1, -1))
        rows = (behind.linear - ahead.linear, wrap(behind.angular - ahead.angular))
        slope = np.concatenate(rows, axis=1) / (2 * STEP)
        if arm.task is Task.PLANE_POINT or arm.task is Task.PLANE_POSE:
            np.testing.assert_allclose(np.einsum("ni,nik->nk", reading.normals(chain), jacobian[:, :3]), 0, atol=1e-15)
        np.testing.assert_allclose(jacobian[sharp, :, column], slope[sharp], atol=100 * QUOTIENT)
    assert sharp.sum() > 20


def test_pitch_is_read_in_the_plane_of_the_arm():
    """On a level base, yaw 0: the plane is x-z, so the pitch of the tool's z axis is its angle from x towards z."""
    arm = dataclasses.replace(yaw_and_three_pitches(Task.POINT_PITCH), base=frame(("0", "0", "0"), ("0", "0", "0")))
    reading = TaskReading(Reference(arm))
    chain = reading.reference.chain(np.zeros((1, 4)))
    np.testing.assert_allclose(chain.tool.rotation[0, :, 2], [1, 0, 0], atol=1e-15)  # the tool's rpy turned z forward
    pitch, out_of_plane = 0.3, 0.8
    flat = math.cos(out_of_plane)
    target = Poses(np.zeros((1, 3, 3)), chain.tool.position)
    target.rotation[0, :, 2] = [flat * math.cos(pitch), math.sin(out_of_plane), flat * math.sin(pitch)]
    position, angle = reading.errors(target, chain)
    assert position[0] == 0.0
    assert angle[0] == pytest.approx(pitch, abs=1e-15)
    assert reading.sharpness(target, chain)[0] == pytest.approx(math.cos(out_of_plane))


def test_yaw_is_the_heading_of_the_tool_x_axis():
    """atan2(y, x) of the x axis, whatever its tilt (contract, section 1)."""
    arm = dataclasses.replace(PUMA_560, task=Task.POINT_YAW)
    reading = TaskReading(Reference(arm))
    chain = reading.reference.chain(np.full((1, 6), 0.4))
    turned = Rotation.from_euler("z", 0.25).as_matrix() @ chain.tool.rotation
    _, angle = reading.errors(Poses(turned, chain.tool.position), chain)
    assert angle[0] == pytest.approx(0.25, abs=1e-15)


def test_out_of_plane_is_ignored_by_planar_tasks():
    reading = TaskReading(Reference(planar(Task.PLANE_POINT)))
    q = reading.reference.random_joints(np.random.default_rng(8), 5)
    chain = reading.reference.chain(q)
    shifted = chain.tool.position + 0.7 * reading.normals(chain)
    position, angle = reading.errors(Poses(chain.tool.rotation, shifted), chain)
    np.testing.assert_allclose(position, 0.0, atol=1e-15)
    assert not angle.any()


def test_rotation_vectors_against_scipy():
    vectors = np.random.default_rng(9).uniform(-1.8, 1.8, (50, 3))  # shorter than pi
    np.testing.assert_allclose(rotation_about(vectors), Rotation.from_rotvec(vectors).as_matrix(), atol=1e-15)
    np.testing.assert_allclose(rotation_vector(rotation_about(vectors)), vectors, atol=1e-14)


def test_drifted_matrix_stands_for_its_nearest_rotation():
    """The polar factor (scipy's nearest rotation) is what the miss is measured from."""
    rng = np.random.default_rng(10)
    rotation = rotation_about(rng.normal(size=(50, 3)))
    stretch = 5e-4 * rng.uniform(-1, 1, (50, 3, 3))
    drifted = rotation @ (np.eye(3) + stretch)
    nearest = Rotation.from_matrix(drifted).as_matrix()
    misses = rotation_vector(drifted @ nearest.swapaxes(1, 2))
    assert np.abs(misses).max() < ROUNDING


def test_reach_bounds_the_distance_of_the_tool_from_the_base():
    """Slides at their limits included."""
    slide = dataclasses.replace(
        joint("slide", "0", "0.1", "0.2", JointKind.PRISMATIC), limits=(Fraction(-1), Fraction(2))
    )
    rows = (joint("turn", "90", "0.3", "-0.4"), slide, joint("wrist", "45", "0.5", "0"))
    arm = Arm("reaching", Convention.STANDARD, Task.POINT, rows, tool=frame(("0.3", "0", "0.4"), ("0", "0", "0")))
    reference = Reference(arm)
    assert reference.reach == pytest.approx(0.3 + 0.4 + 0.1 + 2.2 + 0.5 + 0.5)
    q = reference.random_joints(np.random.default_rng(11), 10_000)
    distance = np.linalg.norm(reference.forward(q).position, axis=1)
    assert distance.max() <= reference.reach


def test_random_joints_fill_the_limits():
    """Within limits; without them -pi..pi, or half the reach to either side."""
    limited = dataclasses.replace(joint("limited", "0", "1", "0"), limits=(Angle.degrees(-30), Angle.degrees(400)))
    rows = (limited, joint("free", "0", "1", "0"), joint("slide", "0", "0", "0", JointKind.PRISMATIC))
    reference = Reference(Arm("spans", Convention.STANDARD, Task.POINT, rows))
    q = reference.random_joints(np.random.default_rng(12), 50_000)
    low, high = np.array([-math.pi / 6, -math.pi, -1.0]), np.array([math.radians(400), math.pi, 1.0])
    assert ((q >= low) & (q <= high)).all()
    np.testing.assert_allclose(q.min(axis=0), low, atol=0.01)
    np.testing.assert_allclose(q.max(axis=0), high, atol=0.01)


def test_smallest_singular_value_vanishes_with_a_straight_wrist():
    """A straight wrist only turns q4 + q6: Paul and Stevenson, IJRR 2(1), 1983 (from memory)."""
    reading = TaskReading(Reference(PUMA_560))
    straight, bent = (np.array([[0.3, -0.5, 1.2, 0.7, wrist, -0.4]]) for wrist in (0.0, 0.5))
    assert reading.smallest_singular(straight)[0] < 1e-15
    assert reading.smallest_singular(bent)[0] > 0.01
