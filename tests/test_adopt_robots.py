"""Robot descriptions of real arms, adopted and compared with an independent reader.

Descriptions: the packages airo-models (MIT licence) and example-robot-data (BSD-3-Clause), as data. Independent
reader and forward kinematics: MuJoCo, a general physics engine (Todorov, Erez and Tassa, "MuJoCo: A physics engine
for model-based control", IROS 2012), which parses the URDF by itself. What is compared is the arm file as written,
read back by the arm file reader and multiplied out by the float64 reference of the checks.
"""

from __future__ import annotations

import importlib.metadata
import re
from pathlib import Path

import mujoco
import numpy as np
import numpy.typing as npt
import pytest

from build_checks.reference import Reference
from codegen.adopt import Adoption, Wanted, adopt_file
from codegen.armfile import read_arm
from codegen.armwriter import arm_file_text
from codegen.model import Arm, Task

Array = npt.NDArray[np.float64]

# Package, file, root, tip; then the joints and task to expect; the largest move of the tool (m) that the
# description's own rounding explains: 1e-9 where it types all digits, 1e-5 where it types 1.5708 and the like, 1e-3
# where it types 3.14.
ROBOTS = [
    ("airo-models", "ur5e.urdf", "base_link", "tool0", 6, Task.POSE, 1e-9),
    ("airo-models", "ur3e.urdf", "base_link", "tool0", 6, Task.POSE, 1e-9),
    ("example-robot-data", "ur10_robot.urdf", "base_link", "ee_link", 6, Task.POSE, 1e-9),
    ("example-robot-data", "panda.urdf", "panda_link0", "panda_hand_tcp", 7, Task.POSE, 1e-9),
    ("example-robot-data", "xarm7.urdf", "world", "link7", 7, Task.POSE, 1e-5),
    ("example-robot-data", "z1.urdf", "link00", "link06", 6, Task.POSE, 1e-9),
    ("example-robot-data", "kinova.urdf", "base", "j2s6s200_end_effector", 6, Task.POSE, 1e-9),
    ("example-robot-data", "so101.urdf", "base_link", "gripper_frame_link", 5, Task.POINT_AXIS, 1e-5),
    ("example-robot-data", "baxter.urdf", "torso", "left_gripper", 7, Task.POSE, 1e-5),
    ("example-robot-data", "pr2.urdf", "torso_lift_link", "r_gripper_palm_link", 7, Task.POSE, 1e-9),
    ("example-robot-data", "icub.urdf", "chest", "l_hand", 7, Task.POSE, 1e-5),
    ("example-robot-data", "tiago.urdf", "base_footprint", "head_2_link", 3, Task.POINT, 1e-9),
    ("example-robot-data", "tiago_pro.urdf", "torso_lift_link", "arm_left_tool_link", 7, Task.POSE, 1e-3),
    ("example-robot-data", "talos_full_v2.urdf", "base_link", "right_sole_link", 6, Task.POSE, 1e-9),
    ("example-robot-data", "allegro_left_hand.urdf", "palm_link", "link_3.0_tip", 4, Task.POINT_PITCH, 1e-9),
    ("tests", "wall_lift.urdf", "wall", "plate", 5, Task.POINT_AXIS, 1e-5),
]
_READER_OPTIONS = (
    '<mujoco><compiler fusestatic="false" discardvisual="true" '
    'boundmass="1" boundinertia="1" strippath="true"/></mujoco>'
)


def description(package: str, name: str) -> Path:
    if package == "tests":
        return Path(__file__).parent / "data" / name
    files = importlib.metadata.files(package) or []
    return Path(str(next(file.locate() for file in files if file.name == name)))


def physics_model(path: Path) -> mujoco.MjModel:
    """The description in MuJoCo, without what needs mesh files and without masses, which it would check."""
    text = path.read_text()
    for element in ("visual", "collision", "inertial", "transmission", "gazebo", "mujoco"):
        text = re.sub(rf"<{element}\b[^>]*/>|<{element}\b.*?</{element}>", "", text, flags=re.DOTALL)
    return mujoco.MjModel.from_xml_string(text.replace("</robot>", _READER_OPTIONS + "</robot>"))


def physics_poses(model: mujoco.MjModel, names: list[str], q: Array, root: str, tip: str) -> Array:
    """4x4 poses of the tip in the root, at the joint vectors q."""
    data = mujoco.MjData(model)
    addresses = [model.joint(name).qposadr[0] for name in names]
    return np.stack([_physics_pose(model, data, addresses, values, root, tip) for values in q])


def _physics_pose(model, data, addresses, values, root: str, tip: str) -> Array:
    data.qpos[:] = model.qpos0
    data.qpos[addresses] = values
    mujoco.mj_kinematics(model, data)
    return np.linalg.inv(_body_pose(model, data, root)) @ _body_pose(model, data, tip)


def _body_pose(model, data, link: str) -> Array:
    """MuJoCo merges the description's outermost link into its world body."""
    pose = np.eye(4)
    names = {model.body(index).name for index in range(model.nbody)}
    body = data.body(link if link in names else "world")
    pose[:3, :3], pose[:3, 3] = body.xmat.reshape(3, 3), body.xpos
    return pose


def reference_poses(arm: Arm, q: Array) -> Array:
    tool = Reference(arm).chain(q).tool
    poses = np.tile(np.eye(4), (len(q), 1, 1))
    poses[:, :3, :3], poses[:, :3, 3] = tool.rotation, tool.position
    return poses


def read_back(adoption: Adoption, folder: Path) -> Arm:
    path = folder / "adopted.toml"
    path.write_text(arm_file_text(adoption.arm, adoption.notes))
    return read_arm(path).arm


@pytest.mark.parametrize(
    ("package", "name", "root", "tip", "joints", "task", "budget"), ROBOTS, ids=[f"{row[1]}-{row[3]}" for row in ROBOTS]
)
def test_tool_pose_is_the_descriptions(tmp_path, package, name, root, tip, joints, task, budget) -> None:
    """At 200 joint vectors within limits: same pose, same signs and zeros of the joints, as MuJoCo reads the file."""
    path = description(package, name)
    arm = read_back(adopt_file(path, Wanted(tip, root)), tmp_path)
    assert len(arm.joints) == joints
    assert arm.task is task
    q = Reference(arm).random_joints(np.random.default_rng(7), 200)
    model = physics_model(path)
    want = physics_poses(model, [row.name for row in arm.joints], q, root, tip)
    got = reference_poses(arm, q)
    assert np.abs(got - want)[:, :3, 3].max() < budget
    assert np.abs(got - want)[:, :3, :3].max() < 10 * budget  # rad; the arms are about 1 m, wrists about 0.1 m long


@pytest.mark.parametrize(("package", "name", "root", "tip"), [row[:4] for row in ROBOTS])
def test_limits_are_the_descriptions(package, name, root, tip) -> None:
    """MuJoCo's limits, in radians and metres, to the fifth decimal at which a whole degree may be cut off."""
    path = description(package, name)
    model = physics_model(path)
    arm = adopt_file(path, Wanted(tip, root)).arm
    reference = Reference(arm)
    for index, row in enumerate(arm.joints):
        joint = model.joint(row.name)
        if row.limits is not None:
            assert bool(joint.limited[0])
            assert (reference.lower[index], reference.upper[index]) == pytest.approx(tuple(joint.range), abs=1e-5)


@pytest.mark.parametrize(
    ("package", "name", "root", "tip", "held"),
    [
        ("example-robot-data", "pr2.urdf", "torso_lift_link", "r_gripper_palm_link", "r_upper_arm_roll_joint"),
        ("example-robot-data", "panda.urdf", "panda_link0", "panda_link8", "panda_joint7"),
    ],
)
def test_the_held_joint_leaves_three_axes_that_meet(package, name, root, tip, held) -> None:
    """A 7-joint arm with a wrist whose axes meet is held at its third joint; one whose shoulder axes meet, elsewhere.

    Three neighbouring axes that meet make a six-joint chain solvable: Pieper, "The kinematics of manipulators under
    computer control", Stanford, 1968.
    """
    assert adopt_file(description(package, name), Wanted(tip, root)).arm.held == (held,)


def test_published_link_lengths_of_the_ur5e_come_out() -> None:
    """Maker's table for the UR5e (article "DH Parameters for calculations of kinematics and dynamics"): d1 0.1625,
    a2 -0.425, a3 -0.3922, d4 0.1333, d5 0.0997, d6 0.0996; the sign of an a is the choice of an x axis."""
    rows = adopt_file(description("airo-models", "ur5e.urdf"), Wanted("tool0")).arm.joints
    assert [abs(float(row.a)) for row in rows] == [0, 0.425, 0.3922, 0, 0, 0]
    assert [float(row.d) for row in rows] == [0.1625, 0, 0, 0.1333, 0.0997, 0.0996]
    assert [row.alpha.quarter_turns for row in rows][1:3] == [0, 0]
