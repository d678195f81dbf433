"""Three unknown joints that must bring one plane to another: what is left of a pose once a planar group is set aside.

A plane is a unit normal and an offset; turning joints cannot change its tilt against their axis nor its distance from a
point on it. The elimination is the one of the point problem with these two invariants.
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Vector
from codegen.inverse.elimination import Equation, Outer, outer_equation, plane_equations, solve_outer, solved_for_z
from codegen.inverse.groups import Plane, moved_plane
from codegen.inverse.orientation import DirectionProblem, solve_direction2
from codegen.inverse.plan import Least
from codegen.inverse.planar import axes_now
from codegen.inverse.polish import Pairing, polish
from codegen.inverse.polynomial import Algebra, Poly, PolyVector
from codegen.inverse.segment import Segment, core_of
from codegen.inverse.solver import Balance, Solver
from codegen.program import Node


@dataclass(frozen=True, slots=True)
class PlaneProblem:
    """segment . source = goal."""

    segment: Segment
    source: Plane
    goal: Plane

    def reversed(self, solver: Solver) -> PlaneProblem:
        return PlaneProblem(self.segment.reversed(solver.space), self.goal, self.source)


@dataclass(frozen=True, slots=True)
class PlaneElimination:
    problem: PlaneProblem
    normal: PolyVector
    equations: list[Equation]
    outer: Outer


def solve_plane3(solver: Solver, problem: PlaneProblem, what: str) -> bool:
    """Three joints that bring a plane to its place."""
    solver.heading(what)
    if all(use.turns for use in problem.segment.uses):
        return _three_turns(solver, problem, what)
    if sum(use.turns for use in problem.segment.uses) == 2:
        return _turns_then_slide(solver, problem, what)
    return False


def _turns_then_slide(solver: Solver, problem: PlaneProblem, what: str) -> bool:
    """A slide does not change the normal: two turns give it, then the offset is linear in the slide."""
    space, b = solver.space, solver.builder
    segment = problem.segment
    k = next(i for i, use in enumerate(segment.uses) if not use.turns)
    turns, n, v = _normals_without_slide(solver, problem, k)
    if not solve_direction2(solver, DirectionProblem(turns, n, v), what):
        return False
    axes, rest = axes_now(solver, segment)
    start = moved_plane(solver, rest, problem.source)
    slope = space.dot(problem.goal.normal, axes[k])
    if solver.oracle.vanishes(slope):
        return False
    solver.slide(segment.uses[k], b.sub(problem.goal.offset, start.offset), slope, f"{what}: the plane's distance")
    return True


def _normals_without_slide(solver: Solver, problem: PlaneProblem, k: int) -> tuple[Segment, Vector, Vector]:
    """The two turning joints with the slide's cores joined, and the normals at either end."""
    space, segment = solver.space, problem.segment
    n, v = problem.source.normal, problem.goal.normal
    cores = [core.whole(space) for core in segment.cores]
    if k == 0:
        v = space.times(space.transposed(cores[0].rotation), v)
        cores = cores[1:]
    elif k == 2:
        n = space.times(cores[1].rotation, n)
        cores = cores[:1]
    else:
        cores = [space.compose(cores[0], cores[1])]
    uses = segment.uses[:k] + segment.uses[k + 1 :]
    return Segment(uses, tuple(core_of(space, core) for core in cores)), n, v


def _eliminations(solver: Solver, problem: PlaneProblem) -> list[PlaneElimination]:
    ways = []
    for way in (problem, problem.reversed(solver)):
        normal, offset, goal, algebra = _carried(solver, way)
        first, core = way.segment.uses[0], way.segment.cores[0]
        equations = plane_equations(solver, first, core, normal, offset, (goal.normal, goal.offset), algebra)
        outer = outer_equation(solver, equations, normal, algebra, way.segment.uses[1])
        if outer is not None:
            ways.append(PlaneElimination(way, normal, equations, outer))
    return sorted(ways, key=lambda way: way.outer.score)


def _carried(solver: Solver, problem: PlaneProblem) -> tuple[PolyVector, Poly, Plane, Algebra]:
    """The plane behind joint 2 as polynomials in joint 3, and the goal with the slide along axis 1 taken out."""
    space, b = solver.space, solver.builder
    first, second = problem.segment.cores
    use = problem.segment.uses[2]
    algebra = Algebra(b, turns=True)
    turned = algebra.moved_by_joint(problem.source.normal, use.sign)
    behind = b.add(problem.source.offset, b.mul(second.behind, problem.source.normal[2]))
    normal = algebra.times(second.middle.rotation, turned)
    if second.middle.undone is None:
        along_shift = algebra.dot(second.middle.shift, normal)
    else:  # the same product in the other frame, where the shift is known as it was given
        along_shift = algebra.dot(space.negative(second.middle.undone.shift), turned)
    offset = algebra.add(algebra.constant(behind), along_shift)
    along = b.add(second.before, first.behind)
    offset = algebra.add(offset, algebra.scale(normal[2], along))
    goal = problem.goal
    moved = b.sub(goal.offset, b.mul(first.before, goal.normal[2]))
    return normal, offset, Plane(goal.normal, moved), algebra


def _three_turns(solver: Solver, problem: PlaneProblem, what: str) -> bool:
    ways = _eliminations(solver, problem)
    if not ways:
        return False
    way = ways[0]
    segment = way.problem.segment
    solve_outer(solver, segment.uses[2], way.outer, f"{what}: {solver.label(segment.uses[2].joint.index)} alone")
    if way.outer.kind == "quartic":
        pairing = Pairing(segment.uses[1], segment.uses[2], way.equations, way.normal, way.outer.det, None)
        polish(solver, pairing, what)
    return _two_turns(solver, way, what)


def _two_turns(solver: Solver, way: PlaneElimination, what: str) -> bool:
    """The other two: both invariants together give one root, the tilt alone gives two."""
    space, b = solver.space, solver.builder
    segment = way.problem.segment
    inner = segment.uses[1]
    plane = moved_plane(solver, solver.motion(segment.uses[2]), way.problem.source)
    plane = moved_plane(solver, segment.cores[1].whole(space), plane)
    if inner.joint.index not in solver.pairs:
        det = b.sub(
            b.mul(way.equations[0].a[0], way.equations[1].a[1]), b.mul(way.equations[0].a[1], way.equations[1].a[0])
        )
        if solver.oracle.vanishes(det):
            problem = DirectionProblem(segment.part(0, 2), plane.normal, way.problem.goal.normal)
            if solve_direction2(solver, problem, what):
                return True
            if not _inner_from_offset(solver, way, plane, what):
                return False
        else:
            _inner_from_both(solver, way, plane, what)
    normal = space.times(solver.motion(inner).rotation, plane.normal)
    normal = space.times(segment.cores[0].middle.rotation, normal)
    solver.turn_onto(segment.uses[0], normal, way.problem.goal.normal, Least.ANGLE_SQUARED, what)
    if way.outer.kind == "quartic":
        solver.start_at_seed_below(Least.ANGLE)
    return True


def _inner_equations(solver: Solver, way: PlaneElimination, plane: Plane) -> tuple[list[Equation], list[Node]]:
    """What the first joint cannot change, with the plane before it known but for the inner joint; and what is left of the
    right sides as that one turns."""
    space, b = solver.space, solver.builder
    first, core = way.problem.segment.uses[0], way.problem.segment.cores[0]
    algebra = Algebra(b, turns=True)
    offset = b.add(plane.offset, b.mul(core.behind, plane.normal[2]))
    goal = way.problem.goal
    moved = b.sub(goal.offset, b.mul(core.before, goal.normal[2]))
    constant = (
        algebra.constant(plane.normal[0]),
        algebra.constant(plane.normal[1]),
        algebra.constant(plane.normal[2]),
    )
    equations = plane_equations(
        solver, first, core, constant, algebra.constant(offset), (goal.normal, moved), algebra
    )
    rhs = [b.sub(e.rhs.coefficient((0, 0), space.zero), b.mul(e.a[2], plane.normal[2])) for e in equations]
    return equations, rhs


def _inner_from_both(solver: Solver, way: PlaneElimination, plane: Plane, what: str) -> None:
    equations, rhs = _inner_equations(solver, way, plane)
    z_x, z_y = solved_for_z(solver, (equations[0], equations[1]), rhs[0], rhs[1])
    solver.turn_onto(way.problem.segment.uses[1], plane.normal, (z_x, z_y, plane.normal[2]), Least.NOTHING, what)


def _inner_from_offset(solver: Solver, way: PlaneElimination, plane: Plane, what: str) -> bool:
    """Parallel axes: the tilt says nothing of the inner joint, the plane's distance alone gives it, two roots."""
    equations, rhs = _inner_equations(solver, way, plane)
    b, a, n = solver.builder, equations[1].a, plane.normal
    cosine_part = b.add(b.mul(a[0], n[0]), b.mul(a[1], n[1]))
    sine_part = b.sub(b.mul(a[1], n[0]), b.mul(a[0], n[1]))
    if solver.oracle.vanishes(cosine_part, sine_part):
        return False
    inner = way.problem.segment.uses[1]
    note = f"{what}: {solver.label(inner.joint.index)} by the distance of the plane"
    solver.balance(inner, Balance(cosine_part, sine_part, rhs[1], Least.LENGTH), note)
    return True
