"""What every agreement check works with: the reference, the compiled C, the error budgets, the count of results.

Two things are added to the promised accuracy (`agree_budget`) that no implementation can avoid: joint values of more
than one turn, and sums of them, are rounded more coarsely than those within it; and a tool further from the world
origin than the reach is moved further by the same angle.
"""

from __future__ import annotations

import copy
import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from build_checks.agree_budget import budget_of
from build_checks.compile import AnyArray, Branches, Kinematics, Library, Status
from build_checks.reference import Array, Flags, Integers, Poses, Reference
from build_checks.reference_task import TaskReading, length
from build_checks.report import Check, CheckResult, Failure, Worst, join
from codegen.model import Arm

SOLVED = (Status.OK, Status.SINGULAR, Status.OVER_LIMIT)
WITHIN_LIMITS = (Status.OK, Status.SINGULAR)


def is_in(statuses: Integers, wanted: tuple[Status, ...]) -> Flags:
    return np.isin(statuses, [status.value for status in wanted])


def any_in_row(flags: Flags) -> Flags:
    """[N] whether some flag of [N, n] stands."""
    found: Flags = np.logical_or.reduce(flags, axis=1)
    return found


def all_in_row(flags: Flags) -> Flags:
    return ~any_in_row(~flags)


@dataclass(frozen=True, slots=True)
class Batch:
    """N poses to solve.

    packed   [N, 12], as the C gets them
    seeds    [N, n], as the C gets them
    origins  [N, n], the joint values that the poses came from; NaN where there are none
    stretch  what the budgets are multiplied by: 2 at singular and boundary poses
    kind     what these poses are, for a failure's text
    """

    packed: AnyArray
    seeds: AnyArray
    origins: Array
    stretch: float
    kind: str

    def __len__(self) -> int:
        return len(self.packed)

    @property
    def poses(self) -> Poses:
        return Kinematics.unpack(self.packed)


@dataclass(frozen=True, slots=True)
class Flat:
    """The M solutions among the branches of a batch: row of the batch, branch, joint values in float64, status."""

    rows: Integers
    branches: Integers
    q: Array
    status: Integers

    def __len__(self) -> int:
        return len(self.rows)

    def take(self, which: Flags | slice) -> Flat:
        return Flat(self.rows[which], self.branches[which], self.q[which], self.status[which])


SINGULAR_STRETCH = 2.0  # the accuracy promise is doubled at singular and boundary poses


def flatten(found: Branches) -> Flat:
    rows, branches = np.nonzero(is_in(found.status, SOLVED))
    return Flat(rows, branches, found.q[rows, branches].astype(np.float64), found.status[rows, branches])


class Tally:
    """Counts what was judged, by check; the first failure of each is kept whole."""

    def __init__(self) -> None:
        self._results: dict[Check, CheckResult] = {}

    def add(self, result: CheckResult) -> None:
        known = self._results.get(result.check)
        self._results[result.check] = join(known, result) if known else result

    def judge(
        self,
        check: Check,
        failed: Flags,
        describe: Callable[[int], Failure],
        *,
        undecided: Flags | None = None,
        excused: bool = False,
        position: Worst | None = None,
        angle: Worst | None = None,
    ) -> None:
        """`failed` has one flag per case; undecided cases count for themselves and never fail.

        `excused`: what failed is only counted as lacking, for a numeric inverse that promises most solutions, not all.
        """
        open_cases = np.zeros_like(failed) if undecided is None else undecided
        bad = failed & ~open_cases
        failure = describe(int(np.flatnonzero(bad)[0])) if bad.any() and not excused else None
        judged, count = int(failed.size - open_cases.sum()), int(bad.sum())
        wrong, lacking = (0, count) if excused else (count, 0)
        self.add(CheckResult(check, judged, wrong, int(open_cases.sum()), position, angle, failure, lacking))

    @property
    def results(self) -> list[CheckResult]:
        return list(self._results.values())


def worst(errors: Array, joints: Array) -> Worst | None:
    """The largest of N errors with its joint values; an error that is no number is the largest."""
    if errors.size == 0:
        return None
    index = int(np.argmax(np.where(np.isnan(errors), np.inf, errors)))
    return Worst(float(errors[index]), tuple(float(value) for value in joints[index]))


def plain(values: Any) -> Any:
    """Arrays as lists, for a failure's details."""
    return values.tolist() if isinstance(values, (np.ndarray, np.generic)) else values


class Bench:
    """One arm's reference beside its compiled C."""

    def __init__(self, arm: Arm, library: Library) -> None:
        self.reference = Reference(arm)
        self.reading = TaskReading(self.reference)
        self.c = Kinematics(library)
        self.budget = budget_of(library.options, self.reference.count)
        self.tally = Tally()

    def fresh(self) -> Bench:
        """The same with nothing counted."""
        other = copy.copy(self)
        other.tally = Tally()
        self.c.calls, self.c.overruns = 0, 0
        return other

    def judge_overruns(self) -> None:
        """Of all calls so far: whether one wrote past the end of an output."""
        failure = Failure("an output's next row was written", {}) if self.c.overruns else None
        self.tally.add(CheckResult(Check.OVERRUN, self.c.calls, self.c.overruns, failure=failure))

    def random_joints(self, rng: np.random.Generator, size: int) -> Array:
        """Joint vectors within the span that the C's number type holds exactly."""
        return self.exact(self.reference.random_joints(rng, size))

    def exact(self, q: Array) -> Array:
        return self.c.rounded(q).astype(np.float64)

    def seeds_for(self, q: Array, seeds: Array) -> AnyArray:
        """Seeds whose held joints are those that the poses of q need."""
        seeds = seeds.copy()
        seeds[:, self.reference.held] = q[:, self.reference.held]
        return self.c.rounded(seeds)

    def batch(self, q: Array, seeds: Array, kind: str, stretch: float = 1.0) -> Batch:
        """The poses of joint vectors q, rounded to the C's number type."""
        return Batch(self.c.pack(self.reference.forward(q)), self.seeds_for(q, seeds), q, stretch, kind)

    def budgets(self, batch: Batch, rows: Integers, q: Array) -> tuple[Array, Array]:
        """Position (m) and angle (rad) errors allowed to solutions q [M, n] of the batch's rows."""
        return self.allowed(q, batch.poses.position[rows], batch.stretch)

    def allowed(self, q: Array, position: Array, stretch: float = 1.0) -> tuple[Array, Array]:
        """Position (m) and angle (rad) errors allowed where joint values q [M, n] meet positions [M, 3]."""
        beyond_a_turn = np.maximum(0.0, np.abs(q) - 2 * np.pi)[:, self.reference.revolute].sum(axis=1)
        return self.promised(position, 2 * self.budget.unit * beyond_a_turn, stretch)

    def promised(self, position: Array, coarse: Array | float = 0.0, stretch: float = 1.0) -> tuple[Array, Array]:
        """The same where joint values add a rounding of `coarse` radians."""
        far = np.maximum(0.0, length(position) - self.reference.reach)
        angle = np.broadcast_to(stretch * self.budget.angle + coarse, far.shape)
        return (stretch * self.budget.share + coarse) * self.reference.reach + angle * far, angle

    def apart(self, first: Array, second: Array) -> Array:
        """How far joint vectors [..., n] are apart: the largest difference, turns not counted, metres in reaches."""
        difference = first - second
        turns = 2 * np.pi * np.round(difference / (2 * np.pi))
        scale = np.where(self.reference.revolute, 1.0, 1.0 / self.reference.reach)
        distance: Array = np.max(np.abs(difference - np.where(self.reference.revolute, turns, 0.0)) * scale, axis=-1)
        return distance

    def apart_with_turns(self, first: Array, second: Array) -> Array:
        scale = np.where(self.reference.revolute, 1.0, 1.0 / self.reference.reach)
        distance: Array = np.max(np.abs(first - second) * scale, axis=-1)
        return distance

    @property
    def blur(self) -> float:
        """Smallest singular value of the scaled task Jacobian below which rounding of the pose alone can make a
        solution come, go or move freely: near a fold two solutions lie sqrt(error) apart."""
        return 4.0 * math.sqrt(self.budget.task)

    def same(self, distance: Array, q: Array) -> tuple[Flags, Flags]:
        """(same, undecided) for joint vectors q that came back `distance` away.

        An error e of the pose moves a regular solution by at most e / s, s being the smallest singular value of the
        scaled task Jacobian; below `blur` no bound of that kind holds and a larger distance decides nothing.
        """
        near = distance <= 4.0 * self.budget.task
        undecided = np.zeros_like(near)
        doubtful = np.flatnonzero(~near)
        singular = self.reading.smallest_singular(q[doubtful])
        allowed = 4.0 * self.budget.task / np.maximum(singular, 1e-300)
        near[doubtful] = distance[doubtful] <= np.minimum(allowed, 0.05)
        undecided[doubtful] = ~near[doubtful] & (singular < self.blur)
        return near, undecided

    def details(self, batch: Batch, row: int, **more: Any) -> dict[str, Any]:
        """What repeats one case of a batch."""
        origin = batch.origins[row]
        poses = batch.packed[row]
        return {
            "poses": batch.kind,
            "joint values": None if np.isnan(origin).any() else plain(origin),
            "rotation": plain(poses[:9].reshape(3, 3)),
            "position": plain(poses[9:]),
            "seed joints": plain(batch.seeds[row]),
            **{key.replace("_", " "): plain(value) for key, value in more.items()},
        }
