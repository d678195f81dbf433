"""Roots of an elimination, polished on the two equations it came from: Newton steps in the inner and the outer joint.

Squaring and expanding costs digits; the two equations themselves do not have that loss. A distance from a point on the
first axis is polished as the distance from that axis, whose square is small where the axis is near.
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Pair, Rigid, Vector
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


@dataclass(frozen=True, slots=True)
class FirstAxis:
    """What the first joint turns about z: points behind `core`, which must come as far from the axis as `p` is."""

    core: Rigid
    p: Vector


def polish(
    solver: Solver, inner: Use, outer: Use, equations: list[Equation], u: PolyVector, axis: FirstAxis | None, what: str
) -> None:
    """Find the inner joint from the unpolished outer one, then polish both together."""
    rough = _inner_from_outer(solver, inner, outer, equations, u, what)
    outer_before = solver.pairs[outer.joint.index] if outer.turns else solver.slides[outer.joint.index]
    variables = (
        _variable(solver, inner, rough),
        _variable(solver, outer, outer_before),
    )
    residuals, slopes = _newton(solver, inner, equations, u, axis, variables)
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
    turned = b.add(b.square(known[0]), b.square(known[1]))
    solver.start_at_seed_below(turned, Least.ANGLE if equations[0].least is Least.ANGLE else Least.LENGTH)
    return solver.pairs[inner.joint.index]


def _newton(
    solver: Solver,
    inner: Use,
    equations: list[Equation],
    u: PolyVector,
    axis: FirstAxis | None,
    variables: tuple[Variable, Variable],
) -> tuple[tuple[Node, Node], tuple[tuple[Node, Node], tuple[Node, Node]]]:
    moving = _carried(solver, inner, u, variables)
    rows = []
    for equation in equations:
        if equation.least is Least.AREA and axis is not None:
            rows.append(_distance_row(solver, axis, moving))
        else:
            rows.append(_row(solver, equation, moving, variables[1].during))
    (r1, s1), (r2, s2) = rows
    return (r1, r2), (s1, s2)


@dataclass(frozen=True, slots=True)
class _Carried:
    """What the inner joint carries, at the values being polished, and its slopes by the inner and the outer joint."""

    value: Vector
    by_inner: Vector
    by_outer: Vector


def _carried(solver: Solver, inner: Use, u: PolyVector, variables: tuple[Variable, Variable]) -> _Carried:
    space, b = solver.space, solver.builder
    now, outer_now = variables[0].during, variables[1].during
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
