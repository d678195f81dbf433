"""One branch alone, all branches, and the nearest one give the same bits: the stages that they share are the same code.

Poses along the axes are among those tried: there cosines and sines are zeros, whose signs must not show.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from build_checks.compile import Kinematics, Status, compiled
from codegen.armfile import read_arm
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
