"""Two or three unknown joints that must bring one point to another: J1 K1 J2 [K2 J3] w = p."""

from __future__ import annotations

from dataclasses import dataclass, replace

from codegen.geometry import Pair, Vector
from codegen.inverse.commuting import orders
from codegen.inverse.elimination import (
    Equation,
    Outer,
    outer_equation,
    point_equations,
    solve_outer,
    solved_for_z,
    square_by_radius,
)
from codegen.inverse.plan import Least
from codegen.inverse.polish import FirstAxis, Pairing, polish
from codegen.inverse.polynomial import Algebra, Poly, PolyVector
from codegen.inverse.segment import Core, Segment, Use
from codegen.inverse.solver import Balance, Solver
from codegen.program import Node


@dataclass(frozen=True, slots=True)
class PointProblem:
    """segment . w = p: find the joints of the segment."""

    segment: Segment
    w: Vector
    p: Vector

    def reversed(self, solver: Solver) -> PointProblem:
        return PointProblem(self.segment.reversed(solver.space), self.p, self.w)


@dataclass(frozen=True, slots=True)
class Elimination:
    """One way to solve a three-joint point problem: joint 1 eliminated, joint 3 first, then 2, then 1."""

    problem: PointProblem
    source: Carried
    p: Vector
    equations: list[Equation]
    outer: Outer

    def square(self, solver: Solver) -> Node | None:
        """The discriminant of a distance equation as that of a triangle, which keeps its digits where it is flat."""
        if not self.outer.distance:
            return None
        b, space = solver.builder, solver.space
        first, second = self.source.sides
        rise = b.add(first[2], second[2])
        across = b.sub(space.dot(self.p, self.p), b.square(rise))
        return _flat_triangle(solver, _square_xy(solver, first), _square_xy(solver, second), across)


@dataclass(frozen=True, slots=True)
class Carried:
    """u of J1 K1 J2 u = p and |u|^2, as polynomials in joint 3; the slides of K1 along axis 2 are in them."""

    u: PolyVector
    square: Poly
    algebra: Algebra
    sides: tuple[Vector, Vector]  # seen along axis 3: from the axis to joint 2's point, and to the point carried


def carried(solver: Solver, segment: Segment, w: Vector) -> Carried:
    space, b = solver.space, solver.builder
    first, second = segment.cores
    use, middle = segment.uses[2], segment.cores[1].middle
    algebra = Algebra(b, use.turns)
    x = algebra.plus(algebra.moved_by_joint(w, use.sign), space.along_z(second.behind))
    along = b.add(second.before, first.behind)
    shift = space.plus(middle.shift, space.along_z(along))
    u = algebra.plus(algebra.times(middle.rotation, x), shift)
    # |R x + t|^2 = |x|^2 + 2 x . R^T t + |t|^2, and a turn does not change |x|^2
    back = space.negative(space.inverse(middle).shift)
    back = space.plus(back, space.scaled(middle.rotation[2], along))
    start = space.plus(w, space.along_z(second.behind))
    x_square = algebra.constant(space.dot(start, start))
    if not use.turns:
        x_square = algebra.add(*(algebra.mul(entry, entry) for entry in x))
    doubled = algebra.scale(algebra.dot(back, x), b.integer(2))
    square = algebra.add(x_square, doubled, algebra.constant(space.dot(back, back)))
    return Carried(u, square, algebra, (back, start))


def eliminations(solver: Solver, problem: PointProblem) -> list[Elimination]:
    """Every workable order, cheapest first."""
    ways = []
    for way in readings(solver, problem):
        source = carried(solver, way.segment, way.w)
        u, algebra = source.u, source.algebra
        first, core = way.segment.uses[0], way.segment.cores[0]
        p = solver.space.minus(way.p, solver.space.along_z(core.before))
        equations = point_equations(solver, first, core, source.square, p, algebra)
        outer = outer_equation(solver, equations, u, algebra, way.segment.uses[1])
        if outer is not None:
            ways.append(Elimination(way, source, p, equations, outer))
    return sorted(ways, key=lambda way: way.outer.score)


def readings(solver: Solver, problem: PointProblem) -> list[PointProblem]:
    """The problem in every order that commuting joints allow, each from both ends."""
    space = solver.space
    found = []
    for framed in orders(space, problem.segment):
        w = space.moved(framed.trail, problem.w)
        p = space.moved(space.inverse(framed.lead), problem.p)
        forward = PointProblem(framed.segment, w, p)
        found += [forward, forward.reversed(solver)]
    return found


def solve_point3(solver: Solver, problem: PointProblem, what: str) -> bool:
    """Three joints; False when no elimination leaves a solvable equation."""
    solver.heading(what)
    ways = eliminations(solver, problem)
    if not ways:
        return False
    way = ways[0]
    segment = way.problem.segment
    outer_use = segment.uses[2]
    note = f"{what}: {_what_is_left(solver, segment)}"
    solve_outer(solver, outer_use, way.outer, note, way.square(solver))
    if way.outer.kind == "quartic":
        axis = FirstAxis(segment.cores[0].middle, way.p)
        pairing = Pairing(segment.uses[1], outer_use, way.equations, way.source.u, way.outer.det, axis)
        polish(solver, pairing, what)
        _last_joint(solver, _without_last(solver, way.problem), what)
        return True
    return solve_point2(solver, _without_last(solver, way.problem), what)


def _what_is_left(solver: Solver, segment: Segment) -> str:
    first, inner, outer = (solver.label(use.joint.index) for use in segment.uses)
    return f"what {first} cannot change, without {inner}, leaves {outer}"


def _without_last(solver: Solver, problem: PointProblem) -> PointProblem:
    """The two-joint problem once the last joint is known."""
    space, segment = solver.space, problem.segment
    w = space.moved(solver.motion(segment.uses[-1]), problem.w)
    w = space.moved(segment.cores[-1].whole(space), w)
    space.named(w, f"point_past_{solver.label(segment.uses[-1].joint.index)}")
    return PointProblem(segment.part(0, 2), w, problem.p)


def solve_point2(solver: Solver, problem: PointProblem, what: str) -> bool:
    """Two joints: one of them alone from what the other cannot change, then the other."""
    solver.heading(what)
    space = solver.space
    solver.builder.named(space.dot(problem.p, problem.p), "distance_squared")
    solver.builder.named(space.dot(problem.w, problem.w), "length_squared")
    ways = [_second_joint(solver, problem), _second_joint(solver, problem.reversed(solver))]
    found = [way for way in ways if way is not None]
    if not found:
        return False
    best = min(found, key=lambda way: way.score)
    best.solve(solver, what)
    _last_joint(solver, best.problem, what)
    return True


@dataclass(frozen=True, slots=True)
class SecondJoint:
    """How the inner joint of a two-joint problem is found."""

    problem: PointProblem
    u: Vector
    equations: tuple[Equation, Equation]
    kind: str
    which: int
    score: int

    def solve(self, solver: Solver, what: str) -> None:
        use = self.problem.segment.uses[1]
        note = f"{what}: {solver.label(use.joint.index)}"
        equation = self.equations[self.which]
        if self.kind == "balance":
            solver.balance(use, self._kept_balance(solver, equation), note)
        elif self.kind == "direction":
            _from_both(solver, use, self.equations, self.u, note)
        elif self.kind == "slide":
            rest = solver.builder.sub(_rhs(solver, equation), solver.space.dot(equation.a, self.u))
            solver.slide(use, rest, equation.a[2], note)
        else:
            _slide_roots(solver, self.problem, self.u, note)


    def _kept_balance(self, solver: Solver, equation: Equation) -> Balance:
        """The equation, with its discriminant in the form that keeps its digits."""
        balance = _balance(solver, equation, self.u)
        _, p, core, first = _inner_data(solver, self.problem)
        if not first.turns:
            return balance
        if self.which == 0 and solver.oracle.vanishes(*core.middle.shift):
            return replace(balance, square=square_by_radius(solver, equation.a, self.u, p), exact=True)
        if self.which == 1 and _parallel_axes(core) and not balance.fixed:
            return replace(balance, square=_triangle_square(solver, core.middle.shift, self.u, p))
        return balance


def _parallel_axes(core: Core) -> bool:
    row = core.middle.rotation[2]
    return row[0].is_exactly(0) and row[1].is_exactly(0)


def _triangle_square(solver: Solver, t: Vector, u: Vector, p: Vector) -> Node:
    """A^2 + B^2 - C^2 of parallel axes: the two links and the distance, seen along the axes."""
    return _flat_triangle(solver, _square_xy(solver, t), _square_xy(solver, u), _square_xy(solver, p))


def _flat_triangle(solver: Solver, first: Node, second: Node, across: Node) -> Node:
    """(a b)^2 - C^2 of a triangle with the squares of its sides a, b and c, by its factors (Heron): it keeps its digits
    where the triangle is flat."""
    b = solver.builder
    a_side, b_side = b.sqrt(first), b.sqrt(second)
    stretched = b.sub(b.square(b.add(a_side, b_side)), across)
    folded = b.sub(across, b.square(b.sub(a_side, b_side)))
    return b.mul(b.half(stretched), b.half(folded))


def _square_xy(solver: Solver, v: Vector) -> Node:
    return solver.builder.add(solver.builder.square(v[0]), solver.builder.square(v[1]))


def _rhs(solver: Solver, equation: Equation) -> Node:
    return equation.rhs.coefficient((0, 0), solver.space.zero)


def _inner_data(solver: Solver, problem: PointProblem) -> tuple[Vector, Vector, Core, Use]:
    """(u, p, core, first): the slides along both axes moved out of the core."""
    space = solver.space
    core, first = problem.segment.cores[0], problem.segment.uses[0]
    u = space.plus(problem.w, space.along_z(core.behind))
    p = space.minus(problem.p, space.along_z(core.before))
    return u, p, core, first


def _second_joint(solver: Solver, problem: PointProblem) -> SecondJoint | None:
    u, p, core, first = _inner_data(solver, problem)
    inner = problem.segment.uses[1]
    algebra = Algebra(solver.builder, inner.turns)
    one, two = point_equations(solver, first, core, algebra.constant(solver.space.dot(u, u)), p, algebra)
    if first.turns and _parallel_axes(core):
        two = _distance_across(solver, core, u, p, algebra)
    found = _turning_kind(solver, (one, two), u) if inner.turns else _sliding_kind(solver, (one, two))
    return None if found is None else SecondJoint(problem, u, (one, two), *found)


def _distance_across(solver: Solver, core: Core, u: Vector, p: Vector, algebra: Algebra) -> Equation:
    """Parallel axes: the distance from the first axis, without the heights, which are equal and would only cost digits."""
    b, zero = solver.builder, solver.space.zero
    back = solver.space.negative(solver.space.inverse(core.middle).shift)
    known = b.sub(b.sub(_square_xy(solver, p), _square_xy(solver, core.middle.shift)), _square_xy(solver, u))
    return Equation((back[0], back[1], zero), algebra.constant(b.half(known)), Least.AREA)


def _turning_kind(solver: Solver, equations: tuple[Equation, Equation], u: Vector) -> tuple[str, int, int] | None:
    oracle, b = solver.oracle, solver.builder
    balances = [_balance(solver, equation, u) for equation in equations]
    there = [not oracle.vanishes(balance.cosine_part, balance.sine_part) for balance in balances]
    if not any(there):
        return None
    if all(there):
        one, two = equations
        if not oracle.vanishes(b.sub(b.mul(one.a[0], two.a[1]), b.mul(one.a[1], two.a[0]))):
            return ("direction", 0, 5)
    which = min((k for k in (0, 1) if there[k]), key=lambda k: not balances[k].fixed)
    return ("balance", which, 2 if balances[which].fixed else 6)


def _sliding_kind(solver: Solver, equations: tuple[Equation, Equation]) -> tuple[str, int, int] | None:
    linear = [
        k for k, e in enumerate(equations) if e.least is Least.LENGTH and not solver.oracle.vanishes(e.a[2])
    ]
    if linear:
        which = min(linear, key=lambda k: not equations[k].a[2].is_constant)
        return ("slide", which, 1 if equations[which].a[2].is_constant else 7)
    return ("slide roots", 1, 4) if equations[1].least is Least.AREA else None


def _balance(solver: Solver, equation: Equation, u: Vector) -> Balance:
    """a . R u = rhs as A c + B s = C."""
    b, a = solver.builder, equation.a
    cosine_part = b.add(b.mul(a[0], u[0]), b.mul(a[1], u[1]))
    sine_part = b.sub(b.mul(a[1], u[0]), b.mul(a[0], u[1]))
    return Balance(cosine_part, sine_part, b.sub(_rhs(solver, equation), b.mul(a[2], u[2])), equation.least)


def _from_both(solver: Solver, use: Use, equations: tuple[Equation, Equation], u: Vector, note: str) -> Pair:
    """The inner turning joint from two independent linear equations."""
    b = solver.builder
    left, right = (b.sub(_rhs(solver, e), b.mul(e.a[2], u[2])) for e in equations)
    z_x, z_y = solved_for_z(solver, equations, left, right)
    return solver.turn_onto(use, u, (z_x, z_y, u[2]), Least.NOTHING, note)


def _slide_roots(solver: Solver, problem: PointProblem, u: Vector, note: str) -> None:
    """A slide across the axis of a turning joint: the point keeps its distance from the axis."""
    space, b = solver.space, solver.builder
    u, p, core, _ = _inner_data(solver, problem)
    along = space.column(core.middle.rotation, 2)
    across = space.cross(space.unit[2], along)
    start = space.moved(core.middle, u)
    missed = space.dot(across, start)
    flat = b.square(missed)
    square = b.sub(b.add(b.square(p[0]), b.square(p[1])), flat)
    solver.slide_roots(problem.segment.uses[1], b.neg(space.dot(along, start)), square, flat, note)


def _last_joint(solver: Solver, problem: PointProblem, what: str) -> None:
    """The first joint of the segment, once everything behind it is known."""
    space = solver.space
    first, inner = problem.segment.uses
    name = solver.label(first.joint.index)
    y = space.moved(problem.segment.cores[0].whole(space), space.moved(solver.motion(inner), problem.w))
    space.named(y, f"{name}_from", f"{what}, before {name} moves it")
    if first.turns:
        solver.turn_onto(first, y, problem.p, Least.LENGTH_SQUARED, f"{what}: {name} turns it to its place")
    else:
        solver.slide(first, solver.builder.sub(problem.p[2], y[2]), space.one, f"{what}: {name} slides it to its place")
