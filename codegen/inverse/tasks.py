"""From a task to a plan: what each task wants, as a problem for the solvers.

Tasks that read a part of the pose are made whole first: a free turn about the tool's z axis becomes a sixth joint, a wanted
heading or pitch becomes a rotation that the parallel axes can reach.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace

from codegen.geometry import Matrix, Pair, Rigid, Vector
from codegen.inverse.commuting import orders
from codegen.inverse.doubt import with_doubts
from codegen.inverse.goal import Goal, completed_rotation, goal_of, virtual_roll
from codegen.inverse.groups import at_rest, common_normal, frame_about, planar_normal, turned_about
from codegen.inverse.plan import Least, Plan
from codegen.inverse.planar import solve_parallel4, solve_planar3
from codegen.inverse.point import PointProblem, solve_point2, solve_point3
from codegen.inverse.pose import STRATEGIES, PoseProblem, Strategy, readings
from codegen.inverse.segment import Core, Segment, Use
from codegen.inverse.solver import Balance, Solver
from codegen.model import Arm, Task
from codegen.program import Node, Op, reachable


@dataclass(frozen=True, slots=True)
class Derivation:
    """A finished plan with the ground it stands on."""

    goal: Goal
    plan: Plan

    def misses(self) -> list[tuple[str, Node]]:
        """("length" or "angle", pose reached minus pose wanted) for every entry that the task reads."""
        goal, space = self.goal, self.goal.space
        rotation, position = goal.pose_from(self.plan.pairs, self.plan.slides)
        gap = space.minus(position, goal.position)
        if goal.arm.task in (Task.PLANE_POSE, Task.PLANE_POINT):
            gap = _across(goal, gap)
        found = [("length", entry) for entry in gap]
        columns = {Task.POSE: (0, 1, 2), Task.POINT_AXIS: (2,)}.get(goal.arm.task, ())
        for k in columns:
            turned = space.minus(space.column(rotation, k), space.column(goal.rotation, k))
            found += [("angle", entry) for entry in turned]
        return [(kind, node) for kind, node in found if not node.is_constant]

    def known_values(self) -> dict[Node, Node]:
        """Every leaf of the plan by what it is where all joints are known: for finding the branch of joint values."""
        goal, solver = self.goal, self.goal.solver
        rotation, position = goal.known_pose()
        values = dict(zip(goal.position, position, strict=True))
        for wanted, known in zip(goal.rotation, rotation, strict=True):
            values.update(zip(wanted, known, strict=True))
        pairs = [(solver.pairs[k], solver.known_pairs[k]) for k in sorted(solver.pairs)]
        for pair, known_pair in pairs + list(solver.known_headings.items()):
            values[pair.cosine], values[pair.sine] = known_pair.cosine, known_pair.sine
        for k in sorted(solver.slides):
            values[solver.slides[k]] = solver.known_slides[k]
        return values


Attempt = Callable[[Goal], bool]


def _across(goal: Goal, gap: Vector) -> Vector:
    """The part of a difference of points that lies in the plane of motion, in the world frame."""
    space = goal.space
    before, segment, _ = goal.segment()
    axes, _ = at_rest(goal.solver, segment)
    normal = planar_normal(goal.solver, segment) or space.cross(axes[0], axes[1])
    up = space.times(before.rotation, normal)
    return space.minus(gap, space.scaled(up, space.dot(up, gap)))


def derivations(arm: Arm) -> Iterator[Derivation]:
    """Every way that the search finds; each attempt starts from fresh ground."""
    for attempt in _attempts(arm):
        goal = goal_of(arm)
        if attempt(goal):
            solver = goal.solver
            real = set(arm.free_indices)
            pairs = {k: pair for k, pair in solver.pairs.items() if k in real}
            yield Derivation(goal, Plan(tuple(solver.steps), pairs, dict(solver.slides), tuple(solver.structure)))


def derive(arm: Arm) -> Derivation | None:
    """The cheapest plan: fewest quartics, then fewest operations; None where no closed form is found."""
    best: tuple[tuple[int, int], Derivation] | None = None
    for derivation in derivations(arm):
        cost = plan_cost(derivation.plan)
        if best is None or cost < best[0]:
            best = (cost, derivation)
    if best is None:
        return None
    derivation = best[1]
    return replace(derivation, plan=with_doubts(derivation.plan, derivation.goal, derivation.known_values()))


def plan_cost(plan: Plan) -> tuple[int, int]:
    """What plans are compared by: quartics, operations."""
    return _quartics(plan), _operations(plan)


def _quartics(plan: Plan) -> int:
    return sum(step.roots == 4 for step in plan.steps)


def _operations(plan: Plan) -> int:
    roots = [node for step in plan.steps for node in step_nodes(step)]
    weights = {Op.SUM: 1, Op.PRODUCT: 1, Op.QUOTIENT: 10, Op.ROOT: 10, Op.SIZE: 1, Op.CHOICE: 2}
    return sum(weights.get(node.op, 0) for node in reachable(roots))


def step_nodes(step: object) -> list[Node]:
    """Every value that a step reads."""
    found: list[Node] = []

    def gather(value: object) -> None:
        if isinstance(value, Node):
            found.append(value)
        elif isinstance(value, tuple):
            for item in value:
                gather(item)

    for name in step.__dataclass_fields__:  # type: ignore[attr-defined]
        if name not in ("side", "known", "bit", "turned", "doubt", "doubts"):
            gather(getattr(step, name))
    return found


def _attempts(arm: Arm) -> Iterator[Attempt]:
    match arm.task:
        case Task.POSE:
            yield from _pose_attempts(arm, pose_problem)
        case Task.POINT_AXIS:
            yield from _pose_attempts(arm, axis_problem)
        case Task.POINT:
            yield _point
        case Task.POINT_PITCH:
            yield _pitch
            yield _pitch_parallel
        case Task.POINT_YAW:
            yield _yaw
        case Task.PLANE_POSE:
            yield _plane_pose
        case Task.PLANE_POINT:
            yield _plane_point


def _pose_attempts(arm: Arm, problem_of: Callable[[Goal], PoseProblem]) -> Iterator[Attempt]:
    goal = goal_of(arm)
    count = len(readings(goal.solver, problem_of(goal)))
    for strategy in STRATEGIES:
        for k in range(count):
            yield _pose_attempt(problem_of, strategy, k)


def _pose_attempt(problem_of: Callable[[Goal], PoseProblem], strategy: Strategy, k: int) -> Attempt:
    def attempt(goal: Goal) -> bool:
        return strategy(goal.solver, readings(goal.solver, problem_of(goal))[k])

    return attempt


def pose_problem(goal: Goal) -> PoseProblem:
    space = goal.space
    before, segment, behind = goal.segment()
    wanted = Rigid(goal.rotation, goal.position)
    last = space.compose(space.inverse(before), wanted, space.inverse(behind))
    for k, axis in enumerate("xyz"):
        space.named(space.column(last.rotation, k), f"last_{axis}_axis", f"{axis} axis of the last link frame")
    space.named(last.shift, "last_point", "origin of the last link frame, seen from the base; m")
    return PoseProblem(segment, last)


def axis_problem(goal: Goal) -> PoseProblem:
    """Five joints and a free turn about the tool's z axis."""
    space, solver = goal.space, goal.solver
    before, segment, behind = goal.segment()
    roll = virtual_roll(goal)
    rotation = completed_rotation(goal)
    known, _ = goal.known_pose()
    x_chosen = space.column(rotation, 0)
    solver.known_pairs[roll.index] = Pair(
        space.dot(space.column(known, 0), x_chosen), space.dot(space.column(known, 1), x_chosen)
    )
    cores = (*segment.cores, Core(space.zero, behind, space.zero))
    wanted = Rigid(rotation, goal.position)
    return PoseProblem(Segment((*segment.uses, Use(roll)), cores), space.compose(space.inverse(before), wanted))


def _point(goal: Goal) -> bool:
    before, segment, behind = goal.segment()
    p = goal.space.moved(goal.space.inverse(before), goal.position)
    return solve_point3(goal.solver, PointProblem(segment, behind.shift, p), "tool point")


def _in_plane(goal: Goal, normal: Vector, p: Vector, rest: Vector) -> Vector:
    """The point with its height along the normal replaced by the one that the chain keeps."""
    space, b = goal.space, goal.solver.builder
    change = b.sub(space.dot(normal, rest), space.dot(normal, p))
    return space.plus(p, space.scaled(normal, change))


def _plane_point(goal: Goal) -> bool:
    space = goal.space
    before, segment, behind = goal.segment()
    axes, motion = at_rest(goal.solver, segment)
    normal = planar_normal(goal.solver, segment) or space.cross(axes[0], axes[1])
    p = space.moved(space.inverse(before), goal.position)
    p = _in_plane(goal, normal, p, space.moved(motion, behind.shift))
    return solve_point2(goal.solver, PointProblem(segment, behind.shift, p), "tool point")


def _heading(goal: Goal, segment: Segment, normal: Vector) -> tuple[tuple[int, int], ...]:
    """The joints that turn about the normal, with the sense in which each does."""
    axes, _ = at_rest(goal.solver, segment)
    return tuple(
        (use.joint.index, use.sign if goal.solver.oracle.sample(goal.space.dot(axis, normal)) > 0 else -use.sign)
        for use, axis in zip(segment.uses, axes, strict=True)
        if use.turns
    )


def _group_angle(goal: Goal, segment: Segment, normal: Vector, name: str, x: Node, y: Node, note: str) -> Pair:
    """The angle by which a group turns about its normal, with what it is where all joints are known."""
    solver = goal.solver
    heading = _heading(goal, segment, normal)
    pair = solver.heading_angle(name, x, y, heading, note)
    known: Pair | None = None
    for index, sign in heading:
        own = solver.known_pairs[index]
        own = own if sign > 0 else goal.space.opposite(own)
        known = own if known is None else goal.space.sum_of(known, own)
    assert known is not None
    solver.known_headings[pair] = known
    return pair


def plane_block(goal: Goal) -> tuple[tuple[Node, Node], tuple[Node, Node]] | None:
    """The part in the plane of motion of the wanted rotation against the one at rest; None where the arm is not planar."""
    space, solver = goal.space, goal.solver
    before, segment, behind = goal.segment()
    normal = planar_normal(solver, segment)
    if normal is None:
        return None
    axes, motion = at_rest(solver, segment)
    frame = frame_about(solver, normal, axes[0])
    rest = space.compose(before, motion, behind).rotation
    turn = space.product(goal.rotation, space.transposed(rest))
    in_world = space.product(before.rotation, frame.rotation)
    local = space.product(space.product(space.transposed(in_world), turn), in_world)
    return (local[0][0], local[0][1]), (local[1][0], local[1][1])


def _plane_pose(goal: Goal) -> bool:
    """The turn about the normal that is nearest to the wanted rotation, and the point in the plane."""
    space, solver, b = goal.space, goal.solver, goal.solver.builder
    before, segment, behind = goal.segment()
    normal, block = planar_normal(solver, segment), plane_block(goal)
    if normal is None or block is None:
        return False
    axes, motion = at_rest(solver, segment)
    frame = frame_about(solver, normal, axes[0])
    x, y = b.add(block[0][0], block[1][1]), b.sub(block[1][0], block[0][1])
    angle = _group_angle(goal, segment, normal, "heading", x, y, "turn in the plane of motion")
    rotation = space.compose(turned_about(solver, frame, angle), motion).rotation
    return _planar_goal(goal, segment, normal, rotation, before, motion, behind)


def _planar_goal(
    goal: Goal, segment: Segment, normal: Vector, rotation: Matrix, before: Rigid, motion: Rigid, behind: Rigid
) -> bool:
    """Place the last frame of a planar group so that the tool point is where it is wanted, in the plane."""
    space = goal.space
    p = space.moved(space.inverse(before), goal.position)
    p = _in_plane(goal, normal, p, space.moved(motion, behind.shift))
    shift = space.minus(p, space.times(rotation, behind.shift))
    space.named(shift, "last_frame", "last frame of the planar joints; m")
    return solve_planar3(goal.solver, segment, Rigid(rotation, shift), "in the plane")


def _yaw(goal: Goal) -> bool:
    """All turning axes vertical: the wanted heading of the tool's x axis is a turn about them."""
    space, solver, b = goal.space, goal.solver, goal.solver.builder
    before, segment, behind = goal.segment()
    normal = common_normal(solver, segment)
    if normal is None:
        return False
    up = space.times(before.rotation, normal)
    if not solver.oracle.vanishes(up[0], up[1]):
        return False
    _, motion = at_rest(solver, segment)
    start = space.column(space.compose(before, motion, behind).rotation, 0)
    if solver.oracle.vanishes(start[0], start[1]):
        return False
    r0, r1 = goal.rotation[0][0], goal.rotation[1][0]
    x = b.add(b.mul(start[0], r0), b.mul(start[1], r1))
    y = b.mul(up[2], b.sub(b.mul(start[0], r1), b.mul(start[1], r0)))
    angle = _group_angle(goal, segment, normal, "heading", x, y, "turn about the vertical axes")
    return _parallel_goal(goal, segment, normal, angle, before, motion, behind)


def _parallel_goal(
    goal: Goal, segment: Segment, normal: Vector, angle: Pair, before: Rigid, motion: Rigid, behind: Rigid
) -> bool:
    space, solver = goal.space, goal.solver
    axes, _ = at_rest(solver, segment)
    first = next(
        (axis for axis in (space.unit[0], space.unit[1]) if solver.oracle.vanishes(space.dot(axis, normal))), axes[0]
    )
    frame = frame_about(solver, normal, first)
    rotation = space.compose(turned_about(solver, frame, angle), motion).rotation
    p = space.moved(space.inverse(before), goal.position)
    shift = space.minus(p, space.times(rotation, behind.shift))
    return solve_parallel4(solver, segment, Rigid(rotation, shift), "along the parallel axes")


def _pitch_parallel(goal: Goal) -> bool:
    """All turning axes parallel: the wanted tool z axis, seen along them, is a turn about them."""
    solver = goal.solver
    before, segment, behind = goal.segment()
    normal = common_normal(solver, segment)
    if normal is None:
        return False
    _, motion = at_rest(solver, segment)
    angle = _angle_of_axis(goal, segment, normal, motion, behind, _tool_axis(goal, before))
    return angle is not None and _parallel_goal(goal, segment, normal, angle, before, motion, behind)


def _tool_axis(goal: Goal, before: Rigid) -> Vector:
    """The wanted tool z axis in the frame of the first unknown joint."""
    return goal.space.times(goal.space.transposed(before.rotation), goal.space.column(goal.rotation, 2))


def _angle_of_axis(
    goal: Goal, segment: Segment, normal: Vector, motion: Rigid, behind: Rigid, wanted: Vector
) -> Pair | None:
    """The turn about the normal that brings the tool's z axis, both seen along the normal, to the wanted one."""
    space, solver = goal.space, goal.solver
    start = space.times(motion.rotation, space.column(behind.rotation, 2))
    seen = space.cross(normal, start)
    if solver.oracle.vanishes(*seen):
        return None
    x = space.dot(space.cross(normal, wanted), seen)
    y = space.dot(normal, space.cross(start, wanted))
    return _group_angle(goal, segment, normal, "pitch", x, y, "angle of the tool in the arm's own plane")


def _pitch(goal: Goal) -> bool:
    """One joint places the arm's plane, the other three move in it."""
    solver, space = goal.solver, goal.space
    before, whole, behind = goal.segment()
    for framed in orders(space, whole):
        group = framed.segment.part(1, 3)
        normal = planar_normal(solver, group)
        if normal is None:
            continue
        first, core = framed.segment.uses[0], framed.segment.cores[0].whole(space)
        lead = space.compose(before, framed.lead)
        trail = space.compose(framed.trail, behind)
        if _place_plane(goal, first, core, group, normal, lead, trail):
            return _move_in_plane(goal, first, core, group, normal, lead, trail)
    return False


def _place_plane(
    goal: Goal, first: Use, core: Rigid, group: Segment, normal: Vector, before: Rigid, behind: Rigid
) -> bool:
    """The first joint, from the tool point's height along the plane's normal, which the group cannot change."""
    space, solver, b = goal.space, goal.solver, goal.solver.builder
    _, motion = at_rest(solver, group)
    p = space.moved(space.inverse(before), goal.position)
    height = space.dot(normal, space.moved(motion, behind.shift))
    a = space.times(core.rotation, normal)
    target = b.sub(b.add(height, space.dot(a, core.shift)), b.mul(a[2], p[2]))
    note = "tool point: its distance from the arm's plane"
    if not first.turns:
        if solver.oracle.vanishes(a[2]):
            return False
        gap = b.sub(space.dot(a, space.minus(p, core.shift)), height)
        solver.slide(first, gap, a[2], note)
        return True
    cosine_part = b.add(b.mul(a[0], p[0]), b.mul(a[1], p[1]))
    sine_part = b.sub(b.mul(a[0], p[1]), b.mul(a[1], p[0]))
    if solver.oracle.vanishes(cosine_part, sine_part):
        return False
    solver.balance(first, Balance(cosine_part, sine_part, target, Least.LENGTH), note)
    return True


def _move_in_plane(
    goal: Goal, first: Use, core: Rigid, group: Segment, normal: Vector, before: Rigid, behind: Rigid
) -> bool:
    space, solver = goal.space, goal.solver
    placed = space.compose(before, solver.motion(first), core)
    _, motion = at_rest(solver, group)
    wanted = _tool_axis(goal, placed)
    angle = _angle_of_axis(goal, group, normal, motion, behind, wanted)
    if angle is None:
        return False
    axes, _ = at_rest(solver, group)
    frame = frame_about(solver, normal, axes[0])
    rotation = space.compose(turned_about(solver, frame, angle), motion).rotation
    return _planar_goal(goal, group, normal, rotation, placed, motion, behind)


def solver_of(derivation: Derivation) -> Solver:
    return derivation.goal.solver
