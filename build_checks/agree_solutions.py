"""Checks that hold for any pose and any seed: whatever comes back must be right, whole, within limits and consistent.

None of these needs to know which solutions the pose has; `agree_sets` checks that none is missing.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from build_checks.agree_bench import (
    SINGULAR_STRETCH,
    SOLVED,
    WITHIN_LIMITS,
    Batch,
    Bench,
    Flat,
    all_in_row,
    any_in_row,
    flatten,
    is_in,
    worst,
)
from build_checks.compile import CANARY, CANARY_BRANCH, AnyArray, Branches, Status
from build_checks.reference import Array, Flags, Integers
from build_checks.reference_task import length, wrap
from build_checks.report import Check, Failure

_ROUNDING = 10.0  # units of the number type, relative: how near a limit either answer is right
_SINGULAR_WITHIN = 4.0  # angle budgets: how singular a place must be for SINGULAR to be said there


def inspect(bench: Bench, batch: Batch) -> tuple[Branches, Flat]:
    """Solves every branch of every pose and judges what comes back."""
    found = bench.c.inverse_all(batch.packed, batch.seeds)
    flat = flatten(found)
    check_outputs(bench, batch, found)
    _round_trip(bench, batch, found, flat)
    _held(bench, batch, flat)
    _turns_and_limits(bench, batch, found, flat)
    _singular_claims(bench, batch, found, flat)
    _one_by_one(bench, batch, found)
    check_nearest(bench, batch, found)
    return found, flat


def check_outputs(bench: Bench, batch: Batch, found: Branches) -> None:
    """Known statuses, finite joint values, untouched rows where there is no solution, the right count."""
    solved = is_in(found.status, SOLVED)
    legal = solved | (found.status == Status.OUT_OF_REACH)
    finite = np.isfinite(found.q).all(axis=2)

    def describe(index: int) -> Failure:
        row, branch = divmod(index, bench.c.branches)
        details = bench.details(
            batch, row, branch=branch, statuses=found.status[row], joints_found=found.q[row, branch]
        )
        return Failure(f"branch {branch} gives {named(int(found.status[row, branch]))}", details)

    bench.tally.judge(Check.FINITE, (~legal | (solved & ~finite)).ravel(), describe)
    moved = _moved(bench, found.q)
    unsolved = np.flatnonzero(~solved)
    bench.tally.judge(Check.UNTOUCHED, moved.ravel()[unsolved], lambda i: describe(int(unsolved[i])))


def _moved(bench: Bench, q: AnyArray) -> Flags:
    """[...] joint vectors [..., n] that are not as they were before the call."""
    moved: Flags = np.not_equal(q, np.asarray(CANARY, dtype=bench.c.real)).any(axis=-1)
    return moved


def named(status: int) -> str:
    """A status as the contract names it."""
    known = [member.name for member in Status if member.value == status]
    return known[0] if known else f"the unknown status {status}"


def _round_trip(bench: Bench, batch: Batch, found: Branches, flat: Flat) -> None:
    """A random pose may be singular or at the edge of the reach, too: then the promise is the one of such poses.

    Solutions say that they are singular; that one lies at an edge, its smallest singular value tells.
    """
    if batch.stretch > 1.0:
        _trips(bench, batch, found, flat)
        return
    singular: Flags = flat.status == Status.SINGULAR
    beyond = np.flatnonzero(~singular & ~_within_budget(bench, batch, flat))
    singular[beyond] = bench.reading.smallest_singular(flat.q[beyond]) < bench.blur
    _trips(bench, batch, found, flat.take(~singular))
    _trips(bench, replace(batch, stretch=SINGULAR_STRETCH), found, flat.take(singular))


def _within_budget(bench: Bench, batch: Batch, flat: Flat) -> Flags:
    position, angle = bench.reading.errors(batch.poses.take(flat.rows), bench.reference.chain(flat.q))
    position_budget, angle_budget = bench.budgets(batch, flat.rows, flat.q)
    within: Flags = (position <= position_budget) & (angle <= angle_budget)
    return within


def _trips(bench: Bench, batch: Batch, found: Branches, flat: Flat) -> None:
    if len(flat) == 0:
        return
    chain = bench.reference.chain(flat.q)
    targets = batch.poses.take(flat.rows)
    position, angle = bench.reading.errors(targets, chain)
    position_budget, angle_budget = bench.budgets(batch, flat.rows, flat.q)
    sharpness = bench.reading.sharpness(targets, chain)
    angle_budget = angle_budget / np.maximum(sharpness, 1e-9)
    failed = ~((position <= position_budget) & (angle <= angle_budget))  # so that a NaN fails

    def describe(index: int) -> Failure:
        row, branch = int(flat.rows[index]), int(flat.branches[index])
        what = (
            f"branch {branch} misses its pose by {position[index]:.3g} m and {angle[index]:.3g} rad, "
            f"allowed {position_budget[index]:.3g} m and {angle_budget[index]:.3g} rad"
        )
        found_here = {"branch": branch, "statuses": found.status[row], "joints_found": flat.q[index]}
        return Failure(what, bench.details(batch, row, **found_here))

    ordinary = _ordinary(bench, flat.q, targets.position)
    origins = np.where(np.isnan(batch.origins[flat.rows]), flat.q, batch.origins[flat.rows])
    bench.tally.judge(
        Check.ROUND_TRIP if batch.stretch == 1.0 else Check.EDGE_TRIP,
        failed,
        describe,
        position=worst(position[ordinary], origins[ordinary]),
        angle=worst((angle * sharpness)[ordinary], origins[ordinary]),  # told like the budget: where the angle is stated
    )


def _ordinary(bench: Bench, q: Array, position: Array) -> Flags:
    """Joint values within a turn and positions near the arm: the plain budgets hold, and the worst error is told."""
    turned = np.abs(q[:, bench.reference.revolute]).max(axis=1, initial=0.0) > 2 * np.pi
    far = length(position - bench.reference.base_position) > 2 * bench.reference.reach
    ordinary: Flags = ~(turned | far)
    return ordinary


def _held(bench: Bench, batch: Batch, flat: Flat) -> None:
    if not len(bench.reference.held):
        return
    seeds = batch.seeds.astype(np.float64)[flat.rows]
    moved = (flat.q != seeds)[:, bench.reference.held].any(axis=1)
    bench.tally.judge(Check.HELD, moved, lambda i: _solution(bench, batch, flat, i, "a held joint left its seed"))


def _solution(bench: Bench, batch: Batch, flat: Flat, index: int, what: str) -> Failure:
    row, branch = int(flat.rows[index]), int(flat.branches[index])
    status = named(int(flat.status[index]))
    details = bench.details(batch, row, branch=branch, status=status, joints_found=flat.q[index])
    return Failure(f"branch {branch} ({status}): {what}", details)


def _turns_and_limits(bench: Bench, batch: Batch, found: Branches, flat: Flat) -> None:
    seeds = batch.seeds.astype(np.float64)[flat.rows]
    surely, perhaps, wrong_turn = turns(bench, flat.q, seeds)
    over = flat.status == Status.OVER_LIMIT
    wrong_limit: Flags = np.where(over, all_in_row(surely), ~all_in_row(perhaps))

    def describe_limit(index: int) -> Failure:
        joint = int(np.argmin(surely[index] if over[index] else perhaps[index]))
        limits = f"limits {bench.reference.lower[joint]:.9g} to {bench.reference.upper[joint]:.9g}"
        none = f"joint {joint + 1} has no turn within its {limits}"
        said = "every joint has a turn within its limits" if over[index] else none
        return _solution(bench, batch, flat, index, said)

    def describe_turn(index: int) -> Failure:
        joint = int(np.argmax(wrong_turn[index]))
        said = f"joint {joint + 1} is not at the turn nearest to its seed that its limits allow"
        return _solution(bench, batch, flat, index, said)

    bench.tally.judge(Check.LIMITS, wrong_limit, describe_limit)
    bench.tally.judge(Check.TURNS, any_in_row(wrong_turn), describe_turn)


def turns(bench: Bench, q: Array, seeds: Array) -> tuple[Flags, Flags, Flags]:
    """[M, n] each: a turn is within the limits by more than rounding; to rounding; this turn is the wrong one."""
    low, high = bench.reference.lower, bench.reference.upper
    own_size = np.where(bench.reference.revolute, 1.0, bench.reference.reach)
    sizes = (np.abs(q), np.abs(seeds), _finite_size(low), _finite_size(high), own_size)
    margin = _ROUNDING * bench.budget.unit * np.maximum.reduce([np.broadcast_to(size, q.shape) for size in sizes])
    surely = _some_turn(bench, q, low + margin, high - margin)
    perhaps = _some_turn(bench, q, low - margin, high + margin)
    return surely, perhaps, _wrong_turns(bench, q, seeds, margin, (surely, perhaps))


def _finite_size(limits: Array) -> Array:
    return np.where(np.isinf(limits), 0.0, np.abs(limits))


def _some_turn(bench: Bench, q: Array, low: Array, high: Array) -> Flags:
    """Whether some turn of a revolute joint, or a slide as it stands, lies within low..high."""
    turned = np.ceil((low - q) / (2 * np.pi)) <= np.floor((high - q) / (2 * np.pi))
    return np.where(bench.reference.revolute, turned, (q >= low) & (q <= high))


def _wrong_turns(bench: Bench, q: Array, seeds: Array, margin: Array, limits: tuple[Flags, Flags]) -> Flags:
    """A closer turn that the limits surely allow, or a turn outside limits that allow one."""
    low, high = bench.reference.lower, bench.reference.upper
    surely, perhaps = limits
    inside = (q >= low - margin) & (q <= high + margin)
    wanted = np.round((seeds - q) / (2 * np.pi))
    lowest, highest = np.ceil((low + margin - q) / (2 * np.pi)), np.floor((high - margin - q) / (2 * np.pi))
    allowed = np.where(surely, np.minimum(np.maximum(wanted, lowest), highest), wanted)
    closer = np.abs(q + 2 * np.pi * allowed - seeds) < np.abs(q - seeds) - 4 * margin
    judged = surely | ~perhaps  # at a limit, to rounding, either reading is right
    wrong: Flags = ((judged & closer) | (surely & ~inside)) & bench.reference.revolute
    return wrong


def _singular_claims(bench: Bench, batch: Batch, found: Branches, flat: Flat) -> None:
    """Where SINGULAR is said, the task Jacobian has no full rank and some free joint stands at its seed."""
    chosen = np.flatnonzero(flat.status == Status.SINGULAR)
    q, seeds = flat.q[chosen], batch.seeds.astype(np.float64)[flat.rows[chosen]]
    singular = bench.reading.smallest_singular(q)
    turned = np.where(bench.reference.revolute, wrap(q - seeds), q - seeds)  # the limits may ask for another turn of it
    near = np.abs(turned) <= 4 * bench.budget.unit * np.maximum(1.0, np.abs(seeds))
    kept = any_in_row(near[:, bench.reference.free])
    not_free = ~(singular <= _SINGULAR_WITHIN * bench.budget.angle)

    def describe(index: int) -> Failure:
        said = f"smallest singular value of the task Jacobian is {singular[index]:.3g}, so no joint is free"
        what = said if not_free[index] else "no joint kept its seed"
        return _solution(bench, batch, flat, int(chosen[index]), what)

    bench.tally.judge(Check.NOT_FREE, not_free | ~kept, describe)


def _one_by_one(bench: Bench, batch: Batch, found: Branches) -> None:
    """inverse gives branch by branch what inverse_all gave, and inverse_all counts what it gave."""
    rows, branches = _asked_alone(bench, batch)
    q, status = bench.c.inverse(batch.packed[rows], branches, batch.seeds[rows])
    among_all, status_among_all = found.q[rows, branches], found.status[rows, branches]
    differs = (status != status_among_all) | ~_equal_or_same(bench, q, among_all, is_in(status, SOLVED))
    miscounted: Flags = np.not_equal(found.solved, is_in(found.status, WITHIN_LIMITS).sum(axis=1))

    def describe(index: int) -> Failure:
        row, branch = int(rows[index]), int(branches[index])
        both = f"{named(int(status[index]))} by itself, {named(int(status_among_all[index]))} among all"
        what = f"inverse_all counts {found.solved[row]}" if miscounted[row] else f"branch {branch} is {both}"
        details = {"statuses": found.status[row], "joints_alone": q[index], "joints_among_all": among_all[index]}
        return Failure(what, bench.details(batch, row, branch=branch, **details))

    bench.tally.judge(Check.ALL, differs | miscounted[rows], describe)


def _asked_alone(bench: Bench, batch: Batch) -> tuple[Integers, Integers]:
    """Every branch of every pose; of a numeric inverse, where each costs a whole search, two of each pose."""
    rows = np.arange(len(batch))
    if bench.c.numeric:
        some = (rows + rows // bench.c.branches) % bench.c.branches
        return np.tile(rows, 2), np.concatenate((np.zeros_like(rows), some))
    return np.repeat(rows, bench.c.branches), np.tile(np.arange(bench.c.branches), len(batch))


def _equal_or_same(bench: Bench, first: AnyArray, second: AnyArray, solved: Flags) -> Flags:
    """Equal to the bit, or of solved rows the same solution to rounding."""
    equal: Flags = (first == second).all(axis=1)
    doubtful = np.flatnonzero(~equal & solved)
    left, right = first[doubtful].astype(np.float64), second[doubtful].astype(np.float64)
    same, undecided = bench.same(bench.apart_with_turns(left, right), left)
    equal[doubtful] = same | undecided
    return equal


def efforts(bench: Bench, q: Array, seeds: Array) -> Array:
    """The largest |move| / max_speed over the joints (contract, section 2)."""
    effort: Array = np.max(np.abs(q - seeds) / bench.reference.speeds, axis=-1)
    return effort


def check_nearest(bench: Bench, batch: Batch, found: Branches) -> None:
    """inverse_nearest gives the branch of inverse_all that is soonest reached, within the limits if any is."""
    q, branches, status = bench.c.inverse_nearest(batch.packed, batch.seeds)
    within = is_in(found.status, WITHIN_LIMITS)
    over = found.status == Status.OVER_LIMIT
    counted = np.where(any_in_row(within)[:, None], within, over)
    solvable = any_in_row(counted)
    failed = np.where(solvable, _bad_choice(bench, batch, found, counted, (q, branches, status)), False)
    failed |= ~solvable & (status != Status.OUT_OF_REACH)

    def describe(index: int) -> Failure:
        row = int(index)
        answer = {"branch": branches[row], "status": named(int(status[row])), "joints_found": q[row]}
        what = f"inverse_nearest gives {answer['status']}, branch {branches[row]}"
        more = {"statuses": found.status[row], "all_joints": found.q[row]}
        return Failure(what, bench.details(batch, row, **answer, **more))

    bench.tally.judge(Check.NEAREST, failed, describe)
    moved = _moved(bench, q) | (branches != CANARY_BRANCH)
    unsolved = np.flatnonzero(~is_in(status, SOLVED))
    bench.tally.judge(Check.UNTOUCHED, moved[unsolved], lambda i: describe(int(unsolved[i])))


def _bad_choice(
    bench: Bench, batch: Batch, found: Branches, counted: Flags, answer: tuple[AnyArray, Integers, Integers]
) -> Flags:
    """Not a branch that counts, not that branch's answer, or slower than the best by more than rounding."""
    q, branches, status = answer
    rows = np.arange(len(batch))
    chosen = np.minimum(branches, bench.c.branches - 1)
    seeds = batch.seeds.astype(np.float64)
    effort = np.where(counted, efforts(bench, found.q.astype(np.float64), seeds[:, None, :]), np.inf)
    own = efforts(bench, q.astype(np.float64), seeds)
    rounding = 16 * bench.budget.unit * (1.0 + np.max(np.abs(seeds) / bench.reference.speeds, axis=1))
    slower = ~(own <= effort.min(axis=1) * (1 + 16 * bench.budget.unit) + rounding)
    other = ~_equal_or_same(bench, q, found.q[rows, chosen], is_in(status, SOLVED))
    uncounted = (branches >= bench.c.branches) | ~counted[rows, chosen] | (status != found.status[rows, chosen])
    wrong: Flags = slower | other | uncounted
    return wrong
