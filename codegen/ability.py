"""Whether an arm can do its task at all, found by rank: which motion is missing, in the user's terms.

The motions that the task asks for are compared, at joint values drawn at random, with those that the joints can make. A
rank that is too low at every one of them is too low everywhere but at isolated places (the rank of an analytic matrix is
the same almost everywhere).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from codegen.chain import Chain, chain_of
from codegen.evaluate import evaluate
from codegen.exact import MP, Real
from codegen.forward import Carrier, Heading, axis_frames, cumulative_pair, pose_columns
from codegen.geometry import Pair, Space
from codegen.model import Arm, Task
from codegen.program import Builder, Node

_SAMPLES = 3
_NOTHING = MP.mpf(10) ** -30
Row = list[Real]


@dataclass(frozen=True, slots=True)
class Lack:
    """What an arm cannot do: how many motions its task asks for, how many it has, and words for what is missing."""

    wanted: int
    found: int
    missing: tuple[str, ...]
    idle: tuple[str, ...]


def lack_of(arm: Arm) -> Lack | None:
    """None where the joints that are not held can make every motion of the task."""
    ranks = []
    for sample in range(_SAMPLES):
        rows, names = _task_rows(arm, sample)
        ranks.append((_rank(rows), rows, names))
    rank, rows, names = max(ranks, key=lambda item: item[0])
    wanted = arm.task.joints
    if rank == wanted:
        return None
    return Lack(wanted, rank, _missing(rows, names), _idle(arm, rows))


def _task_rows(arm: Arm, sample: int) -> tuple[list[Row], tuple[str, ...]]:
    """The Jacobian of what the task reads, one row a motion, one column a joint that is not held; lengths scaled to 1."""
    builder = Builder()
    space = Space(builder)
    chain = chain_of(arm, builder)
    values = _joint_values(builder, space, chain, sample)
    frames = axis_frames(values.carrier)
    columns, point = pose_columns(values.carrier, (0, 1, 2))
    nodes: list[Node] = [*point, *(entry for k in range(3) for entry in columns[k])]
    nodes += [entry for frame in frames for entry in (*space.column(frame.rotation, 2), *frame.shift)]
    numbers = evaluate(nodes, values.inputs)
    p, x, z = numbers[0:3], numbers[3:6], numbers[9:12]
    axes = [(numbers[12 + 6 * k : 15 + 6 * k], numbers[15 + 6 * k : 18 + 6 * k]) for k in range(len(chain.joints))]
    motions = [_motion(joint.turns, axis, origin, p) for joint, (axis, origin) in zip(chain.joints, axes, strict=True)]
    free = [motions[k] for k in arm.free_indices]
    kinds = [chain.joints[k].turns for k in arm.free_indices]
    normals = [axes[k][0] for k in arm.free_indices]
    return _rows_of(arm.task, free, x, z, kinds, normals)


def _motion(turns: bool, axis: Row, origin: Row, p: Row) -> tuple[Row, Row]:
    """(velocity of the tool point, angular velocity) for one joint."""
    if not turns:
        return axis, [MP.mpf(0)] * 3
    return _cross(axis, [a - c for a, c in zip(p, origin, strict=True)]), axis


def _rows_of(
    task: Task, motions: list[tuple[Row, Row]], x: Row, z: Row, turns: list[bool], axes: list[Row]
) -> tuple[list[Row], tuple[str, ...]]:
    velocity = [[motion[0][i] for motion in motions] for i in range(3)]
    spin = [[motion[1][i] for motion in motions] for i in range(3)]
    moves = tuple(f"moving the tool point along world {name}" for name in "xyz")
    spins = tuple(f"turning the tool about world {name}" for name in "xyz")
    match task:
        case Task.POSE:
            return velocity + spin, moves + spins
        case Task.POINT:
            return velocity, moves
        case Task.POINT_AXIS:
            tilts = [[_cross(motion[1], z)[i] for motion in motions] for i in range(3)]
            names = tuple(f"tilting the tool's z axis towards world {name}" for name in "xyz")
            return velocity + tilts, moves + names
        case Task.POINT_YAW:
            heading = [x[0] * _cross(m[1], x)[1] - x[1] * _cross(m[1], x)[0] for m in motions]
            return [*velocity, heading], (*moves, "turning the heading of the tool's x axis about world z")
        case Task.POINT_PITCH:
            normal = _pitch_axis(turns, axes)
            if _parallel(normal, z):
                why = "the tool's z axis has no angle in the arm's own plane, it lies along the pitch axis: mend [tool] rpy"
                return [*velocity, [MP.mpf(0)] * len(motions)], (*moves, why)
            pitch = [_dot(motion[1], normal) for motion in motions]
            return [*velocity, pitch], (*moves, "turning the tool in the arm's own plane")
        case Task.PLANE_POSE | Task.PLANE_POINT:
            return _plane_rows(task, motions, turns, axes)


def _pitch_axis(turns: list[bool], axes: list[Row]) -> Row:
    """The axis that most neighbouring turning joints share; the last such run decides a tie."""
    turning = [axis for axis, turning in zip(axes, turns, strict=True) if turning]
    if not turning:
        return [MP.mpf(0)] * 3
    counts = [sum(_parallel(axis, other) for other in turning) for axis in turning]
    best = max(range(len(turning)), key=lambda k: (counts[k], k))
    return turning[best]


def _plane_rows(
    task: Task, motions: list[tuple[Row, Row]], turns: list[bool], axes: list[Row]
) -> tuple[list[Row], tuple[str, ...]]:
    """Motions within the plane normal to the turning axes, or spanned by the two slides."""
    turning = [axis for axis, turning in zip(axes, turns, strict=True) if turning]
    normal = turning[0] if turning else _cross(axes[0], axes[1])
    first = _across(normal)
    second = _cross(normal, first)
    rows = [[_dot(motion[0], direction) for motion in motions] for direction in (first, second)]
    names = ["moving the tool point one way in the plane", "moving it the other way in the plane"]
    if any(not _parallel(normal, axis) for axis in turning):
        return [], ("a plane of motion: the turning axes are not parallel",)
    slides = [axis for axis, turning in zip(axes, turns, strict=True) if not turning]
    if any(abs(_dot(normal, axis)) > _NOTHING for axis in slides):
        return [], ("a plane of motion: a slide leaves it",)
    if task is Task.PLANE_POSE:
        rows.append([_dot(motion[1], normal) for motion in motions])
        names.append("turning the tool in the plane")
    return rows, tuple(names)


# -- joint values at random ----------------------------------------------------------------------------------------------
@dataclass(frozen=True, slots=True)
class _Values:
    carrier: Carrier
    inputs: dict[Node, Any]


def _joint_values(builder: Builder, space: Space, chain: Chain, sample: int) -> _Values:
    inputs: dict[Node, Any] = {}
    pairs: dict[int, Pair] = {}
    slides: dict[int, Node] = {}
    for joint in chain.joints:
        angle = MP.mpf(1 + (7919 * (joint.index + 1) * (sample + 3)) % 1009) / 173
        if joint.turns:
            pair = Pair(builder.input(f"c{joint.index}"), builder.input(f"s{joint.index}"))
            inputs[pair.cosine], inputs[pair.sine] = MP.cos(angle), MP.sin(angle)
            pairs[joint.index] = pair
        else:
            slides[joint.index] = builder.input(f"d{joint.index}")
            inputs[slides[joint.index]] = angle

    def pair_of(heading: Heading) -> Pair:
        return cumulative_pair(space, lambda index: pairs[index], heading)

    return _Values(Carrier(space, chain, pair_of, lambda index: slides[index]), inputs)


# -- small linear algebra with 60 digits ---------------------------------------------------------------------------------
def _dot(u: Row, v: Row) -> Real:
    return sum((a * c for a, c in zip(u, v, strict=True)), MP.mpf(0))


def _cross(u: Row, v: Row) -> Row:
    return [u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2], u[0] * v[1] - u[1] * v[0]]


def _parallel(u: Row, v: Row) -> bool:
    return all(abs(entry) < _NOTHING for entry in _cross(u, v))


def _across(normal: Row) -> Row:
    """A unit vector across the normal."""
    start = [MP.mpf(k == min(range(3), key=lambda i: abs(normal[i]))) for k in range(3)]
    across = _cross(normal, start)
    size = MP.sqrt(_dot(across, across))
    return [entry / size for entry in across]


def _rank(rows: list[Row]) -> int:
    return len(_echelon(rows))


def _echelon(rows: list[Row]) -> list[Row]:
    """Rows that span the same space, each with a leading place of its own; the largest pivot first (full pivoting)."""
    left = [list(row) for row in rows]
    found: list[Row] = []
    used: set[int] = set()
    while left:
        size, row, column = max(
            ((abs(entry), i, j) for i, r in enumerate(left) for j, entry in enumerate(r) if j not in used),
            default=(MP.mpf(0), 0, 0),
        )
        if size < _NOTHING:
            break
        pivot = left.pop(row)
        used.add(column)
        found.append(pivot)
        left = [[a - r[column] / pivot[column] * c for a, c in zip(r, pivot, strict=True)] for r in left]
    return found


def _missing(rows: list[Row], names: tuple[str, ...]) -> tuple[str, ...]:
    """The motions without which nothing changes: a single one that no joint makes, else all that hang together."""
    if not rows:
        return names
    alone = tuple(
        name for row, name in zip(rows, names, strict=True) if all(abs(entry) < _NOTHING for entry in row)
    )
    return alone or ("two of these at once: " + "; ".join(names),)


def _idle(arm: Arm, rows: list[Row]) -> tuple[str, ...]:
    """Joints that change nothing that the task reads."""
    return tuple(
        arm.joints[index].name
        for place, index in enumerate(arm.free_indices)
        if rows and all(abs(row[place]) < _NOTHING for row in rows)
    )
