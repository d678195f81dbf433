"""Three or four neighbouring joints whose motions form a group, and what that group cannot change.

    spherical     three axes that meet: their common point               (Pieper 1968)
    planar        turns about parallel axes, slides across them: a plane normal to the axes
    screw-free    turns about parallel axes and slides in any direction: the direction of the axes

What a group cannot change gives equations in the joints outside it; the group itself is solved last.
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Pair, Rigid, Vector
from codegen.inverse.segment import Core, Segment
from codegen.inverse.solver import Solver
from codegen.program import Node


@dataclass(frozen=True, slots=True)
class Plane:
    """normal . x = offset."""

    normal: Vector
    offset: Node


def moved_plane(solver: Solver, motion: Rigid, plane: Plane) -> Plane:
    space = solver.space
    normal = space.times(motion.rotation, plane.normal)
    if motion.undone is None:
        along = space.dot(normal, motion.shift)
    else:  # the same product in the other frame, where the shift is known as it was given
        along = space.dot(plane.normal, space.negative(motion.undone.shift))
    return Plane(normal, solver.builder.add(plane.offset, along))


def meeting(solver: Solver, core: Core) -> tuple[Node, Node] | None:
    """Where two neighbouring turning axes meet: the places along the first and along the second; None if they do not."""
    space, b = solver.space, solver.builder
    t, r = core.middle.shift, space.column(core.middle.rotation, 2)
    z = space.unit[2]
    across = space.cross(r, z)
    size = space.dot(across, across)
    if solver.oracle.vanishes(size) or not solver.oracle.vanishes(space.dot(t, across)):
        return None
    f = b.div(space.dot(space.cross(t, z), across), size)
    e = b.sub(t[2], b.mul(f, r[2]))
    return b.add(core.before, e), b.neg(b.add(core.behind, f))


def spherical(solver: Solver, group: Segment) -> tuple[Vector, Vector] | None:
    """The common point of three turning axes, in the frame before the group and in the frame behind it."""
    if not all(use.turns for use in group.uses):
        return None
    left, right = meeting(solver, group.cores[0]), meeting(solver, group.cores[1])
    if left is None or right is None or not solver.oracle.vanishes(solver.builder.sub(left[1], right[0])):
        return None
    return solver.space.along_z(left[0]), solver.space.along_z(right[1])


def at_rest(solver: Solver, group: Segment) -> tuple[list[Vector], Rigid]:
    """Axes of the joints in the frame before the group, and its motion, all variables being zero."""
    space = solver.space
    axes, motion = [], space.identity
    for k in range(len(group.uses)):
        axes.append(space.column(motion.rotation, 2))
        if k < len(group.cores):
            motion = space.compose(motion, group.cores[k].whole(space))
    return axes, motion


def common_normal(solver: Solver, group: Segment) -> Vector | None:
    """The direction of the turning axes where they are all parallel; None where they are not or nothing turns."""
    space = solver.space
    axes, _ = at_rest(solver, group)
    turning = [axis for use, axis in zip(group.uses, axes, strict=True) if use.turns]
    if not turning:
        return None
    for axis in turning[1:]:
        if not solver.oracle.vanishes(*space.cross(turning[0], axis)):
            return None
    return turning[0]


def planar_normal(solver: Solver, group: Segment) -> Vector | None:
    """The normal of the plane of motion: turns about it, slides across it."""
    normal = common_normal(solver, group)
    if normal is None:
        return None
    axes, _ = at_rest(solver, group)
    slides = [axis for use, axis in zip(group.uses, axes, strict=True) if not use.turns]
    if all(solver.oracle.vanishes(solver.space.dot(normal, axis)) for axis in slides):
        return normal
    return None


def kept_plane(solver: Solver, group: Segment, normal: Vector) -> tuple[Plane, Plane]:
    """A plane that a planar group maps to itself, in the frame before the group and in the frame behind it."""
    space = solver.space
    _, motion = at_rest(solver, group)
    before = Plane(normal, space.zero)
    behind = moved_plane(solver, space.inverse(motion), before)
    return before, behind


def frame_about(solver: Solver, normal: Vector, first_axis: Vector) -> Rigid:
    """A rotation whose third column is the normal; the unit matrix where that fits."""
    space = solver.space
    if normal == space.unit[2]:
        return space.identity
    second = space.cross(normal, first_axis)
    return Rigid(space.transposed((first_axis, second, normal)), space.origin)


def turned_about(solver: Solver, frame: Rigid, pair: Pair) -> Rigid:
    """The turn by a pair about the third axis of a frame."""
    space = solver.space
    turn = Rigid(space.about_z(pair), space.origin)
    return space.compose(frame, turn, space.inverse(frame))
