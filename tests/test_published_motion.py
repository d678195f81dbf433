"""Forward kinematics and Jacobian of generated C against a physics engine and rotations of scipy; its operation count.

MuJoCo holds a chain as nested bodies and computes poses and Jacobians by its own recursion; scipy.spatial.transform
multiplies rotations as quaternions. Neither reads a link table: the tests turn each row into elementary moves for them.
"""

from __future__ import annotations

import dataclasses
from xml.etree import ElementTree

import mujoco
import numpy as np
import pytest
from arms_random import HELD_ARMS, POINT_ARMS, POSE_ARMS, YAW_ARMS, Structure, random_arm
from generated import kinematics
from link_tables import PUMA_560
from scipy.spatial.transform import Rotation

from build_checks.compile import Kinematics, Status
from build_checks.reference import Reference, number
from codegen.emit.expression import Constants
from codegen.emit.motion_text import MotionText
from codegen.exact import Angle
from codegen.forward import pose_nodes
from codegen.model import Arm, Convention, Frame, JointKind, JointRow
from codegen.options import Options, RealType
from codegen.program import Op, reachable

SHARE = {RealType.FLOAT: 1e-6, RealType.DOUBLE: 1e-14}  # of the reach: the position error that is promised
ANGLE = {RealType.FLOAT: 2e-6, RealType.DOUBLE: 2e-14}  # radians: the rotation error that is promised
STRUCTURES = [POSE_ARMS[0], POSE_ARMS[22], POSE_ARMS[32], POINT_ARMS[2], POINT_ARMS[5], YAW_ARMS[1], HELD_ARMS[0]]


def named(structure: Structure) -> str:
    return structure.name


# -- a chain as a physics engine holds it ------------------------------------------------------------------------------
Move = tuple[str, str, float]  # "turn" or "slide", axis, amount


def moves_of(row: JointRow, convention: Convention) -> tuple[list[Move], list[Move]]:
    """What stands before a row's joint and behind it, offsets counted as before."""
    link = [("slide", "x", float(row.a)), ("turn", "x", number(row.alpha))]
    own = [("turn", "z", number(row.theta)), ("slide", "z", float(row.d))]
    return (link + own, []) if convention is Convention.MODIFIED else (own, link)


def frame_moves(frame: Frame) -> list[Move]:
    roll, pitch, yaw = (number(angle) for angle in frame.rpy)
    slides = [("slide", axis, float(value)) for axis, value in zip("xyz", frame.xyz, strict=True)]
    return [*slides, ("turn", "z", yaw), ("turn", "y", pitch), ("turn", "x", roll)]


def body_in(parent: ElementTree.Element, moves: list[Move]) -> ElementTree.Element:
    """The innermost of nested bodies, one for each move."""
    for kind, axis, amount in moves:
        unit = np.eye(3)["xyz".index(axis)]
        half = 0.5 * amount
        place = {"pos": unit * amount} if kind == "slide" else {"quat": [np.cos(half), *(np.sin(half) * unit)]}
        texts = {key: " ".join(repr(float(v)) for v in value) for key, value in place.items()}
        parent = ElementTree.SubElement(parent, "body", texts)
    return parent


def physics_model(arm: Arm) -> mujoco.MjModel:
    root = ElementTree.Element("mujoco")
    ElementTree.SubElement(root, "compiler", {"angle": "radian", "boundmass": "1", "boundinertia": "1"})
    body = body_in(ElementTree.SubElement(root, "worldbody"), frame_moves(arm.base))
    for row in arm.joints:
        before, behind = moves_of(row, arm.convention)
        body = ElementTree.SubElement(body_in(body, before), "body")
        kind = "hinge" if row.kind is JointKind.REVOLUTE else "slide"
        ElementTree.SubElement(body, "joint", {"type": kind, "axis": "0 0 1"})
        body = body_in(body, behind)
    ElementTree.SubElement(body_in(body, frame_moves(arm.tool)), "site", {"name": "tool"})
    return mujoco.MjModel.from_xml_string(ElementTree.tostring(root, encoding="unicode"))


def physics_motion(arm: Arm, q: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Rotations [N, 3, 3], positions [N, 3] and Jacobians [N, 6, n] of the tool."""
    model = physics_model(arm)
    data = mujoco.MjData(model)
    rotations, positions, jacobians = [], [], []
    for row in q:
        data.qpos[:] = row
        mujoco.mj_kinematics(model, data)
        mujoco.mj_comPos(model, data)
        linear, angular = np.zeros((3, model.nv)), np.zeros((3, model.nv))
        mujoco.mj_jacSite(model, data, linear, angular, 0)
        rotations.append(data.site_xmat[0].reshape(3, 3).copy())
        positions.append(data.site_xpos[0].copy())
        jacobians.append(np.concatenate((linear, angular)))
    return np.array(rotations), np.array(positions), np.array(jacobians)


def some_joints(arm: Arm) -> np.ndarray:
    """Joint values that a float holds exactly."""
    rng = np.random.default_rng(11)
    wide = np.array([3.0 if row.kind is JointKind.REVOLUTE else 0.5 for row in arm.joints])
    return (wide * rng.uniform(-1, 1, (50, len(wide)))).astype(np.float32).astype(np.float64)


@pytest.mark.parametrize("real", list(RealType), ids=lambda real: real.c_name)
@pytest.mark.parametrize("structure", STRUCTURES, ids=named)
def test_motion_is_that_of_a_physics_engine(structure: Structure, real: RealType):
    """MuJoCo's pose of the tool site and its Jacobian there (linear rows first, world frame)."""
    arm = random_arm(structure, 1)
    c, q = kinematics(arm, real), some_joints(arm)
    rotation, position, jacobian = physics_motion(arm, q)
    packed, status = c.forward(c.rounded(q))
    poses = Kinematics.unpack(packed)
    assert (status == Status.OK).all()
    reach = Reference(arm).reach
    np.testing.assert_allclose(poses.rotation, rotation, atol=ANGLE[real])
    np.testing.assert_allclose(poses.position, position, atol=SHARE[real] * reach)
    found, status = c.jacobian(c.rounded(q))
    assert (status == Status.OK).all()
    np.testing.assert_allclose(found[:, :3], jacobian[:, :3], atol=2 * SHARE[real] * reach)
    np.testing.assert_allclose(found[:, 3:], jacobian[:, 3:], atol=ANGLE[real])


@pytest.mark.parametrize("structure", STRUCTURES, ids=named)
def test_rotation_is_the_product_of_scipys(structure: Structure):
    """The turns alone, multiplied as quaternions."""
    arm = random_arm(structure, 2)
    c, q = kinematics(arm), some_joints(arm)
    total = turned(frame_moves(arm.base), len(q))
    for index, row in enumerate(arm.joints):
        before, behind = moves_of(row, arm.convention)
        spin = q[:, index] if row.kind is JointKind.REVOLUTE else np.zeros(len(q))
        total = total * turned(before, len(q)) * Rotation.from_euler("z", spin[:, None]) * turned(behind, len(q))
    total = total * turned(frame_moves(arm.tool), len(q))
    packed, _ = c.forward(c.rounded(q))
    np.testing.assert_allclose(Kinematics.unpack(packed).rotation, total.as_matrix(), atol=ANGLE[RealType.DOUBLE])


def turned(moves: list[Move], count: int) -> Rotation:
    total = Rotation.identity()
    for kind, axis, amount in moves:
        total = total * Rotation.from_euler(axis, amount if kind == "turn" else 0.0)
    return Rotation.from_matrix(np.repeat(total.as_matrix()[None], count, axis=0))


# -- what it costs -----------------------------------------------------------------------------------------------------
PUMA_RANGES = [(-160, 160), (-225, 45), (-45, 225), (-110, 170), (-100, 100), (-266, 266)]


def test_forward_kinematics_costs_no_more_than_by_hand():
    """12 sines and cosines, 44 multiplications, 23 additions: the textbook arrangement worked out by hand.

    Fu, Gonzalez and Lee, Robotics (1987), section 2.2.11 (from memory) give 12, 40 and 20 for this arm, as an order of
    size: their count leaves out what they do not say.
    """
    limits = [tuple(Angle.degrees(end) for end in ends) for ends in PUMA_RANGES]
    rows = [dataclasses.replace(row, limits=ends) for row, ends in zip(PUMA_560.joints, limits, strict=True)]
    motion = MotionText(dataclasses.replace(PUMA_560, joints=tuple(rows)), Options(), Constants(Options()))
    pose = pose_nodes(motion.carrier)
    nodes = reachable([*(entry for row in pose.rotation for entry in row), *pose.position])
    angles = [motion.values.angle(heading) for heading, pair in motion.values.pairs.items() if pair.cosine in nodes]
    nodes = [*nodes, *(node for node in reachable(angles) if node not in nodes)]
    assert 2 * len(angles) <= 12
    assert sum(node.op is Op.PRODUCT for node in nodes) <= 44
    assert sum(len(node.args) - 1 for node in nodes if node.op is Op.SUM) <= 23
    assert {node.op for node in nodes} <= {Op.CONSTANT, Op.INPUT, Op.SUM, Op.PRODUCT}
