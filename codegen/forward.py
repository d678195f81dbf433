"""Forward kinematics and the geometric Jacobian as programs.

Neighbouring turning joints with parallel axes share one angle: their headings add up, so the pair (cos, sin) of the sum
is taken once. The tool's axes and point are carried from the tool to the base as vectors (Craig, Introduction to
Robotics, section on computational considerations: a vector through three frames costs less than the frames first).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from codegen.chain import Chain, ChainJoint
from codegen.geometry import Matrix, Pair, Rigid, Space, Vector
from codegen.program import Node, Op, reachable

Heading = tuple[tuple[int, int], ...]  # (joint index, +1 or -1), in order: the angles that add up
PairOf = Callable[[Heading], Pair]
SlideOf = Callable[[int], Node]


@dataclass(frozen=True, slots=True)
class Parallels:
    """Neighbouring joints first..last whose axes stay parallel; headings[k] is the angle after joint first + k.

    A sliding joint adds nothing to the heading.
    """

    first: int
    last: int
    headings: tuple[Heading, ...]


def parallels_of(chain: Chain) -> tuple[Parallels, ...]:
    """The chain cut into runs of joints with parallel axes."""
    runs: list[Parallels] = []
    first = 0
    for k in range(len(chain.joints)):
        last = k + 1 == len(chain.joints)
        if last or _axis_sign(chain.cores[k + 1]) == 0:
            runs.append(_run(chain, first, k))
            first = k + 1
    return tuple(runs)


def _axis_sign(core: Rigid) -> int:
    """+1 or -1 when a core keeps or turns round the z axis, else 0."""
    z = core.rotation[2][2]
    return int(z.value) if z.structural and z.value in (1, -1) else 0


def _run(chain: Chain, first: int, last: int) -> Parallels:
    headings: list[Heading] = []
    heading: Heading = ()
    sign = 1
    for k in range(first, last + 1):
        if k > first:
            sign *= _axis_sign(chain.cores[k])
        if chain.joints[k].turns:
            heading = (*heading, (k, sign))
        headings.append(heading)
    return Parallels(first, last, tuple(headings))


@dataclass(frozen=True, slots=True)
class Carrier:
    """Carries points and directions from behind a joint to before it."""

    space: Space
    chain: Chain
    pair_of: PairOf
    slide_of: SlideOf
    labels: tuple[str, ...] = ()

    def turned(self, heading: Heading, v: Vector) -> Vector:
        return self.space.spun(self.pair_of(heading), v) if heading else v

    def joint_shift(self, joint: ChainJoint) -> Vector:
        """What a joint adds along its own axis."""
        return self.space.along_z(joint.slide if joint.turns else self.slide_of(joint.index))

    def direction(self, run: Parallels, v: Vector) -> Vector:
        """A direction behind the run, in the frame before it."""
        for k in range(run.last, run.first, -1):
            v = self.space.times(self.chain.cores[k].rotation, v)
        return self.turned(run.headings[-1], v)

    def point(self, run: Parallels, v: Vector) -> Vector:
        """A point behind the run, in the frame before it; each term is turned once, by its own heading."""
        total = self._term(run, run.last, v)
        for k in range(run.last, run.first - 1, -1):
            step = self.joint_shift(self.chain.joints[k])
            if k > run.first:
                step = self._back(run, k, step)
                total = self.space.plus(total, self._before(run, k, self.chain.cores[k].shift))
            total = self.space.plus(total, step)
        return total

    def _back(self, run: Parallels, k: int, v: Vector) -> Vector:
        """A vector along z just before joint k: no heading changes it, but the cores may turn it round."""
        for j in range(k, run.first, -1):
            v = self.space.times(self.chain.cores[j].rotation, v)
        return v

    def _before(self, run: Parallels, k: int, v: Vector) -> Vector:
        """A vector in the frame behind joint k - 1, its own axis of the core k, before the run."""
        return self._term(run, k - 1, v)

    def _term(self, run: Parallels, k: int, v: Vector) -> Vector:
        """A vector in the frame behind joint k of the run, in the frame before the run."""
        for j in range(k, run.first, -1):
            v = self.space.times(self.chain.cores[j].rotation, v)
        return self.turned(run.headings[k - run.first], v)


@dataclass(frozen=True, slots=True)
class PoseNodes:
    rotation: Matrix
    position: Vector


def pose_columns(carrier: Carrier, columns: tuple[int, ...]) -> tuple[dict[int, Vector], Vector]:
    """Chosen columns of the tool's rotation, and its point, in the world frame."""
    space, chain = carrier.space, carrier.chain
    end = chain.cores[-1]
    vectors = {k: space.column(end.rotation, k) for k in columns}
    point = end.shift
    for run in reversed(parallels_of(chain)):
        core = chain.cores[run.first]
        where = carrier.labels[run.first] if carrier.labels else "tool"
        point = space.named(space.moved(core, carrier.point(run, point)), f"point_before_{where}")
        vectors = {
            k: space.named(space.times(core.rotation, carrier.direction(run, v)), f"{'xyz'[k]}_axis_before_{where}")
            for k, v in vectors.items()
        }
    return vectors, point


def pose_nodes(carrier: Carrier) -> PoseNodes:
    """The tool pose in the fewest operations: all three columns carried, or two and their cross product."""
    space = carrier.space
    candidates: list[tuple[int, int, PoseNodes]] = []
    for kept in ((0, 1, 2), (0, 1), (1, 2), (0, 2)):
        columns, point = pose_columns(carrier, kept)
        for missing in {0, 1, 2} - set(kept):
            columns[missing] = space.cross(columns[(missing + 1) % 3], columns[(missing + 2) % 3])
        rotation = space.transposed((columns[0], columns[1], columns[2]))
        pose = PoseNodes(rotation, point)
        candidates.append((operations([*(e for row in rotation for e in row), *point]), len(candidates), pose))
    return min(candidates, key=lambda c: c[:2])[2]


def operations(roots: list[Node]) -> int:
    """Adds and multiplies that the roots need."""
    return sum(
        len(node.args) - 1 if node.op is Op.SUM else 1
        for node in reachable(roots)
        if node.op not in (Op.CONSTANT, Op.INPUT)
    )


def jacobian_nodes(carrier: Carrier) -> tuple[Vector, tuple[tuple[Vector, Vector], ...]]:
    """The tool point and, per joint, the columns (velocity, angular velocity) of the geometric Jacobian.

    World frame at the tool point. A turning joint gives (z x (p - o), z), a sliding one (z, 0), with z its axis and o a
    point on it (Craig, section on Jacobians in the force and velocity domain).
    """
    space, chain = carrier.space, carrier.chain
    frames = axis_frames(carrier)
    _, point = pose_columns(carrier, ())
    columns = []
    for joint, frame in zip(chain.joints, frames, strict=True):
        axis = space.column(frame.rotation, 2)
        if joint.turns:
            columns.append((space.cross(axis, space.minus(point, frame.shift)), axis))
        else:
            columns.append((axis, space.origin))
    return point, tuple(columns)


def axis_frames(carrier: Carrier) -> tuple[Rigid, ...]:
    """Per joint a frame in the world with z along its axis and its origin on it; x and y before the run turns."""
    space, chain = carrier.space, carrier.chain
    frames: list[Rigid] = []
    before = space.identity
    for run in parallels_of(chain):
        before = space.compose(before, chain.cores[run.first])
        for k in range(run.first, run.last + 1):
            sign = before.rotation if k == run.first else _cores_between(space, chain, run.first, k, before)
            part = Parallels(run.first, k - 1, run.headings[: k - run.first])
            start = carrier.point(part, chain.cores[k].shift) if k > run.first else space.origin
            frames.append(Rigid(sign, space.moved(before, start)))
        end = Rigid(_end_rotation(carrier, run), carrier.point(run, space.origin))
        before = space.compose(before, end)
    return tuple(frames)


def _cores_between(space: Space, chain: Chain, first: int, k: int, before: Rigid) -> Matrix:
    total = before.rotation
    for j in range(first + 1, k + 1):
        total = space.product(total, chain.cores[j].rotation)
    return total


def _end_rotation(carrier: Carrier, run: Parallels) -> Matrix:
    columns = [carrier.direction(run, axis) for axis in carrier.space.unit]
    return carrier.space.transposed((columns[0], columns[1], columns[2]))


def cumulative_pair(space: Space, single: Callable[[int], Pair], heading: Heading) -> Pair:
    """The pair of a heading from the pairs of its single angles."""
    total: Pair | None = None
    for index, sign in heading:
        pair = single(index) if sign > 0 else space.opposite(single(index))
        total = pair if total is None else space.sum_of(total, pair)
    assert total is not None
    return total

