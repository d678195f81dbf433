"""Six unknown joints that must reach a whole pose: the search over groups that simplify it.

Each strategy sets aside a group of neighbouring joints, solves the joints outside it from what the group cannot change,
then the group. Strategies are tried on the chain in every order that commuting joints allow, and on the chain reversed.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from codegen.geometry import Matrix, Pair, Rigid
from codegen.inverse.commuting import orders
from codegen.inverse.groups import common_normal, kept_plane, moved_plane, planar_normal, spherical
from codegen.inverse.orientation import DirectionProblem, solve_direction2, solve_orientation3, solve_slides
from codegen.inverse.planar import axes_now, solve_parallel4, solve_planar3
from codegen.inverse.plane import PlaneProblem, solve_plane3
from codegen.inverse.point import PointProblem, solve_point3
from codegen.inverse.segment import Core, Segment, Use, core_of
from codegen.inverse.solver import Solver


@dataclass(frozen=True, slots=True)
class PoseProblem:
    """segment (six joints) = goal."""

    segment: Segment
    goal: Rigid

    def reversed(self, solver: Solver) -> PoseProblem:
        return PoseProblem(self.segment.reversed(solver.space), solver.space.inverse(self.goal))


Strategy = Callable[[Solver, PoseProblem], bool]


def readings(solver: Solver, problem: PoseProblem) -> list[PoseProblem]:
    """The problem in every order that commuting joints allow, each from both ends."""
    space = solver.space
    found = []
    for framed in orders(space, problem.segment):
        goal = space.compose(space.inverse(framed.lead), problem.goal, space.inverse(framed.trail))
        forward = PoseProblem(framed.segment, goal)
        found += [forward, forward.reversed(solver)]
    return found


def names_of(solver: Solver, group: Segment) -> str:
    return ", ".join(sorted(solver.label(use.joint.index) for use in group.uses))


def left_rotation(solver: Solver, segment: Segment, count: int, rotation: Matrix) -> Matrix:
    """The rotation that is left for the joints behind the first `count`, which are known.

    The known turns are taken off one after the other, column by column, which costs less than their product; neighbours
    with parallel axes are one turn by the sum of their angles.
    """
    space = solver.space
    k = 0
    while k < count:
        last = k
        pair = solver.own_pair(segment.uses[k]) if segment.uses[k].turns else None
        cores = segment.cores[k].middle.rotation
        while last + 1 < count and _keeps_axis(segment.cores[last]):
            last += 1
            pair = _added(solver, pair, segment.uses[last], cores)
            cores = space.product(cores, segment.cores[last].middle.rotation)
        if pair is not None:
            rotation = space.product(space.transposed(space.about_z(pair)), rotation)
        rotation = space.product(space.transposed(cores), rotation)
        _name_columns(solver, rotation, f"past_{solver.label(segment.uses[last].joint.index)}")
        k = last + 1
    return rotation


def _name_columns(solver: Solver, rotation: Matrix, where: str) -> None:
    for k, axis in enumerate("xyz"):
        solver.space.named(solver.space.column(rotation, k), f"{axis}_axis_{where}")


def _keeps_axis(core: Core) -> bool:
    z = core.middle.rotation[2][2]
    return z.structural and z.value in (1, -1)


def _added(solver: Solver, pair: Pair | None, use: Use, cores: Matrix) -> Pair | None:
    """The pair of a run's angle with one more joint; cores that turn the axis round change its sense."""
    if not use.turns:
        return pair
    own = solver.own_pair(use)
    own = own if int(cores[2][2].value) > 0 else solver.space.opposite(own)
    if pair is None:
        return own
    total = solver.space.sum_of(pair, own)
    solver.builder.named(total.cosine, f"cosine_to_{solver.label(use.joint.index)}", "angles of parallel axes added")
    solver.builder.named(total.sine, f"sine_to_{solver.label(use.joint.index)}")
    return total


def spherical_at_end(solver: Solver, problem: PoseProblem) -> bool:
    """Axes 4, 5, 6 meet: their point is placed by joints 1 to 3, then they give the orientation."""
    space, segment = solver.space, problem.segment
    group = segment.part(3, 3)
    meet = spherical(solver, group)
    if meet is None:
        return False
    solver.structure_found(f"the axes of {names_of(solver, group)} meet in one point")
    solver.heading("wrist")
    w = space.moved(segment.cores[2].whole(space), meet[0])
    p = space.moved(problem.goal, meet[1])
    space.named(p, "centre", "point where the three axes meet, seen from the other joints; m")
    if not solve_point3(solver, PointProblem(segment.part(0, 3), w, p), "meeting point"):
        return False
    rotation = left_rotation(solver, segment, 3, problem.goal.rotation)
    return solve_orientation3(solver, group, rotation, "orientation")


def _between(solver: Solver, problem: PoseProblem, first: int, last: int) -> Segment:
    """The joints outside a group first..last with one joint before it, read as one segment through the pose."""
    segment, goal = problem.segment, problem.goal
    before = tuple(use.undone for use in reversed(segment.uses[:first]))
    behind = tuple(use.undone for use in reversed(segment.uses[last + 1 :]))
    cores = [core.inverted(solver.space) for core in reversed(segment.cores[: first - 1])]
    cores.append(core_of(solver.space, goal))
    cores += [core.inverted(solver.space) for core in reversed(segment.cores[last + 1 :])]
    return Segment(before + behind, tuple(cores))


def _inside_goal(solver: Solver, problem: PoseProblem, first: int, last: int) -> Rigid:
    """What the group first..last must do, all joints outside it being known."""
    space, segment = solver.space, problem.segment
    goal = problem.goal
    for use, core in zip(segment.uses[:first], segment.cores, strict=False):
        goal = space.compose(space.inverse(core.whole(space)), space.inverse(solver.motion(use)), goal)
    for k in range(len(segment.uses) - 1, last, -1):
        undone = space.inverse(solver.motion(segment.uses[k]))
        goal = space.compose(goal, undone, space.inverse(segment.cores[k - 1].whole(space)))
    return goal


def spherical_inside(solver: Solver, problem: PoseProblem) -> bool:
    """Axes 2, 3, 4 meet: their point, seen from joint 1 and through the pose from joints 5 and 6."""
    space, segment = solver.space, problem.segment
    group = segment.part(1, 3)
    meet = spherical(solver, group)
    if meet is None:
        return False
    solver.structure_found(f"the axes of {names_of(solver, group)} meet in one point")
    w = space.moved(space.inverse(segment.cores[3].whole(space)), meet[1])
    p = space.moved(segment.cores[0].whole(space), meet[0])
    outside = _between(solver, problem, 1, 3)
    if not solve_point3(solver, PointProblem(outside, w, p), "meeting point"):
        return False
    return solve_orientation3(solver, group, _inside_goal(solver, problem, 1, 3).rotation, "orientation")


def planar_at_end(solver: Solver, problem: PoseProblem) -> bool:
    """Joints 4, 5, 6 move in a plane: the plane is placed by joints 1 to 3, then they move in it."""
    space, segment = solver.space, problem.segment
    group = segment.part(3, 3)
    normal = planar_normal(solver, group)
    if normal is None:
        return False
    solver.structure_found(f"{names_of(solver, group)} move in one plane")
    before, behind = kept_plane(solver, group, normal)
    source = moved_plane(solver, segment.cores[2].whole(space), before)
    goal = moved_plane(solver, problem.goal, behind)
    if not solve_plane3(solver, PlaneProblem(segment.part(0, 3), source, goal), "plane of motion"):
        return False
    return solve_planar3(solver, group, _inside_goal(solver, problem, 3, 5), "in the plane")


def planar_inside(solver: Solver, problem: PoseProblem) -> bool:
    """Joints 2, 3, 4 move in a plane: it is seen from joint 1 and through the pose from joints 5 and 6."""
    space, segment = solver.space, problem.segment
    group = segment.part(1, 3)
    normal = planar_normal(solver, group)
    if normal is None:
        return False
    solver.structure_found(f"{names_of(solver, group)} move in one plane")
    before, behind = kept_plane(solver, group, normal)
    source = moved_plane(solver, space.inverse(segment.cores[3].whole(space)), behind)
    goal = moved_plane(solver, segment.cores[0].whole(space), before)
    outside = _between(solver, problem, 1, 3)
    if not solve_plane3(solver, PlaneProblem(outside, source, goal), "plane of motion"):
        return False
    return solve_planar3(solver, group, _inside_goal(solver, problem, 1, 3), "in the plane")


def parallel_at_end(solver: Solver, problem: PoseProblem) -> bool:
    """The turning axes of joints 3 to 6 are parallel: joints 1 and 2 give their direction."""
    segment = problem.segment
    group = segment.part(2, 4)
    return _parallel(solver, problem, group, 2, segment.part(0, 2))


def parallel_inside(solver: Solver, problem: PoseProblem) -> bool:
    """The turning axes of joints 2 to 5 are parallel: joints 1 and 6 give their direction."""
    return _parallel(solver, problem, problem.segment.part(1, 4), 1, _between(solver, problem, 1, 4))


def _parallel(solver: Solver, problem: PoseProblem, group: Segment, first: int, outside: Segment) -> bool:
    space, segment = solver.space, problem.segment
    normal = common_normal(solver, group)
    if normal is None or not all(use.turns for use in outside.uses):
        return False
    solver.structure_found(f"the turning axes among {names_of(solver, group)} are parallel")
    before, behind = kept_plane(solver, group, normal)
    if first == 2:
        n = space.times(segment.cores[1].whole(space).rotation, before.normal)
        v = space.times(problem.goal.rotation, behind.normal)
    else:
        n = space.times(space.transposed(segment.cores[4].whole(space).rotation), behind.normal)
        v = space.times(segment.cores[0].whole(space).rotation, before.normal)
    if not solve_direction2(solver, DirectionProblem(outside, n, v), "direction of the parallel axes"):
        return False
    return solve_parallel4(solver, group, _inside_goal(solver, problem, first, first + 3), "along the parallel axes")


def three_slides(solver: Solver, problem: PoseProblem) -> bool:
    """Three turning joints give the orientation whatever the slides do; the slides are then linear."""
    space, segment = solver.space, problem.segment
    turning = [k for k, use in enumerate(segment.uses) if use.turns]
    if len(turning) != 3:
        return False
    solver.structure_found("three joints slide: the turning ones alone give the orientation")
    chunks = [space.unit]
    for k, use in enumerate(segment.uses):
        if use.turns:
            chunks.append(space.unit)
        if k < len(segment.cores):
            chunks[-1] = space.product(chunks[-1], segment.cores[k].middle.rotation)
    rotation = space.product(space.transposed(chunks[0]), problem.goal.rotation)
    rotation = space.product(rotation, space.transposed(chunks[3]))
    cores = tuple(core_of(space, Rigid(chunk, space.origin)) for chunk in chunks[1:3])
    turns = Segment(tuple(segment.uses[k] for k in turning), cores)
    if not solve_orientation3(solver, turns, rotation, "orientation"):
        return False
    axes, rest = axes_now(solver, segment)
    slides = [k for k, use in enumerate(segment.uses) if not use.turns]
    gap = space.minus(problem.goal.shift, rest.shift)
    return solve_slides(solver, tuple(segment.uses[k] for k in slides), [axes[k] for k in slides], gap, "slides", None)


STRATEGIES: tuple[Strategy, ...] = (
    three_slides,
    spherical_at_end,
    planar_inside,
    planar_at_end,
    parallel_at_end,
    parallel_inside,
    spherical_inside,
)

