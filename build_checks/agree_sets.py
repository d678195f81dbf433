"""Checks of whole solution sets: the known solution is there, none is given twice, each one leads back to the same set.

Joint values are compared turns apart, and only as sharply as the pose determines them (`Bench.same`). Where a pose is
so near a fold or a singularity that its rounding alone makes a solution come or go, the case counts as undecided,
never as right.
"""

from __future__ import annotations

import numpy as np

from build_checks.agree_bench import SOLVED, WITHIN_LIMITS, Batch, Bench, Flat, is_in
from build_checks.agree_solutions import named, turns
from build_checks.compile import Branches
from build_checks.reference import Array, Flags, Integers, Poses
from build_checks.report import Check, Failure
from codegen.model import Task

_SHARP = 0.1  # below it the pose hardly states the angle
_PART = 16384  # solutions fed back at a time: their sets stay small enough for the processor's cache


def check_sets(bench: Bench, batch: Batch, found: Branches, flat: Flat) -> None:
    """All of them, on a batch whose poses came from known joint values.

    A numeric inverse promises no completeness, and its branch numbers hold within one call: its sets are not closed.
    """
    check_known(bench, batch, found)
    _distinct(bench, batch, found)
    check_branch_of(bench, batch.origins, batch, np.arange(len(batch)))
    within = np.flatnonzero(is_in(flat.status, WITHIN_LIMITS))
    check_branch_of(bench, flat.q[within], batch, flat.rows[within])
    if not bench.c.numeric:
        _closed(bench, batch, found, flat)


def _distances(bench: Bench, found: Branches, wanted: Array) -> Array:
    """[N, B] from wanted joint values [N, n] to each branch's solution; infinite where a branch has none."""
    apart = bench.apart(found.q.astype(np.float64), wanted[:, None, :])
    return np.where(is_in(found.status, SOLVED), apart, np.inf)


def check_known(bench: Bench, batch: Batch, found: Branches) -> None:
    """The joint values that each pose of the batch came from are among its solutions.

    A numeric inverse promises most of them: what it lacks is counted.
    """
    distance = _distances(bench, found, batch.origins).min(axis=1)
    same, undecided = bench.same(distance, batch.origins)

    def describe(index: int) -> Failure:
        what = f"the nearest solution is {distance[index]:.3g} away from the joint values that the pose came from"
        more = {"statuses": found.status[index], "all_joints": found.q[index]}
        return Failure(what, bench.details(batch, index, **more))

    bench.tally.judge(Check.KNOWN, ~same, describe, undecided=undecided, excused=bench.c.numeric)


def _distinct(bench: Bench, batch: Batch, found: Branches) -> None:
    """Branches may coincide only where the pose itself makes them."""
    solved, q = is_in(found.status, SOLVED), found.q.astype(np.float64)
    for first in range(bench.c.branches):
        for second in range(first + 1, bench.c.branches):
            rows = np.flatnonzero(solved[:, first] & solved[:, second])
            equal = bench.apart(q[rows, first], q[rows, second]) <= 16 * bench.budget.task
            _judge_distinct(bench, batch, found, (first, second), (rows, equal))


def _judge_distinct(
    bench: Bench, batch: Batch, found: Branches, pair: tuple[int, int], cases: tuple[Integers, Flags]
) -> None:
    rows, equal = cases
    regular = np.zeros_like(equal)
    joints = found.q[rows[equal], pair[0]].astype(np.float64)
    regular[equal] = bench.reading.smallest_singular(joints) >= bench.blur

    def describe(index: int) -> Failure:
        row = int(rows[index])
        more = {"statuses": found.status[row], "all_joints": found.q[row]}
        return Failure(f"branches {pair[0]} and {pair[1]} give one solution", bench.details(batch, row, **more))

    bench.tally.judge(Check.DISTINCT, equal & regular, describe)


def _closed(bench: Bench, batch: Batch, found: Branches, flat: Flat) -> None:
    for start in range(0, len(flat), _PART):
        part = slice(start, start + _PART)
        _closed_part(bench, batch, found, flat.take(part))


def _closed_part(bench: Bench, batch: Batch, found: Branches, flat: Flat) -> None:
    """Solves the pose of each solution again: the two sets must be one."""
    poses = bench.reference.forward(flat.q)
    alike = _read_alike(bench, found, flat, poses)
    poses, flat = poses.take(alike), flat.take(alike)
    packed = bench.c.pack(poses)
    again = bench.c.inverse_all(packed, batch.seeds[flat.rows])
    first = Branches(found.q[flat.rows], found.status[flat.rows], found.solved[flat.rows])
    lost, lost_undecided = _lacking(bench, first, again)
    gained, gained_undecided = _lacking(bench, again, first)

    def describe(index: int) -> Failure:
        row, branch = int(flat.rows[index]), int(flat.branches[index])
        what = f"solution {branch} as a new start {'loses' if lost[index] else 'adds'} a solution"
        more = {"statuses": found.status[row], "all_joints": found.q[row]}
        more |= {"statuses_again": again.status[index], "all_joints_again": again.q[index]}
        return Failure(what, bench.details(batch, row, start=flat.q[index], **more))

    undecided = ~lost & ~gained & (lost_undecided | gained_undecided)
    bench.tally.judge(Check.CLOSED, lost | gained, describe, undecided=undecided)


def _read_alike(bench: Bench, found: Branches, flat: Flat, poses: Poses) -> Flags:
    """[M] whether each solution's own pose asks of the other solutions what the first pose asked.

    The pitch of `point_pitch` is read in the arm's own plane. Where two solutions have planes that are not parallel, the
    tool axis of one has another angle in the plane of the other: their sets differ by what the task is.
    """
    alike = np.ones(len(flat), dtype=bool)
    if bench.reading.task is not Task.POINT_PITCH:
        return alike
    for branch in range(bench.c.branches):
        rows = np.flatnonzero(is_in(found.status[flat.rows, branch], SOLVED))
        chain = bench.reference.chain(found.q[flat.rows[rows], branch].astype(np.float64))
        targets = poses.take(rows)
        clear = bench.reading.sharpness(targets, chain) > _SHARP
        alike[rows] &= clear & (bench.reading.errors(targets, chain)[1] <= bench.budget.task)
    return alike


def _lacking(bench: Bench, whole: Branches, other: Branches) -> tuple[Flags, Flags]:
    """[M] sets of `whole` with a solution that `other` surely lacks, and those where rounding may explain it."""
    solved, solved_other = is_in(whole.status, SOLVED), is_in(other.status, SOLVED)
    q, q_other = whole.q.astype(np.float64), other.q.astype(np.float64)
    by_number = bench.apart(q, q_other)
    open_rows, open_branches = np.nonzero(solved & ~(solved_other & (by_number <= 4 * bench.budget.task)))
    wanted = q[open_rows, open_branches]
    distances = np.where(solved_other[open_rows], bench.apart(q_other[open_rows], wanted[:, None, :]), np.inf)
    same, undecided = bench.same(distances.min(axis=1, initial=np.inf), wanted)
    lacks, doubtful = np.zeros(len(q), dtype=bool), np.zeros(len(q), dtype=bool)
    lacks[open_rows[~same & ~undecided]] = True
    doubtful[open_rows[undecided]] = True
    return lacks, doubtful


def check_branch_of(bench: Bench, q: Array, batch: Batch, rows: Integers) -> None:
    """The branch of joint values, solved with them as the seed, gives them back, turns and all."""
    packed = bench.c.pack(bench.reference.forward(q))
    branches = bench.c.branch_of(bench.c.rounded(q))
    back, status = bench.c.inverse(packed, branches, bench.c.rounded(q))
    wide = back.astype(np.float64)
    solved = is_in(status, SOLVED)
    distance = np.where(_near_a_limit(bench, q), bench.apart(wide, q), bench.apart_with_turns(wide, q))
    same, undecided = bench.same(np.where(solved, distance, np.inf), q)
    exists = branches < bench.c.branches

    def describe(index: int) -> Failure:
        said = named(int(status[index]))
        what = f"branch_of gives {branches[index]}, and inverse there {said}, {distance[index]:.3g} away"
        more = {"joints_in": q[index], "joints_back": back[index]}
        return Failure(what, bench.details(batch, int(rows[index]), **more))

    bench.tally.judge(Check.BRANCH_OF, ~same, describe, undecided=undecided & exists)


def _near_a_limit(bench: Bench, q: Array) -> Flags:
    """Rounding there may call for another turn."""
    surely, perhaps, _ = turns(bench, q, q)
    low, high = bench.reference.lower, bench.reference.upper
    edge = 64 * bench.budget.task
    near: Flags = (surely != perhaps).any(axis=1) | ((q < low + edge) | (q > high - edge)).any(axis=1)
    return near
