"""One branch alone, all branches, and the nearest one give the same bits: the stages that they share are the same code.

Poses along the axes are among those tried: there cosines and sines are zeros, whose signs must not show.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from test_tracking_steps import without_structure

from build_checks.compile import Kinematics, Status, compiled
from codegen.armfile import read_arm
from codegen.model import Arm, Task
from codegen.options import Arithmetic, Options, RealType
from codegen.pipeline import generate

ARMS = Path(__file__).parents[1] / "arms"
SEED = 7
SOLVED = (Status.OK, Status.SINGULAR, Status.OVER_LIMIT)
CASES = [
    ("bench_six", Options()),
    ("bench_six", Options(real=RealType.DOUBLE)),
    ("bench_six", Options(angles=Arithmetic.INTEGER)),
    ("column_gantry", Options()),
    ("press_tender", Options()),
    ("railed_six", Options()),
    ("seven_held", Options()),
    ("vial_picker", Options()),
]


@pytest.mark.parametrize(("arm", "options"), CASES)
def test_one_branch_alone_is_a_row_of_all(arm: str, options: Options) -> None:
    read = read_arm(ARMS / f"{arm}.toml").arm
    random = np.random.default_rng(SEED)
    quarters = random.integers(-2, 3, (400, len(read.joints))) * (np.pi / 2)
    joints = np.concatenate([random.uniform(-3, 3, (400, len(read.joints))), quarters])
    seeds = np.concatenate([random.uniform(-6, 6, (400, len(read.joints))), np.zeros_like(quarters)])
    with compiled(generate(read, options), options) as library:
        kinematics = Kinematics(library)
        poses, _ = kinematics.forward(joints)
        poses[400:, :9] = np.round(poses[400:, :9])  # exactly along the axes
        every = kinematics.inverse_all(poses, seeds)
        for branch in range(kinematics.branches):
            alone, status = kinematics.inverse(poses, np.full(len(poses), branch), seeds)
            assert np.array_equal(status, every.status[:, branch])
            assert alone.tobytes() == np.ascontiguousarray(every.q[:, branch]).tobytes()
        nearest, number, status = kinematics.inverse_nearest(poses, seeds)
        solved = np.isin(status, SOLVED)
        assert solved.sum() > 100
        rows = np.flatnonzero(solved)
        assert nearest[solved].tobytes() == np.ascontiguousarray(every.q[rows, number[solved]]).tobytes()


IN_PLACE = {
    **{name: ARMS / f"{name}.toml" for name in ("bench_six", "press_tender", "vial_picker", "wall_sorter")},
    "no closed form": without_structure(Task.POSE, "RRRRRR"),
}


@pytest.mark.parametrize("arm", IN_PLACE.values(), ids=IN_PLACE)
def test_an_inverse_may_be_written_over_its_seed(arm: Arm | Path) -> None:
    """As firmware does that steps along a path: q = inverse(pose, q)."""
    read = read_arm(arm).arm if isinstance(arm, Path) else arm
    options = Options()
    random = np.random.default_rng(SEED)
    count = len(read.joints)
    with compiled(generate(read, options), options) as library:
        kinematics = Kinematics(library)
        poses, _ = kinematics.forward(random.uniform(-0.9, 0.9, (60, count)))
        seeds = random.uniform(-1.5, 1.5, (60, count))
        apart, branches, statuses = kinematics.inverse_nearest(poses, seeds)
        solved = np.isin(statuses, SOLVED)
        assert solved.sum() > 20
        over, branches_over, statuses_over = kinematics.inverse_nearest(poses, seeds, in_place=True)
        assert np.array_equal(statuses, statuses_over)
        assert np.array_equal(branches, branches_over)
        assert over[solved].tobytes() == apart[solved].tobytes()
        for branch in range(kinematics.branches):
            number = np.full(len(poses), branch)
            apart, statuses = kinematics.inverse(poses, number, seeds)
            over, statuses_over = kinematics.inverse(poses, number, seeds, in_place=True)
            solved = np.isin(statuses, SOLVED)
            assert np.array_equal(statuses, statuses_over)
            assert over[solved].tobytes() == apart[solved].tobytes()
