"""Many starts tracked to many random reachable poses, and which solutions each start finds."""

from __future__ import annotations

import random
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from codegen.exact import real
from codegen.model import Arm, JointRow
from codegen.tracking.batch import Batch
from codegen.tracking.lanes import Flags, LanePoses, LaneVector
from codegen.tracking.shape import ArmShape

TURN_GRID = 40  # starts are multiples of 1/40 rad: half a turn is 126 of them, so a start fits a signed char
LARGEST_START = 126
SAME_SOLUTION = 1e-3  # rad, or slide units: solutions closer than this count as one
_BLOCK = 6144  # lanes tracked at a time, so that they stay in the processor's cache
_TURN = 2 * 3.141592653589793

Start = tuple[int, ...]
Table = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Searched:
    """hits[solution, start], of all poses together; steps[pose, start]; the most solutions that one pose had."""

    hits: Flags
    steps: npt.NDArray[np.intp]
    most: int


class Search:
    """Random poses and starts for one arm, from one seed.

    Turning joints range over the whole turn; slides over their limits, or one reach either way where they have none.
    Solutions with a slide past its limits are not counted: they lie arbitrarily far away and no arm can use them.
    """

    def __init__(self, arm: Arm, shape: ArmShape, seed: int) -> None:
        self.shape = shape
        self._batch = Batch(shape)
        self._random = random.Random(seed)
        self._ranges = [_slide_range(row, float(shape.reach)) for row in arm.joints]
        self.grid = tuple(TURN_GRID if shape.turning[i] else self._slide_grid(i) for i in shape.free)

    def _slide_grid(self, joint: int) -> int:
        """The coarsest step 1/grid m that is no longer than a step of a turning joint would move the tool."""
        lowest, highest = self._ranges[joint]
        finest = int(LARGEST_START / max(abs(lowest), abs(highest)))
        return max(1, min(finest, int(TURN_GRID / float(self.shape.slide_unit)) + 1))

    def starts(self, count: int) -> list[Start]:
        """Random starts on the grid, one whole number per free joint."""
        return [tuple(self._start(k, joint) for k, joint in enumerate(self.shape.free)) for _ in range(count)]

    def _start(self, k: int, joint: int) -> int:
        if self.shape.turning[joint]:
            return self._random.randrange(1 - LARGEST_START, LARGEST_START + 1)
        lowest, highest = self._ranges[joint]
        return int(np.rint((lowest + (highest - lowest) * self._random.random()) * self.grid[k]))

    def run(self, poses: int, starts: Sequence[Start]) -> Searched:
        """Every start tracked to each of so many fresh poses."""
        true_values = self._true_values(poses)
        count = len(starts)
        lanes = [np.repeat(values, count) for values in true_values]
        target = self._batch.poses(lanes)
        for k, joint in enumerate(self.shape.free):
            lanes[joint] = np.tile(np.array([start[k] / self.grid[k] for start in starts]), poses)
        ends, solved, steps = self._tracked(target, lanes)
        solved &= self._within(ends)
        found = [
            self._hits(ends[:, p * count : (p + 1) * count], solved[p * count : (p + 1) * count]) for p in range(poses)
        ]
        return Searched(np.concatenate(found), steps.reshape(poses, count), max(len(hits) for hits in found))

    def _true_values(self, poses: int) -> list[npt.NDArray[np.float64]]:
        """Per joint, held ones too, a random value for each pose."""
        return [
            np.array([low + (high - low) * self._random.random() for _ in range(poses)]) for low, high in self._ranges
        ]

    def _tracked(self, target: LanePoses, q: LaneVector) -> tuple[Table, Flags, npt.NDArray[np.intp]]:
        """(free joint values [free, lanes], solved, steps), block by block."""
        count = len(q[0])
        ends = np.empty((len(self.shape.free), count))
        solved, steps = np.empty(count, dtype=np.bool_), np.empty(count, dtype=np.intp)
        for first in range(0, count, _BLOCK):
            lanes = np.arange(first, min(first + _BLOCK, count))
            values, solved[lanes], steps[lanes] = self._batch.tracked(target.take(lanes), [entry[lanes] for entry in q])
            for k, joint in enumerate(self.shape.free):
                ends[k, lanes] = values[joint]
        return ends, solved, steps

    def _within(self, ends: Table) -> Flags:
        """No slide past its range."""
        within = np.ones(ends.shape[1], dtype=np.bool_)
        for k, joint in enumerate(self.shape.free):
            if not self.shape.turning[joint]:
                lowest, highest = self._ranges[joint]
                within &= (ends[k] >= lowest) & (ends[k] <= highest)
        return within

    def _hits(self, ends: Table, solved: Flags) -> Flags:
        """[solution, start] of one pose."""
        turning = np.array([self.shape.turning[joint] for joint in self.shape.free])[:, None]
        units = np.where(turning, 1.0, float(self.shape.slide_unit))
        left, found = solved.copy(), []
        while left.any():
            apart = ends - ends[:, [int(np.argmax(left))]]
            apart = np.where(turning, apart - _TURN * np.rint(apart / _TURN), apart / units)
            same = solved & (np.abs(apart).max(axis=0) < SAME_SOLUTION)
            found.append(same)
            left &= ~same
        return np.array(found, dtype=np.bool_).reshape(len(found), len(solved))


def _slide_range(row: JointRow, reach: float) -> tuple[float, float]:
    """Of the joint variable: a whole turn, or where the slide may go (m)."""
    if row.kind.value == "revolute":
        return -_TURN / 2, _TURN / 2
    if row.limits is None:
        return -reach, reach
    lowest, highest = (float(real(limit)) for limit in row.limits if not hasattr(limit, "radians"))
    return lowest, highest
