"""What a picture of an arm shows, in metres and world coordinates: links, joints, frames. Knows nothing of paper.

A row's link runs along its two lengths, d along the joint's axis and a along the common normal, so that each length
of the table can be seen and labelled. A joint stands in the middle of its d, or where its axis meets the chain when d
is zero.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.link_product import Floats, frames_along
from codegen.model import Arm, Convention, Frame, JointKind


@dataclass(frozen=True, slots=True)
class Segment:
    """A straight piece of the chain; `symbol` is the table's name of its length, or "" for base and tool."""

    start: Floats
    end: Floats
    symbol: str

    @property
    def length(self) -> float:
        return float(np.linalg.norm(self.end - self.start))


@dataclass(frozen=True, slots=True)
class JointMark:
    """Where a joint is drawn; `axis` is the unit vector of its z axis."""

    number: int
    kind: JointKind
    centre: Floats
    axis: Floats


@dataclass(frozen=True, slots=True)
class FrameMark:
    """A frame: its 4x4 pose and its index as the table counts, or "tool" or "world"."""

    index: str
    pose: Floats

    @property
    def origin(self) -> Floats:
        return np.asarray(self.pose[:3, 3])

    def axis(self, number: int) -> Floats:
        return np.asarray(self.pose[:3, number])


@dataclass(frozen=True, slots=True)
class Scene:
    """Everything to draw. `size` is the chain's extent, m; `mark` the length of a joint symbol, m."""

    segments: tuple[Segment, ...]
    joints: tuple[JointMark, ...]
    frames: tuple[FrameMark, ...]
    size: float
    mark: float

    @property
    def points(self) -> Floats:
        return np.array([point for segment in self.segments for point in (segment.start, segment.end)])


def scene_of(arm: Arm, q: Floats) -> Scene:
    """The arm at joint values q (rad, m)."""
    poses = frames_along(arm, q[None, :])[0]
    joint_segments = [_row_segments(arm, poses, index) for index in range(len(arm.joints))]
    segments = [Segment(np.zeros(3), poses[0][:3, 3], "base")]
    for along_z, along_x in joint_segments:  # in the order of the chain
        segments += [along_z, along_x] if arm.convention is Convention.STANDARD else [along_x, along_z]
    segments.append(Segment(poses[-2][:3, 3], poses[-1][:3, 3], "tool"))
    size = _size(segments)
    mark = size / 14
    joints = _spread([_joint_mark(arm, poses, index, joint_segments[index]) for index in range(len(arm.joints))], mark)
    frames = [FrameMark(str(index), pose) for index, pose in enumerate(poses[:-1])]
    frames += [FrameMark("tool", poses[-1]), *_world_frame(arm, poses[0], size)]
    return Scene(tuple(segments), joints, tuple(frames), size, mark)


def _world_frame(arm: Arm, base: Floats, size: float) -> list[FrameMark]:
    """The world frame, when frame 0 is another one and not so far away that the arm would be drawn tiny."""
    near = float(np.linalg.norm(base[:3, 3])) < size
    return [FrameMark("world", np.eye(4))] if near and arm.base != Frame() else []


def _row_segments(arm: Arm, poses: Floats, index: int) -> tuple[Segment, Segment]:
    """The lengths of a row: the one along the joint's axis and the one along x."""
    start, end = poses[index][:3, 3], poses[index + 1][:3, 3]
    if arm.convention is Convention.STANDARD:
        corner = end - float(arm.joints[index].a) * poses[index + 1][:3, 0]
        return Segment(start, corner, f"d_{index + 1}"), Segment(corner, end, f"a_{index + 1}")
    corner = start + float(arm.joints[index].a) * poses[index][:3, 0]
    return Segment(corner, end, f"d_{index + 1}"), Segment(start, corner, f"a_{index}")


def _joint_mark(arm: Arm, poses: Floats, index: int, lengths: tuple[Segment, Segment]) -> JointMark:
    frame = poses[index] if arm.convention is Convention.STANDARD else poses[index + 1]
    centre = (lengths[0].start + lengths[0].end) / 2
    return JointMark(index + 1, arm.joints[index].kind, centre, frame[:3, 2])


def _size(segments: list[Segment]) -> float:
    """Extent of the chain; never zero, so that an arm without lengths can be drawn too."""
    points = np.array([point for segment in segments[1:] for point in (segment.start, segment.end)])
    return float(np.linalg.norm(np.ptp(points, axis=0))) or 1.0


def _spread(marks: list[JointMark], size: float) -> tuple[JointMark, ...]:
    """Moves joints that would be drawn on one another apart, along their own axes, where they may stand anywhere."""
    placed: list[JointMark] = []
    for mark in marks:
        shifts = sorted((number * size * 0.65 for number in range(-4, 5)), key=lambda shift: (abs(shift), -shift))
        centres = [mark.centre + shift * mark.axis for shift in shifts]
        free = [centre for centre in centres if all(_apart(centre, other, size) for other in placed)]
        placed.append(JointMark(mark.number, mark.kind, free[0] if free else mark.centre, mark.axis))
    return tuple(placed)


def _apart(centre: Floats, other: JointMark, size: float) -> bool:
    return float(np.linalg.norm(centre - other.centre)) > 1.2 * size
