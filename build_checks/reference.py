"""The arm in float64, straight from its link table: what every check compares the C with.

The tool pose is the plain product `base A_1 ... A_n tool` of the arm file's link transforms (Hartenberg and Denavit,
"A kinematic notation for lower-pair mechanisms based on matrices", J. Appl. Mech. 22, 1955), multiplied elementary
turn by elementary slide. The Jacobian is read off the same products: a turning joint moves the tool point by axis x
arm, a sliding one along its axis. Nothing here is derived, simplified or shared with the generator, and everything is
vectorised over N joint vectors.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from codegen.exact import Angle
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Quantity

Array: TypeAlias = npt.NDArray[np.float64]
Integers: TypeAlias = npt.NDArray[np.int64]
Flags: TypeAlias = npt.NDArray[np.bool_]

_BLOCK = 8192  # joint vectors multiplied at a time, so that the intermediate frames stay in the processor's cache


@dataclass(frozen=True, slots=True)
class Poses:
    """N tool poses: rotation [N, 3, 3], its columns the tool axes in the world frame, and position [N, 3] in metres."""

    rotation: Array
    position: Array

    def __len__(self) -> int:
        return len(self.position)

    def take(self, rows: Integers | Flags) -> Poses:
        return Poses(self.rotation[rows], self.position[rows])


@dataclass(frozen=True, slots=True)
class Chain:
    """N placed chains: the tool poses, and each joint's axis and a point on it, [N, n, 3], in the world frame."""

    tool: Poses
    axes: Array
    origins: Array


def number(quantity: Quantity) -> float:
    """A length in metres or an angle in radians, to float64."""
    return float(quantity.value()) if isinstance(quantity, Angle) else float(quantity)


def cosine_sine(angle: Angle) -> tuple[float, float]:
    """(cos, sin), exact at right angles."""
    cosine, sine = angle.cosine_sine()
    return float(cosine), float(sine)


def frame_matrix(frame: Frame) -> tuple[Array, Array]:
    """A fixed frame as (rotation, translation): Rz(yaw) Ry(pitch) Rx(roll), then xyz."""
    (cr, sr), (cp, sp), (cy, sy) = (cosine_sine(angle) for angle in frame.rpy)
    about_x = np.array([[1.0, 0.0, 0.0], [0.0, cr, -sr], [0.0, sr, cr]])
    about_y = np.array([[cp, 0.0, sp], [0.0, 1.0, 0.0], [-sp, 0.0, cp]])
    about_z = np.array([[cy, -sy, 0.0], [sy, cy, 0.0], [0.0, 0.0, 1.0]])
    return about_z @ about_y @ about_x, np.array([float(value) for value in frame.xyz])


class _Moving:
    """N frames carried along the chain: the columns x, y, z of the rotation and the origin, each [3, N]."""

    def __init__(self, frame: tuple[Array, Array], count: int) -> None:
        rotation, translation = frame
        self.x, self.y, self.z = (np.repeat(rotation[:, i : i + 1], count, axis=1) for i in range(3))
        self.origin = np.repeat(translation[:, None], count, axis=1)

    def turn_z(self, cosine: Array | float, sine: Array | float) -> None:
        self.x, self.y = cosine * self.x + sine * self.y, cosine * self.y - sine * self.x

    def turn_x(self, cosine: float, sine: float) -> None:
        self.y, self.z = cosine * self.y + sine * self.z, cosine * self.z - sine * self.y

    def slide_x(self, distance: float) -> None:
        self.origin = self.origin + distance * self.x

    def slide_z(self, distance: Array | float) -> None:
        self.origin = self.origin + distance * self.z


def _joint(frame: _Moving, row: JointRow, variable: Array) -> None:
    """Rot_z(theta) Trans_z(d) with the joint variable added to theta or to d."""
    frame.turn_z(*cosine_sine(row.theta))
    if row.kind is JointKind.REVOLUTE:
        frame.turn_z(np.cos(variable), np.sin(variable))
        frame.slide_z(float(row.d))
    else:
        frame.slide_z(float(row.d) + variable)


def _twist(frame: _Moving, row: JointRow) -> None:
    """Trans_x(a) Rot_x(alpha): the two commute, so both conventions use it."""
    frame.slide_x(float(row.a))
    frame.turn_x(*cosine_sine(row.alpha))


class Reference:
    """The link table in float64.

    count         joints n
    revolute      [n], True for a turning joint
    lower, upper  [n], limits in rad or m; infinite where the file gives none
    speeds        [n], rad/s or m/s; 1 where the file gives none (contract, section 2)
    free, held    positions of the joints that inverse kinematics solves, and of those it takes from its seed
    base_position [3], origin of frame 0 in the world frame, m
    reach         m, a length that the tool's distance from frame 0 never exceeds (but for unlimited slides): the sum of
                  |a| and |d| over the rows, the travel of limited slides, and the tool's offset; 1 m when all are 0
    """

    def __init__(self, arm: Arm) -> None:
        self.arm = arm
        self.count = len(arm.joints)
        self.revolute: Flags = np.array([row.kind is JointKind.REVOLUTE for row in arm.joints])
        limits = [_limits(row) for row in arm.joints]
        self.lower = np.array([low for low, _ in limits])
        self.upper = np.array([high for _, high in limits])
        self.speeds = np.array([1.0 if row.max_speed is None else number(row.max_speed) for row in arm.joints])
        self.free: Integers = np.array(arm.free_indices, dtype=np.int64)
        self.held: Integers = np.array(arm.held_indices, dtype=np.int64)
        self._base = frame_matrix(arm.base)
        self._tool = frame_matrix(arm.tool)
        self.base_position = self._base[1]
        self.reach = _reach(arm)

    def chain(self, q: Array) -> Chain:
        """Tool poses, joint axes and joint origins at joint vectors q [N, n]."""
        size = len(q)
        rotation, position = np.empty((size, 3, 3)), np.empty((size, 3))
        axes, origins = np.empty((size, self.count, 3)), np.empty((size, self.count, 3))
        for start in range(0, size, _BLOCK):
            part = slice(start, start + _BLOCK)
            frame = self._place(q[part], axes[part], origins[part])
            turned = (frame.x, frame.y, frame.z) if self._tool_is_straight() else self._turned_by_tool(frame)
            for column, axis in enumerate(turned):
                rotation[part, :, column] = axis.T
            position[part] = frame.origin.T + np.stack((frame.x.T, frame.y.T, frame.z.T), axis=2) @ self._tool[1]
        return Chain(Poses(rotation, position), axes, origins)

    def _place(self, q: Array, axes: Array, origins: Array) -> _Moving:
        """The last link frame; fills in the axes and origins of the joints."""
        frame = _Moving(self._base, len(q))
        for index, row in enumerate(self.arm.joints):
            if self.arm.convention is Convention.MODIFIED:
                _twist(frame, row)
            axes[:, index], origins[:, index] = frame.z.T, frame.origin.T
            _joint(frame, row, q[:, index])
            if self.arm.convention is Convention.STANDARD:
                _twist(frame, row)
        return frame

    def _tool_is_straight(self) -> bool:
        return bool(np.array_equal(self._tool[0], np.eye(3)))

    def _turned_by_tool(self, frame: _Moving) -> tuple[Array, Array, Array]:
        tool = self._tool[0]
        x, y, z = (frame.x * tool[0, i] + frame.y * tool[1, i] + frame.z * tool[2, i] for i in range(3))
        return x, y, z

    def forward(self, q: Array) -> Poses:
        """Tool poses in the world frame at joint vectors q [N, n]."""
        return self.chain(q).tool

    def jacobian(self, q: Array) -> Array:
        """Geometric Jacobian [N, 6, n] in the world frame at the tool point: rows vx vy vz wx wy wz."""
        return self.jacobian_of(self.chain(q))

    def jacobian_of(self, chain: Chain) -> Array:
        arms = chain.tool.position[:, None, :] - chain.origins
        turning = self.revolute[None, :, None]
        linear = np.where(turning, np.cross(chain.axes, arms), chain.axes)
        angular = np.where(turning, chain.axes, 0.0)
        return np.concatenate((linear, angular), axis=2).swapaxes(1, 2)

    def span(self) -> tuple[Array, Array]:
        """[n] lowest and highest joint value to sample: the limits, else -pi..pi, or half the reach to either side."""
        wide = np.where(self.revolute, math.pi, 0.5 * self.reach)
        return np.where(np.isinf(self.lower), -wide, self.lower), np.where(np.isinf(self.upper), wide, self.upper)

    def random_joints(self, rng: np.random.Generator, size: int) -> Array:
        """Uniform joint vectors [size, n] within the span."""
        low, high = self.span()
        return low + (high - low) * rng.random((size, self.count))


def _limits(row: JointRow) -> tuple[float, float]:
    if row.limits is None:
        return -math.inf, math.inf
    return number(row.limits[0]), number(row.limits[1])


def _reach(arm: Arm) -> float:
    rows = sum(abs(float(row.a)) + _length_along_z(row) for row in arm.joints)
    return rows + math.hypot(*(float(value) for value in arm.tool.xyz)) or 1.0


def _length_along_z(row: JointRow) -> float:
    offset = float(row.d)
    if row.kind is JointKind.REVOLUTE or row.limits is None:
        return abs(offset)
    return max(abs(offset + number(limit)) for limit in row.limits)
