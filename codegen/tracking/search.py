"""Many starts tracked to many random reachable poses, and which solutions each start finds."""

from __future__ import annotations

import random
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from codegen.exact import real
from codegen.model import Arm, JointKind, JointRow
from codegen.tracking.batch import Batch
from codegen.tracking.lanes import Flags, LanePoses, LaneVector
from codegen.tracking.shape import ArmShape

TURN_STEP = Fraction(1, 40)  # rad, of the starts: half a turn is 126 of them, so a start fits a signed char
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
        self.batch = Batch(shape)
        self._random = random.Random(seed)
        self._ranges = [_range(row, float(shape.reach)) for row in arm.joints]
        self.steps = tuple(TURN_STEP if shape.turning[i] else self._slide_step(i) for i in shape.free)

    def _slide_step(self, joint: int) -> Fraction:
        """m: as fine as the steps of turning joints move the tool, but not so fine that a start is no signed char."""
        least = float(self.shape.slide_unit) * float(TURN_STEP)
        return round_step(max(least, max(abs(end) for end in self._ranges[joint]) / LARGEST_START))

    def starts(self, count: int) -> list[Start]:
        """Random starts on the grid, one whole number per free joint."""
        return [tuple(self._start(k, joint) for k, joint in enumerate(self.shape.free)) for _ in range(count)]

    def _start(self, k: int, joint: int) -> int:
        lowest, highest = self._ranges[joint]
        return int(np.rint((lowest + (highest - lowest) * self._random.random()) / float(self.steps[k])))

    def run(self, poses: int, starts: Sequence[Start]) -> Searched:
        """Every start tracked to each of so many fresh poses."""
        true_values = self.true_values(poses)
        count = len(starts)
        lanes = [np.repeat(values, count) for values in true_values]
        target = self.batch.poses(lanes)
        for k, joint in enumerate(self.shape.free):
            lanes[joint] = np.tile(np.array([start[k] * float(self.steps[k]) for start in starts]), poses)
        ends, solved, steps = self.tracked(target, lanes)
        found = [
            self.hits(ends[:, p * count : (p + 1) * count], solved[p * count : (p + 1) * count]) for p in range(poses)
        ]
        return Searched(np.concatenate(found), steps.reshape(poses, count), max(len(hits) for hits in found))

    def true_values(self, poses: int) -> list[npt.NDArray[np.float64]]:
        """Per joint, held ones too, a random value for each pose."""
        return [
            np.array([low + (high - low) * self._random.random() for _ in range(poses)]) for low, high in self._ranges
        ]

    def tracked(self, target: LanePoses, q: LaneVector) -> tuple[Table, Flags, npt.NDArray[np.intp]]:
        """(free joint values [free, lanes], solved, steps), block by block. A slide past its range is no solution."""
        count = len(q[0])
        ends = np.empty((len(self.shape.free), count))
        solved, steps = np.empty(count, dtype=np.bool_), np.empty(count, dtype=np.intp)
        for first in range(0, count, _BLOCK):
            lanes = np.arange(first, min(first + _BLOCK, count))
            values, solved[lanes], steps[lanes] = self.batch.tracked(target.take(lanes), [entry[lanes] for entry in q])
            for k, joint in enumerate(self.shape.free):
                ends[k, lanes] = values[joint]
        return ends, solved & self._within(ends), steps

    def _within(self, ends: Table) -> Flags:
        """No slide past its range."""
        within = np.ones(ends.shape[1], dtype=np.bool_)
        for k, joint in enumerate(self.shape.free):
            if not self.shape.turning[joint]:
                lowest, highest = self._ranges[joint]
                within &= (ends[k] >= lowest) & (ends[k] <= highest)
        return within

    def hits(self, ends: Table, solved: Flags) -> Flags:
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


def round_step(least: float) -> Fraction:
    """The smallest of 1, 2 or 5 times a power of ten that is no less (m)."""
    step = Fraction(1, 10**9)
    while True:
        for digit in (1, 2, 5):
            if digit * step >= least:
                return digit * step
        step *= 10


def _range(row: JointRow, reach: float) -> tuple[float, float]:
    """Of the joint variable: a whole turn (rad), or where the slide may go (m)."""
    if row.kind is JointKind.REVOLUTE:
        return -_TURN / 2, _TURN / 2
    lengths = [float(real(limit)) for limit in row.limits or () if isinstance(limit, Fraction)]
    return (lengths[0], lengths[1]) if lengths else (-reach, reach)
