"""Whether a branch number still names the same posture, tried at joint values drawn at random.

The same joint values lie on a branch of the old arm and on one of the new. Near the border between two branches a small
change moves the border, so a few joint values in a thousand may disagree although the numbering is the same.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

import numpy as np

from codegen.compare.sides import Array, Integers, Side

_CLEAR = 0.98  # of the joint values on one old branch lie on one new branch: a translation can be given


class Numbering(Enum):
    KEPT = "kept"
    RENUMBERED = "renumbered"
    VOID = "void"
    NONE = "none to store"


@dataclass(frozen=True, slots=True)
class BranchNumbers:
    """same: share of joint values that lie on a branch of the same number; translation: (old, new) numbers."""

    numbering: Numbering
    same: float | None
    translation: tuple[tuple[int, int], ...]
    means: str


def without_numbers(means: str) -> BranchNumbers:
    return BranchNumbers(Numbering.NONE, None, (), means)


def branch_numbers(old: Side, new: Side, q_old: Array, q_new: Array, comparable: bool) -> BranchNumbers:
    """From the same postures in both arms; `comparable` says whether joint values mean the same in both."""
    if old.derivation is None:
        return without_numbers("the old inverse is numeric: its numbers were good within one call only")
    if new.derivation is None:
        return _void("the new inverse is numeric, its numbers do not last")
    if old.compiled.branches == new.compiled.branches == 1:
        return without_numbers("there is one branch before and after")
    if not comparable:
        return _void("the joints are not the same ones")
    return _tried(old.compiled.branch_of(q_old), new.compiled.branch_of(q_new))


def _void(why: str, same: float | None = None) -> BranchNumbers:
    means = f"stored branch numbers are void ({why}): store joint values and ask arm_branch_of again"
    return BranchNumbers(Numbering.VOID, same, (), means)


def _tried(before: Integers, after: Integers) -> BranchNumbers:
    same = float(np.mean(before == after))
    likely = {int(b): _most_common(after[before == b]) for b in np.unique(before)}
    translation = tuple((b, number) for b, (number, _) in sorted(likely.items()))
    if all(b == number for b, number in translation):
        return BranchNumbers(Numbering.KEPT, same, translation, _kept(same))
    clear = all(share >= _CLEAR for _, share in likely.values())
    if clear and len({number for _, number in translation}) == len(translation):
        listed = ", ".join(f"{b} is now {number}" for b, number in translation if b != number)
        return BranchNumbers(Numbering.RENUMBERED, same, translation, f"translate stored branch numbers: {listed}")
    return _void("no fixed rule turns old numbers into new ones", same)


def _most_common(numbers: Integers) -> tuple[int, float]:
    values, counts = np.unique(numbers, return_counts=True)
    best = int(np.argmax(counts))
    return int(values[best]), float(counts[best] / len(numbers))


def _kept(same: float) -> str:
    if same == 1.0:
        return "stored branch numbers stay valid"
    few = f"{100 * (1 - same):.2g} %"
    return f"stored branch numbers stay valid, but for {few} of postures: those near the border of two branches"
