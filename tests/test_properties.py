"""One arm written down in two ways is one arm: the generated C of both gives the same poses and the same solutions.

Neither side is compared with the reference here; each compares two derivations that start from different tables.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator
from contextlib import contextmanager
from fractions import Fraction

import numpy as np
from arms_random import HELD_ARMS, PARTIAL_ARMS, POSE_ARMS, Structure, as_modified, can_be_modified, random_arm
from generated import apart, compiled_arm, farthest, pose_at, solutions
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from build_checks.compile import Kinematics, Status
from build_checks.reference import Array, Poses, Reference, frame_matrix
from build_checks.reference_task import TaskReading
from codegen.armfile import read_arm
from codegen.armwriter import arm_file_text
from codegen.exact import Angle
from codegen.model import Arm, Convention, Frame, JointKind
from codegen.options import Options, RealType
from codegen.pipeline import generate

FORWARD = 5e-14  # metres and matrix entries: two roundings of the same pose, arms of a few metres
REGULAR = 1e-2  # smallest singular value of a pose whose solutions rounding moves by less than SAME
SAME = 1e-9
few = settings(
    max_examples=4,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.function_scoped_fixture, HealthCheck.filter_too_much],
)
arms = st.builds(random_arm, st.sampled_from([*POSE_ARMS, *PARTIAL_ARMS]), st.integers(0, 50))
whole_pose = st.builds(random_arm, st.sampled_from(POSE_ARMS), st.integers(0, 50))


@contextmanager
def both(first: Arm, second: Arm) -> Iterator[tuple[Kinematics, Kinematics]]:
    options = Options(real=RealType.DOUBLE)
    with compiled_arm(first, options) as one, compiled_arm(second, options) as other:
        yield one, other


def some_joints(arm: Arm, count: int = 20) -> Array:
    return Reference(arm).random_joints(np.random.default_rng(8), count)


def forward(c: Kinematics, q: Array) -> Poses:
    packed, status = c.forward(q)
    assert (status == Status.OK).all()
    return Kinematics.unpack(packed)


def assert_same_poses(first: Poses, second: Poses) -> None:
    np.testing.assert_allclose(first.rotation, second.rotation, atol=FORWARD)
    np.testing.assert_allclose(first.position, second.position, atol=FORWARD)


def regular_joints(arm: Arm) -> Array:
    """Joint values whose pose has no solution near a singularity of its own."""
    q = some_joints(arm, 64)
    sharp = TaskReading(Reference(arm)).smallest_singular(q)
    assume(sharp.max() > REGULAR)
    return q[int(np.argmax(sharp))]


def assert_same_solutions(arm: Arm, first: Array, second: Array) -> None:
    assert len(first) == len(second)
    assert farthest(Reference(arm), first, second) < SAME


@few
@given(arms)
def test_either_convention_gives_the_same_arm(arm: Arm):
    """The table of distal frames and the one of proximal frames of one chain."""
    assume(arm.convention is Convention.STANDARD and can_be_modified(arm))
    other = as_modified(arm)
    q = some_joints(arm)
    with both(arm, other) as (one, two):
        assert_same_poses(forward(one, q), forward(two, q))
        joints = regular_joints(arm)
        pose = pose_at(arm, joints)
        assert_same_solutions(arm, solutions(one, arm, pose, joints), solutions(two, other, pose, joints))


@few
@given(whole_pose, st.tuples(*[st.integers(-2000, 2000)] * 3), st.sampled_from([0, 90, 200]))
def test_a_base_moves_the_whole_arm(arm: Arm, millimetres: tuple[int, int, int], degrees: int):
    """The arm on a base reaches what the arm without one reaches, moved as the base is; same joint values."""
    x, y, z = (Fraction(value, 1000) for value in millimetres)
    bare = dataclasses.replace(arm, base=Frame())
    turn = Angle.degrees(degrees)
    placed = dataclasses.replace(arm, base=Frame((x, y, z), (turn, Angle(), turn)))
    rotation, shift = frame_matrix(placed.base)
    joints = regular_joints(arm)
    with both(bare, placed) as (one, two):
        plain = forward(one, joints[None])
        moved = Poses(rotation @ plain.rotation, plain.position @ rotation.T + shift)
        assert_same_poses(moved, forward(two, joints[None]))
        assert_same_solutions(arm, solutions(one, bare, plain, joints), solutions(two, placed, moved, joints))


@few
@given(arms, st.integers(0, 6), st.sampled_from([90, 180, 37]))
def test_an_offset_shifts_its_joint(arm: Arm, place: int, degrees: int):
    """theta of a turning joint grows: that joint's values shrink by as much."""
    index = place % len(arm.joints)
    assume(arm.joints[index].kind is JointKind.REVOLUTE and arm.joints[index].name not in arm.held)
    rows = list(arm.joints)
    rows[index] = dataclasses.replace(rows[index], theta=rows[index].theta + Angle.degrees(degrees), limits=None)
    other = dataclasses.replace(arm, joints=tuple(rows))
    shift = np.zeros(len(rows))
    shift[index] = np.radians(degrees)
    joints = regular_joints(arm)
    with both(arm, other) as (one, two):
        pose = forward(one, joints[None])
        assert_same_poses(pose, forward(two, (joints - shift)[None]))
        found = solutions(one, arm, pose, joints)
        assert_same_solutions(arm, found, solutions(two, other, pose, joints) + shift)


@few
@given(arms)
def test_units_do_not_matter(tmp_path, arm: Arm):
    """Millimetres and degrees or metres and radians in the file: the same C, to the byte."""
    texts = []
    for length_unit in ("m", "mm"):
        path = tmp_path / f"{length_unit}.toml"
        written = dataclasses.replace(arm, length_unit=length_unit, angle_unit="deg")
        path.write_text(arm_file_text(written), encoding="utf-8")
        texts.append(generate(read_arm(path).arm, Options()))
    assert texts[0] == texts[1]


def fixed_at(arm: Arm, value: float) -> Arm:
    """The arm whose one held joint is welded at a value: its row merged into the tables as an offset."""
    (index,) = arm.held_indices
    row = arm.joints[index]
    exact = Fraction(value)
    if row.kind is JointKind.REVOLUTE:
        row = dataclasses.replace(row, theta=row.theta + Angle(radians=exact))
    else:
        row = dataclasses.replace(row, d=row.d + exact)
    rows = [*arm.joints[:index], dataclasses.replace(row, limits=None), *arm.joints[index + 1 :]]
    return dataclasses.replace(arm, joints=tuple(rows))


@few
@given(st.sampled_from([structure for structure in HELD_ARMS if len(structure.held) == 1]), st.integers(0, 50))
def test_a_held_joint_may_be_welded(structure: Structure, number: int):
    """Held at a seed value, or held at zero with that value in the table: the other joints come out alike."""
    arm = random_arm(structure, number)
    joints = regular_joints(arm)
    (index,) = arm.held_indices
    other = fixed_at(arm, float(joints[index]))
    at_zero = joints.copy()
    at_zero[index] = 0.0
    with both(arm, other) as (one, two):
        pose = forward(one, joints[None])
        first, second = solutions(one, arm, pose, joints), solutions(two, other, pose, at_zero)
        assert len(first) == len(second)
        back = second.copy()
        back[:, index] = joints[index]
        assert farthest(Reference(arm), first, back) < SAME
        assert apart(Reference(arm), first, joints).min() < SAME
