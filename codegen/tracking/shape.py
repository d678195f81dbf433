"""What the steps need to know of an arm: its links, its free joints, the scale of its lengths, how its task is read."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from codegen.exact import MP, Real, real
from codegen.model import Arm, JointKind, JointRow, Task
from codegen.tracking.conditioning import Matrix
from codegen.tracking.links import links_of

Vector = tuple[float, float, float]

POSITION_WEIGHT = 2  # a metre counts as this many radians per reach; measured: 1 to 4 need the fewest starts
NO_LENGTH = 1  # m, the reach of an arm whose every length is zero

_ROWS = {  # position rows, angle rows
    Task.POSE: (3, 3),
    Task.POINT_AXIS: (3, 2),
    Task.POINT_PITCH: (3, 1),
    Task.POINT_YAW: (3, 1),
    Task.POINT: (3, 0),
    Task.PLANE_POSE: (2, 1),
    Task.PLANE_POINT: (2, 0),
}


@dataclass(frozen=True, slots=True)
class ArmShape:
    """An arm as the steps see it.

    links         K0..Kn, 4x4
    turning       per joint: it turns (True) or slides (False)
    free          positions of the joints that are not held, base first
    last_turning  position of the last free turning joint: its axis is the normal of the arm's plane (point_pitch)
    reach         m, a length that the tool never exceeds from frame 0, the travel of limited slides included
    base_distance m, of frame 0 from the world origin
    plane         for the plane tasks: two unit vectors that span the plane, and its normal, in the world frame
    """

    task: Task
    links: tuple[Matrix, ...]
    turning: tuple[bool, ...]
    free: tuple[int, ...]
    last_turning: int | None
    reach: Real
    base_distance: Real
    plane: tuple[tuple[Real, Real, Real], ...]

    @property
    def rows(self) -> tuple[int, int]:
        """How many residuals are lengths, how many are angles."""
        return _ROWS[self.task]

    @property
    def length_scale(self) -> Real:
        """1/m: a length residual times this is as much worth as an angle residual in radians."""
        return POSITION_WEIGHT / self.reach

    @property
    def slide_unit(self) -> Real:
        """m: a slide moves this much where a turning joint moves one radian."""
        return self.reach / POSITION_WEIGHT


def shape_of(arm: Arm) -> ArmShape:
    links = links_of(arm)
    turning = tuple(row.kind is JointKind.REVOLUTE for row in arm.joints)
    turning_free = [i for i in arm.free_indices if turning[i]]
    lengths = sum(_length(link) for link in links[1:]) + sum(_travel(row) for row in arm.joints)
    return ArmShape(
        task=arm.task,
        links=links,
        turning=turning,
        free=arm.free_indices,
        last_turning=turning_free[-1] if turning_free else None,
        reach=lengths or MP.mpf(NO_LENGTH),
        base_distance=_length(links[0]),
        plane=_plane(arm, links, turning_free) if arm.task in (Task.PLANE_POSE, Task.PLANE_POINT) else (),
    )


def _length(link: Matrix) -> Real:
    return MP.sqrt(sum(link[k, 3] ** 2 for k in range(3)))


def _travel(row: JointRow) -> Real:
    """The largest size of a limited slide (m); 0 for other joints."""
    if row.kind is JointKind.REVOLUTE or row.limits is None:
        return MP.mpf(0)
    return max(abs(real(limit)) for limit in row.limits if isinstance(limit, Fraction))


def _plane(arm: Arm, links: tuple[Matrix, ...], turning_free: list[int]) -> tuple[tuple[Real, Real, Real], ...]:
    """(u, v, normal), all joints at zero: the normal along the last free turning axis, or across the two slides."""
    axes, total = [], MP.eye(4)
    for link in links[:-1]:
        total = total * link
        axes.append(tuple(total[k, 2] for k in range(3)))
    across = (axes[arm.free_indices[0]], axes[arm.free_indices[-1]])
    normal = axes[turning_free[-1]] if turning_free else _unit(_cross(*across))
    smallest = min(range(3), key=lambda k: (abs(normal[k]), k))
    first = _unit(_cross(tuple(MP.mpf(int(k == smallest)) for k in range(3)), normal))
    return first, _cross(normal, first), normal


def _cross(a: tuple[Real, ...], b: tuple[Real, ...]) -> tuple[Real, Real, Real]:
    return (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])


def _unit(v: tuple[Real, ...]) -> tuple[Real, Real, Real]:
    length = MP.sqrt(sum(entry**2 for entry in v))
    return (v[0] / length, v[1] / length, v[2] / length)
