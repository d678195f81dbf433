"""Generated C against published tables and worked examples, each named where it stands.

Where a source says "from memory", the print was not at hand; its numbers reproduce each other to rounding, as the tests
of the search and of the reference show with no generated code at all.
"""

from __future__ import annotations

import dataclasses
import math
from fractions import Fraction

import numpy as np
import pytest
from generated import apart, farthest, kinematics, pose_at, searched, solutions
from link_tables import (
    MANSEUR_0M37,
    MANSEUR_DOTY,
    PRISMATIC,
    PUMA_560,
    RAGHAVAN_ROTH,
    STANFORD,
    UR5_SERIES_3,
    frame,
    joint,
    turning,
)

from build_checks.compile import Kinematics, Status
from build_checks.reference import Poses, Reference
from codegen.exact import Angle
from codegen.inverse.tasks import derive
from codegen.model import Arm, Convention, Task

ROUNDING = 2e-14  # metres and matrix entries of arms of a metre or a few
PRINTED = math.radians(1e-6)  # the tables print eight decimals of a degree
SEED = np.zeros(6)


def radians(rows: object) -> np.ndarray:
    return np.radians(np.array(rows, dtype=float))


def forward(arm: Arm, q: np.ndarray) -> Poses:
    c = kinematics(arm)
    packed, status = c.forward(c.rounded(np.atleast_2d(q)))
    assert (status == Status.OK).all()
    return Kinematics.unpack(packed)


def test_the_published_pose_of_the_puma():
    """Fu, Gonzalez and Lee, Robotics (1987), section 2.2.11, from memory: the matrix at (90, 0, 90, 0, 0, 0)."""
    poses = forward(PUMA_560, radians((90, 0, 90, 0, 0, 0)))
    np.testing.assert_allclose(poses.rotation[0], [(0, -1, 0), (0, 0, 1), (-1, 0, 0)], atol=ROUNDING)
    np.testing.assert_allclose(poses.position[0], (-0.14909, 0.92112, 0.02032), atol=ROUNDING)


PUMA_POSE = [  # of the first posture below, recomputed from Fu, Gonzalez and Lee's table; millimetres
    (0.493176500047, 0.279986783270, 0.823640905368, 185.977989665687),
    (0.168526520786, 0.898104987824, -0.406209604314, 186.636757825868),
    (-0.853449325732, 0.339138367100, 0.395739076119, 858.038821254256),
]
PUMA_FOUR = [  # degrees, by a search that shares nothing with this project
    (20, -70, 80, -50, 60, 30),
    (20, -82.71210372, 105.37278951, -56.83504233, 52.42121162, 42.23114039),
    (-87.37665978, -110, 105.37278951, 59.48624289, 68.98130594, 26.01174758),
    (-87.37665978, -97.28789628, 80, 56.06762981, 75.75491852, 37.24551666),
]
PUMA_EIGHT = PUMA_FOUR + [(q1, q2, q3, q4 + 180, -q5, q6 + 180) for q1, q2, q3, q4, q5, q6 in PUMA_FOUR]
UR5_EIGHT = [  # degrees, by a search that shares nothing with this project
    (20, -70, 80, -50, 60, 30),
    (20, 6.14824255, -80, 33.85175745, 60, 30),
    (20, -48.17564116, 67.60243167, 120.57320949, -60, -150),
    (20, 16.35326015, -67.60243167, -168.75082848, -60, -150),
    (-139.12369433, -131.16915971, -69.55524816, 55.62206264, 103.34225105, -163.61593597),
    (-139.12369433, 162.46368588, 69.55524816, -17.12127928, 103.34225105, -163.61593597),
    (-139.12369433, -110.79022918, -78.14853069, -136.16358537, -103.34225105, 16.38406403),
    (-139.12369433, 174.78838014, 78.14853069, 141.96074394, -103.34225105, 16.38406403),
]
EIGHTS = [
    (PUMA_560, PUMA_EIGHT, "Fu, Gonzalez and Lee, Robotics (1987), table 2.1, from memory"),
    (UR5_SERIES_3, UR5_EIGHT, "arm maker's manual, appendices B and C, series 3"),
]


@pytest.mark.parametrize(("arm", "degrees", "source"), EIGHTS)
def test_all_eight_solutions(arm, degrees, source):
    """The set of solutions is the table's: none missing, none beside it."""
    wanted = radians(degrees)
    found = solutions(kinematics(arm), arm, pose_at(arm, wanted[0]), SEED)
    assert len(found) == 8, source
    assert farthest(Reference(arm), wanted, found) < PRINTED, source


def test_the_puma_pose_is_the_tables():
    poses = forward(PUMA_560, radians(PUMA_FOUR[0]))
    wanted = np.array(PUMA_POSE)
    np.testing.assert_allclose(poses.rotation[0], wanted[:, :3], atol=1e-11)
    np.testing.assert_allclose(poses.position[0] * 1000, wanted[:, 3], atol=1e-10)


def test_craigs_table_is_the_same_arm():
    """Craig, Introduction to Robotics, eq. 3.14 (from memory), modified convention: r33, px, py and pz."""
    a2, a3, d3, d4 = 0.4318, -0.02032, 0.12446, 0.4318
    twists = ("0", "-90", "0", "-90", "90", "-90")
    shifts = [("0", "0"), ("0", "0"), (str(a2), str(d3)), (str(a3), str(d4)), ("0", "0"), ("0", "0")]
    rows = [(alpha, *shift) for alpha, shift in zip(twists, shifts, strict=True)]
    arm = turning(rows, convention=Convention.MODIFIED)
    q = np.random.default_rng(4).uniform(-3, 3, (100, 6))
    poses = forward(arm, q)
    (c1, c2, _, c4, c5, _), (s1, s2, _, _, s5, _) = np.cos(q).T, np.sin(q).T
    c23, s23 = np.cos(q[:, 1] + q[:, 2]), np.sin(q[:, 1] + q[:, 2])
    in_plane = a2 * c2 + a3 * c23 - d4 * s23
    np.testing.assert_allclose(poses.position[:, 0], c1 * in_plane - d3 * s1, atol=ROUNDING)
    np.testing.assert_allclose(poses.position[:, 1], s1 * in_plane + d3 * c1, atol=ROUNDING)
    np.testing.assert_allclose(poses.position[:, 2], -a3 * s23 - a2 * s2 - d4 * c23, atol=ROUNDING)
    np.testing.assert_allclose(poses.rotation[:, 2, 2], s23 * c4 * s5 - c23 * c5, atol=ROUNDING)


# x, y, heading in degrees; solutions in degrees; tolerance in degrees of the print
CRAIG_PLANAR = [
    ((9, 0, 0), [(0, 0, 0)], 1e-5),
    ((7.5373, 3.9266, 60), [(10, 20, 30), (27.115, -20.002, 52.887)], 2e-3),
    ((-3, 2, -90), [(90, 90, 90), (163.7397952917, -90, -163.7397952917)], 1e-9),
    ((-3.1245, 9.1674, -30), [], 0),
]
PLANAR = dataclasses.replace(
    turning([("0", "4", "0"), ("0", "3", "0"), ("0", "0", "0")], Task.PLANE_POSE),
    tool=frame(("2", "0", "0"), ("0", "0", "0")),
)


@pytest.mark.parametrize(("goal", "wanted", "tolerance"), CRAIG_PLANAR)
def test_planar_arm_of_craigs_exercises(goal, wanted, tolerance):
    """Craig, Introduction to Robotics, 3rd edition, exercises 3A and 4A (from memory): straight, general, a 3-4-5
    triangle, out of reach."""
    c, reference = kinematics(PLANAR), Reference(PLANAR)
    x, y, heading = goal
    cosine, sine = math.cos(math.radians(heading)), math.sin(math.radians(heading))
    rotation = np.array([[[cosine, -sine, 0.0], [sine, cosine, 0.0], [0.0, 0.0, 1.0]]])
    pose = Poses(rotation, np.array([[x, y, 0.0]]))
    found = solutions(c, PLANAR, pose, np.zeros(3))
    if not wanted:
        statuses = c.inverse_all(c.pack(pose), np.zeros((1, 3))).status
        assert (statuses == Status.OUT_OF_REACH).all()
    assert farthest(reference, radians(wanted).reshape(-1, 3), found) <= math.radians(tolerance)
    assert farthest(reference, found, radians(wanted).reshape(-1, 3)) <= math.radians(tolerance)


def test_the_stretched_planar_arm_says_so():
    """At (9, 0, 0) the two branches merge: each that returns gives the straight arm."""
    c = kinematics(PLANAR)
    pose = pose_at(PLANAR, np.zeros(3))
    found = c.inverse_all(c.pack(pose), np.full((1, 3), 0.3))
    reached = np.isin(found.status[0], (Status.OK, Status.SINGULAR))
    assert reached.any()
    np.testing.assert_allclose(found.q[0][reached], 0.0, atol=1e-7)  # the square root of the rounding


def stanford_position(q: np.ndarray) -> np.ndarray:
    (c1, c2, _, c4, c5, _), (s1, s2, _, s4, s5, _) = np.cos(q).T, np.sin(q).T
    d2, d3, d6 = 0.154, q[:, 2], 0.263
    x = c1 * s2 * d3 - s1 * d2 + d6 * (c1 * c2 * c4 * s5 + c1 * c5 * s2 - s1 * s4 * s5)
    y = s1 * s2 * d3 + c1 * d2 + d6 * (c1 * s4 * s5 + c2 * c4 * s1 * s5 + c5 * s1 * s2)
    return np.stack((x, y, c2 * d3 + d6 * (c2 * c5 - c4 * s2 * s5)), axis=1)


def test_stanford_arm_by_its_published_formula():
    """Paul, Robot Manipulators (1981), chapter 2, with d6 (Spong and Vidyasagar), from memory."""
    q = Reference(STANFORD).random_joints(np.random.default_rng(3), 200)
    np.testing.assert_allclose(forward(STANFORD, q).position, stanford_position(q), atol=ROUNDING)


def test_stanford_arm_has_eight_solutions_four_of_them_stretching_out():
    """Four of the eight have the slide on its positive side; recomputed by a search that shares nothing with this."""
    q = np.array([0.4, -1.1, 0.5, 0.7, 1.2, -0.9])
    found = solutions(kinematics(STANFORD), STANFORD, pose_at(STANFORD, q), np.zeros(6))
    assert len(found) == 8
    assert (found[:, 2] > 0).sum() == 4
    assert apart(Reference(STANFORD), found, q).min() < 1e-12


SCARA = Arm(
    "scara",
    Convention.STANDARD,
    Task.POINT_YAW,
    (
        joint("joint1", "0", "0.45", "0"),
        joint("joint2", "180", "0.35", "0"),
        joint("joint3", "0", "0", "0", kind=PRISMATIC),
        joint("joint4", "0", "0", "0.12"),
    ),
)
ELBOW = turning([("90", "0", "0.4"), ("0", "0.35", "0"), ("0", "0.3", "0")], Task.POINT)


def test_scara_by_its_published_formula():
    """Spong, Hutchinson and Vidyasagar, Robot Modeling and Control, chapter 3 (from memory); two solutions."""
    q = np.random.default_rng(5).uniform(-2, 2, (100, 4))
    poses = forward(SCARA, q)
    turn = q[:, 0] + q[:, 1]
    x = 0.45 * np.cos(q[:, 0]) + 0.35 * np.cos(turn)
    y = 0.45 * np.sin(q[:, 0]) + 0.35 * np.sin(turn)
    np.testing.assert_allclose(poses.position, np.stack((x, y, -q[:, 2] - 0.12), axis=1), atol=ROUNDING)
    heading = turn - q[:, 3]
    np.testing.assert_allclose(poses.rotation[:, 0, 0], np.cos(heading), atol=ROUNDING)
    np.testing.assert_allclose(poses.rotation[:, 0, 1], np.sin(heading), atol=ROUNDING)
    np.testing.assert_allclose(poses.rotation[:, 2, 2], -1.0, atol=ROUNDING)
    found = solutions(kinematics(SCARA), SCARA, pose_at(SCARA, q[0]), np.zeros(4))
    assert len(found) == 2
    np.testing.assert_allclose(found[:, 1].sum(), 0.0, atol=1e-12)  # elbow to either side
    np.testing.assert_allclose(found[:, 2], q[0, 2], atol=1e-14)


def test_elbow_arm_by_its_published_formula():
    """The same book, chapters 3 and 5 (from memory): four solutions without a shoulder offset."""
    q = np.random.default_rng(6).uniform(-3, 3, (100, 3))
    radius = 0.35 * np.cos(q[:, 1]) + 0.3 * np.cos(q[:, 1] + q[:, 2])
    height = 0.4 + 0.35 * np.sin(q[:, 1]) + 0.3 * np.sin(q[:, 1] + q[:, 2])
    wanted = np.stack((np.cos(q[:, 0]) * radius, np.sin(q[:, 0]) * radius, height), axis=1)
    np.testing.assert_allclose(forward(ELBOW, q).position, wanted, atol=ROUNDING)
    found = solutions(kinematics(ELBOW), ELBOW, pose_at(ELBOW, q[0]), np.zeros(3))
    assert len(found) == 4


# d1, a2, a3, d4, d5, d6
COLLABORATIVE = {
    "UR5 series 1": ("0.08920", "-0.42500", "-0.39243", "0.10900", "0.09300", "0.08200"),
    "UR5 series 2": ("0.08920", "-0.42500", "-0.39225", "0.11000", "0.09475", "0.08250"),
    "UR5 series 3": ("0.089159", "-0.42500", "-0.39225", "0.10915", "0.09465", "0.08230"),
    "UR10": ("0.118", "-0.6127", "-0.5716", "0.1639", "0.1157", "0.0922"),
    "UR3e": ("0.15185", "-0.24355", "-0.2132", "0.13105", "0.08535", "0.0921"),
    "UR5e": ("0.1625", "-0.425", "-0.3922", "0.1333", "0.0997", "0.0996"),
    "UR10e": ("0.1807", "-0.6127", "-0.57155", "0.17415", "0.11985", "0.11655"),
}
"""Arm maker's manual, appendices B and C, and support article "DH Parameters" (d6 of the last row from memory)."""


def collaborative(lengths: tuple[str, ...]) -> Arm:
    d1, a2, a3, d4, d5, d6 = lengths
    rows = [("90", "0", d1), ("0", a2, "0"), ("0", a3, "0"), ("90", "0", d4), ("-90", "0", d5), ("0", "0", d6)]
    return turning(rows)


@pytest.mark.parametrize("name", sorted(COLLABORATIVE))
def test_collaborative_arms(name):
    """At the zero pose p = (a2 + a3, -(d4 + d6), d1 - d5) and R = Rx(90), and a general pose has all its solutions."""
    lengths = COLLABORATIVE[name]
    arm = collaborative(lengths)
    d1, a2, a3, d4, d5, d6 = (float(Fraction(value)) for value in lengths)
    pose = forward(arm, np.zeros(6))
    np.testing.assert_allclose(pose.position[0], (a2 + a3, -(d4 + d6), d1 - d5), atol=ROUNDING)
    np.testing.assert_allclose(pose.rotation[0], [[1, 0, 0], [0, 0, -1], [0, 1, 0]], atol=ROUNDING)
    q = radians(UR5_EIGHT[0])
    found = solutions(kinematics(arm), arm, pose_at(arm, q), SEED)
    wanted = searched(arm, pose_at(arm, q), q)
    assert len(found) == len(wanted) == 8
    assert farthest(Reference(arm), wanted.q, found) < 1e-9


CALIBRATED = [  # theta rad, a m, d m, alpha rad
    ("-2.4147806894359e-07", "2.12234865571206e-05", "0.180539811714259", "1.57014608044242"),
    ("1.60233952386695", "0.0193171326277006", "439.140974079901", "0.0013941666682559"),
    ("-1.68607190752171", "-0.569251663611088", "-446.027059806332", "0.00693818880325995"),
    ("0.0837331147700119", "-4.61409023720934e-05", "7.0603368964236", "1.56998468543761"),
    ("-1.01260355871158e-07", "-6.39280053471802e-05", "0.119811341150314", "-1.57038520649543"),
    ("3.91986209186124e-08", "0", "0.115670917257426", "0"),
]
"""Values of a real arm as printed in its driver's manual, page "calibration correction algorithm"."""


def calibrated() -> Arm:
    rows = []
    for k, (theta, a, d, alpha) in enumerate(CALIBRATED, start=1):
        row = joint(f"joint{k}", "0", a, d)
        twist, offset = Angle(radians=Fraction(alpha)), Angle(radians=Fraction(theta))
        rows.append(dataclasses.replace(row, alpha=twist, theta=offset))
    return Arm("calibrated", Convention.STANDARD, Task.POSE, tuple(rows))


NO_CLOSED_FORM = [
    (MANSEUR_DOTY, "sixteen solutions; a twist of 1 degree is not parallel: IJRR 8(5), 1989, from memory"),
    (RAGHAVAN_ROTH, "general, degree 16: 5th ISRR, 1990"),
    (MANSEUR_0M37, "orthogonal with all offsets: University of Florida dissertation, equation 9.60"),
    (calibrated(), "axes nearly parallel: values of a real arm in a driver's manual"),
]


@pytest.mark.parametrize(("arm", "source"), NO_CLOSED_FORM)
def test_no_closed_form_is_claimed(arm, source):
    assert derive(arm) is None, source
