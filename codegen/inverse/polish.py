"""Roots of an elimination, polished on the two equations it came from: Newton steps in the inner and the outer joint.

Squaring and expanding costs digits; the two equations themselves do not have that loss.
"""

from __future__ import annotations

from codegen.geometry import Pair, Vector
from codegen.inverse.elimination import Equation, reduced_rhs, solved_for_z
from codegen.inverse.plan import Least, Variable
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


def polish(
    solver: Solver, inner: Use, outer: Use, equations: list[Equation], u: PolyVector, what: str
) -> None:
    """Find the inner joint from the unpolished outer one, then polish both together."""
    rough = _inner_from_outer(solver, inner, outer, equations, u, what)
    outer_before = solver.pairs[outer.joint.index] if outer.turns else solver.slides[outer.joint.index]
    variables = (
        _variable(solver, inner, rough),
        _variable(solver, outer, outer_before),
    )
    residuals, slopes = _newton(solver, inner, equations, u, variables)
    solver.refine(variables, residuals, slopes, f"{what}: polish both roots on the two equations they came from")
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


def _inner_from_outer(
    solver: Solver, inner: Use, outer: Use, equations: list[Equation], u: PolyVector, what: str
) -> Pair | Node:
    b = solver.builder
    where = solver.pairs[outer.joint.index] if outer.turns else solver.slides[outer.joint.index]
    algebra = Algebra(b, outer.turns)
    known: Vector = (
        value_at(solver, u[0], where),
        value_at(solver, u[1], where),
        value_at(solver, u[2], where),
    )
    note = f"{what}: {solver.label(inner.joint.index)}, not polished yet"
    if not inner.turns:
        first = equations[0]
        rest = b.sub(value_at(solver, first.rhs, where), solver.space.dot(first.a, known))
        solver.slide(inner, rest, first.a[2], note, settles=False)
        return solver.slides[inner.joint.index]
    left, right = (value_at(solver, reduced_rhs(solver, e, u, algebra), where) for e in equations)
    z_x, z_y = solved_for_z(solver, (equations[0], equations[1]), left, right)
    solver.turn_onto(inner, known, (z_x, z_y, known[2]), Least.NOTHING, note, settles=False)
    return solver.pairs[inner.joint.index]


def _newton(
    solver: Solver, inner: Use, equations: list[Equation], u: PolyVector, variables: tuple[Variable, Variable]
) -> tuple[tuple[Node, Node], tuple[tuple[Node, Node], tuple[Node, Node]]]:
    rows = [_row(solver, inner, e, u, variables) for e in equations]
    (r1, s1), (r2, s2) = rows
    return (r1, r2), (s1, s2)


def _row(
    solver: Solver, inner: Use, equation: Equation, u: PolyVector, variables: tuple[Variable, Variable]
) -> tuple[Node, tuple[Node, Node]]:
    """One equation's residual and its slopes by the inner and the outer joint, at the values being polished."""
    space, b = solver.space, solver.builder
    now, outer_now = variables[0].during, variables[1].during
    here: Vector = (value_at(solver, u[0], outer_now), value_at(solver, u[1], outer_now), value_at(solver, u[2], outer_now))
    slope: Vector = (slope_at(solver, u[0], outer_now), slope_at(solver, u[1], outer_now), slope_at(solver, u[2], outer_now))
    sign = b.integer(inner.sign)
    if isinstance(now, Pair):
        turn = now if inner.sign > 0 else space.opposite(now)
        moved, moved_slope = space.spun(turn, here), space.spun(turn, slope)
        by_inner = b.mul(sign, space.dot(equation.a, space.cross(space.unit[2], moved)))
        extra, extra_slope, extra_inner = space.zero, space.zero, space.zero
    else:
        slid = b.mul(sign, now)
        moved, moved_slope = space.plus(here, space.along_z(slid)), slope
        by_inner = b.mul(sign, equation.a[2])
        extra, extra_slope, extra_inner = _slide_square(solver, equation, here, slope, slid, sign)
    residual = b.add(space.dot(equation.a, moved), extra, b.neg(value_at(solver, equation.rhs, outer_now)))
    by_outer = b.add(space.dot(equation.a, moved_slope), extra_slope, b.neg(slope_at(solver, equation.rhs, outer_now)))
    return residual, (b.add(by_inner, extra_inner), by_outer)


def _slide_square(
    solver: Solver, equation: Equation, here: Vector, slope: Vector, slid: Node, sign: Node
) -> tuple[Node, Node, Node]:
    """What a sliding inner joint adds to the squared distance: d u_z + d^2 / 2, and its slopes."""
    b, zero = solver.builder, solver.space.zero
    if equation.least is not Least.AREA:
        return zero, zero, zero
    value = b.add(b.mul(slid, here[2]), b.half(b.square(slid)))
    return value, b.mul(slid, slope[2]), b.mul(sign, b.add(here[2], slid))
