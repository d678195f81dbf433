"""The plan of a sweep on many lanes at once: where the other joints stand for a value of the swept joint.

A sample is a rough place: square roots that do not exist are taken as zero, and what nears a solution is then stepped on to
it. The arithmetic is that of `lanes`, so what is measured with it is the same on every machine.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from codegen.evaluate import node_value
from codegen.geometry import Pair
from codegen.inverse.plan import BalanceStep, DirectionStep, SlideRootsStep, SlideStep, Step
from codegen.inverse.sweep import Sweep
from codegen.program import Node
from codegen.tracking.lanes import Flags, Lane, LanePoses, LaneVector, angle_of, sine_cosine

NOWHERE = -1.0  # of `spare`, where not even the size of what a joint turns is left

Values = dict[Node, Lane]
Numbers = npt.NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Samples:
    """One lane each.

    angle  of the swept joint's pair, rad
    spare  how much is left under the square root that is nearest to vanishing; negative where the branch is not there
    miss   of the equation that is left over
    place  where the joints stand: cosine and sine of turning ones, then the values of slides
    """

    angle: Lane
    spare: Lane
    miss: Lane
    place: LaneVector

    def take(self, lanes: Numbers) -> Samples:
        place = [entry[lanes] for entry in self.place]
        return Samples(self.angle[lanes], self.spare[lanes], self.miss[lanes], place)

    def where(self, chosen: Flags, other: Samples) -> Samples:
        """Of every lane this sample or the other."""
        return Samples(
            np.where(chosen, self.angle, other.angle),
            np.where(chosen, self.spare, other.spare),
            np.where(chosen, self.miss, other.miss),
            [np.where(chosen, own, its) for own, its in zip(self.place, other.place, strict=True)],
        )


def joined(parts: list[Samples]) -> Samples:
    """All lanes of the parts, one behind the other."""
    rows = [np.concatenate(row) for row in zip(*((part.angle, part.spare, part.miss) for part in parts), strict=True)]
    place = [np.concatenate(row) for row in zip(*(part.place for part in parts), strict=True)]
    return Samples(rows[0], rows[1], rows[2], place)


class Placing:
    """Samples of one sweep. Branches are numbered by their roots, the last step's digit first."""

    def __init__(self, sweep: Sweep, reach: float) -> None:
        self._sweep = sweep
        self._area = reach * reach
        self.branches = sweep.plan.branches

    def everywhere(self, target: LanePoses, joints: LaneVector, angle: Lane) -> list[Samples]:
        """Every branch. `joints` holds the values of joints that are held; those of the others are not read."""
        values = self._known(target, joints, angle)
        spare = np.full(len(angle), 1.0)
        with np.errstate(all="ignore"):
            return self._branches(self._sweep.plan.steps, values, spare, angle)

    def at(self, target: LanePoses, joints: LaneVector, branch: Numbers, angle: Lane) -> Samples:
        """Of every lane its own branch."""
        found = self.everywhere(target, joints, angle)
        chosen = found[0]
        for number, samples in enumerate(found[1:], start=1):
            chosen = samples.where(branch == number, chosen)
        return chosen

    def _known(self, target: LanePoses, joints: LaneVector, angle: Lane) -> Values:
        goal = self._sweep.goal
        values: Values = {}
        for k, axis in enumerate((target.x, target.y, target.z)):
            values.update({goal.rotation[i][k]: axis[i] for i in range(3)})
        values.update(zip(goal.position, target.point, strict=True))
        for index, pair in goal.held_pairs.items():
            values[pair.sine], values[pair.cosine] = sine_cosine(joints[index] + self._offset(index))
        for index, slide in goal.held_slides.items():
            values[slide] = joints[index] + self._offset(index)
        pair = self._sweep.pair
        values[pair.sine], values[pair.cosine] = sine_cosine(angle)
        return values

    def _offset(self, index: int) -> float:
        return float(self._sweep.goal.chain.joints[index].offset.value)

    def _branches(self, steps: tuple[Step, ...], values: Values, spare: Lane, angle: Lane) -> list[Samples]:
        if not steps:
            miss = _value(self._sweep.miss, values)
            return [Samples(angle, spare, miss, self._place(values))]
        step, rest = steps[0], steps[1:]
        match step:
            case DirectionStep():
                _set_pair(values, step.pair, step.x, step.y)
                return self._branches(rest, values, spare, angle)
            case SlideStep():
                values[step.value] = _value(step.numerator, values) / _value(step.denominator, values)
                return self._branches(rest, values, spare, angle)
            case BalanceStep() | SlideRootsStep():
                square = _value(step.square, values)
                spare = np.minimum(spare, self._share(step, square, values))
                root = np.sqrt(np.maximum(square, 0.0))
                ways = [self._chosen(step, dict(values), signed) for signed in (root, -root)]
                found = [self._branches(rest, way, spare, angle) for way in ways]
                return [samples for both in zip(*found, strict=True) for samples in both]
        raise TypeError(f"a sweep without {type(step).__name__}")

    def _share(self, step: BalanceStep | SlideRootsStep, square: Lane, values: Values) -> Lane:
        """The square against what it is made of."""
        if isinstance(step, SlideRootsStep):
            return square / self._area
        if step.size is None:
            return square
        size = _value(step.size, values)
        return np.where(size > 0.0, square / size, NOWHERE)

    def _chosen(self, step: BalanceStep | SlideRootsStep, values: Values, root: Lane) -> Values:
        values[step.root] = root
        if isinstance(step, BalanceStep):
            _set_pair(values, step.pair, step.x, step.y)
        else:
            values[step.value] = _value(step.middle, values) + root
        return values

    def _place(self, values: Values) -> LaneVector:
        pairs = self._sweep.plan.pairs.values()
        place = [values[entry] for pair in pairs for entry in (pair.cosine, pair.sine)]
        return place + [values[slide] for slide in self._sweep.plan.slides.values()]

    def joint_values(self, place: LaneVector, joints: LaneVector) -> LaneVector:
        """Of all joints, turning ones within half a turn of zero but for their offsets; held ones as in `joints`."""
        q, plan = list(joints), self._sweep.plan
        for k, index in enumerate(plan.pairs):
            q[index] = angle_of(place[2 * k], place[2 * k + 1]) - self._offset(index)
        for k, index in enumerate(plan.slides, start=2 * len(plan.pairs)):
            q[index] = place[k] - self._offset(index)
        return q


def _set_pair(values: Values, pair: Pair, x: Node, y: Node) -> None:
    """(x, y) brought to length 1; no turn where it has no direction."""
    across, along = _value(y, values), _value(x, values)
    length = np.sqrt(along * along + across * across)
    there = length > 0.0
    scale = 1.0 / np.where(there, length, 1.0)
    values[pair.cosine], values[pair.sine] = np.where(there, along * scale, 1.0), across * scale


def _value(node: Node, values: Values) -> Lane:
    if node not in values:
        for arg in node.args:
            _value(arg, values)
        values[node] = _lane(node, values)
    return values[node]


def _lane(node: Node, values: Values) -> Lane:
    return node_value(node, values, lambda value: np.float64(float(value)), _root, _where)  # type: ignore[no-any-return]


def _root(square: Lane) -> Lane:
    return np.sqrt(np.maximum(square, 0.0))


def _where(test: Lane, positive: Lane, other: Lane) -> Lane:
    return np.where(test > 0.0, positive, other)
