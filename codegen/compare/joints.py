"""Which joint of the new arm is which of the old one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.compare.sides import Array, Integers
from codegen.model import Arm


@dataclass(frozen=True, slots=True)
class JointMap:
    """pairs  (position in the old arm, in the new one), by the old order; None where there is no counterpart."""

    pairs: tuple[tuple[int | None, int | None], ...]

    @property
    def both(self) -> tuple[tuple[int, int], ...]:
        return tuple((old, new) for old, new in self.pairs if old is not None and new is not None)

    @property
    def complete(self) -> bool:
        """Every joint has a counterpart."""
        return len(self.both) == len(self.pairs)

    @property
    def in_order(self) -> bool:
        return all(old == new for old, new in self.both)

    def to_new(self, q: Array, start: Array) -> Array:
        """Old joint values [N, n] as seeds of the new arm; joints without a counterpart stand at `start`."""
        return _carried(q, start, [(old, new) for old, new in self.both])

    def to_old(self, q: Array, start: Array) -> Array:
        return _carried(q, start, [(new, old) for old, new in self.both])

    def old_positions(self) -> Integers:
        return np.array([old for old, _ in self.both], dtype=np.int64)


def _carried(q: Array, start: Array, pairs: list[tuple[int, int]]) -> Array:
    carried = np.repeat(start[None], len(q), axis=0)
    for source, target in pairs:
        carried[:, target] = q[:, source]
    return carried


def match_joints(old: Arm, new: Arm) -> JointMap:
    """By name; then, between arms with as many joints, what is left over by its position: it was renamed."""
    names = {row.name: k for k, row in enumerate(new.joints)}
    found: dict[int, int] = {k: names[row.name] for k, row in enumerate(old.joints) if row.name in names}
    if len(old.joints) == len(new.joints):
        left_new = [k for k in range(len(new.joints)) if k not in found.values()]
        left_old = [k for k in range(len(old.joints)) if k not in found]
        found.update(zip(left_old, left_new, strict=True))
    pairs: list[tuple[int | None, int | None]] = [(k, found.get(k)) for k in range(len(old.joints))]
    pairs += [(None, k) for k in range(len(new.joints)) if k not in found.values()]
    return JointMap(tuple(pairs))
