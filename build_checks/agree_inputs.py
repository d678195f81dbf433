"""Inputs that the contract refuses, and inputs that it must not refuse.

Which entries of a pose a task reads follows from the contract's list of tasks; where that leaves a choice (the in-
plane block of the rotation for `plane_pose`) either answer passes, a wrong solution does not.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from build_checks.agree_bench import SOLVED, Batch, Bench, all_in_row, any_in_row, is_in
from build_checks.agree_solutions import inspect
from build_checks.compile import CANARY, CANARY_BRANCH, AnyArray, Status
from build_checks.reference import Flags, Poses
from build_checks.report import Check, Failure
from codegen.model import Task

_NOT_NUMBERS = (np.nan, np.inf, -np.inf)
_REFUSED, _ACCEPTED = 1.05e-3, 0.95e-3  # either side of the contract's 1e-3, clear of rounding
_DECADES = 10.0  # of a little drift
_REGULAR = 0.05  # smallest singular value of the poses used here, where there are such


@dataclass(frozen=True, slots=True)
class Reading:
    """[12] each, rotation row by row, then position: entries that the task must read, and those it must not."""

    must: Flags
    never: Flags


def entries_read(bench: Bench, rng: np.random.Generator) -> Reading:
    """What the contract's words about the task say of each entry of a pose."""
    task = bench.reading.task
    must, never = np.zeros(12, dtype=bool), np.zeros(12, dtype=bool)
    rotation = {Task.POSE: range(9), Task.POINT_AXIS: (2, 5, 8), Task.POINT_PITCH: (2, 5, 8), Task.POINT_YAW: (0, 3)}
    must[list(rotation.get(task, ()))] = True
    must[9:] = True
    if task is not Task.PLANE_POSE:
        never[:9] = ~must[:9]
    if bench.reading.is_planar or task is Task.POINT_PITCH:
        _leave_out_normal(bench, rng, Reading(must, never))
    return Reading(must, never)


def _leave_out_normal(bench: Bench, rng: np.random.Generator, read: Reading) -> None:
    """World axes that are always normal to the arm's plane are not read; those that never are must be."""
    chain = bench.reference.chain(bench.random_joints(rng, 64))
    normals = bench.reading.normals(chain).T
    along = all_in_row(normals != 0.0)  # exactly: an angle typed as 1.5708 rad tilts the plane a little
    always, ever = along & (along.sum() == 1), any_in_row(np.abs(normals) > 1 - 1e-6)
    rows = (2, 5, 8) if bench.reading.task is Task.POINT_PITCH else (9, 10, 11)
    for axis, entry in enumerate(rows):
        read.must[entry], read.never[entry] = not ever[axis], bool(always[axis])
    if bench.reading.task is Task.PLANE_POSE:
        read.never[:9] = np.repeat(always, 3)


def regular_batch(bench: Bench, rng: np.random.Generator, size: int) -> Batch:
    """Random poses clear of singularities and of the edge, where the arm has any."""
    q = bench.random_joints(rng, 8 * size)
    singular = bench.reading.smallest_singular(q)
    best = np.argsort(singular < _REGULAR, kind="stable")[:size]
    return bench.batch(q[best], bench.random_joints(rng, size), "regular poses")


def check_inputs(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Every kind of input that is refused or must not be."""
    batch = regular_batch(bench, rng, size)
    read = entries_read(bench, rng)
    _bad_entries(bench, batch, read)
    _bad_seeds(bench, batch)
    _bad_joints(bench, batch)
    _bad_branches(bench, batch)
    _unread_entries(bench, rng, batch, read)
    _either_way(bench, batch, read)
    for what, packed in _no_rotations(bench, batch):
        _refused(bench, replace(batch, packed=packed, kind=what))
    _drifted(bench, rng, batch)


def _bad_entries(bench: Bench, batch: Batch, read: Reading) -> None:
    for entry in np.flatnonzero(read.must):
        for value in _NOT_NUMBERS:
            packed = batch.packed.copy()
            packed[:, entry] = value
            _refused(bench, replace(batch, packed=packed, kind=f"{value} in entry {entry} of 12 of the pose"))


def _bad_seeds(bench: Bench, batch: Batch) -> None:
    for joint in range(bench.c.joints):
        for value in _NOT_NUMBERS:
            seeds = batch.seeds.copy()
            seeds[:, joint] = value
            _refused(bench, replace(batch, seeds=seeds, kind=f"{value} in joint {joint + 1} of the seed"))


def _refused(bench: Bench, batch: Batch) -> None:
    """BAD_INPUT from all three inverse functions, every output left alone."""
    found = bench.c.inverse_all(batch.packed, batch.seeds)
    numbers = np.arange(len(batch)) % bench.c.branches
    q, status = bench.c.inverse(batch.packed, numbers, batch.seeds)
    nearest, branch, nearest_status = bench.c.inverse_nearest(batch.packed, batch.seeds)
    statuses = np.column_stack((found.status, status, nearest_status))
    accepted = any_in_row(statuses != Status.BAD_INPUT) | (found.solved != 0)
    moved = touched(found.q) | touched(q) | touched(nearest) | (branch != CANARY_BRANCH)

    def describe(index: int) -> Failure:
        more = {"statuses_of_all_one_and_nearest": statuses[index], "solved": found.solved[index]}
        what = "not refused" if accepted[index] else "outputs were written"
        return Failure(f"{batch.kind}: {what}", bench.details(batch, index, **more))

    bench.tally.judge(Check.BAD_INPUT, accepted, describe)
    bench.tally.judge(Check.UNTOUCHED, moved, describe)


def touched(values: AnyArray) -> Flags:
    """[N] rows where some value is not what stood there before the call."""
    return any_in_row(values.reshape(len(values), -1) != np.asarray(CANARY, dtype=values.dtype))


def _bad_joints(bench: Bench, batch: Batch) -> None:
    """NaN and infinities in the joint values of forward kinematics, of the Jacobian, and of the branch they lie on."""
    for joint in range(bench.c.joints):
        for value in _NOT_NUMBERS:
            q = batch.seeds.copy()
            q[:, joint] = value
            poses, status = bench.c.forward(q)
            matrices, jacobian_status = bench.c.jacobian(q)
            accepted = (status != Status.BAD_INPUT) | (jacobian_status != Status.BAD_INPUT)
            accepted |= bench.c.branch_of(q) > bench.c.branches  # the contract names none for such joints
            moved = touched(poses) | touched(matrices)
            kind = f"{value} in joint {joint + 1} of forward, Jacobian and branch_of"
            _judge_joints(bench, kind, q, accepted, moved)


def _judge_joints(bench: Bench, kind: str, q: AnyArray, accepted: Flags, moved: Flags) -> None:
    def describe(index: int) -> Failure:
        return Failure(kind, {"joint values": q[index].tolist()})

    bench.tally.judge(Check.BAD_INPUT, accepted, describe)
    bench.tally.judge(Check.UNTOUCHED, moved, describe)


def _bad_branches(bench: Bench, batch: Batch) -> None:
    for branch in (bench.c.branches, bench.c.branches + 1, 2**31, 2**32 - 1):
        q, status = bench.c.inverse(batch.packed, np.full(len(batch), branch), batch.seeds)
        wrong = status != Status.BAD_BRANCH

        def describe(index: int, branch: int = branch, status: AnyArray = status) -> Failure:
            return Failure(f"branch {branch} gives status {status[index]}", bench.details(batch, index))

        bench.tally.judge(Check.BAD_BRANCH, wrong, describe)
        bench.tally.judge(Check.UNTOUCHED, touched(q), describe)


def _unread_entries(bench: Bench, rng: np.random.Generator, batch: Batch, read: Reading) -> None:
    """Whatever stands in entries that are not read, the answer is the same to the bit."""
    wanted = bench.c.inverse_all(batch.packed, batch.seeds)
    fillings = (*_NOT_NUMBERS, 1e30, 0.0, rng.normal())
    for filling in fillings if read.never.any() else ():
        packed = batch.packed.copy()
        packed[:, read.never] = filling
        found = bench.c.inverse_all(packed, batch.seeds)
        differs = any_in_row(found.status != wanted.status) | any_in_row(_flat(found.q) != _flat(wanted.q))
        changed = replace(batch, packed=packed, kind=f"{filling:g} in every entry that the task does not read")

        def describe(index: int, found: AnyArray = found.status, changed: Batch = changed) -> Failure:
            more = {"statuses": found[index], "statuses_before": wanted.status[index]}
            return Failure(changed.kind, bench.details(changed, index, **more))

        bench.tally.judge(Check.UNREAD, differs, describe)


def _flat(values: AnyArray) -> AnyArray:
    return values.reshape(len(values), -1)


def _either_way(bench: Bench, batch: Batch, read: Reading) -> None:
    """NaN where the contract leaves open whether it is read: refused, or solved for the rest of the pose."""
    for entry in np.flatnonzero(~read.must & ~read.never):
        packed = batch.packed.copy()
        packed[:, entry] = np.nan
        found = bench.c.inverse_all(packed, batch.seeds)
        solved = is_in(found.status, SOLVED)
        refused = all_in_row(found.status == Status.BAD_INPUT)
        back, status = bench.c.inverse_all(batch.packed, batch.seeds), found.status
        agrees = (status == back.status) & (~solved | (bench.apart(_wide(found.q), _wide(back.q)) < 1e-3))
        changed = replace(batch, packed=packed, kind=f"NaN in entry {entry} of 12, which may be read or not")

        def describe(index: int, changed: Batch = changed, status: AnyArray = status) -> Failure:
            return Failure(changed.kind, bench.details(changed, index, statuses=status[index]))

        bench.tally.judge(Check.UNREAD, ~refused & any_in_row(~agrees), describe)


def _wide(values: AnyArray) -> AnyArray:
    return values.astype(np.float64)


def _no_rotations(bench: Bench, batch: Batch) -> Iterator[tuple[str, AnyArray]]:
    """Matrices that are no rotation as far as the task reads them."""
    task = bench.reading.task
    rotation = batch.poses.rotation
    columns = {Task.POSE: (0, 1, 2), Task.POINT_AXIS: (2,), Task.POINT_PITCH: (2,), Task.POINT_YAW: (0,)}.get(task, ())
    for column in columns:
        lengths = np.linalg.norm(rotation[:, :2, column] if task is Task.POINT_YAW else rotation[:, :, column], axis=1)
        for scale in _wrong_lengths(task):
            changed = rotation.copy()
            changed[:, :, column] *= (scale / lengths)[:, None]
            yield f"column {column + 1} of length {scale:g}", _packed(bench, batch, changed)
    if task is Task.POSE:
        for what, changed in _wrong_frames(rotation):
            yield what, _packed(bench, batch, changed)
    if task is Task.PLANE_POSE:
        yield "NaN in the whole rotation", _packed(bench, batch, np.full_like(rotation, np.nan))


def _wrong_lengths(task: Task) -> tuple[float, ...]:
    """Too short cannot be told of a heading, which a tilted axis shortens."""
    long = (1.0 + _REFUSED, 2.0, 1e15)
    return long if task is Task.POINT_YAW else (*long, 1.0 - _REFUSED, 0.5, 0.0)


def _wrong_frames(rotation: AnyArray) -> Iterator[tuple[str, AnyArray]]:
    for first, second in ((0, 1), (1, 2), (2, 0)):
        sheared = rotation.copy()
        sheared[:, :, second] += _REFUSED * rotation[:, :, first]
        yield f"columns {first + 1} and {second + 1} off a right angle by {_REFUSED:g}", sheared
        swapped = rotation.copy()
        swapped[:, :, [first, second]] = rotation[:, :, [second, first]]
        yield f"columns {first + 1} and {second + 1} swapped: a reflection", swapped
    for column in range(3):
        mirrored = rotation.copy()
        mirrored[:, :, column] *= -1.0
        yield f"column {column + 1} negated: a reflection", mirrored
    yield "all zero", np.zeros_like(rotation)
    yield "all 1e30", np.full_like(rotation, 1e30)


def _packed(bench: Bench, batch: Batch, rotation: AnyArray) -> AnyArray:
    return bench.c.pack(Poses(rotation, batch.poses.position))


def _drifted(bench: Bench, rng: np.random.Generator, batch: Batch) -> None:
    """Columns up to 1e-3 off are no fault: the answer reaches the nearest rotation, which `errors` measures against."""
    if bench.reading.task in (Task.POINT, Task.PLANE_POINT, Task.PLANE_POSE):
        return  # nothing of the rotation is read, or which part of it is left open
    stretch = _ACCEPTED * rng.uniform(-1.0, 1.0, (len(batch), 3, 3)) * np.where(np.eye(3) > 0, 1.0, 0.5)
    little = 10.0 ** rng.uniform(-_DECADES, 0.0, (len(batch), 1, 1))  # lengths change with the square: right angles only
    stretch = np.where(rng.random((len(batch), 1, 1)) < 0.5, stretch, little * np.where(np.eye(3) > 0, 0.0, stretch))
    stretch = 0.5 * (stretch + stretch.swapaxes(1, 2))  # symmetric: the nearest rotation stays what it was
    packed = _packed(bench, batch, batch.poses.rotation @ (np.eye(3) + stretch))
    drifted = replace(batch, packed=packed, kind="a drifted rotation")
    found, _ = inspect(bench, drifted)
    refused = any_in_row(found.status == Status.BAD_INPUT)

    def describe(index: int) -> Failure:
        return Failure("a drifted rotation is refused", bench.details(drifted, index, statuses=found.status[index]))

    bench.tally.judge(Check.DRIFTED, refused, describe)
