"""Joints that rounding may leave in doubt, and the later roots that hang on them.

A joint found from a direction is off by the rounding of that direction against its length. Just beside a place where the
pose leaves the joint free this is much; often what follows makes up for it. Where a later root hangs on the joint, its
square may come out negative though the joint, a little to the side, reaches the pose: the root is then allowed what the
joint is in doubt by, and the solution is brought nearer.

Which roots hang on which joints is measured: at random joint values the joint is turned aside, what comes behind it is
solved again, and the squares of the roots are looked at. They must change to first order, and some turn must make one
negative: a wrist with right angles reaches every direction.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import product
from random import Random

from codegen.evaluate import evaluate
from codegen.geometry import Pair
from codegen.inverse.goal import Goal
from codegen.inverse.plan import BalanceStep, DirectionStep, Least, Plan, RefineStep, SlideRootsStep, SlideStep, Step
from codegen.program import Node

_PLACES = 12  # random joint values
_ASIDE = 1e-6  # rad, for slopes
_SLOPE = 1e-5  # of a square, in parts of what it can be: below, it does not change to first order
_NEGATIVE = -1e-9
_TURNS = tuple(math.radians(45) * k for k in range(1, 8))

Values = dict[Node, float]


@dataclass(frozen=True, slots=True)
class Place:
    """All leaves of a plan at random joint values."""

    values: Values
    span: float


def with_doubts(plan: Plan, goal: Goal, known: dict[Node, Node]) -> Plan:
    """The plan with its doubts; `known` are its leaves by what they are where all joints are known."""
    last_root = max((k for k, step in enumerate(plan.steps) if isinstance(step, BalanceStep | SlideRootsStep)), default=0)
    candidates = [k for k, step in enumerate(plan.steps[:last_root]) if _may_be_free(step)]
    places = list(_places(goal, known)) if candidates else []
    steps = list(plan.steps)
    for k in candidates:
        hanging = _hanging(plan.steps, k, places)
        if not hanging:
            continue
        own = steps[k]
        assert isinstance(own, DirectionStep | BalanceStep)
        doubt = goal.solver.builder.fresh_stage(f"{own.angle}_doubt", _stage_of(plan.steps, k))
        steps[k] = replace(own, doubt=doubt)
        for later in hanging:
            step = steps[later]
            assert isinstance(step, BalanceStep | SlideRootsStep)
            steps[later] = replace(step, doubts=(*step.doubts, doubt))
    return replace(plan, steps=tuple(steps))


def _may_be_free(step: Step) -> bool:
    if isinstance(step, BalanceStep):  # one with a constant target has a size of no less
        return step.size is not None and (not step.target.is_constant or step.target.is_exactly(0))
    return isinstance(step, DirectionStep) and step.turned is not None and (step.rough or step.least is not Least.NOTHING)


def _stage_of(steps: tuple[Step, ...], index: int) -> int:
    return sum(step.roots > 1 for step in steps[: index + 1])


def _places(goal: Goal, known: dict[Node, Node]) -> Iterator[Place]:
    solver, rng = goal.solver, Random(20011)
    reach = sum((abs(row.a) + abs(row.d) for row in goal.arm.joints), start=0)
    span = float(reach) or 1.0
    for _ in range(_PLACES):
        values: Values = {}
        for pair in [*solver.known_pairs.values(), *goal.held_pairs.values()]:
            _put_pair(values, pair, rng.uniform(-math.pi, math.pi))
        for slide in [*solver.known_slides.values(), *goal.held_slides.values()]:
            values[slide] = rng.uniform(-span, span)
        pose = [*goal.position, *(entry for row in goal.rotation for entry in row)]
        for leaves in (pose, [leaf for leaf in known if leaf not in pose]):
            found = _evaluated([known[leaf] for leaf in leaves], values)
            values.update(zip(leaves, found, strict=True))
        yield Place(values, span)


def _put_pair(values: Values, pair: Pair, angle: float) -> None:
    values[pair.cosine], values[pair.sine] = math.cos(angle), math.sin(angle)


def _evaluated(nodes: list[Node], values: Values) -> list[float]:
    return evaluate(nodes, values, float, lambda x: math.sqrt(max(x, 0.0)))


def _hanging(steps: tuple[Step, ...], index: int, places: list[Place]) -> list[int]:
    """Later roots that change to first order with the joint of one step, and may have no root."""
    sloped: set[int] = set()
    for place in places:
        ahead, behind = (_squares(steps, index, place, aside) for aside in (_ASIDE, -_ASIDE))
        sloped |= {k for k in ahead if abs(ahead[k] - behind[k]) > 2 * _ASIDE * _SLOPE}
    negative: set[int] = set()
    for turn, place in product(_TURNS, places):
        if sloped <= negative:
            break
        negative |= {k for k, square in _squares(steps, index, place, turn).items() if square < _NEGATIVE}
    return sorted(sloped & negative)


def _settled(steps: tuple[Step, ...], index: int) -> tuple[Pair, int]:
    """The pair that a step settles, itself or once it is polished, and the first step that reads it."""
    step = steps[index]
    assert isinstance(step, DirectionStep | BalanceStep)
    for k in range(index + 1, len(steps)):
        polished = steps[k]
        for variable in polished.variables if isinstance(polished, RefineStep) else ():
            if variable.before == step.pair and isinstance(variable.after, Pair):
                return variable.after, k + 1
    return step.pair, index + 1


def _squares(steps: tuple[Step, ...], index: int, place: Place, aside: float) -> dict[int, float]:
    """Per later root its square, in parts of what it can be, when one joint stands aside by an angle."""
    values = dict(place.values)
    pair, first = _settled(steps, index)
    _put_pair(values, pair, math.atan2(values[pair.sine], values[pair.cosine]) + aside)
    squares = {}
    for k in range(first, len(steps)):
        step = steps[k]
        match step:
            case DirectionStep():
                x, y = _evaluated([step.x, step.y], values)
                _put_pair(values, step.pair, math.atan2(y, x))
            case BalanceStep():
                size = 1.0 if step.size is None else _evaluated([step.size], values)[0]
                (root,) = _evaluated([step.side], place.values)
                (square,) = _evaluated([step.square], values)
                squares[k] = square / size if size > 0.0 else 0.0
                values[step.root] = math.copysign(math.sqrt(max(square, 0.0)), root)
                x, y = _evaluated([step.x, step.y], values)
                _put_pair(values, step.pair, math.atan2(y, x))
            case SlideStep():
                numerator, denominator = _evaluated([step.numerator, step.denominator], values)
                values[step.value] = numerator / denominator if denominator != 0.0 else 0.0
            case SlideRootsStep():
                (root,) = _evaluated([step.side], place.values)
                square, middle = _evaluated([step.square, step.middle], values)
                squares[k] = square / place.span**2
                values[step.value] = middle + math.copysign(math.sqrt(max(square, 0.0)), root)
            case _:
                pass  # a quartic's roots, and their polish, come before what may be in doubt
    return squares
