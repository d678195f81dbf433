"""What inverse kinematics must reach, read from a pose as the contract says, and how far a pose is from it.

`misses` gives target minus actual in the parts that the task reads; `jacobian` gives how those parts move with the
joints that are not held. Both follow from the geometric Jacobian by elementary vector algebra. The pitch of
`point_pitch` is an angle in the arm's own plane, which turns with the arm: its rate counts the turning of that plane
too.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from build_checks.reference import Array, Chain, Poses, Reference
from codegen.model import Task

_PLANE_TASKS = (Task.PLANE_POSE, Task.PLANE_POINT)


def dot(left: Array, right: Array) -> Array:
    product: Array = np.einsum("...i,...i->...", left, right)
    return product


def cross(left: Array, right: Array) -> Array:
    a, b = np.moveaxis(left, -1, 0), np.moveaxis(right, -1, 0)
    return np.stack((a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]), axis=-1)


def length(vectors: Array) -> Array:
    return np.sqrt(dot(vectors, vectors))


def wrap(angle: Array) -> Array:
    """The same angle in -pi..pi."""
    return angle - 2 * np.pi * np.round(angle / (2 * np.pi))


def _skew(rotation: Array) -> Array:
    """[N, 3] twice the axis times the sine of the angle."""
    lower = (rotation[:, 2, 1], rotation[:, 0, 2], rotation[:, 1, 0])
    upper = (rotation[:, 1, 2], rotation[:, 2, 0], rotation[:, 0, 1])
    return np.stack(lower, axis=1) - np.stack(upper, axis=1)


def rotation_vector(rotation: Array) -> Array:
    """Axis times angle [N, 3] of rotations [N, 3, 3]; of a drifted matrix, to second order, its nearest rotation's."""
    skew = 0.5 * _skew(rotation)
    sine = length(skew)
    angle = np.arctan2(sine, 0.5 * (np.trace(rotation, axis1=1, axis2=2) - 1.0))
    return skew * np.where(sine > 0.0, angle / np.where(sine > 0.0, sine, 1.0), 1.0)[:, None]


def rotation_about(vectors: Array) -> Array:
    """Rotations [N, 3, 3] by axis times angle [N, 3] (Rodrigues' formula)."""
    angle = length(vectors)
    axis = vectors / np.where(angle > 0.0, angle, 1.0)[:, None]
    zero = np.zeros_like(angle)
    x, y, z = axis.T
    across = np.array([[zero, -z, y], [z, zero, -x], [-y, x, zero]]).transpose(2, 0, 1)
    sine, versine = np.sin(angle)[:, None, None], (1.0 - np.cos(angle))[:, None, None]
    rotation: Array = np.eye(3) + sine * across + versine * (across @ across)
    return rotation


@dataclass(frozen=True, slots=True)
class Misses:
    """Target minus actual: metres [N, 3], and radians [N, m], m being 3, 1 or 0 by the task."""

    linear: Array
    angular: Array


class TaskReading:
    """How one arm's task reads a pose."""

    def __init__(self, reference: Reference) -> None:
        self.reference = reference
        self.task = reference.arm.task
        turning = [int(i) for i in reference.free if reference.revolute[i]]
        self._last_turning = turning[-1] if turning else None

    @property
    def is_planar(self) -> bool:
        return self.task in _PLANE_TASKS

    def normals(self, chain: Chain) -> Array:
        """[N, 3] normals of the arm's plane: along the axis of the last free turning joint, or across two slides."""
        if self._last_turning is not None:
            return chain.axes[:, self._last_turning]
        across = cross(chain.axes[:, self.reference.free[0]], chain.axes[:, self.reference.free[-1]])
        return across / length(across)[:, None]

    def misses(self, target: Poses, chain: Chain) -> Misses:
        linear = target.position - chain.tool.position
        if self.is_planar:
            linear = _in_plane(linear, self.normals(chain))
        return Misses(linear, self._angular(target, chain))

    def errors(self, target: Poses, chain: Chain) -> tuple[Array, Array]:
        """How far the tool is from the target in what the task reads: metres [N], radians [N]."""
        misses = self.misses(target, chain)
        return length(misses.linear), length(misses.angular)

    def sharpness(self, target: Poses, chain: Chain) -> Array:
        """[N] 1 where the target states its angle fully; less where only a short projection states it, so that rounding
        of the target's entries moves the angle by 1/sharpness as much. 0: the angle is not stated at all."""
        if self.task is Task.POINT_PITCH:
            return length(_in_plane(target.rotation[:, :, 2], self.normals(chain)))
        if self.task is Task.POINT_YAW:
            return np.hypot(target.rotation[:, 0, 0], target.rotation[:, 1, 0])
        return np.ones(len(target))

    def _angular(self, target: Poses, chain: Chain) -> Array:
        actual = chain.tool.rotation
        if self.task is Task.POSE:
            return rotation_vector(target.rotation @ actual.swapaxes(1, 2))
        if self.task is Task.POINT_AXIS:
            return _axis_to_axis(actual[:, :, 2], target.rotation[:, :, 2])
        if self.task is Task.POINT_PITCH:
            return _angle_about(self.normals(chain), actual[:, :, 2], target.rotation[:, :, 2])[:, None]
        if self.task is Task.POINT_YAW:
            return wrap(_heading(target.rotation) - _heading(actual))[:, None]
        if self.task is Task.PLANE_POSE:
            return _turn_about(self.normals(chain), target.rotation @ actual.swapaxes(1, 2))[:, None]
        return np.zeros((len(target), 0))

    def jacobian(self, target: Poses, chain: Chain) -> Array:
        """[N, 3 + m, k]: how the parts the task reads move with the k free joints, the linear rows first."""
        full = self.reference.jacobian_of(chain)[:, :, self.reference.free]
        linear, spin = full[:, :3], full[:, 3:].swapaxes(1, 2)  # spin: [N, k, 3]
        if self.is_planar:
            normals = self.normals(chain)
            linear = linear - normals[:, :, None] * np.einsum("ni,nik->nk", normals, linear)[:, None, :]
        return np.concatenate((linear, self._spin_rows(target, chain, spin)), axis=1)

    def _spin_rows(self, target: Poses, chain: Chain, spin: Array) -> Array:
        actual = chain.tool.rotation
        if self.task is Task.POSE:
            return spin.swapaxes(1, 2)
        if self.task is Task.POINT_AXIS:
            return _in_plane(spin, actual[:, None, :, 2]).swapaxes(1, 2)
        if self.task is Task.POINT_PITCH:
            return self._pitch_rates(target, chain, spin)[:, None, :]
        if self.task is Task.POINT_YAW:
            return _heading_rates(actual[:, None, :, 0], spin)[:, None, :]
        if self.task is Task.PLANE_POSE:
            return dot(spin, self.normals(chain)[:, None, :])[:, None, :]
        return np.zeros((len(target), 0, spin.shape[1]))

    def _pitch_rates(self, target: Poses, chain: Chain, spin: Array) -> Array:
        """Rate of (actual - target) angle in the plane that the joints before the last turning one carry around."""
        normals = self.normals(chain)[:, None, :]
        carried = np.where((self.reference.free < (self._last_turning or 0))[None, :, None], spin, 0.0)
        actual_rate = _angle_rate(normals, chain.tool.rotation[:, None, :, 2], spin - carried)
        return actual_rate + _angle_rate(normals, target.rotation[:, None, :, 2], carried)

    def moved(self, chain: Chain, linear: Array, angular: Array) -> Poses:
        """The tool poses moved by metres [N, 3] and by radians [N, m], the rows of `jacobian`."""
        tool = chain.tool
        turn = angular
        if self.task in (Task.POINT_PITCH, Task.PLANE_POSE):
            turn = angular * self.normals(chain)
        if self.task is Task.POINT_YAW:
            turn = angular * np.array([0.0, 0.0, 1.0])
        if self.task in (Task.POINT, Task.PLANE_POINT):
            turn = np.zeros_like(linear)
        return Poses(rotation_about(turn) @ tool.rotation, tool.position + linear)

    def scaled(self, jacobian: Array) -> Array:
        """The same without units: metres in reaches."""
        sized = jacobian.copy()
        sized[:, :3] /= self.reference.reach
        sized[:, :, ~self.reference.revolute[self.reference.free]] *= self.reference.reach
        return sized

    def smallest_singular(self, q: Array) -> Array:
        """[N] smallest singular value of the scaled task Jacobian; 0: some motion leaves the task as it is.

        NaN where q is no number.
        """
        finite = np.flatnonzero(np.isfinite(q).all(axis=1))
        smallest = np.full(len(q), np.nan)
        if len(finite):
            chain = self.reference.chain(q[finite])
            values = np.linalg.svd(self.scaled(self.jacobian(chain.tool, chain)), compute_uv=False)
            smallest[finite] = values[:, -1]
        return smallest


def _in_plane(vectors: Array, normals: Array) -> Array:
    return vectors - normals * dot(normals, vectors)[..., None]


def _axis_to_axis(start: Array, end: Array) -> Array:
    """[N, 3] the shortest turn that takes one axis to the other."""
    across = cross(start, end)
    sine = length(across)
    angle = np.arctan2(sine, dot(start, end))
    return across * np.where(sine > 0.0, angle / np.where(sine > 0.0, sine, 1.0), 1.0)[:, None]


def _angle_about(normals: Array, start: Array, end: Array) -> Array:
    """[N] the turn about the normal that takes one vector's projection to the other's."""
    first, second = _in_plane(start, normals), _in_plane(end, normals)
    return np.arctan2(dot(normals, cross(first, second)), dot(first, second))


def _angle_rate(normals: Array, vectors: Array, spin: Array) -> Array:
    """[N, k] rate of the angle of a vector's projection when it turns with `spin`."""
    flat = _in_plane(vectors, normals)
    squared = dot(flat, flat)
    return dot(normals, cross(flat, cross(spin, vectors))) / np.where(squared > 0.0, squared, 1.0)


def _heading(rotation: Array) -> Array:
    angle: Array = np.arctan2(rotation[:, 1, 0], rotation[:, 0, 0])
    return angle


def _heading_rates(axis: Array, spin: Array) -> Array:
    rate = cross(spin, axis)
    squared = axis[..., 0] ** 2 + axis[..., 1] ** 2
    return (axis[..., 0] * rate[..., 1] - axis[..., 1] * rate[..., 0]) / np.where(squared > 0.0, squared, 1.0)


def _turn_about(normals: Array, rotation: Array) -> Array:
    """[N] the turn about the normal that comes nearest to each rotation."""
    along = np.einsum("ni,nij,nj->n", normals, rotation, normals)
    angle: Array = np.arctan2(dot(normals, _skew(rotation)), np.trace(rotation, axis1=1, axis2=2) - along)
    return angle
