"""What the generated functions cost, counted on the program's nodes and on the steps of the plan.

Counted: the formulas as they stand, and what each solvable form adds to them (a root, a pair brought to length 1, the
angle of a returned joint held against its seed). Not counted: comparisons, changes of sign, products of constants,
copies, the check of the input, and the seldom case of an angle that whole turns bring to its seed. Subtractions count as
additions; both sides of a choice are counted. A form with four roots is counted at its worst: every search step taken,
every root there.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, fields
from typing import assert_never

from codegen.emit.expression import Constants
from codegen.emit.inverse_text import InverseText
from codegen.emit.motion_text import MotionText
from codegen.emit.tolerances import within_one_turn
from codegen.forward import jacobian_nodes, pose_nodes
from codegen.geometry import Pair
from codegen.inverse.known_length import known_length
from codegen.inverse.plan import (
    BalanceStep,
    DirectionStep,
    QuarticStep,
    RefineStep,
    SlideQuarticStep,
    SlideRootsStep,
    SlideStep,
    Step,
    Variable,
)
from codegen.inverse.tasks import Derivation
from codegen.model import Arm
from codegen.options import Mathematics, Options
from codegen.program import Node, Op, reachable


@dataclass(frozen=True, slots=True)
class OperationCount:
    """How often each operation is done; `sine_cosine_pairs` are sine and cosine of one angle, taken together."""

    additions: int = 0
    multiplications: int = 0
    divisions: int = 0
    roots: int = 0
    arc_tangents: int = 0
    sine_cosine_pairs: int = 0

    def __add__(self, other: OperationCount) -> OperationCount:
        return OperationCount(*(getattr(self, f.name) + getattr(other, f.name) for f in fields(self)))

    def minus(self, other: OperationCount) -> OperationCount:
        return self + other.times(-1)

    def times(self, count: int) -> OperationCount:
        return OperationCount(*(getattr(self, f.name) * count for f in fields(self)))


@dataclass(frozen=True, slots=True)
class InverseCount:
    """one_branch: arm_inverse; all_branches: arm_inverse_all, where stages are shared; worst: it has a search in it."""

    one_branch: OperationCount
    all_branches: OperationCount
    worst: bool


_NOTHING = OperationCount()
UNIT = OperationCount(additions=1, multiplications=4, divisions=1, roots=1)  # (x, y) brought to length 1
SETTLE = OperationCount(additions=1)  # how far a returned angle is from its seed
SHARED_ROOT = OperationCount(multiplications=2, divisions=1)  # the same where its length is known
TIDY = OperationCount(additions=2, multiplications=5)  # a pair of almost length 1 brought to length 1
DOUBT = OperationCount(divisions=1, roots=1)  # how far off an angle may be
_NEWTON = OperationCount(additions=7, multiplications=19, divisions=1)  # two equations in two unknowns
_TURN_BY = OperationCount(additions=2, multiplications=2) + UNIT
_SEARCH_STEPS = {24: 30, 53: 60}  # of one root of a polynomial, by the bits of the number type
_MOST_CROSSINGS = 6  # that one polynomial of fourth degree can note, double ones included


def counted(nodes: Iterable[Node]) -> OperationCount:
    """The arithmetic of nodes, each done once."""
    total = _NOTHING
    for node in nodes:
        match node.op:
            case Op.SUM:
                total += OperationCount(additions=len(node.args) - 1)
            case Op.PRODUCT:
                total += OperationCount(multiplications=1)
            case Op.QUOTIENT:
                total += OperationCount(divisions=1)
            case Op.ROOT:
                total += OperationCount(roots=1)
            case Op.CONSTANT | Op.INPUT | Op.SIZE | Op.CHOICE:
                pass
            case _:
                assert_never(node.op)
    return total


# -- functions that start from joint values ----------------------------------------------------------------------------
def forward_count(arm: Arm, options: Options) -> OperationCount:
    motion = MotionText(arm, options, Constants(options))
    pose = pose_nodes(motion.carrier)
    return motion_count(motion, [*pose.position, *(entry for row in pose.rotation for entry in row)])


def jacobian_count(arm: Arm, options: Options, derivation: Derivation | None) -> OperationCount:
    """Where the inverse takes Newton steps, the C makes the pose beside the Jacobian: they need both."""
    with_pose = derivation is None or derivation.plan.retraced
    motion = MotionText(arm, options, Constants(options))
    _, columns = jacobian_nodes(motion.carrier)
    results = [entry for column in columns for vector in column for entry in vector]
    if with_pose:
        pose = pose_nodes(motion.carrier)
        results += [*pose.position, *(entry for row in pose.rotation for entry in row)]
    return motion_count(motion, results)


def motion_count(motion: MotionText, results: list[Node]) -> OperationCount:
    """Results that start from joint values: each angle is summed and its pair taken once."""
    used = reachable(results)
    total = counted(used)
    for heading, pair in motion.values.pairs.items():
        if pair.cosine in used or pair.sine in used:
            total += counted(reachable([motion.values.angle(heading)])) + OperationCount(sine_cosine_pairs=1)
    return total


# -- the inverse -------------------------------------------------------------------------------------------------------
def inverse_count(derivation: Derivation, options: Options) -> InverseCount:
    """Of an ordinary solution: within the limits, no joint free."""
    stages = stage_counts(derivation, options)
    one = all_branches = _NOTHING
    runs = 1
    image = _mirror_count(derivation, options)
    for number, (count, roots) in enumerate(stages):
        runs *= roots
        one += count
        if image is not None and number == len(stages) - 1:
            one += _half_turns(derivation, options)
            all_branches += (count + image).times(runs // 2)
        else:
            all_branches += count.times(runs)
    worst = any(step.roots == 4 for step in derivation.plan.steps)
    if worst:
        check = _reach_check(derivation, options)
        one, all_branches = one + check, all_branches + check.times(runs)
    return InverseCount(one, all_branches, worst)


def _mirror_count(derivation: Derivation, options: Options) -> OperationCount | None:
    """What the mirror image of a solution takes: half turns of its angles. None where there is none."""
    flips = InverseText(derivation, options, Constants(options)).mirror()
    if not flips:
        return None
    total = _NOTHING
    for flip in flips:
        total += OperationCount(additions=int(flip.cosine)) + _noted_turn(derivation, flip.joint)
    return total


def _half_turns(derivation: Derivation, options: Options) -> OperationCount:
    """What the second solution of the last stage takes more than its first where it alone is wanted."""
    flips = InverseText(derivation, options, Constants(options)).mirror()
    return OperationCount(additions=sum(flip.cosine for flip in flips))


def stage_counts(derivation: Derivation, options: Options) -> list[tuple[OperationCount, int]]:
    """Per stage (what no choice changes first): one run of it, and how many roots its choice has."""
    text = InverseText(derivation, options, Constants(options))
    made = [_Made(number, frozenset(text.carried)) for number in range(len(text.stages))]
    counts = [_held_count(derivation), *(_NOTHING for _ in text.stages[1:])]
    for number, steps in enumerate(text.stages):
        for place, step in enumerate(steps):
            length = known_length(step, steps[:place])
            own, repeated = _nodes_of(step) if length is None else ([length.x, length.y], [])
            if step.roots == 4:  # its coefficients stand at the end of the stage before
                counts[number - 1] += counted(made[number - 1].new(own)) + _search_count(step, options)
                own = []
            counts[number] += counted(made[number].new(own))
            for node in made[number].new(repeated):
                counts[number] += counted([node]).times(_passes(step) if node.stage == number else 1)
            form = _form_count(derivation, step, text.unread, options)
            counts[number] += form if length is None else form + SHARED_ROOT.minus(UNIT)
    for node in text.carried:
        counts[node.stage] += counted(made[node.stage].new([node]))
    return list(zip(counts, [1, *(steps[0].roots for steps in text.stages[1:])], strict=True))


class _Made:
    """The values that one stage makes: what it does not read from the stages before, each once."""

    def __init__(self, number: int, carried: frozenset[Node]) -> None:
        self._number, self._carried = number, carried
        self._done: set[Node] = set()

    def new(self, roots: list[Node]) -> list[Node]:
        found, waiting = [], list(roots)
        while waiting:
            node = waiting.pop()
            read = node.stage < self._number and node in self._carried
            if not read and node not in self._done:
                self._done.add(node)
                found.append(node)
                waiting += node.args
        return found


def _held_count(derivation: Derivation) -> OperationCount:
    """Pairs and slides of held joints, from the seed."""
    goal = derivation.goal
    total = _NOTHING
    for index in goal.arm.held_indices:
        total += _offset_count(derivation, index) + OperationCount(sine_cosine_pairs=int(index in goal.held_pairs))
    return total


def _passes(step: Step) -> int:
    return step.passes if isinstance(step, RefineStep) else 1


def _nodes_of(step: Step) -> tuple[list[Node], list[Node]]:
    """What a step reads once, and what it reads in every pass."""
    match step:
        case DirectionStep():
            read = step.rough or step.doubt is not None
            return [*([step.turned] if read and step.turned is not None else []), step.x, step.y], []
        case BalanceStep():
            extra = [step.flat] if step.size is None else [step.flat, step.size, step.target]
            return [node for node in extra if node] + [step.square, step.x, step.y], []
        case SlideStep():
            return [step.numerator, step.denominator], []
        case SlideRootsStep():
            return [step.flat, step.middle, step.square], []
        case QuarticStep() | SlideQuarticStep():
            return list(step.coefficients), []
        case RefineStep():
            return list(step.scales), [*step.residuals, *step.slopes[0], *step.slopes[1]]
        case _:
            assert_never(step)


def _form_count(
    derivation: Derivation, step: Step, unread: frozenset[Pair], options: Options
) -> OperationCount:
    """What the form adds to the formulas of its step."""
    match step:
        case DirectionStep():
            unit = _NOTHING if step.pair in unread else UNIT
            return unit + DOUBT.times(int(step.doubt is not None)) + _settled_turn(derivation, step.joint, options)
        case BalanceStep():
            to_length = UNIT if step.doubts else TIDY
            doubts = DOUBT.times(int(step.doubt is not None)) + OperationCount(additions=len(step.doubts))
            own = OperationCount(roots=1) + _balance_count(step) + to_length + doubts
            return own + _settled_turn(derivation, step.joint, options)
        case SlideStep():
            return _division(step) + _settled_slide(derivation, step.joint)
        case SlideRootsStep():
            added = OperationCount(
                additions=int(not step.middle.is_exactly(0)), multiplications=int(not step.flat.is_constant), roots=1
            )
            return added + _settled_slide(derivation, step.joint)
        case QuarticStep() | SlideQuarticStep():
            return _NOTHING
        case RefineStep():
            changes = _NOTHING
            for variable in step.variables:
                changes += OperationCount(additions=1) if isinstance(variable.during, Node) else _TURN_BY
            total = (_NEWTON + changes).times(step.passes)
            for variable in step.variables:
                total += _settled_variable(derivation, variable, options)
            return total
        case _:
            assert_never(step)


def _balance_count(step: BalanceStep) -> OperationCount:
    """How far the square may be from what rounding explains, and (c, s) where A and B are no constants."""
    count = OperationCount(multiplications=int(step.flat is not None and not step.flat.is_constant))
    if step.size is None:
        return count
    count += OperationCount(multiplications=3, divisions=1)
    if not step.target.is_exactly(0):
        count += OperationCount(additions=1, multiplications=int(not step.target.is_constant))
    return count


def _division(step: SlideStep) -> OperationCount:
    if not step.denominator.is_constant:
        return OperationCount(divisions=1)
    return OperationCount(multiplications=int(not step.denominator.structural))


def _offset_count(derivation: Derivation, joint: int) -> OperationCount:
    return OperationCount(additions=int(not derivation.goal.chain.joints[joint].offset.is_exactly(0)))


def _settled_turn(derivation: Derivation, joint: int | None, options: Options) -> OperationCount:
    """
    The angle that is returned; a pair whose joint a later step settles, or that is no joint's, has none. The library's
    arc tangent is handed a sine that is no negative zero.
    """
    if joint is None:
        return _NOTHING
    arc = OperationCount(arc_tangents=1, additions=int(options.mathematics is Mathematics.LIBM))
    return arc + _noted_turn(derivation, joint)


def _noted_turn(derivation: Derivation, joint: int) -> OperationCount:
    """Its offset taken off, and held against its seed where its limits leave more than one turn of it."""
    arm = derivation.goal.arm
    if joint >= len(derivation.goal.chain.joints):
        return SETTLE
    return _offset_count(derivation, joint) + (_NOTHING if within_one_turn(arm, joint) else SETTLE)


def _settled_slide(derivation: Derivation, joint: int | None) -> OperationCount:
    return _NOTHING if joint is None else _offset_count(derivation, joint)


def _settled_variable(derivation: Derivation, variable: Variable, options: Options) -> OperationCount:
    if variable.joint >= len(derivation.goal.chain.joints):
        return _NOTHING
    if isinstance(variable.after, Node):
        return _settled_slide(derivation, variable.joint)
    return _settled_turn(derivation, variable.joint, options)


def _reach_check(derivation: Derivation, options: Options) -> OperationCount:
    """The pose reached against the pose wanted, where roots are approximate: their squares added up, by kind."""
    misses = derivation.misses()
    unread = InverseText(derivation, options, Constants(options)).unread
    kinds = {kind for kind, _ in misses}
    squares = OperationCount(additions=len(misses) - len(kinds), multiplications=len(misses))
    used = reachable([node for _, node in misses])
    units = UNIT.times(sum(bool({pair.cosine, pair.sine} & set(used)) for pair in unread))
    return counted(used) + squares + units


# -- at the worst: the search for four roots ---------------------------------------------------------------------------
def _search_count(step: Step, options: Options) -> OperationCount:
    """Both halves of the circle, or near and far slides: a quartic and its derivatives, each between the last one's."""
    halves = 2
    steps = _SEARCH_STEPS[options.real.bits]
    quartic = OperationCount(additions=5)
    for degree in range(1, 5):
        quartic += OperationCount(multiplications=degree + 1) + _crossings_count(degree, steps)
    quartic += _prepared(step) + _noted(step).times(_MOST_CROSSINGS)
    scaling = OperationCount(multiplications=10) if isinstance(step, SlideQuarticStep) else _NOTHING
    return quartic.times(halves) + scaling


def _crossings_count(degree: int, steps: int) -> OperationCount:
    """As many intervals as the degree; in each a value at its end, and at the worst one search."""
    value = OperationCount(additions=degree, multiplications=degree)
    newton = OperationCount(additions=2 * degree + 3, multiplications=2 * degree + 2, divisions=1)
    search = value + OperationCount(additions=1, multiplications=1) + newton.times(steps)
    return value + (value + search).times(degree)


def _prepared(step: Step) -> OperationCount:
    """The coefficients in the half angle's tangent."""
    return OperationCount(additions=7, multiplications=7) if isinstance(step, QuarticStep) else _NOTHING


def _noted(step: Step) -> OperationCount:
    """One root turned into a pair or a slide, and compared with those already there."""
    if isinstance(step, QuarticStep):
        return OperationCount(additions=10, multiplications=10, divisions=1)
    return OperationCount(additions=2, multiplications=1, divisions=1)
