"""Which task an adopted arm is given, and which joint of a seven-joint arm is held."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace

from codegen.adopt.rigid import NO_SHIFT, Motion, Vector, about_x, about_z, dot, motion_of, multiply
from codegen.errors import CallError, CannotSolveError, Fault
from codegen.model import Arm, JointKind, JointRow, Task

# Joints to try to hold, first choice first. The third is the usual one (it swivels the elbow); a joint of the elbow
# comes last, as holding it fixes the reach. Common practice, no published source.
HOLD_ORDER = (2, 6, 0, 4, 1, 5, 3)


def with_task(arm: Arm, task: Task | None, held: tuple[str, ...] | None, solvable: Callable[[Arm], bool] | None) -> Arm:
    """The arm with a task that fits its joints.

    task, held   the user's choice, or None to choose here
    solvable     tells whether an arm's inverse kinematics can be derived; None: judged by its axes alone
    Raises CallError when no choice fits.
    """
    names = tuple(row.name for row in arm.joints)
    for name in held or ():
        if name not in names:
            raise CallError(Fault("--hold", f'there is no joint "{name}"', f"joints that move: {', '.join(names)}"))
    free = len(names) - len(held or ())
    chosen = task or _task_for(arm, free if held is not None else min(free, 6))
    if chosen is None:
        what = f"no task fits {free} joint{'s' * (free != 1)}"
        hint = f"tasks need 2 to 6 joints that are not held; this chain moves {', '.join(names)}"
        raise CallError(Fault(arm.name, what, hint))
    arm = replace(arm, task=chosen, held=held or ())
    return _with_held(arm, free - chosen.joints, held is not None, solvable)


def _with_held(arm: Arm, surplus: int, held_given: bool, solvable: Callable[[Arm], bool] | None) -> Arm:
    if surplus == 0:
        return arm
    if surplus == 1 and not held_given:
        return _hold_one(arm, solvable)
    task = arm.task
    what = f'task "{task.key}" takes {task.joints} joints that are not held, and there are {task.joints + surplus}'
    fitting = ", ".join(sorted(other.key for other in Task if other.joints == task.joints + surplus))
    hint = f"name {surplus} with --hold" if surplus > 0 else f"tasks that fit: {fitting or 'none'}"
    raise CallError(Fault(arm.name, what, hint))


def _hold_one(arm: Arm, solvable: Callable[[Arm], bool] | None) -> Arm:
    """Holds the first joint of HOLD_ORDER that leaves a chain with an inverse; the third if none does."""
    judge = solvable or _looks_solvable
    order = [index for index in HOLD_ORDER if index < len(arm.joints)]
    candidates = [replace(arm, held=(arm.joints[index].name,)) for index in order]
    return next((candidate for candidate in candidates if _judged(judge, candidate)), candidates[0])


def _judged(judge: Callable[[Arm], bool], candidate: Arm) -> bool:
    """A derivation that gives up with a reason is a no."""
    try:
        return judge(candidate)
    except CannotSolveError:
        return False


def _looks_solvable(arm: Arm) -> bool:
    """Three neighbouring axes that are free meet in a point or are parallel (Pieper 1968)."""
    rows = arm.joints
    for first in range(len(rows) - 2):
        group = rows[first : first + 3]
        if any(row.name in arm.held or row.kind is not JointKind.REVOLUTE for row in group):
            continue
        parallel = all(_is_parallel(row) for row in group[:2])
        meeting = group[0].a == group[1].a == group[1].d == 0 and not any(_is_parallel(row) for row in group[:2])
        if parallel or meeting:
            return True
    return False


def _is_parallel(row: JointRow) -> bool:
    quarters = row.alpha.quarter_turns
    return quarters is not None and quarters % 2 == 0


def _task_for(arm: Arm, joints: int) -> Task | None:
    if joints == 4:
        return Task.POINT_YAW if _all_turns_vertical(arm) else Task.POINT_PITCH
    if joints == 3:
        return Task.PLANE_POSE if _is_planar(arm) else Task.POINT
    return {6: Task.POSE, 5: Task.POINT_AXIS, 2: Task.PLANE_POINT}.get(joints)


def _axes(arm: Arm) -> Iterator[tuple[JointKind, Vector]]:
    """Direction of each joint axis in the world frame at joint values zero (standard rows)."""
    pose = motion_of(arm.base)
    for row in arm.joints:
        yield row.kind, (pose.turn[0][2], pose.turn[1][2], pose.turn[2][2])
        turn = multiply(about_z(*row.theta.cosine_sine()), about_x(*row.alpha.cosine_sine()))
        pose = pose @ Motion(turn, NO_SHIFT)


def _all_turns_vertical(arm: Arm) -> bool:
    return all(abs(axis[2]) == 1 for kind, axis in _axes(arm) if kind is JointKind.REVOLUTE)


def _is_planar(arm: Arm) -> bool:
    """All turning axes are parallel, and slides are square to them. Turning about such axes keeps it so."""
    turns = [axis for kind, axis in _axes(arm) if kind is JointKind.REVOLUTE]
    slides = [axis for kind, axis in _axes(arm) if kind is JointKind.PRISMATIC]
    if not turns:
        return False
    parallel = all(abs(abs(dot(turns[0], axis)) - 1) < 1e-40 for axis in turns)
    return parallel and all(abs(dot(turns[0], axis)) < 1e-40 for axis in slides)
