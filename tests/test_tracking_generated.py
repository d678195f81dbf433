"""The generated C of arms without a closed form, against published solution sets and searches of another make."""

from __future__ import annotations

import subprocess
import tempfile
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from generated import QUICK, REACHED, apart, farthest, kinematics, pose_at, searched, solutions
from link_tables import MANSEUR_0M37, MANSEUR_DOTY, RAGHAVAN_ROTH, frame, turning
from test_tracking_conditioning import CALIBRATED, DEGREES
from test_tracking_steps import ARMS

from build_checks.compile import Kinematics, Status, compile_library, find_compiler
from build_checks.reference import Poses, Reference
from build_checks.reference_task import TaskReading
from codegen.emit.files import Source
from codegen.exact import Angle
from codegen.model import Arm, Convention, Task
from codegen.options import Options, RealType
from codegen.tracking.files import tracked_files
from codegen.tracking.starts import Effort, prepare_starts

PRINTED = 1e-7  # rad: eight decimals of a degree are printed
FOUR_DECIMALS = 2e-6  # rad: four decimals of a degree
SMALL = Effort(choosing_poses=30, candidates=80, deciding_poses=20, measuring_poses=20, dense_starts=100)
BUDGETS = {RealType.FLOAT: (1e-6, 2e-6), RealType.DOUBLE: (1e-14, 2e-14)}  # of the reach, rad: what is promised

# Manseur and Doty, IJRR 8(5), 1989: 16 real solutions. The pose in the exact form that agrees with every printed
# digit; solutions recomputed by a search of another make.
SIXTEEN_POSE = Poses(
    np.array(
        [
            [-np.sqrt(130) / 15, -np.sqrt(7 / 17), 2 / 15 * np.sqrt(10 / 17)],
            [2 / 15, 0, np.sqrt(221) / 15],
            [-np.sqrt(91) / 15, np.sqrt(10 / 17), 2 / 15 * np.sqrt(7 / 17)],
        ]
    )[None],
    np.array([[-np.sqrt(1.3), 0.0, 0.0]]),
)
EIGHT_OF_SIXTEEN = [
    (-178.12617097, 108.19161999, 32.26618928, -174.30676493, -15.32545325, -0.41949830),
    (-120.78834148, 172.33434216, 0.92716819, 148.66797968, -33.28484420, -37.17911568),
    (-96.28454430, -6.27360818, -0.03113648, 141.51400110, 127.45014917, 140.59528254),
    (-12.94296426, -105.09633260, 65.02463212, 176.97652206, 172.58299715, 100.57816780),
    (2.51725944, 108.07590924, -67.95688054, -169.47701066, 179.99490529, 179.89045390),
    (88.67843233, -176.72467592, 3.27095632, -116.75808181, 22.80407788, -39.56334852),
    (113.84362812, 5.30640743, 2.25572330, -124.07581752, -117.01517406, 136.62264563),
    (168.32188778, -103.89212714, -33.39623706, -162.75906389, -8.12076113, -81.83489477),
]
# Manseur's dissertation, University of Florida, chapter 9, example 4: six real solutions, two of them 3.4 degrees apart.
SIX = [
    (0, 0, -90, -180, 90, -180),
    (45.2397, 126.8699, -180, 53.1301, -134.7603, -180),
    (60.4290, 0, 151.5865, 180, -91.1575, 180),
    (60.4039, -3.4060, 150.4403, -177.0388, -90.0798, -178.3205),
    (79.1097, -121.1109, 141.4202, -71.6521, -117.6523, -142.9324),
    (-136.7736, -153.2893, -9.0097, -147.8681, 144.6340, -6.9853),
]
# Raghavan and Roth, 5th ISRR, 1990: two real solutions of sixteen.
TWO = [
    (14, 29.7, -45, 71, -63, 10),
    (13.10971077661, 50.992551193468, -72.044110806382, 72.064909021547, -7.196259252376, -37.85229319006),
]
OFFSET_WRIST = replace(
    turning(
        [
            ("90", "0", "0.3"),
            ("0", "0.6", "0.1"),
            ("90", "0.5", "0"),
            ("-90", "0", "0.12"),
            ("90", "0", "0.1"),
            ("0", "0", "0.08"),
        ]
    ),
    tool=frame(("0", "0", "0.05"), ("0", "0", "0")),
)


def sixteen() -> np.ndarray:
    partners = [(a, b, c + 180, 180 - d, 180 - e, f + 180) for a, b, c, d, e, f in EIGHT_OF_SIXTEEN]
    return np.radians(EIGHT_OF_SIXTEEN + partners)


@pytest.mark.parametrize("seed", [(0.1, 0.2, -0.3, 0.4, 0.5, -0.6), (2.0, -1.0, 1.0, 3.0, -2.0, 1.5)])
def test_sixteen_real_solutions(seed):
    c = kinematics(MANSEUR_DOTY)
    found = solutions(c, MANSEUR_DOTY, SIXTEEN_POSE, np.array(seed))
    assert c.branches == 16
    assert len(found) == 16
    assert farthest(Reference(MANSEUR_DOTY), sixteen(), found) < PRINTED


def test_six_real_solutions_with_two_close_together():
    """The pose is printed: rows [1 0 0 1], [0 0 -1 1/2], [0 1 0 -1/2]."""
    pose = Poses(np.array([[[1.0, 0, 0], [0, 0, -1], [0, 1, 0]]]), np.array([[1.0, 0.5, -0.5]]))
    found = solutions(kinematics(MANSEUR_0M37), MANSEUR_0M37, pose, np.zeros(6))
    assert len(found) == 6
    assert farthest(Reference(MANSEUR_0M37), np.radians(SIX), found) < FOUR_DECIMALS


def test_two_real_solutions():
    found = solutions(kinematics(RAGHAVAN_ROTH), RAGHAVAN_ROTH, pose_at(RAGHAVAN_ROTH, np.radians(TWO[0])), np.zeros(6))
    assert len(found) == 2
    assert farthest(Reference(RAGHAVAN_ROTH), np.radians(TWO), found) < PRINTED


def test_calibrated_arm_has_eight():
    """An as-measured table whose axes 2, 3, 4 are nearly parallel: the eight that a search of another make finds."""
    pose = pose_at(CALIBRATED, np.radians(DEGREES))
    wanted = searched(CALIBRATED, pose, np.zeros(6))
    found = solutions(kinematics(CALIBRATED), CALIBRATED, pose, np.zeros(6))
    assert len(wanted) == len(found) == 8
    assert farthest(Reference(CALIBRATED), wanted.q, found) < 1e-9


def accuracy(arm: Arm, real: RealType) -> None:
    """Every solution of 400 random poses reaches its pose within what is promised; the way back is among them."""
    c, reference, reading = kinematics(arm, real), Reference(arm), TaskReading(Reference(arm))
    generator = np.random.default_rng(6)
    q = c.rounded(reference.random_joints(generator, 400)).astype(float)
    seeds = reference.random_joints(generator, 400)
    seeds[:, reference.held] = q[:, reference.held]
    poses = reference.forward(q)
    found = c.inverse_all(c.pack(poses), c.rounded(seeds))
    rows, branches = np.nonzero(np.isin(found.status, REACHED))
    chain = reference.chain(found.q[rows, branches].astype(float))
    position, angle = reading.errors(poses.take(rows), chain)
    share, radians = BUDGETS[real]
    assert (position <= share * reference.reach).all()
    assert (angle * np.minimum(reading.sharpness(poses.take(rows), chain), 0.03) <= radians).all()
    near = np.where(np.isin(found.status, REACHED), apart(reference, found.q.astype(float), q[:, None, :]), 9.0)
    assert (near.min(axis=1) < (0.01 if real is RealType.FLOAT else 1e-6)).mean() >= 0.99


@pytest.mark.parametrize("name", ["pose", "point_axis with a joint held", "point_pitch", "point_yaw"])
@pytest.mark.parametrize("real", list(RealType))
def test_random_poses(name, real):
    accuracy(ARMS[name], real)


@pytest.mark.parametrize("arm", [MANSEUR_DOTY, RAGHAVAN_ROTH, MANSEUR_0M37, OFFSET_WRIST])
def test_random_poses_of_published_arms_in_float(arm):
    accuracy(arm, RealType.FLOAT)


def test_calibrated_arm_in_float():
    """The same budget as any arm of that size, though the raw table would lose 75 micrometres."""
    c, reference = kinematics(CALIBRATED, RealType.FLOAT), Reference(CALIBRATED)
    q = c.rounded(np.random.default_rng(8).uniform(-3, 3, (200, 6)))
    pose, _ = c.forward(q)
    gap = np.linalg.norm(c.unpack(pose).position - reference.forward(q.astype(float)).position, axis=1)
    assert gap.max() < 1e-6 * 1.5  # m; the arm reaches 1.5 m


def test_tracked_from_itself():
    """Branch 0 is the solution tracked from the seed: joint values come back from their own pose."""
    c, reference = kinematics(RAGHAVAN_ROTH), Reference(RAGHAVAN_ROTH)
    q = np.random.default_rng(9).uniform(-3, 3, (300, 6))
    assert (c.branch_of(q) == 0).all()
    back, status = c.inverse(c.pack(reference.forward(q)), np.zeros(300, dtype=int), q)
    regular = TaskReading(reference).smallest_singular(q) > 1e-4
    assert (status == Status.OK).all()
    assert apart(reference, back, q)[regular].max() < 1e-9


def test_each_branch_alone_is_that_of_all():
    c = kinematics(MANSEUR_DOTY)
    pose, seed = c.pack(SIXTEEN_POSE), np.full((1, 6), 0.3)
    every = c.inverse_all(pose, seed)
    alone, status = c.inverse(np.repeat(pose, 16, axis=0), np.arange(16), np.repeat(seed, 16, axis=0))
    assert (status == every.status[0]).all()
    assert (alone == every.q[0]).all()
    _, status = c.inverse(pose, np.array([16]), seed)
    assert status[0] == Status.BAD_BRANCH


@pytest.mark.parametrize("spread", [0.003, 0.02, 0.2, 3.0])
def test_nearest_is_the_nearest_of_all(spread):
    """Seeds from beside the solution to anywhere: the early answer is the one that the whole search would give."""
    arm = replace(
        MANSEUR_DOTY,
        joints=tuple(
            replace(row, max_speed=Angle(radians=Fraction(1 + i, 2))) for i, row in enumerate(MANSEUR_DOTY.joints)
        ),
    )
    c, reference = kinematics(arm), Reference(arm)
    generator = np.random.default_rng(10)
    q = generator.uniform(-3, 3, (400, 6))
    seeds = q + generator.uniform(-spread, spread, q.shape)
    pose = c.pack(reference.forward(q))
    every, (nearest, branch, status) = c.inverse_all(pose, seeds), c.inverse_nearest(pose, seeds)
    times = np.where(
        every.status == Status.OK, np.max(np.abs(every.q - seeds[:, None]) / reference.speeds, axis=2), np.inf
    )
    assert (status == Status.OK).all()
    assert np.max(np.abs(nearest - seeds) / reference.speeds, axis=1) == pytest.approx(times.min(axis=1), abs=1e-9)
    assert (every.q[np.arange(400), branch] == nearest).all()


@pytest.mark.parametrize("real", list(RealType))
def test_point_on_the_first_axis_leaves_it_free(real):
    """Three joints, the tool's point on axis 1: the first joint keeps its seed, and the pose is reached."""
    arm = turning([("80", "0.1", "0.3"), ("20", "0.5", "0.1"), ("40", "0.5", "0.05")], Task.POINT)
    c, reference = _small(arm, real), Reference(arm)
    at_axis = _on_first_axis(reference)
    seeds = np.random.default_rng(11).uniform(-3, 3, (len(at_axis), 3))
    found = c.inverse_all(c.pack(reference.forward(at_axis)), c.rounded(seeds))
    solved = np.isin(found.status, REACHED)
    assert solved.any(axis=1).all()
    assert (found.status[solved] == Status.SINGULAR).all()
    rows, branches = np.nonzero(solved)
    assert (found.q[rows, branches, 0] == c.rounded(seeds)[rows, 0]).all()


def _on_first_axis(reference: Reference) -> np.ndarray:
    """Joint values with the tool's point on axis 1, by Newton's steps in the other two joints."""
    places = []
    for start in np.random.default_rng(12).uniform(-3, 3, (20, 2)):
        q = np.array([[0.4, *start]])
        for _ in range(60):
            rows = reference.jacobian(q)[0][:2, 1:]
            q[0, 1:] -= np.clip(np.linalg.lstsq(rows, reference.forward(q).position[0, :2], rcond=None)[0], -0.5, 0.5)
        if np.abs(reference.forward(q).position[0, :2]).max() < 1e-16:
            places.append(q[0])
    assert places
    return np.array(places)


def test_aligned_first_and_last_axes_leave_them_free():
    """The last axis along the first: both turn together; the first keeps its seed, and each posture comes once."""
    c, reference = kinematics(OFFSET_WRIST), Reference(OFFSET_WRIST)
    q = np.array([[0.3, 0.58573, 2.55586, -np.pi, 0.0, 0.7], [0.3, 3.72732, -3.72732, np.pi, np.pi, 0.7]])
    for _ in range(60):
        pose, rows = reference.forward(q), reference.jacobian(q)
        miss = np.concatenate((pose.position[:, :2], pose.rotation[:, 0, 2:], pose.rotation[:, 1, 2:]), axis=1)
        tilt = np.stack((rows[:, 4] * pose.rotation[:, 2, 2, None], -rows[:, 3] * pose.rotation[:, 2, 2, None]), axis=1)
        moves = np.concatenate((rows[:, :2], tilt), axis=1)[:, :, 1:5]
        for k in range(len(q)):
            q[k, 1:5] -= np.linalg.lstsq(moves[k], miss[k], rcond=1e-6)[0]
    seeds = np.random.default_rng(13).uniform(-3, 3, q.shape)
    found = c.inverse_all(c.pack(reference.forward(q)), seeds)
    for k in range(len(q)):
        assert (found.status[k] == Status.SINGULAR).sum() == 2
        assert (found.q[k][found.status[k] == Status.SINGULAR, 0] == seeds[k, 0]).all()


def test_out_of_reach_and_bad_input_leave_everything():
    c = kinematics(RAGHAVAN_ROTH)
    far = Poses(np.eye(3)[None], np.array([[40.0, 0.0, 0.0]]))
    near = Poses(np.eye(3)[None], np.array([[13.0, 0.0, 0.0]]))  # within all links end to end, yet not reached
    for pose in (far, near):
        found = c.inverse_all(c.pack(pose), np.zeros((1, 6)))
        assert (found.status == Status.OUT_OF_REACH).all()
        assert len(np.unique(found.q)) == 1  # what stood there before
        assert c.inverse(c.pack(pose), np.array([0]), np.zeros((1, 6)))[1][0] == Status.OUT_OF_REACH
    nan = c.inverse_all(c.pack(near), np.full((1, 6), np.nan))
    assert (nan.status == Status.BAD_INPUT).all()


def test_stretched_seed_finds_its_way_in():
    """From a straight arm, a target straight inward has no gradient: the steps begin beside the seed."""
    arm = turning([("0", "0.4", "0"), ("0", "0.3", "0")], Task.PLANE_POINT)
    c, reference = _small(arm, RealType.FLOAT), Reference(arm)
    target = Poses(np.eye(3)[None], np.array([[0.5, 0.0, 0.0]]))
    q, status = c.inverse(c.pack(target), np.array([0]), c.rounded(np.zeros((1, 2))))
    assert status[0] == Status.OK
    assert reference.forward(q.astype(float)).position[0] == pytest.approx([0.5, 0, 0], abs=1e-6)


def test_half_a_turn_is_not_taken_for_none():
    """At a seed whose tool is turned by half a turn from the target, axis times sine is zero: no solution stands there."""
    c, reference = kinematics(OFFSET_WRIST), Reference(OFFSET_WRIST)
    q = np.random.default_rng(14).uniform(-3, 3, (100, 6))
    pose = reference.forward(q)
    turned = Poses(pose.rotation * np.array([1.0, -1.0, -1.0]), pose.position)
    found, status = c.inverse(c.pack(turned), np.zeros(100, dtype=int), q)
    solved = status == Status.OK
    assert solved.any()
    assert np.abs(reference.forward(found[solved]).rotation - turned.rotation[solved]).max() < 1e-13


def _small(arm: Arm, real: RealType):
    """Compiled from a table that was prepared with little effort, whether or not the arm has a closed form."""
    options = Options(real)
    files = tracked_files(arm, options, Source("arm.toml"), prepare_starts(arm, SMALL))
    with tempfile.TemporaryDirectory() as folder:
        return Kinematics(compile_library(files, options, Path(folder), QUICK))


@pytest.mark.parametrize("name", ARMS)
@pytest.mark.parametrize("real", list(RealType))
def test_no_warnings(name, real, tmp_path):
    """As C99 and as C++17, with every warning an error."""
    options = Options(real)
    files = tracked_files(ARMS[name], options, Source("arm.toml"), prepare_starts(ARMS[name], SMALL))
    for file, text in files.items():
        (tmp_path / file).write_text(text)
    named = (
        "all extra pedantic conversion sign-conversion double-promotion shadow float-equal undef cast-qual vla error"
    )
    warnings = [f"-W{name}" for name in named.split()]
    for language in (["-std=c99", "-Wstrict-prototypes"], ["-x", "c++", "-std=c++17"]):
        command = [find_compiler(), *language, *warnings, "-c", "-o", "arm.o", "arm_kin.c"]
        done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, check=False)
        assert done.returncode == 0, done.stderr


def test_header_says_what_it_is():
    """The kind of inverse, what a branch number means, the share and the worst-case steps."""
    header = tracked_files(RAGHAVAN_ROTH, Options(), Source("arm.toml"), prepare_starts(RAGHAVAN_ROTH, SMALL))[
        "arm_kin.h"
    ]
    assert "#define ARM_INVERSE_NUMERIC 1" in header
    for words in (
        "Inverse: numeric",
        "only within one call",
        "at the very worst",
        "against a dense search",
        "proven bound",
    ):
        assert " ".join(words.split()) in " ".join(header.replace("\n *", " ").split())


def test_conventions_do_not_matter():
    """The same arm as a modified table tracks to the same solutions."""
    rows = RAGHAVAN_ROTH.joints
    shifted = tuple(
        replace(row, a=before.a, alpha=before.alpha)
        for row, before in zip(rows, (replace(rows[0], a=Fraction(0), alpha=Angle()), *rows[:-1]), strict=True)
    )
    last = rows[-1]
    arm = Arm(
        "modified", Convention.MODIFIED, Task.POSE, shifted, tool=frame((str(last.a), "0", "0"), ("100", "0", "0"))
    )
    found = solutions(_small(arm, RealType.DOUBLE), arm, pose_at(RAGHAVAN_ROTH, np.radians(TWO[0])), np.zeros(6))
    assert farthest(Reference(arm), np.radians(TWO), found) < PRINTED
