"""The brute-force search against published arms whose numbers of solutions are known."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest
from link_tables import MANSEUR_0M37, MANSEUR_DOTY, PUMA_560, RAGHAVAN_ROTH, UR5_SERIES_3, turning

from build_checks.reference import Reference
from build_checks.search import Solutions, all_solutions
from codegen.model import Task

PRINTED = 1e-6  # radians: the tables below hold eight decimals of a degree, or four where said
FOUR_DECIMALS = math.radians(1e-4)


def apart(found: Solutions, wanted_degrees: tuple[float, ...]) -> float:
    """From one wanted solution to the nearest found, turns not counted."""
    difference = found.q - np.radians(wanted_degrees)
    return float(np.abs(difference - 2 * np.pi * np.round(difference / (2 * np.pi))).max(axis=1).min())


def search(arm, degrees: tuple[float, ...], starts: int = 2000) -> Solutions:
    pose = Reference(arm).forward(np.radians([degrees]).astype(float))
    return all_solutions(Reference(arm), pose.rotation[0], pose.position[0], starts=starts)


PUMA_FOUR = [  # with the wrist flipped they are eight; recomputed with a search of another make
    (20, -70, 80, -50, 60, 30),
    (20, -82.71210372, 105.37278951, -56.83504233, 52.42121162, 42.23114039),
    (-87.37665978, -110, 105.37278951, 59.48624289, 68.98130594, 26.01174758),
    (-87.37665978, -97.28789628, 80, 56.06762981, 75.75491852, 37.24551666),
]


def test_puma_560_has_eight():
    """Fu, Gonzalez and Lee's table; each of four arm postures with two wrists."""
    found = search(PUMA_560, PUMA_FOUR[0])
    assert len(found) == 8
    for q1, q2, q3, q4, q5, q6 in PUMA_FOUR:
        assert apart(found, (q1, q2, q3, q4, q5, q6)) < PRINTED
        assert apart(found, (q1, q2, q3, q4 + 180, -q5, q6 + 180)) < PRINTED


UR5_EIGHT = [  # recomputed with a search of another make
    (20, -70, 80, -50, 60, 30),
    (20, 6.14824255, -80, 33.85175745, 60, 30),
    (20, -48.17564116, 67.60243167, 120.57320949, -60, -150),
    (20, 16.35326015, -67.60243167, -168.75082848, -60, -150),
    (-139.12369433, -131.16915971, -69.55524816, 55.62206264, 103.34225105, -163.61593597),
    (-139.12369433, 162.46368588, 69.55524816, -17.12127928, 103.34225105, -163.61593597),
    (-139.12369433, -110.79022918, -78.14853069, -136.16358537, -103.34225105, 16.38406403),
    (-139.12369433, 174.78838014, 78.14853069, 141.96074394, -103.34225105, 16.38406403),
]


def test_three_parallel_axes_have_eight():
    """The UR5 of the arm maker's manual."""
    found = search(UR5_SERIES_3, UR5_EIGHT[0])
    assert len(found) == 8
    for wanted in UR5_EIGHT:
        assert apart(found, wanted) < PRINTED


def test_manseur_and_doty_has_sixteen():
    """IJRR 8(5), 1989: the pose in the exact form that agrees with every printed digit; each solution well apart."""
    root = math.sqrt
    rotation = np.array(
        [
            [-root(130) / 15, -root(7 / 17), 2 / 15 * root(10 / 17)],
            [2 / 15, 0.0, root(221) / 15],
            [-root(91) / 15, root(10 / 17), 2 / 15 * root(7 / 17)],
        ]
    )
    position = np.array([-root(1.3), 0.0, 0.0])
    found = all_solutions(Reference(MANSEUR_DOTY), rotation, position)
    assert len(found) == 16
    assert found.hits.min() > 20
    pose = Reference(MANSEUR_DOTY).forward(found.q)
    np.testing.assert_allclose(pose.rotation, np.broadcast_to(rotation, (16, 3, 3)), atol=1e-13)
    np.testing.assert_allclose(pose.position, np.broadcast_to(position, (16, 3)), atol=1e-13)


def test_raghavan_and_roth_has_two_real():
    """5th ISRR, 1990: sixteen solutions, two of them real."""
    found = search(RAGHAVAN_ROTH, (14, 29.7, -45, 71, -63, 10))
    assert len(found) == 2
    other = (13.10971077661, 50.992551193468, -72.044110806382, 72.064909021547, -7.196259252376, -37.85229319006)
    assert apart(found, (14, 29.7, -45, 71, -63, 10)) < PRINTED
    assert apart(found, other) < PRINTED


MANSEUR_SIX = [  # the third and the fourth are 3.4 degrees apart
    (0, 0, -90, -180, 90, -180),
    (45.2397, 126.8699, -180, 53.1301, -134.7603, -180),
    (60.4290, 0, 151.5865, 180, -91.1575, 180),
    (60.4039, -3.4060, 150.4403, -177.0388, -90.0798, -178.3205),
    (79.1097, -121.1109, 141.4202, -71.6521, -117.6523, -142.9324),
    (-136.7736, -153.2893, -9.0097, -147.8681, 144.6340, -6.9853),
]


def test_two_solutions_close_together_stay_two():
    """Manseur's dissertation, equation 9.60: six real solutions."""
    found = search(MANSEUR_0M37, MANSEUR_SIX[0], starts=4000)
    assert len(found) == 6
    for wanted in MANSEUR_SIX:
        assert apart(found, wanted) < FOUR_DECIMALS


@pytest.mark.parametrize(
    ("goal", "wanted"),
    [
        ((-3.0, 2.0, -90.0), [(90, 90, 90), (163.7397952917, -90, -163.7397952917)]),
        ((-3.1245, 9.1674, -30.0), []),
    ],
)
def test_planar_arm_of_craigs_exercises(goal, wanted):
    """Craig, Introduction to Robotics, exercises 3A and 4A (from memory): a 3-4-5 triangle, and a goal out of reach."""
    arm = turning([("0", "4", "0"), ("0", "3", "0"), ("0", "2", "0")], Task.PLANE_POSE)
    x, y, heading = goal
    angle = math.radians(heading)
    rotation = np.array([[math.cos(angle), -math.sin(angle), 0], [math.sin(angle), math.cos(angle), 0], [0, 0, 1]])
    found = all_solutions(Reference(arm), rotation, np.array([x, y, 0.0]), starts=300)
    assert len(found) == len(wanted)
    for degrees in wanted:
        assert apart(found, degrees) < PRINTED


def test_held_joints_come_from_the_seed():
    """The PUMA 560 as a point arm with its wrist held: four arm postures, the wrist as it stands."""
    arm = dataclasses.replace(PUMA_560, task=Task.POINT, held=("joint4", "joint5", "joint6"))
    q = np.radians(PUMA_FOUR[0]).astype(float)
    pose = Reference(arm).forward(q[None])
    found = all_solutions(Reference(arm), pose.rotation[0], pose.position[0], seed=q, starts=500)
    assert len(found) == 4
    np.testing.assert_allclose(found.q[:, 3:], np.broadcast_to(q[3:], (4, 3)), atol=1e-12)
