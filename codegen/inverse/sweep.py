"""Six unknown joints without a closed form: one is swept, the others follow in closed form, one equation is left over.

Two neighbouring turning axes that meet, or are parallel, form a pair. With one of the other four joints at a known value,
the remaining three are solved from what the pair cannot change:

    axes that meet      their common point              a point problem; the angle between the axes is left over
    parallel axes       a plane at right angles to them a plane problem; the distance between the axes is left over

Whether that last equation holds depends on the swept joint alone: its roots are the solutions of the arm. Their number is
not lowered by such a pair, up to 16 (Tsai and Morgan, ASME J. Mech. Trans. Autom. 107 (1985)), so no closed form is missed.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

from codegen.geometry import Pair, Rigid
from codegen.inverse.goal import Goal, goal_of
from codegen.inverse.groups import kept_plane, meeting, moved_plane
from codegen.inverse.plan import Least, Plan
from codegen.inverse.plane import PlaneProblem, solve_plane3
from codegen.inverse.point import PointProblem, solve_point3
from codegen.inverse.pose import PoseProblem
from codegen.inverse.segment import Core, Segment, Use, core_of
from codegen.inverse.solver import Solver
from codegen.inverse.tasks import axis_problem, plan_cost, pose_problem
from codegen.model import Arm, Task
from codegen.program import Node


@dataclass(frozen=True, slots=True)
class Sweep:
    """A finished plan in which one joint is given.

    swept  the joint that is given, by its place in the arm; it may be the free turn of a tool, behind the last
    pair   what it is given as
    miss   what is left over: zero at a solution of the arm
    """

    goal: Goal
    plan: Plan
    swept: int
    pair: Pair
    miss: Node

    @property
    def label(self) -> str:
        return self.goal.solver.label(self.swept)


@dataclass(frozen=True, slots=True)
class _Outside:
    """The motion that undoes a pair, as made by the joints outside it: from behind the pair, through the pose, to before it.

    It is lead segment trail, the swept joint being in one of the three.
    """

    lead: Rigid
    segment: Segment
    trail: Rigid

    def whole(self, solver: Solver) -> Rigid:
        """All joints being known."""
        space = solver.space
        parts = [self.lead]
        for k, use in enumerate(self.segment.uses):
            parts.append(solver.motion(use))
            if k < len(self.segment.cores):
                parts.append(self.segment.cores[k].whole(space))
        return space.compose(*parts, self.trail)


def sweeps(arm: Arm) -> Iterator[Sweep]:
    """Every way to solve five joints once the sixth is known; each from fresh ground."""
    problem_of = {Task.POSE: pose_problem, Task.POINT_AXIS: axis_problem}.get(arm.task)
    if problem_of is None:
        return
    for first in range(5):
        for place in range(4):
            sweep = _sweep(goal_of(arm), problem_of, first, place)
            if sweep is not None:
                yield sweep


def cheapest_sweep(arm: Arm) -> Sweep | None:
    """Fewest quartics, then fewest operations, as of a closed form; None where no two axes meet or are parallel."""
    return min(sweeps(arm), key=lambda sweep: plan_cost(sweep.plan), default=None)


def _sweep(goal: Goal, problem_of: Callable[[Goal], PoseProblem], first: int, place: int) -> Sweep | None:
    """Joints first and first + 1 as the pair, and of the others, counted from behind the pair, the one at `place` swept."""
    solver, problem = goal.solver, problem_of(goal)
    pair = problem.segment.part(first, 2)
    uses = (*problem.segment.uses[first + 2 :], *problem.segment.uses[:first])
    if not all(use.turns for use in (*pair.uses, uses[place])):
        return None
    swept = uses[place].joint.index
    solver.pairs[swept] = solver.new_pair(solver.label(swept))
    solver.heading("swept")
    outside = _outside(solver, problem, first, place)
    miss = _meeting_pair(solver, pair, outside) or _parallel_pair(solver, pair, outside)
    if miss is None or solver.oracle.vanishes(miss):
        return None
    real = set(goal.arm.free_indices)
    pairs = {k: found for k, found in solver.pairs.items() if k in real}
    plan = Plan(tuple(solver.steps), pairs, dict(solver.slides), tuple(solver.structure))
    return Sweep(goal, plan, swept, solver.pairs[swept], miss)


def _outside(solver: Solver, problem: PoseProblem, first: int, place: int) -> _Outside:
    space, segment = solver.space, problem.segment
    uses: list[Use] = [*segment.uses[first + 2 :], *segment.uses[:first]]
    cores: list[Core] = [
        *segment.cores[first + 1 :],
        core_of(space, space.inverse(problem.goal)),
        *segment.cores[:first],
    ]
    swept = solver.motion(uses.pop(place))
    joined = space.compose(cores[place].whole(space), swept, cores[place + 1].whole(space))
    cores[place : place + 2] = [core_of(space, joined)]
    return _Outside(cores[0].whole(space), Segment(tuple(uses), tuple(cores[1:3])), cores[3].whole(space))


def _meeting_pair(solver: Solver, pair: Segment, outside: _Outside) -> Node | None:
    """The cosine of the angle between the axes that is reached, less the cosine wanted."""
    space, b = solver.space, solver.builder
    meet = meeting(solver, pair.cores[0])
    if meet is None:
        return None
    names = [solver.label(use.joint.index) for use in pair.uses]
    solver.structure_found(f"the axes of {' and '.join(names)} meet in one point")
    before, behind = space.along_z(meet[0]), space.along_z(meet[1])
    p = space.moved(space.inverse(outside.lead), behind)
    if not solve_point3(solver, PointProblem(outside.segment, space.moved(outside.trail, before), p), "meeting point"):
        return None
    solver.heading("left")
    undone = outside.whole(solver).rotation
    core = pair.cores[0].middle.rotation
    miss = b.sub(undone[2][2], core[2][2])
    first, second = pair.uses
    solver.turn_onto(
        first, space.column(core, 2), undone[2], Least.NOTHING, f"{names[0]} turns the next axis to its place"
    )  # the last row of the motion that undoes is the last column of the motion itself
    own = space.times(space.transposed(core), space.unit[2])
    back = Use(second.joint, -second.sign)
    solver.turn_onto(back, own, space.column(undone, 2), Least.NOTHING, f"{names[1]} the same seen from behind")
    return miss


def _parallel_pair(solver: Solver, pair: Segment, outside: _Outside) -> Node | None:
    """The squared distance between the axes that is reached, less the one wanted."""
    space, b = solver.space, solver.builder
    core = pair.cores[0]
    row = core.middle.rotation[2]
    if not (row[0].is_exactly(0) and row[1].is_exactly(0)) or solver.oracle.vanishes(*core.middle.shift[:2]):
        return None
    names = [solver.label(use.joint.index) for use in pair.uses]
    solver.structure_found(f"the axes of {' and '.join(names)} are parallel")
    before, behind = kept_plane(solver, pair, space.unit[2])
    source = moved_plane(solver, outside.trail, before)
    goal = moved_plane(solver, space.inverse(outside.lead), behind)
    if not solve_plane3(solver, PlaneProblem(outside.segment, source, goal), "plane across the axes"):
        return None
    solver.heading("left")
    undone = outside.whole(solver)
    done = space.inverse(undone)
    reached, wanted = done.shift, core.whole(space).shift
    miss = b.sub(_square_xy(solver, reached[0], reached[1]), _square_xy(solver, wanted[0], wanted[1]))
    first, second = pair.uses
    solver.turn_onto(first, wanted, reached, Least.NOTHING, f"{names[0]} turns the next axis to its place")
    left = space.product(space.transposed(solver.motion(first).rotation), done.rotation)
    left = space.product(space.transposed(core.middle.rotation), left)
    solver.direction(second, left[0][0], left[1][0], Least.NOTHING, f"{names[1]} makes up the turn that is left over")
    return miss


def _square_xy(solver: Solver, x: Node, y: Node) -> Node:
    return solver.builder.add(solver.builder.square(x), solver.builder.square(y))
