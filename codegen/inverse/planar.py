"""Groups that move in a plane, or in a plane and along its normal, brought to a wanted displacement."""

from __future__ import annotations

from codegen.geometry import Rigid, Vector
from codegen.inverse.groups import at_rest, common_normal, planar_normal
from codegen.inverse.orientation import solve_slides
from codegen.inverse.plan import Least
from codegen.inverse.point import PointProblem, solve_point2
from codegen.inverse.segment import Segment, core_of
from codegen.inverse.solver import Solver


def solve_planar3(solver: Solver, group: Segment, goal: Rigid, what: str) -> bool:
    """Three planar joints: group = goal."""
    solver.heading(what)
    first, _, last = group.uses
    if last.turns:
        return _last_turns(solver, group, goal, what)
    if first.turns:
        return _last_turns(solver, group.reversed(solver.space), solver.space.inverse(goal), what)
    return _only_middle_turns(solver, group, goal, what)


def _last_turns(solver: Solver, group: Segment, goal: Rigid, what: str) -> bool:
    """The last axis's place does not depend on its own turn: a point problem for the other two."""
    space = solver.space
    place = group.cores[1].whole(space).shift
    if not solve_point2(solver, PointProblem(group.part(0, 2), place, goal.shift), what):
        return False
    left = _left_over(solver, group.part(0, 2), group, goal)
    solver.direction(
        group.uses[2], left.rotation[0][0], left.rotation[1][0], Least.NOTHING,
        f"{what}: {solver.label(group.uses[2].joint.index)} makes up the turn that is left over",
    )  # fmt: skip
    return True


def _left_over(solver: Solver, known: Segment, group: Segment, goal: Rigid) -> Rigid:
    """What the joints behind the known ones must do."""
    space = solver.space
    left = goal
    for use, core in zip(known.uses, group.cores, strict=False):
        left = space.compose(space.inverse(solver.motion(use)), left)
        left = space.compose(space.inverse(core.whole(space)), left)
    return left


def _only_middle_turns(solver: Solver, group: Segment, goal: Rigid, what: str) -> bool:
    space = solver.space
    left, right = (core.whole(space) for core in group.cores)
    turn = space.product(space.transposed(left.rotation), goal.rotation)
    turn = space.product(turn, space.transposed(right.rotation))
    solver.direction(group.uses[1], turn[0][0], turn[1][0], Least.NOTHING, f"{what}: the turn")
    motion = space.compose(left, solver.motion(group.uses[1]), right)
    axes = [space.unit[2], space.column(motion.rotation, 2)]
    gap = space.minus(goal.shift, motion.shift)
    normal = space.column(left.rotation, 2)
    return solve_slides(solver, (group.uses[0], group.uses[2]), axes, gap, what, normal)


def solve_parallel4(solver: Solver, group: Segment, goal: Rigid, what: str) -> bool:
    """Four joints, all turning axes parallel, slides in any direction: group = goal.

    The height along the axes is changed by slides only. One slide with a part along them takes it; the other three joints
    are planar. With three slides the turn comes first and the slides are linear.
    """
    space, b = solver.space, solver.builder
    normal = common_normal(solver, group)
    if normal is None:
        return False
    axes, rest = at_rest(solver, group)
    heights = {
        k: space.dot(normal, axes[k])
        for k, use in enumerate(group.uses)
        if not use.turns and not solver.oracle.vanishes(space.dot(normal, axes[k]))
    }
    if sum(not use.turns for use in group.uses) == 3:
        return _turn_then_slides(solver, group, goal, what)
    if len(heights) != 1:
        return False
    ((k, height),) = heights.items()
    rise = b.sub(space.dot(normal, goal.shift), space.dot(normal, rest.shift))
    name = solver.label(group.uses[k].joint.index)
    solver.slide(group.uses[k], rise, height, f"{what}: {name} alone changes the height along the parallel axes")
    three, left = without_known(solver, group, k, goal)
    return planar_normal(solver, three) is not None and solve_planar3(solver, three, left, what)


def without_known(solver: Solver, group: Segment, k: int, goal: Rigid) -> tuple[Segment, Rigid]:
    """The segment without its joint k, which is known, and the goal for what remains."""
    space = solver.space
    motion = solver.motion(group.uses[k])
    uses = group.uses[:k] + group.uses[k + 1 :]
    cores = [core.whole(space) for core in group.cores]
    if k == 0:
        goal = space.compose(space.inverse(space.compose(motion, cores[0])), goal)
        cores = cores[1:]
    elif k == len(group.uses) - 1:
        goal = space.compose(goal, space.inverse(space.compose(cores[-1], motion)))
        cores = cores[:-1]
    else:
        cores[k - 1 : k + 1] = [space.compose(cores[k - 1], motion, cores[k])]
    return Segment(uses, tuple(core_of(space, core) for core in cores)), goal


def _turn_then_slides(solver: Solver, group: Segment, goal: Rigid, what: str) -> bool:
    """One turning joint and three slides."""
    space = solver.space
    k = next(i for i, use in enumerate(group.uses) if use.turns)
    before, behind = space.identity, space.identity
    for core in group.cores[:k]:
        before = space.compose(before, core.whole(space))
    for core in group.cores[k:]:
        behind = space.compose(behind, core.whole(space))
    turn = space.product(space.transposed(before.rotation), goal.rotation)
    turn = space.product(turn, space.transposed(behind.rotation))
    solver.direction(group.uses[k], turn[0][0], turn[1][0], Least.NOTHING, f"{what}: the turn")
    axes, rest = axes_now(solver, group)
    slides = [i for i in range(4) if i != k]
    chosen = tuple(group.uses[i] for i in slides)
    gap = space.minus(goal.shift, rest.shift)
    return solve_slides(solver, chosen, [axes[i] for i in slides], gap, what, None)


def axes_now(solver: Solver, group: Segment) -> tuple[list[Vector], Rigid]:
    """Axes of the joints in the frame before the group and its motion, the known turns done and the slides at zero."""
    space = solver.space
    axes, motion = [], space.identity
    for k, use in enumerate(group.uses):
        axes.append(space.column(motion.rotation, 2))
        if use.turns:
            motion = space.compose(motion, solver.motion(use))
        if k < len(group.cores):
            motion = space.compose(motion, group.cores[k].whole(space))
    return axes, motion
