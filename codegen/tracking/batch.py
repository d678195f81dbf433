"""The steps of the generated C on many lanes at once: one start for one pose in each lane.

Every step solves the task's residuals to first order by damped least squares (Levenberg 1944, here with a damping in
proportion to the residual, so that it fades as the solution is neared and the steps become Newton's). The
arithmetic is that of `lanes`, so a prepared table is the same on every machine.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from codegen.model import Task
from codegen.tracking.lanes import (
    Flags,
    Lane,
    LanePoses,
    LaneVector,
    combined,
    cross,
    dot,
    least_squares_step,
    sine_cosine,
)
from codegen.tracking.settings import DAMPING, LARGEST_MOVE, NEAR, SEARCH_STEPS
from codegen.tracking.shape import ArmShape
from codegen.tracking.turns import Turn, axis_turn, heading_turn, no_turn, pitch_turn, plane_turn, rotation_turn

LEAST_DAMPING = 1e-8
FINISHING_STEPS = 8
SOLVED = 1e-9  # residual of a solution, in float64


@dataclass(frozen=True, slots=True)
class _Placed:
    """A placed chain: the tool, and per joint its axis and a point on it."""

    tool: LanePoses
    axes: list[LaneVector]
    origins: list[LaneVector]


class Batch:
    """The steps for one arm."""

    def __init__(self, shape: ArmShape) -> None:
        self.shape = shape
        self._links = [[[float(link[i, j]) for j in range(4)] for i in range(3)] for link in shape.links]
        self._length_scale = float(shape.length_scale)
        self.units = [1.0 if shape.turning[i] else float(shape.slide_unit) for i in shape.free]
        self._plane = [[float(entry) for entry in vector] for vector in shape.plane]

    def poses(self, q: LaneVector) -> LanePoses:
        """Tool poses at joint values q: one lane array per joint."""
        return self._placed(q).tool

    def rows(self, q: LaneVector, target: LanePoses) -> list[LaneVector]:
        """How the unknowns change the residuals at q: rows[i][j]."""
        return self._rows(q, target)[0]

    def tracked(self, target: LanePoses, q: LaneVector) -> tuple[LaneVector, Flags, npt.NDArray[np.intp]]:
        """Steps from q towards the target: where each lane ends, whether it is a solution, and its steps."""
        q = [entry.copy() for entry in q]
        count = len(q[0])
        steps, solved = np.zeros(count, dtype=np.intp), np.zeros(count, dtype=np.bool_)
        active = np.arange(count)
        for step in range(SEARCH_STEPS + FINISHING_STEPS + 1):
            here, there = [entry[active] for entry in q], target.take(active)
            rows, residual, size = self._rows(here, there)
            solved[active] = size <= SOLVED
            lasting = ~solved[active] & ((step < SEARCH_STEPS) | (size <= NEAR))
            if step == SEARCH_STEPS + FINISHING_STEPS or not lasting.any():
                break
            active, size = active[lasting], size[lasting]
            steps[active] += 1
            rows = [[entry[lasting] for entry in row] for row in rows]
            residual = [entry[lasting] for entry in residual]
            self._moved(q, active, least_squares_step(rows, residual, DAMPING * size + LEAST_DAMPING))
        return q, solved, steps

    def _moved(self, q: LaneVector, active: npt.NDArray[np.intp], move: LaneVector) -> None:
        largest = np.zeros(len(active))
        for entry in move:
            largest = np.maximum(largest, np.abs(entry))
        share = LARGEST_MOVE / np.maximum(largest, LARGEST_MOVE)
        for joint, unit, entry in zip(self.shape.free, self.units, move, strict=True):
            q[joint][active] += entry * share * unit

    def _placed(self, q: LaneVector) -> _Placed:
        one, zero = np.ones_like(q[0]), np.zeros_like(q[0])
        frame = LanePoses([one, zero, zero], [zero, one, zero], [zero, zero, one], [zero, zero, zero])
        frame = self._linked(frame, 0)
        axes, origins = [], []
        for i, value in enumerate(q):
            axes.append(frame.z)
            origins.append(frame.point)
            frame = self._linked(self._joint(frame, i, value), i + 1)
        return _Placed(frame, axes, origins)

    def _joint(self, frame: LanePoses, i: int, value: Lane) -> LanePoses:
        if not self.shape.turning[i]:
            point = [start + value * along for start, along in zip(frame.point, frame.z, strict=True)]
            return LanePoses(frame.x, frame.y, frame.z, point)
        sine, cosine = sine_cosine(value)
        x = [cosine * a + sine * b for a, b in zip(frame.x, frame.y, strict=True)]
        y = [cosine * b - sine * a for a, b in zip(frame.x, frame.y, strict=True)]
        return LanePoses(x, y, frame.z, frame.point)

    def _linked(self, frame: LanePoses, i: int) -> LanePoses:
        link, axes = self._links[i], [frame.x, frame.y, frame.z]
        x, y, z = (combined([link[k][j] for k in range(3)], axes) for j in range(3))
        shift = combined([link[k][3] for k in range(3)], axes)
        return LanePoses(x, y, z, [a + b for a, b in zip(frame.point, shift, strict=True)])

    def _rows(self, q: LaneVector, target: LanePoses) -> tuple[list[LaneVector], LaneVector, Lane]:
        """How the residuals shrink as the free joints move (in their units), the residuals, and their size.

        Residuals are target minus actual. Their size is never small when the tool is turned the wrong way round.
        """
        placed = self._placed(q)
        linear, spin = self._columns(placed)
        miss = [self._length_scale * (a - b) for a, b in zip(target.point, placed.tool.point, strict=True)]
        if self._plane:
            rows = [[_weighed(self._plane[k], column) for column in linear] for k in (0, 1)]
            residual = [_weighed(self._plane[k], miss) for k in (0, 1)]
        else:
            rows = [[column[k] for column in linear] for k in range(3)]
            residual = miss
        turn = self._turn(placed, target, spin)
        residual = residual + turn.residual
        size = np.sqrt(dot(residual, residual))
        return rows + turn.rows, residual, np.where(turn.backwards, np.maximum(size, 1.0), size)

    def _columns(self, placed: _Placed) -> tuple[list[LaneVector], list[LaneVector]]:
        """Per free joint: velocity of the tool point (scaled) and angular velocity, for one unit of the joint."""
        linear, spin = [], []
        for joint, unit in zip(self.shape.free, self.units, strict=True):
            axis = placed.axes[joint]
            velocity = axis
            if self.shape.turning[joint]:
                arm = [a - b for a, b in zip(placed.tool.point, placed.origins[joint], strict=True)]
                velocity = cross(axis, arm)
            linear.append([self._length_scale * unit * entry for entry in velocity])
            spin.append(axis if self.shape.turning[joint] else [np.zeros_like(axis[0])] * 3)
        return linear, spin

    def _turn(self, placed: _Placed, target: LanePoses, spin: list[LaneVector]) -> Turn:
        tool, task = placed.tool, self.shape.task
        if task is Task.POSE:
            return rotation_turn(tool, target, spin)
        if task is Task.POINT_AXIS:
            return axis_turn(tool, target, spin)
        if task is Task.POINT_PITCH and self.shape.last_turning is not None:
            carried = [joint < self.shape.last_turning for joint in self.shape.free]
            return pitch_turn(placed.axes[self.shape.last_turning], tool, target, spin, carried)
        if task is Task.POINT_YAW:
            return heading_turn(tool, target, spin)
        if task is Task.PLANE_POSE:
            normal = [np.full_like(tool.x[0], entry) for entry in self._plane[2]]
            return plane_turn(normal, tool, target, spin)
        return no_turn(tool)


def _weighed(weights: list[float], vector: LaneVector) -> Lane:
    return weights[0] * vector[0] + weights[1] * vector[1] + weights[2] * vector[2]
