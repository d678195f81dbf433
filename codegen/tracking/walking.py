"""Where a sweep comes near a solution: on every branch the places from which the steps are to start.

Along a branch the equation that is left over is sampled all the way round the swept joint. A start is made

    between two samples with different signs, after some steps of closing in (regula falsi, kept off the ends),
    at a sample that is nearer to zero than both its neighbours, where two roots may touch: on both sides of the least
    place, where halving finds that it lies beyond zero,
    at the end of a branch, where it folds back into another one: found by halving, and sampled towards it as the square
    root goes that vanishes there,
    at a sample where a branch nearly ends or nearly begins.

The generated C does the same one pose at a time (`tracking_sweep.c.j2`); here all poses are walked at once.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from codegen.tracking.lanes import Flags, Lane, LanePoses, LaneVector
from codegen.tracking.placing import Numbers, Placing, Samples, joined

CLOSING_STEPS = 4
VALLEY_STEPS = 6
FOLD_STEPS = 8
FOLD_SAMPLES = 4
LEAST_SHARE = 0.1  # of a bracket that a closing step takes off
NARROW = 0.05  # what may be left under a root, or missing, where a branch nearly ends
MOST_LAUNCHES = 64  # of one pose
_TURN = 2 * 3.141592653589793
_PER_END = 2 * FOLD_SAMPLES + 4  # launches that the end of a branch can lead to, for their order
_PER_SAMPLE = 2 * _PER_END + 4


@dataclass(frozen=True, slots=True)
class _Which:
    """Of each lane its pose and its branch, and its place in the order of the C."""

    pose: Numbers
    branch: Numbers
    place: Numbers

    def take(self, lanes: Numbers) -> _Which:
        return _Which(self.pose[lanes], self.branch[lanes], self.place[lanes])


@dataclass(frozen=True, slots=True)
class Launches:
    """Starts in the order in which the C makes them.

    pose    of each start, its number
    q       joint values
    placed  samples taken, all poses together
    """

    pose: Numbers
    q: LaneVector
    placed: int

    def most(self, poses: int) -> int:
        """Of one pose."""
        return int(np.bincount(self.pose, minlength=poses).max()) if len(self.pose) else 0


class Walk:
    """One sweep over many poses. `joints` holds the joint values of the poses; held ones are read."""

    def __init__(self, placing: Placing, target: LanePoses, joints: LaneVector, samples: int) -> None:
        self._placing = placing
        self._target = target
        self._joints = joints
        self._poses = len(target.point[0])
        self._samples = samples
        self._found: list[tuple[Numbers, Numbers, LaneVector]] = []
        self._placed = 0

    def launches(self) -> Launches:
        poses, count, branches = self._poses, self._samples, self._placing.branches
        angle = np.repeat([angle_at(i, count) for i in range(count)], poses)
        pose = np.tile(np.arange(poses), count)
        joints = [entry[pose] for entry in self._joints]
        every = self._placing.everywhere(self._target.take(pose), joints, angle)
        self._placed = len(angle) * branches
        ring = joined(every)
        lanes = np.arange(branches * len(angle)).reshape(branches, count, poses)
        last, now = (ring.take(np.roll(lanes, -ahead, axis=1).ravel()) for ahead in (1, 2))
        branch, sample = np.divmod(lanes.ravel() // poses, count)
        which = _Which(np.tile(pose, branches), branch, (branch * count + sample) * _PER_SAMPLE)
        self._examine(ring, last, now, which)
        return self._in_order()

    def _examine(self, before: Samples, last: Samples, now: Samples, which: _Which) -> None:
        """What happens from the last sample to this one."""
        before = replace(before, angle=before.angle - np.where(before.angle > last.angle, _TURN, 0.0))
        now = replace(now, angle=now.angle + np.where(now.angle < last.angle, _TURN, 0.0))
        there, still = last.spare >= 0.0, now.spare >= 0.0
        self._close_in(last, now, there & still & signs_differ(last, now), which, 0)
        self._fold((before, last, now), there & ~still, which, 0)
        self._fold((now, last, before), there & ~(before.spare >= 0.0), which, _PER_END)
        self._look_into((before, last, now), valley(before, last, now), which, _PER_SAMPLE - 4)
        self._launch(last, nearly_ends(before, last, now), which, _PER_SAMPLE - 1)

    def _at(self, which: _Which, angle: Lane) -> Samples:
        self._placed += len(angle)
        joints = [entry[which.pose] for entry in self._joints]
        return self._placing.at(self._target.take(which.pose), joints, which.branch, angle)

    def _close_in(self, first: Samples, second: Samples, chosen: Flags, which: _Which, later: int) -> None:
        lanes = np.flatnonzero(chosen)
        if not len(lanes):
            return
        which = which.take(lanes)
        low, high = first.take(lanes), second.take(lanes)
        middle = low
        for _ in range(CLOSING_STEPS):
            middle = self._at(which, low.angle + (high.angle - low.angle) * share_of(low.miss, high.miss))
            left = (middle.miss < 0.0) == (low.miss < 0.0)
            low, high = middle.where(left, low), high.where(left, middle)
        self._launch(middle, np.ones(len(lanes), dtype=np.bool_), which, later)

    def _look_into(self, row: tuple[Samples, Samples, Samples], chosen: Flags, which: _Which, later: int) -> None:
        """A valley: halved from either side by turns."""
        lanes = np.flatnonzero(chosen)
        if not len(lanes):
            return
        which = which.take(lanes)
        left, low, right = (samples.take(lanes) for samples in row)
        still = np.ones(len(lanes), dtype=np.bool_)
        for step in range(VALLEY_STEPS):
            edge, other = (left, right) if step % 2 == 0 else (right, left)
            probe = self._at(which, 0.5 * (edge.angle + low.angle))
            crossing = still & (probe.spare >= 0.0) & signs_differ(probe, low)
            self._close_in(low, probe, crossing, which, later)
            self._close_in(probe, edge, crossing, which, later + 1)
            still &= ~crossing
            lower = (probe.spare >= 0.0) & (np.abs(probe.miss) < np.abs(low.miss))
            other, edge, low = low.where(lower, other), edge.where(lower, probe), probe.where(lower, low)
            left, right = (edge, other) if step % 2 == 0 else (other, edge)
        self._launch(low, still, which, later)

    def _fold(self, row: tuple[Samples, Samples, Samples], chosen: Flags, which: _Which, later: int) -> None:
        """The branch ends between the middle one of three places in a row and the last one."""
        lanes = np.flatnonzero(chosen)
        if not len(lanes):
            return
        which = which.take(lanes)
        behind, inside, outside = (samples.take(lanes) for samples in row)
        edge, beyond = inside.angle, outside.angle
        for _ in range(FOLD_STEPS):
            middle = 0.5 * (edge + beyond)
            there = self._at(which, middle).spare >= 0.0
            edge, beyond = np.where(there, middle, edge), np.where(there, beyond, middle)
        before, last = behind, inside
        for k in range(1, FOLD_SAMPLES + 1):
            left = 1.0 - k / FOLD_SAMPLES
            now = self._at(which, edge + (inside.angle - edge) * (left * left))
            self._close_in(last, now, signs_differ(last, now), which, later + 2 * k)
            self._look_into((before, last, now), valley(before, last, now), which, later + 2 * k)
            before, last = last, now
        self._launch(last, np.ones(len(lanes), dtype=np.bool_), which, later + 2 * FOLD_SAMPLES + 2)

    def _launch(self, samples: Samples, chosen: Flags, which: _Which, later: int) -> None:
        lanes = np.flatnonzero(chosen)
        if len(lanes):
            which = which.take(lanes)
            self._found.append((which.pose, which.place + later, [entry[lanes] for entry in samples.place]))

    def _in_order(self) -> Launches:
        pose = np.concatenate([np.zeros(0, dtype=np.intp), *(found[0] for found in self._found)])
        order = np.lexsort((np.concatenate([np.zeros(0, dtype=np.intp), *(found[1] for found in self._found)]), pose))
        pose = pose[order]
        kept = np.arange(len(pose)) - np.searchsorted(pose, pose) < MOST_LAUNCHES
        pose, order = pose[kept], order[kept]
        rows = zip(*(found[2] for found in self._found), strict=True)
        place = [np.concatenate(row)[order] for row in rows]
        joints = [entry[pose] for entry in self._joints]
        return Launches(pose, self._placing.joint_values(place, joints) if place else joints, self._placed)


def most_placed(branches: int, samples: int) -> int:
    """Samples of one pose at the very worst: the first two of a branch are taken again at its end, and whatever takes more
    samples than one ends with a launch; the last launch may be followed by the rest of two folds."""
    each = FOLD_STEPS + FOLD_SAMPLES + VALLEY_STEPS + CLOSING_STEPS
    rest = 2 * FOLD_STEPS + 2 * FOLD_SAMPLES * (1 + VALLEY_STEPS + 2 * CLOSING_STEPS)
    return branches * (samples + 2) + MOST_LAUNCHES * each + rest


def angle_at(i: int, samples: int) -> float:
    """Of sample i, from half a turn backwards on."""
    return -0.5 * _TURN + i * (_TURN / samples)


def signs_differ(a: Samples, b: Samples) -> Flags:
    differ: Flags = (a.miss < 0.0) != (b.miss < 0.0)
    return differ


def valley(before: Samples, last: Samples, now: Samples) -> Flags:
    """The size of what is left over is least at `last`, all three having one sign."""
    there = (before.spare >= 0.0) & (last.spare >= 0.0) & (now.spare >= 0.0)
    size = np.abs(last.miss)
    least = (size <= np.abs(before.miss)) & (size <= np.abs(now.miss))
    return there & ~signs_differ(before, last) & ~signs_differ(last, now) & least


def nearly_ends(before: Samples, last: Samples, now: Samples) -> Flags:
    """All three are there and `last` only just, or none is there and `last` only just not."""
    a, b, c = before.spare, last.spare, now.spare
    there = (a >= 0.0) & (c >= 0.0) & (b >= 0.0) & (b < a) & (b < c)
    missing = (a < 0.0) & (c < 0.0) & (b < 0.0) & (b > a) & (b > c)
    return (there | missing) & (np.abs(b) < NARROW)


def share_of(low: Lane, high: Lane) -> Lane:
    """Where the line between two values with different signs crosses zero, kept off both ends."""
    across = np.where(low == high, 1.0, low - high)
    return np.minimum(np.maximum(low / across, LEAST_SHARE), 1.0 - LEAST_SHARE)
