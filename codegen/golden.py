"""Golden vectors: joint values and the pose that they give, with 60 digits, straight from the link table.

Nothing here is derived: poses are products of link matrices. The joint values are chosen so that the pose determines
them well: of candidates spread evenly over the joint ranges (fractional parts of multiples of square roots of primes:
Weyl, Math. Ann. 77, 1916), each a number that every number type holds exactly, those are kept where every joint motion
changes clearly what the task reads. All of it is exact or has 60 digits, so every machine chooses alike.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

from codegen.emit.tolerances import reach_of
from codegen.exact import MP, Angle, Real, real
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Quantity, Task

_PRIMES = (2, 3, 5, 7, 11, 13, 17)
_WELL_POSED = MP.mpf(1) / 10
_TRIED = 12  # candidates for each vector wanted
_STEP = MP.mpf(10) ** -25  # of a difference quotient; half of the digits are left
_INSET = Fraction(1, 16)  # of a joint's range, kept clear at each end
_GRID = 64  # steps in one rad, in one reach, or in a range that is smaller
_WIDE = Fraction(3)  # rad; a turning joint without limits

Matrix = Real  # 4x4 of MP


@dataclass(frozen=True, slots=True)
class GoldenVector:
    """joints: rad or m, exact in binary; rotation: row by row; position: m; sharpness: see `_sharpness`."""

    joints: tuple[Fraction, ...]
    rotation: tuple[Real, ...]
    position: tuple[Real, ...]
    sharpness: Real


def golden_vectors(arm: Arm, count: int) -> tuple[GoldenVector, ...]:
    """`count` vectors; where fewer are well posed, the best that were tried."""
    kept: list[GoldenVector] = []
    others: list[GoldenVector] = []
    for number, joints in enumerate(_candidates(arm), start=1):
        if len(kept) == count or number > _TRIED * count:
            break
        vector = _vector(arm, joints)
        (kept if vector.sharpness >= _WELL_POSED else others).append(vector)
    others.sort(key=lambda vector: vector.sharpness, reverse=True)
    return tuple([*kept, *others][:count])


def _candidates(arm: Arm) -> Iterator[tuple[Fraction, ...]]:
    spans = [_span(arm, row) for row in arm.joints]
    number = 0
    while True:
        number += 1
        shares = [_fraction_of(number, prime) for prime in _PRIMES]
        yield tuple(_on_grid(low, high, share) for (low, high), share in zip(spans, shares, strict=False))


def _fraction_of(number: int, prime: int) -> Fraction:
    """The fractional part of number * sqrt(prime), to 40 binary digits."""
    scaled = int(MP.floor(number * MP.sqrt(prime) * 2**40))
    return Fraction(scaled % 2**40, 2**40)


def _span(arm: Arm, row: JointRow) -> tuple[Fraction, Fraction]:
    """Where to look for values of one joint, clear of its limits."""
    if row.limits is None:
        wide = _WIDE if row.kind is JointKind.REVOLUTE else reach_of(arm) / 2
        return -wide, wide
    low, high = (_fraction(limit) for limit in row.limits)
    inset = (high - low) * _INSET
    return low + inset, high - inset


def _fraction(quantity: Quantity) -> Fraction:
    """To 50 binary digits behind the point."""
    if isinstance(quantity, Angle):
        return Fraction(int(MP.nint(quantity.value() * 2**50)), 2**50)
    return quantity


def _on_grid(low: Fraction, high: Fraction, share: Fraction) -> Fraction:
    """A number between low and high with few binary digits."""
    steps = _GRID
    while (high - low) * steps < _GRID:
        steps *= 2
    return Fraction(round((low + (high - low) * share) * steps), steps)


def _vector(arm: Arm, joints: tuple[Fraction, ...]) -> GoldenVector:
    pose = tool_pose(arm, [real(q) for q in joints])
    rotation = tuple(pose[i, j] for i in range(3) for j in range(3))
    return GoldenVector(joints, rotation, tuple(pose[i, 3] for i in range(3)), _sharpness(arm, joints))


# -- the link table ----------------------------------------------------------------------------------------------------
def tool_pose(arm: Arm, joints: Sequence[Real]) -> Matrix:
    """base A_1 ... A_n tool, 4x4 (contract of the arm file: the link transforms of both conventions)."""
    return _placed(arm, joints)[-1]


def _placed(arm: Arm, joints: Sequence[Real]) -> list[Matrix]:
    """Of each joint the frame whose z axis it turns about or slides along; last the tool."""
    frame, found = _fixed(arm.base), []
    for row, q in zip(arm.joints, joints, strict=True):
        twist = _shift(0, real(row.a)) * _turn(0, *row.alpha.cosine_sine())
        if arm.convention is Convention.MODIFIED:
            frame = frame * twist
        found.append(frame)
        frame = frame * _joint(row, q)
        if arm.convention is Convention.STANDARD:
            frame = frame * twist
    return [*found, frame * _fixed(arm.tool)]


def _joint(row: JointRow, q: Real) -> Matrix:
    turn = _turn(2, *row.theta.cosine_sine())
    if row.kind is JointKind.REVOLUTE:
        return turn * _turn(2, MP.cos(q), MP.sin(q)) * _shift(2, real(row.d))
    return turn * _shift(2, real(row.d) + q)


def _fixed(frame: Frame) -> Matrix:
    roll, pitch, yaw = (_turn(axis, *angle.cosine_sine()) for axis, angle in enumerate(frame.rpy))
    placed = yaw * pitch * roll
    for i in range(3):
        placed[i, 3] = real(frame.xyz[i])
    return placed


def _turn(axis: int, cosine: Real, sine: Real) -> Matrix:
    turned = MP.eye(4)
    first, second = (axis + 1) % 3, (axis + 2) % 3
    turned[first, first] = turned[second, second] = cosine
    turned[second, first], turned[first, second] = sine, -sine
    return turned


def _shift(axis: int, distance: Real) -> Matrix:
    shifted = MP.eye(4)
    shifted[axis, 3] = distance
    return shifted


# -- how well a pose determines its joint values -----------------------------------------------------------------------
Vector = list[Real]


def _sharpness(arm: Arm, joints: tuple[Fraction, ...]) -> Real:
    """1 over the Frobenius norm of the inverse of the task's Jacobian, lengths counted in reaches.

    Never more than its smallest singular value, so joint values move by at most 1 / sharpness of what the pose moves.
    The Jacobian is by difference quotients; where its columns depend on each other the sharpness is 0.
    """
    exact = [real(q) for q in joints]
    reach, start = real(reach_of(arm)), _placed(arm, exact)
    columns = []
    for index in arm.free_indices:
        turns = arm.joints[index].kind is JointKind.REVOLUTE
        step = _STEP if turns else _STEP * reach
        moved = [q + (step if k == index else 0) for k, q in enumerate(exact)]
        columns.append([entry / _STEP for entry in _seen(arm, start, _placed(arm, moved), reach)])
    gram = MP.matrix([[_dot(one, other) for other in columns] for one in columns])
    try:
        inverse = gram**-1
    except ZeroDivisionError:
        return MP.mpf(0)
    trace = sum((inverse[k, k] for k in range(len(columns))), MP.mpf(0))
    return 1 / MP.sqrt(trace) if trace > 0 else MP.mpf(0)


def _seen(arm: Arm, start: list[Matrix], end: list[Matrix], reach: Real) -> Vector:
    """What the task sees of a small motion: of the point, in reaches, and of the directions that it reads."""
    point = [(end[-1][i, 3] - start[-1][i, 3]) / reach for i in range(3)]
    before, after = start[-1], end[-1]
    match arm.task:
        case Task.POINT:
            return point
        case Task.POSE:
            return [*point, *_spin(before, after)]
        case Task.POINT_AXIS:
            return [*point, *(after[i, 2] - before[i, 2] for i in range(3))]
        case Task.POINT_YAW:
            return [*point, _turned(_column(before, 0), _column(after, 0), [MP.mpf(0), MP.mpf(0), MP.mpf(1)])]
        case Task.POINT_PITCH:
            return [*point, _turned(_column(before, 2), _column(after, 2), _normal(arm, end))]
        case Task.PLANE_POINT:
            return _in_plane(point, _normal(arm, start))
        case Task.PLANE_POSE:
            normal = _normal(arm, start)
            return [*_in_plane(point, normal), _dot(normal, _spin(before, after))]


def _spin(before: Matrix, after: Matrix) -> Vector:
    """The small turn from one rotation to another."""
    turn = after[:3, :3] * before[:3, :3].T
    return [(turn[2, 1] - turn[1, 2]) / 2, (turn[0, 2] - turn[2, 0]) / 2, (turn[1, 0] - turn[0, 1]) / 2]


def _normal(arm: Arm, frames: list[Matrix]) -> Vector:
    """Of the arm's plane: the last free turning joint's axis, or across the slides."""
    turning = [i for i in arm.free_indices if arm.joints[i].kind is JointKind.REVOLUTE]
    if turning:
        return _column(frames[turning[-1]], 2)
    first, last = (_column(frames[i], 2) for i in (arm.free_indices[0], arm.free_indices[-1]))
    return _scaled(_cross(first, last))


def _turned(before: Vector, after: Vector, normal: Vector) -> Real:
    """The small angle about the normal from one direction's projection to the other's; 0 where there is none."""
    first, second = _in_plane(before, normal), _in_plane(after, normal)
    size = _dot(first, first)
    return _dot(normal, _cross(first, second)) / size if size > _STEP else MP.mpf(0)


def _column(matrix: Matrix, index: int) -> Vector:
    return [matrix[i, index] for i in range(3)]


def _dot(one: Sequence[Real], other: Sequence[Real]) -> Real:
    return sum((a * b for a, b in zip(one, other, strict=True)), MP.mpf(0))


def _cross(a: Vector, b: Vector) -> Vector:
    return [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]


def _scaled(vector: Vector) -> Vector:
    size = MP.sqrt(_dot(vector, vector))
    return [entry / size for entry in vector]


def _in_plane(vector: Vector, normal: Vector) -> Vector:
    along = _dot(vector, normal)
    return [a - along * n for a, n in zip(vector, normal, strict=True)]
