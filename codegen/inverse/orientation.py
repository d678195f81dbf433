"""Directions by two turning joints, orientations by three, slides along known directions."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Matrix, Vector
from codegen.inverse.elimination import square_by_radius
from codegen.inverse.plan import Least
from codegen.inverse.segment import Segment, Use
from codegen.inverse.solver import Balance, Solver


@dataclass(frozen=True, slots=True)
class DirectionProblem:
    """segment (two turning joints) takes the unit vector n to the unit vector v."""

    segment: Segment
    n: Vector
    v: Vector

    def reversed(self, solver: Solver) -> DirectionProblem:
        return DirectionProblem(self.segment.reversed(solver.space), self.v, self.n)


def solve_direction2(solver: Solver, problem: DirectionProblem, what: str) -> bool:
    """The second joint from the height along the first axis (two roots), then the first."""
    solver.heading(what)
    ways = [(_height_equation(solver, way), way) for way in (problem, problem.reversed(solver))]
    usable = [
        (balance, way)
        for balance, way in ways
        if not solver.oracle.vanishes(balance.cosine_part, balance.sine_part)
    ]
    if not usable:
        return False
    balance, way = min(usable, key=lambda pair: not pair[0].fixed)
    space = solver.space
    first, second = way.segment.uses
    solver.balance(second, balance, f"{what}: its tilt against the axis of {solver.label(first.joint.index)}")
    turned = space.times(solver.motion(second).rotation, way.n)
    turned = space.times(way.segment.cores[0].middle.rotation, turned)
    name = solver.label(first.joint.index)
    space.named(turned, f"{name}_from", f"{what}, before {name} turns it")
    solver.turn_onto(first, turned, way.v, Least.ANGLE_SQUARED, f"{what}: {name} turns it to its place")
    if not balance.exact:
        solver.never_free()
    _absorb_tilt(solver, way)
    return True


def _absorb_tilt(solver: Solver, way: DirectionProblem) -> None:
    """Where the first joint keeps its seed, the second takes up what it can of the direction: the pose stays exact."""
    space, b = solver.space, solver.builder
    first, second = way.segment.uses
    back = space.times(space.transposed(solver.motion(first).rotation), way.v)
    back = space.times(space.transposed(way.segment.cores[0].middle.rotation), back)
    x = b.add(b.mul(way.n[0], back[0]), b.mul(way.n[1], back[1]))
    y = b.sub(b.mul(way.n[0], back[1]), b.mul(way.n[1], back[0]))
    solver.absorb(second, x, y)


def _height_equation(solver: Solver, problem: DirectionProblem) -> Balance:
    """z . K R n = v_z."""
    b, n, v = solver.builder, problem.n, problem.v
    a = problem.segment.cores[0].middle.rotation[2]
    cosine_part = b.add(b.mul(a[0], n[0]), b.mul(a[1], n[1]))
    sine_part = b.sub(b.mul(a[1], n[0]), b.mul(a[0], n[1]))
    target = b.sub(v[2], b.mul(a[2], n[2]))
    lines_up = solver.oracle.vanishes(b.sub(b.square(a[2]), b.square(n[2])))  # the goal can lie along the first axis
    return Balance(cosine_part, sine_part, target, Least.ANGLE, square_by_radius(solver, a, n, v), exact=lines_up)


def solve_orientation3(solver: Solver, segment: Segment, rotation: Matrix, what: str) -> bool:
    """Three turning joints that must give a rotation: the last axis's direction by two, then the turn left over."""
    space = solver.space
    n = space.column(segment.cores[1].middle.rotation, 2)
    problem = DirectionProblem(segment.part(0, 2), n, space.column(rotation, 2))
    if not solve_direction2(solver, problem, f"{what}, axis of {solver.label(segment.uses[2].joint.index)}"):
        return False
    left = rotation
    for use, core in zip(segment.uses[:2], segment.cores, strict=True):
        left = space.product(space.transposed(solver.motion(use).rotation), left)
        left = space.product(space.transposed(core.middle.rotation), left)
    solver.direction(
        segment.uses[2], left[0][0], left[1][0], Least.NOTHING,
        f"{what}: {solver.label(segment.uses[2].joint.index)} makes up the turn that is left over",
    )  # fmt: skip
    return True


def solve_slides(
    solver: Solver, uses: tuple[Use, ...], axes: list[Vector], gap: Vector, what: str, normal: Vector | None
) -> bool:
    """One, two or three slides along known directions that add up to `gap`.

    Each takes the part of the gap that the others behind it cannot reach, along the direction across them; what is left
    goes to the next (backward stable, and a slide that keeps its seed leaves its part to the others). Two slides that no
    turn makes parallel come last, where there are such: they make up for the first wherever it is free.

    normal  for two slides: the direction that neither needs to reach
    """
    space = solver.space
    order = _order(solver, axes)
    uses, axes = tuple(uses[k] for k in order), [axes[k] for k in order]
    across = _across(solver, axes, normal)
    if across is None or any(solver.oracle.vanishes(space.dot(a, n)) for a, n in zip(axes, across, strict=True)):
        return False
    for use, axis, direction in zip(uses, axes, across, strict=True):
        name = solver.label(use.joint.index)
        space.named(gap, f"{name}_gap", f"{what}: still to go when {name} is solved; m")
        value = solver.slide(use, space.dot(gap, direction), space.dot(axis, direction), f"{what}: {name}")
        gap = space.minus(gap, space.scaled(axis, value))
    return True


def _order(solver: Solver, axes: list[Vector]) -> list[int]:
    """The slides as they come, or the one first without which the other two always span a plane."""
    space = solver.space
    for first in range(len(axes)) if len(axes) == 3 else ():
        others = [k for k in range(3) if k != first]
        normal = space.cross(axes[others[0]], axes[others[1]])
        if solver.oracle.is_constant(space.dot(normal, normal)) and not solver.oracle.vanishes(*normal):
            return [first, *others]
    return list(range(len(axes)))


def _across(solver: Solver, axes: list[Vector], normal: Vector | None) -> list[Vector] | None:
    """Per slide a direction that the slides behind it do not reach."""
    space = solver.space
    if len(axes) == 1:
        return [axes[0]]
    if len(axes) == 2:
        return None if normal is None else [space.cross(axes[1], normal), axes[1]]
    plane = space.cross(axes[1], axes[2])
    return [plane, space.cross(axes[2], plane), axes[2]]
