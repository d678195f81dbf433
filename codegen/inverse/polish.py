"""Roots of an elimination, polished on the two equations it came from: Newton steps in the inner and the outer joint.

Squaring and expanding costs digits; the two equations themselves do not have that loss. A distance from a point on the
first axis is polished as the distance from that axis, whose square is small where the axis is near.
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Pair, Rigid, Vector
from codegen.inverse.elimination import Equation, reduced_rhs, solved_for_z
from codegen.inverse.plan import Least, RefineStep, Variable
from codegen.inverse.polynomial import Algebra, Poly, PolyVector
from codegen.inverse.segment import Use
from codegen.inverse.solver import Solver
from codegen.program import Node


def value_at(solver: Solver, poly: Poly, where: Pair | Node) -> Node:
    """The polynomial at a pair (c, s) or a slide."""
    b = solver.builder
    return b.add(*(b.mul(k, _monomial(solver, m, where)) for m, k in poly.terms), b.integer(0))


def slope_at(solver: Solver, poly: Poly, where: Pair | Node) -> Node:
    """Its derivative by the angle or by the slide."""
    b = solver.builder
    terms = []
    for (i, j), k in poly.terms:
        angle_terms = [((i - 1, j + 1), -i), ((i + 1, j - 1), j)]
        lowered = angle_terms if isinstance(where, Pair) else [((i - 1, j), i)]
        for monomial, factor in lowered:
            if factor:
                terms.append(b.mul(b.mul(b.integer(factor), k), _monomial(solver, monomial, where)))
    return b.add(*terms, b.integer(0))


def _monomial(solver: Solver, monomial: tuple[int, int], where: Pair | Node) -> Node:
    b, product = solver.builder, solver.builder.integer(1)
    bases = (where.cosine, where.sine) if isinstance(where, Pair) else (where, where)
    for base, power in zip(bases, monomial, strict=True):
        for _ in range(power):
            product = b.mul(product, base)
    return product


NEARLY_ALONG = "NEARLY_ALONG"  # squared sine of the angle between two lines


@dataclass(frozen=True, slots=True)
class FirstAxis:
    """What the first joint turns about z: points behind `core`, which must come as far from the axis as `p` is."""

    core: Rigid
    p: Vector


@dataclass(frozen=True, slots=True)
class Pairing:
    """Two equations for an inner and an outer joint: a . (inner joint moved) u = rhs, u and rhs by the outer joint.

    det   of the two in the inner joint's pair; None where the outer joint's polynomial was not made by solving for it
    axis  what the distance equation among them measures from
    """

    inner: Use
    outer: Use
    equations: list[Equation]
    u: PolyVector
    det: Node | None
    axis: FirstAxis | None


def polish(solver: Solver, pairing: Pairing, what: str) -> None:
    """Find the inner joint from the unpolished outer one, then polish both together."""
    inner, outer = pairing.inner, pairing.outer
    side = _number_roots(solver, pairing)
    rough = _inner_from_outer(solver, pairing, side, what)
    outer_before = solver.pairs[outer.joint.index] if outer.turns else solver.slides[outer.joint.index]
    variables = (
        _variable(solver, inner, rough),
        _variable(solver, outer, outer_before),
    )
    residuals, slopes = _newton(solver, pairing, (variables[0].during, variables[1].during))
    note = f"{what}: polish both roots on the two equations they came from"
    if side is not None and inner.sign < 0:
        side = solver.builder.neg(side)
    solver.refine(RefineStep(variables, residuals, slopes, note, _scales(solver, pairing), side))
    for use, variable in zip((inner, outer), variables, strict=True):
        if isinstance(variable.after, Pair):
            solver.pairs[use.joint.index] = variable.after
        else:
            solver.slides[use.joint.index] = variable.after


def _variable(solver: Solver, use: Use, before: Pair | Node) -> Variable:
    index = use.joint.index
    name = solver.label(index)
    if isinstance(before, Pair):
        return Variable(index, name, before, solver.new_pair(f"{name}_now"), solver.new_pair(name))
    return Variable(index, name, before, solver.new_slide(f"{name}_now"), solver.new_slide(name))


def _scales(solver: Solver, pairing: Pairing) -> tuple[Node, Node]:
    b = solver.builder
    reach_squared = b.square(_reach(solver))
    found = []
    for equation in pairing.equations:
        if equation.least is Least.AREA and pairing.axis is not None:
            p = pairing.axis.p
            found.append(b.mul(b.add(b.square(p[0]), b.square(p[1])), reach_squared))
        else:
            found.append(b.integer(1) if equation.least is Least.ANGLE else reach_squared)
    return found[0], found[1]


def _reach(solver: Solver) -> Node:
    return _tolerance(solver, "REACH")


def _tolerance(solver: Solver, name: str) -> Node:
    """A tolerance of the generated C."""
    value = solver.builder.input(name)
    solver.oracle.declare_real(value)
    return value


def _number_roots(solver: Solver, pairing: Pairing) -> Node | None:
    """Where the polynomial's slope is the Jacobian's determinant times `det`, the sign of the determinant is the number."""
    inner, outer = pairing.inner.joint, pairing.outer.joint
    if pairing.det is None or not (inner.turns and outer.turns):
        return None
    b = solver.builder
    known = (solver.known_pairs[inner.index], solver.known_pairs[outer.index])
    _, ((p, q), (r, s)) = _newton(solver, pairing, known)
    turned = b.mul(b.integer(pairing.inner.sign), b.sub(b.mul(p, s), b.mul(q, r)))  # by the inner joint as it is used
    return solver.number_by_jacobian(pairing.det, turned)


def _inner_from_outer(solver: Solver, pairing: Pairing, side: Node | None, what: str) -> Pair | Node:
    b, inner, outer = solver.builder, pairing.inner, pairing.outer
    where = solver.pairs[outer.joint.index] if outer.turns else solver.slides[outer.joint.index]
    algebra = Algebra(b, outer.turns)
    u, equations = pairing.u, pairing.equations
    known: Vector = (value_at(solver, u[0], where), value_at(solver, u[1], where), value_at(solver, u[2], where))
    note = f"{what}: {solver.label(inner.joint.index)}, not polished yet"
    if not inner.turns:
        first = equations[0]
        rest = b.sub(value_at(solver, first.rhs, where), solver.space.dot(first.a, known))
        solver.slide(inner, rest, first.a[2], note, settles=False)
        return solver.slides[inner.joint.index]
    reduced = [reduced_rhs(solver, e, u, algebra) for e in equations]
    left, right = (value_at(solver, poly, where) for poly in reduced)
    z_x, z_y = solved_for_z(solver, (equations[0], equations[1]), left, right)
    turned = b.add(b.square(known[0]), b.square(known[1]))
    if side is not None and pairing.det is not None and not pairing.det.is_constant:
        slopes = [slope_at(solver, poly, where) for poly in reduced]
        other = _by_one_equation(solver, equations, (left, right), slopes, turned, side)
        apart = _clearly_apart(solver, equations, pairing.det)
        z_x, z_y = b.choice(apart, z_x, other[0]), b.choice(apart, z_y, other[1])
    solver.turn_onto(inner, known, (z_x, z_y, known[2]), Least.NOTHING, note, settles=False)
    solver.start_at_seed_below(Least.ANGLE if equations[0].least is Least.ANGLE else Least.LENGTH)
    return solver.pairs[inner.joint.index]


def _across(solver: Solver, equation: Equation) -> Node:
    b = solver.builder
    return b.add(b.square(equation.a[0]), b.square(equation.a[1]))


def _clearly_apart(solver: Solver, equations: list[Equation], det: Node) -> Node:
    """Positive where the two equations, as lines in the plane of Z, cross clearly enough to be solved together.

    The first has the length of a unit vector's part, the second that of the arm: against these, not against their own
    lengths, their rounding counts.
    """
    b = solver.builder
    nearly_along = _tolerance(solver, NEARLY_ALONG)
    link = b.half(b.half(_reach(solver)))  # a length that lengths of this arm may have
    sizes = b.add(_across(solver, equations[1]), b.mul(b.square(link), _across(solver, equations[0])))
    return b.sub(b.square(det), b.mul(nearly_along, sizes))


def _by_one_equation(
    solver: Solver, equations: list[Equation], values: tuple[Node, Node], slopes: list[Node], turned: Node, side: Node
) -> tuple[Node, Node]:
    """A positive multiple of Z from the equation that says more; it has two roots, told apart by `side`.

    Where the two equations are nearly one, the outer joint's roots come in nearly equal pairs, which differ by Z alone:
    the sign of det(J) is that of (a x Z) (C_other' - k C'), with a_other = k a. At a fold that sign is rounding's: where one
    of the two fits the other equation far better, it is the one.
    """
    b = solver.builder
    first, second = equations
    across = b.sub(b.mul(first.a[0], second.a[0]), b.neg(b.mul(first.a[1], second.a[1])))  # their scalar product

    def solved(k: int, turn: int) -> tuple[Node, Node]:
        equation, value, own_slope, other_slope = equations[k], values[k], slopes[k], slopes[1 - k]
        size = _across(solver, equation)
        height = b.sqrt(b.sub(b.mul(size, turned), b.square(value)))
        bend = b.sub(b.mul(other_slope, size), b.mul(across, own_slope))
        sign = b.mul(b.integer(turn), side)
        a_x, a_y = equation.a[0], equation.a[1]
        by_side = b.choice(bend, sign, b.neg(sign))
        signed = b.mul(height, fitting(k, height, size, by_side))
        return b.sub(b.mul(a_x, value), b.mul(a_y, signed)), b.add(b.mul(a_y, value), b.mul(a_x, signed))

    def fitting(k: int, height: Node, size: Node, by_side: Node) -> Node:
        """The sign of the height with which the other equation, too, holds: what it misses by is base +- rise."""
        a, other = equations[k].a, equations[1 - k]
        base = b.sub(b.mul(across, values[k]), b.mul(values[1 - k], size))
        slant = b.sub(b.mul(a[0], other.a[1]), b.mul(a[1], other.a[0]))
        rise = b.size(b.mul(height, slant))
        one = b.integer(1)
        by_fit = b.choice(b.mul(base, slant), b.neg(one), one)
        far_better = b.sub(rise, b.mul(b.integer(8), b.size(b.sub(b.size(base), rise))))
        rough = b.mul(b.square(_tolerance(solver, "LEAST_ROUGH")), b.mul(b.square(size), b.mul(_across(solver, other), turned)))
        return b.choice(b.sub(b.square(rise), rough), b.choice(far_better, by_fit, by_side), by_side)

    by_first, by_second = solved(0, 1), solved(1, -1)
    enough = b.half(b.half(b.half(b.integer(1))))
    says_more = b.sub(_across(solver, first), b.square(enough))
    return b.choice(says_more, by_first[0], by_second[0]), b.choice(says_more, by_first[1], by_second[1])


def _newton(
    solver: Solver, pairing: Pairing, now: tuple[Pair | Node, Pair | Node]
) -> tuple[tuple[Node, Node], tuple[tuple[Node, Node], tuple[Node, Node]]]:
    """Residuals of the two equations and their slopes by the inner and the outer joint, at values of these."""
    moving = _carried(solver, pairing.inner, pairing.u, now)
    rows = []
    for equation in pairing.equations:
        if equation.least is Least.AREA and pairing.axis is not None:
            rows.append(_distance_row(solver, pairing.axis, moving))
        else:
            rows.append(_row(solver, equation, moving, now[1]))
    (r1, s1), (r2, s2) = rows
    return (r1, r2), (s1, s2)


@dataclass(frozen=True, slots=True)
class _Carried:
    """What the inner joint carries, at the values being polished, and its slopes by the inner and the outer joint."""

    value: Vector
    by_inner: Vector
    by_outer: Vector


def _carried(solver: Solver, inner: Use, u: PolyVector, where: tuple[Pair | Node, Pair | Node]) -> _Carried:
    space, b = solver.space, solver.builder
    now, outer_now = where
    here: Vector = (value_at(solver, u[0], outer_now), value_at(solver, u[1], outer_now), value_at(solver, u[2], outer_now))
    slope: Vector = (slope_at(solver, u[0], outer_now), slope_at(solver, u[1], outer_now), slope_at(solver, u[2], outer_now))
    sign = b.integer(inner.sign)
    if isinstance(now, Pair):
        turn = now if inner.sign > 0 else space.opposite(now)
        moved = space.spun(turn, here)
        return _Carried(moved, space.scaled(space.cross(space.unit[2], moved), sign), space.spun(turn, slope))
    moved = space.plus(here, space.along_z(b.mul(sign, now)))
    return _Carried(moved, space.along_z(sign), slope)


def _row(
    solver: Solver, equation: Equation, moving: _Carried, outer: Pair | Node
) -> tuple[Node, tuple[Node, Node]]:
    """One equation's residual and its slopes by the inner and the outer joint."""
    space, b = solver.space, solver.builder
    residual = b.add(space.dot(equation.a, moving.value), b.neg(value_at(solver, equation.rhs, outer)))
    by_outer = b.add(space.dot(equation.a, moving.by_outer), b.neg(slope_at(solver, equation.rhs, outer)))
    return residual, (space.dot(equation.a, moving.by_inner), by_outer)


def _distance_row(solver: Solver, axis: FirstAxis, moving: _Carried) -> tuple[Node, tuple[Node, Node]]:
    """(x^2 + y^2 - p_x^2 - p_y^2) / 2, and its slopes."""
    space, b = solver.space, solver.builder
    x, y, _ = space.moved(axis.core, moving.value)
    wanted = b.add(b.square(axis.p[0]), b.square(axis.p[1]))
    residual = b.half(b.sub(b.add(b.square(x), b.square(y)), wanted))
    slopes = []
    for change in (moving.by_inner, moving.by_outer):
        turned = space.times(axis.core.rotation, change)
        slopes.append(b.add(b.mul(x, turned[0]), b.mul(y, turned[1])))
    return residual, (slopes[0], slopes[1])
