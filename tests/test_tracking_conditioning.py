"""Small constants for nearly parallel axes: the same motion, without offsets of hundreds of metres that cancel."""

from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from codegen.exact import MP, Angle
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Task
from codegen.tracking.conditioning import balanced_links
from codegen.tracking.links import links_of

# theta offset rad, a m, d m, alpha rad. From a vendor's driver documentation, "Calibration correction algorithm"
# (docs.ros.org/en/humble/p/ur_calibration), values "taken from a real robot".
CALIBRATED_ROWS = (
    ("-2.4147806894359e-07", "2.12234865571206e-05", "0.180539811714259", "1.57014608044242"),
    ("1.60233952386695", "0.0193171326277006", "439.140974079901", "0.0013941666682559"),
    ("-1.68607190752171", "-0.569251663611088", "-446.027059806332", "0.00693818880325995"),
    ("0.0837331147700119", "-4.61409023720934e-05", "7.0603368964236", "1.56998468543761"),
    ("-1.01260355871158e-07", "-6.39280053471802e-05", "0.119811341150314", "-1.57038520649543"),
    ("3.91986209186124e-08", "0", "0.115670917257426", "0"),
)
CALIBRATED = Arm(
    "calibrated_six",
    Convention.STANDARD,
    Task.POSE,
    tuple(
        JointRow(
            f"joint{number}",
            JointKind.REVOLUTE,
            a=Fraction(a),
            alpha=Angle(radians=Fraction(alpha)),
            d=Fraction(d),
            theta=Angle(radians=Fraction(theta)),
        )
        for number, (theta, a, d, alpha) in enumerate(CALIBRATED_ROWS, start=1)
    ),
)
DEGREES = (20, -70, 80, -50, 60, 30)
# The tool point there, by multiplying the table's matrices in more digits than float64 has.
POINT = (-0.7903608611234365, -0.5347759318217824, 0.6278483988058107)


def raw_links(arm: Arm):
    """The links straight from the table, multiplied here: Rot_z Trans_z Trans_x Rot_x."""
    links = [MP.eye(4)]
    for row in arm.joints:
        c, s = MP.cos(row.theta.value()), MP.sin(row.theta.value())
        ca, sa = MP.cos(row.alpha.value()), MP.sin(row.alpha.value())
        a, d = MP.mpf(row.a.numerator) / row.a.denominator, MP.mpf(row.d.numerator) / row.d.denominator
        rows = [[c, -s * ca, s * sa, a * c], [s, c * ca, -c * sa, a * s], [0, sa, ca, d], [0, 0, 0, 1]]
        links.append(MP.matrix(rows))
    return tuple(links)


def pose(links, angles, real=float):
    """The product of links and joint turns in the arithmetic of numpy's `real`."""

    def as_real(matrix):
        return np.array([[real(float(matrix[i, j])) for j in range(4)] for i in range(4)], dtype=real)

    total = as_real(links[0])
    for link, angle in zip(links[1:], angles, strict=True):
        turn = MP.eye(4)
        turn[0, 0] = turn[1, 1] = MP.cos(angle)
        turn[1, 0], turn[0, 1] = MP.sin(angle), -MP.sin(angle)
        total = total @ as_real(turn) @ as_real(link)
    return total


def angles_of(degrees):
    return [MP.mpf(value) * MP.pi / 180 for value in degrees]


def test_motion_stays_the_same():
    """Fifty digits of the pose agree, and the printed tool point is met."""
    angles = angles_of(DEGREES)
    raw, balanced = raw_links(CALIBRATED), balanced_links(raw_links(CALIBRATED))
    for links in (raw, balanced):
        total = links[0]
        for link, angle in zip(links[1:], angles, strict=True):
            turn = MP.eye(4)
            turn[0, 0] = turn[1, 1] = MP.cos(angle)
            turn[1, 0], turn[0, 1] = MP.sin(angle), -MP.sin(angle)
            total = total * turn * link
        if links is raw:
            first = total
        assert max(abs(total[i, j] - first[i, j]) for i in range(4) for j in range(4)) < MP.mpf(10) ** -50
        assert [float(total[k, 3]) for k in range(3)] == pytest.approx(POINT, abs=1e-13)


def test_no_long_translation_is_left():
    """439 m, 446 m and 7 m become links no longer than the arm's own."""
    assert max(abs(link[2, 3]) for link in raw_links(CALIBRATED)) > 400
    assert max(abs(link[k, 3]) for link in balanced_links(raw_links(CALIBRATED)) for k in range(3)) < 0.7


def test_binary32_loses_little():
    """The raw table loses tens of micrometres in binary32, the balanced one less than 2."""
    generator = np.random.default_rng(5)
    raw, balanced = raw_links(CALIBRATED), balanced_links(raw_links(CALIBRATED))
    worst_raw = worst_balanced = 0.0
    for _ in range(50):
        angles = [MP.mpf(float(value)) for value in generator.uniform(-math.pi, math.pi, 6)]
        exact = pose(balanced, angles)[:3, 3]
        worst_raw = max(worst_raw, float(abs(pose(raw, angles, np.float32)[:3, 3] - exact).max()))
        worst_balanced = max(worst_balanced, float(abs(pose(balanced, angles, np.float32)[:3, 3] - exact).max()))
    assert worst_raw > 20e-6
    assert worst_balanced < 2e-6


def test_ordinary_arm_comes_back_untouched():
    """Offsets along parallel axes that are the arm's own size stay where the table puts them, with every zero."""
    rows = [
        (0, "0.1625", 90),
        ("-0.425", 0, 0),
        ("-0.3922", 0, 0),
        (0, "0.1333", 90),
        (0, "0.0997", -90),
        (0, "0.0996", 0),
    ]
    joints = tuple(
        JointRow(f"joint{i}", JointKind.REVOLUTE, a=Fraction(a), d=Fraction(d), alpha=Angle.degrees(alpha))
        for i, (a, d, alpha) in enumerate(rows, start=1)
    )
    links = raw_links(Arm("six", Convention.STANDARD, Task.POSE, joints))
    assert all(before is after for before, after in zip(links, balanced_links(links), strict=True))


def test_far_base_and_tool_are_no_reason():
    """A base that stands 50 m from the world origin is not an offset that cancels."""
    arm = replace(CALIBRATED, joints=CALIBRATED.joints[4:], base=Frame(xyz=(Fraction(50), Fraction(0), Fraction(0))))
    assert links_of(arm)[0][0, 3] == 50
    assert float(links_of(arm)[1][2, 3]) == pytest.approx(0.119811341150314, abs=1e-16)
