"""The arm files that come with the tool: each reads without a warning, and its joints can do its task.

The Jacobian is the reference's (Hartenberg and Denavit 1955, plain products); that a task needs a Jacobian of full rank
is the inverse function theorem.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from build_checks.reference import Array, Reference
from codegen.armfile import read_arm
from codegen.model import Arm, Convention, JointKind, Task

FILES = sorted((Path(__file__).parent.parent / "arms").glob("*.toml"))


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_a_shipped_arm_reads_without_a_warning(path: Path) -> None:
    file = read_arm(path)
    assert file.warnings == ()
    assert file.arm.name == path.stem


def test_the_shipped_arms_cover_what_an_arm_file_can_say() -> None:
    arms = [read_arm(path).arm for path in FILES]
    rows = [row for arm in arms for row in arm.joints]
    assert {arm.task for arm in arms} == set(Task)
    assert {arm.convention for arm in arms} == set(Convention)
    assert {(arm.length_unit, arm.angle_unit) for arm in arms} == {(m, a) for m in ("m", "mm") for a in ("rad", "deg")}
    assert {row.kind for row in rows} == set(JointKind)
    assert {len(arm.joints) for arm in arms} == set(range(2, 8))


def task_rows(arm: Arm, rotation: Array, axes: Array, jacobian: Array) -> Array:
    """The rates of what the task reads, from the rates of the tool: [k, free joints]."""
    linear, angular = jacobian[:3], jacobian[3:]
    x, z = rotation[:, 0], rotation[:, 2]
    normal = next((axes[i] for i in (-1, 0) if arm.joints[i].kind is JointKind.REVOLUTE), np.cross(axes[0], axes[1]))
    turned_x = np.cross(angular.T, x).T
    in_plane = linear - np.outer(normal, normal @ linear)
    return {
        Task.POSE: lambda: jacobian,
        Task.POINT_AXIS: lambda: np.vstack((linear, np.cross(angular.T, z).T)),
        Task.POINT_PITCH: lambda: np.vstack((linear, normal @ angular)),
        Task.POINT_YAW: lambda: np.vstack((linear, x[0] * turned_x[1] - x[1] * turned_x[0])),
        Task.POINT: lambda: linear,
        Task.PLANE_POSE: lambda: np.vstack((in_plane, normal @ angular)),
        Task.PLANE_POINT: lambda: in_plane,
    }[arm.task]()


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_a_shipped_arm_can_do_its_task(path: Path) -> None:
    arm = read_arm(path).arm
    reference = Reference(arm)
    joints = reference.random_joints(np.random.default_rng(20), 5)
    chain, jacobians = reference.chain(joints), reference.jacobian(joints)
    for rotation, axes, jacobian in zip(chain.tool.rotation, chain.axes, jacobians, strict=True):
        rows = task_rows(arm, rotation, axes, jacobian)[:, reference.free]
        assert np.linalg.matrix_rank(rows, tol=1e-3) == arm.task.joints
