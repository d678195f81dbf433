"""Everything that is compared, in one value."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeVar

import numpy as np

from codegen.compare.branches import BranchNumbers, Numbering, branch_numbers
from codegen.compare.code_diff import code_diff
from codegen.compare.interface import Facet, facets
from codegen.compare.joints import JointMap, match_joints
from codegen.compare.motion import Accuracy, JointMoves, ToolMotion, accuracy, joint_moves, tool_motion
from codegen.compare.poses_file import GivenPose
from codegen.compare.reach import Exchange, Verdict, gained, lost, verdicts
from codegen.compare.shape import ShapeChange, shape_change
from codegen.compare.sides import Array, Side
from codegen.compare.table import Change, table_changes
from codegen.cost_static import OperationCount, forward_count, inverse_count, jacobian_count
from codegen.emit.tolerances import tolerance_rows
from codegen.options import Options

_NUMERIC_SHARE = 40  # a numeric inverse searches: fewer poses in the same time
_LEAST_NUMERIC = 100
T = TypeVar("T")


@dataclass(frozen=True, slots=True)
class Cost:
    """Operations of one function before and after; None where it has no fixed count."""

    function: str
    old: OperationCount | None
    new: OperationCount | None


@dataclass(frozen=True, slots=True)
class Comparison:
    """tool, moves  None where the joints of the two arms are not the same ones; verdicts: None without a poses file."""

    old: Side
    new: Side
    joints: JointMap
    table: tuple[Change, ...]
    shape: ShapeChange
    facets: tuple[Facet, ...]
    numbers: BranchNumbers
    tool: ToolMotion | None
    moves: JointMoves | None
    lost: Exchange
    gained: Exchange
    verdicts: tuple[Verdict, ...] | None
    costs: tuple[Cost, ...]
    accuracy: tuple[Accuracy, Accuracy]
    code: tuple[str, ...]

    @property
    def interface_changes(self) -> tuple[str, ...]:
        """The parts of the interface that changed; the meaning of branch numbers is one."""
        changed = [facet.what for facet in self.facets if not facet.same]
        if self.numbers.numbering in (Numbering.RENUMBERED, Numbering.VOID):
            changed.append("meaning of branch numbers")
        return tuple(changed)

    @property
    def poses_lost(self) -> bool:
        """Of the user's poses where there are such, else of those drawn."""
        if self.verdicts is not None:
            return any(verdict.lost for verdict in self.verdicts)
        return self.lost.missing > 0


@dataclass(frozen=True, slots=True)
class Effort:
    samples: int
    seed: int


def compare(
    old: Side,
    new: Side,
    options: Options,
    effort: Effort,
    given: tuple[GivenPose, ...] | None,
    progress: Callable[[int, int], None],
) -> Comparison:
    """Draws joint values from `effort.seed` and compares; progress is told (done, of)."""
    joints = match_joints(old.arm, new.arm)
    comparable = joints.complete and _same_types(old, new, joints)
    drawn = _Draws.of(old, new, joints, effort)
    stages = _Stages(progress)
    shape, interface = stages(lambda: shape_change(old, new, joints)), stages(lambda: facets(old, new, joints))
    numbers = stages(lambda: branch_numbers(old, new, drawn.old_common, drawn.new_common, comparable))
    kept = numbers.numbering is Numbering.KEPT
    tool = stages(lambda: tool_motion(old, new, drawn.old_common, drawn.new_common) if comparable else None)
    moves = stages(lambda: joint_moves(old, new, joints, drawn.old, kept) if comparable else None)
    return Comparison(
        old,
        new,
        joints,
        table_changes(old.arm, new.arm, joints),
        shape,
        interface,
        numbers,
        tool,
        moves,
        stages(lambda: lost(old, new, joints, drawn.old, kept)),
        stages(lambda: gained(old, new, joints, drawn.new)),
        stages(lambda: None if given is None else verdicts(old, new, joints, given, kept)),
        _costs(old, new, options),
        stages(lambda: (accuracy(old, drawn.old), accuracy(new, drawn.new))),
        code_diff(old.code, new.code, _saying_nothing(old, options) | _saying_nothing(new, options)),
    )


def _saying_nothing(side: Side, options: Options) -> frozenset[str]:
    """What the C declares that only says what rounding can explain, or which file it came from."""
    bounds = (name for name, _, _ in tolerance_rows(side.arm, options))
    return frozenset({*bounds, f"{options.prefix.upper()}_SOURCE_SHA256"})


class _Stages:
    """Tells how many of the stages are done."""

    _COUNT = 9

    def __init__(self, progress: Callable[[int, int], None]) -> None:
        self._progress, self._done = progress, 0

    def __call__(self, stage: Callable[[], T]) -> T:
        found = stage()
        self._done += 1
        self._progress(self._done, self._COUNT)
        return found


def _same_types(old: Side, new: Side, joints: JointMap) -> bool:
    return all(old.arm.joints[a].kind is new.arm.joints[b].kind for a, b in joints.both)


@dataclass(frozen=True, slots=True)
class _Draws:
    """Joint values: within both arms' limits (as each arm orders them), within the old ones, within the new ones."""

    old_common: Array
    new_common: Array
    old: Array
    new: Array

    @staticmethod
    def of(old: Side, new: Side, joints: JointMap, effort: Effort) -> _Draws:
        rng = np.random.default_rng(effort.seed)
        numeric = old.derivation is None or new.derivation is None
        fewer = max(_LEAST_NUMERIC, effort.samples // _NUMERIC_SHARE)
        searched = min(effort.samples, fewer) if numeric else effort.samples
        common = _common(old, new, joints, rng, effort.samples)
        in_new = joints.to_new(common, new.middle())
        return _Draws(common, in_new, _drawn(old, rng, searched), _drawn(new, rng, searched))


def _drawn(side: Side, rng: np.random.Generator, count: int) -> Array:
    low, high = side.table.low, side.table.high
    return low + (high - low) * rng.random((count, len(low)))


def _common(old: Side, new: Side, joints: JointMap, rng: np.random.Generator, count: int) -> Array:
    """Old joint values within both arms' limits; within the old ones where the two have nothing in common."""
    low, high = old.table.low.copy(), old.table.high.copy()
    for a, b in joints.both:
        inner_low, inner_high = max(low[a], new.table.low[b]), min(high[a], new.table.high[b])
        if inner_low <= inner_high and old.arm.joints[a].kind is new.arm.joints[b].kind:
            low[a], high[a] = inner_low, inner_high
    drawn: Array = low + (high - low) * rng.random((count, len(low)))
    return drawn


def _costs(old: Side, new: Side, options: Options) -> tuple[Cost, ...]:
    rows = [
        Cost("arm_forward", *(forward_count(side.arm, options) for side in (old, new))),
        Cost("arm_jacobian", *(jacobian_count(side.arm, options, side.derivation) for side in (old, new))),
    ]
    inverse = [inverse_count(side.derivation, options) if side.derivation else None for side in (old, new)]
    rows.append(Cost("arm_inverse, one branch", *(count.one_branch if count else None for count in inverse)))
    rows.append(Cost("arm_inverse_all", *(count.all_branches if count else None for count in inverse)))
    return tuple(rows)
