"""Two joints out of three: what the third cannot change.

A turning joint cannot change the height of a point along its axis nor the point's distance from a point on it; it cannot
change the tilt of a plane's normal nor the plane's distance from a point on it. A sliding joint cannot change the two
coordinates across it. So J1 K1 J2 u = p, with u known up to one outer joint, gives two equations

    a_k . J2 u = rhs_k        k = 1, 2

in the inner joint 2 and the outer joint 3 (Pieper 1968; Paul 1981). With Z = (J2 u)_xy both are linear in Z; they are
solved for Z, and |Z|^2 = |u_xy|^2 is the equation of the outer joint alone. Where one of them has no Z, or the two are
dependent, the outer joint comes from an equation of the first degree instead.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from codegen.geometry import Vector
from codegen.inverse.plan import Least
from codegen.inverse.polynomial import Algebra, Poly, PolyVector
from codegen.inverse.segment import Core, Use
from codegen.inverse.solver import Balance, Solver
from codegen.program import Node


@dataclass(frozen=True, slots=True)
class Equation:
    """a . (inner joint moved) u = rhs."""

    a: Vector
    rhs: Poly
    least: Least


@dataclass(frozen=True, slots=True)
class Outer:
    """The equation `poly` = 0 of the outer joint alone, and what it costs to solve."""

    poly: Poly
    least: Least
    score: int
    kind: str
    det: Node | None = None  # of the two equations in Z: by it the polynomial was multiplied, squared
    distance: bool = False  # the equation is the distance from a point that the joints before it cannot change


def point_equations(
    solver: Solver, first: Use, core: Core, u_square: Poly, p: Vector, algebra: Algebra
) -> list[Equation]:
    """What joint `first` cannot change in  first . core . J2 u = p.  `core.before` is already moved into p."""
    space, b = solver.space, solver.builder
    turn, shift = core.middle.rotation, core.middle.shift
    back_shift = space.negative(space.inverse(core.middle).shift)  # the shift in the frame behind the core
    if not first.turns:
        return [
            Equation(turn[k], algebra.constant(b.sub(p[k], shift[k])), Least.LENGTH) for k in (0, 1)
        ]
    height = Equation(turn[2], algebra.constant(b.sub(p[2], shift[2])), Least.LENGTH)
    shortest = min((shift, back_shift), key=lambda v: sum(node.serial for node in v))
    known = b.sub(space.dot(p, p), space.dot(shortest, shortest))
    half = b.half(b.integer(1))
    rhs = algebra.scale(algebra.sub(algebra.constant(known), u_square), half)
    return [height, Equation(back_shift, rhs, Least.AREA)]


def plane_equations(
    solver: Solver, first: Use, core: Core, n: PolyVector, k: Poly, goal: tuple[Vector, Node], algebra: Algebra
) -> list[Equation]:
    """The same for a plane n . x = k that joint `first` takes to the goal plane; n is a unit vector."""
    space = solver.space
    turn = core.middle.rotation
    back_shift = space.negative(space.inverse(core.middle).shift)
    tilt = Equation(turn[2], algebra.constant(goal[0][2]), Least.ANGLE)
    distance = Equation(back_shift, algebra.sub(algebra.constant(goal[1]), k), Least.LENGTH)
    return [tilt, distance]


def reduced_rhs(solver: Solver, equation: Equation, u: PolyVector, algebra: Algebra) -> Poly:
    """rhs - a_z u_z: what is left for Z, as the inner joint turns."""
    return algebra.sub(equation.rhs, algebra.scale(u[2], equation.a[2]))


def outer_equation(solver: Solver, equations: list[Equation], u: PolyVector, algebra: Algebra, inner: Use) -> Outer | None:
    """The equation of the outer joint alone, of the lowest degree."""
    if inner.turns:
        return _outer_under_turn(solver, equations, u, algebra)
    return _outer_under_slide(solver, equations, u, algebra)


def _outer_under_turn(solver: Solver, equations: list[Equation], u: PolyVector, algebra: Algebra) -> Outer | None:
    b, oracle = solver.builder, solver.oracle
    first, second = equations
    left, right = (reduced_rhs(solver, e, u, algebra) for e in equations)
    empty = [oracle.vanishes(e.a[0], e.a[1]) for e in equations]
    if all(empty):
        return None
    if empty[0]:
        return _graded(solver, left, first.least, algebra)
    if empty[1]:
        found = _graded(solver, right, second.least, algebra)
        return found and replace(found, distance=second.least is Least.AREA)
    det = b.sub(b.mul(first.a[0], second.a[1]), b.mul(first.a[1], second.a[0]))
    if oracle.vanishes(det):
        k = 0 if not oracle.vanishes(first.a[0]) else 1
        mixed = algebra.sub(algebra.scale(right, first.a[k]), algebra.scale(left, second.a[k]))
        return _graded(solver, mixed, Least.AREA, algebra)
    z_x = algebra.sub(algebra.scale(left, second.a[1]), algebra.scale(right, first.a[1]))
    z_y = algebra.sub(algebra.scale(right, first.a[0]), algebra.scale(left, second.a[0]))
    z_square = algebra.add(algebra.mul(z_x, z_x), algebra.mul(z_y, z_y))
    radius = algebra.add(algebra.mul(u[0], u[0]), algebra.mul(u[1], u[1]))
    found = _graded(solver, algebra.sub(z_square, algebra.scale(radius, b.square(det))), Least.AREA, algebra)
    return found and replace(found, det=det)


def _outer_under_slide(solver: Solver, equations: list[Equation], u: PolyVector, algebra: Algebra) -> Outer | None:
    """The inner joint slides by d: a . (u + d z) = rhs for the linear equations; the squared distance has d^2 too."""
    first, second = equations
    oracle = solver.oracle
    left = algebra.sub(first.rhs, algebra.dot(first.a, u))
    linear = second.least is Least.LENGTH  # both come from a sliding first joint
    if oracle.vanishes(first.a[2]):
        return _graded(solver, left, first.least, algebra)
    if linear:
        right = algebra.sub(second.rhs, algebra.dot(second.a, u))
        mixed = algebra.sub(algebra.scale(right, first.a[2]), algebra.scale(left, second.a[2]))
        return _graded(solver, mixed, Least.LENGTH, algebra)
    # d = left / a_z in  d^2 + 2 d (u_z + b_z) = 2 (rhs - b . u), with rhs already holding -|u|^2 / 2
    two = solver.builder.integer(2)
    a_z = first.a[2]
    rest = algebra.sub(second.rhs, algebra.dot(second.a, u))
    along = algebra.add(u[2], algebra.constant(second.a[2]))
    poly = algebra.sub(
        algebra.add(algebra.mul(left, left), algebra.scale(algebra.mul(left, along), solver.builder.mul(two, a_z))),
        algebra.scale(rest, solver.builder.mul(two, solver.builder.square(a_z))),
    )
    return _graded(solver, poly, Least.AREA, algebra)


def _graded(solver: Solver, poly: Poly, least: Least, algebra: Algebra) -> Outer | None:
    """Drop coefficients that vanish whatever the pose, and say which form solves what is left."""
    poly = algebra.poly({m: n for m, n in poly.terms if not solver.oracle.vanishes(n)})
    if poly.degree == 0:
        return None
    constant = all(n.is_constant for (i, j), n in poly.terms if i + j > 0)
    if algebra.turns:
        if poly.degree == 1:
            return Outer(poly, least, 2 if constant else 3, "balance")
        return Outer(poly, least, 20, "quartic") if poly.degree == 2 else None
    if poly.degree == 1:
        return Outer(poly, least, 1, "slide")
    if poly.degree == 2:
        return Outer(poly, least, 4, "slide roots")
    return Outer(poly, least, 22, "quartic") if poly.degree <= 4 else None


def solve_outer(solver: Solver, use: Use, outer: Outer, note: str, square: Node | None = None) -> None:
    """Solve the equation of the outer joint alone; `square` is its discriminant where a better form of it is known."""
    b, zero, poly = solver.builder, solver.space.zero, outer.poly
    # The polynomial was made with the motion's own sign folded in, so it speaks of the joint itself.
    own = Use(use.joint)
    if outer.kind == "balance":
        equation = Balance(
            poly.coefficient((1, 0), zero),
            poly.coefficient((0, 1), zero),
            b.neg(poly.coefficient((0, 0), zero)),
            outer.least,
        )
        if square is not None and not equation.fixed:
            equation = replace(equation, square=square)
        solver.balance(own, equation, note)
    elif outer.kind == "slide":
        solver.slide(own, b.neg(poly.coefficient((0, 0), zero)), poly.coefficient((1, 0), zero), note)
    elif outer.kind == "slide roots":
        lead = poly.coefficient((2, 0), zero)
        middle = b.neg(b.half(b.div(poly.coefficient((1, 0), zero), lead)))
        flat = b.square(middle)
        square = b.sub(flat, b.div(poly.coefficient((0, 0), zero), lead))
        solver.slide_roots(own, middle, square, flat, note)
    else:
        solver.quartic(own, poly, note)


def solved_for_z(solver: Solver, equations: tuple[Equation, Equation], left: Node, right: Node) -> tuple[Node, Node]:
    """A positive multiple of Z with a_1 . Z = left, a_2 . Z = right."""
    b = solver.builder
    one, two = (equation.a for equation in equations)
    det = b.sub(b.mul(one[0], two[1]), b.mul(one[1], two[0]))
    z_x = b.sub(b.mul(left, two[1]), b.mul(right, one[1]))
    z_y = b.sub(b.mul(right, one[0]), b.mul(left, two[0]))
    if det.is_constant:
        return b.div(z_x, det), b.div(z_y, det)
    return b.mul(z_x, det), b.mul(z_y, det)


def square_by_radius(solver: Solver, a: Vector, u: Vector, goal: Vector) -> Node:
    """A^2 + B^2 - C^2 of  a . R u = goal_z, where the two axes meet, so that |u| = |goal|.

    With x the angle between the axes it is also (sin(x) |goal_xy|)^2 - (u_z - cos(x) goal_z)^2. Near the first axis the
    terms of this form are small, near the second axis those of A^2 + B^2 - C^2: the smaller ones keep their digits.
    """
    b = solver.builder
    sine_squared = b.add(b.square(a[0]), b.square(a[1]))
    first = b.mul(sine_squared, b.add(b.square(goal[0]), b.square(goal[1])))
    by_first = b.sub(first, b.square(b.sub(u[2], b.mul(a[2], goal[2]))))
    second = b.mul(sine_squared, b.add(b.square(u[0]), b.square(u[1])))
    if second.is_constant:
        return by_first
    by_second = b.sub(second, b.square(b.sub(goal[2], b.mul(a[2], u[2]))))
    return b.choice(b.sub(second, first), by_first, by_second)
