"""One of the two arms that are compared, with what the caller lends: the compiled C and the link table in numbers.

Nothing here compiles or multiplies link matrices; who does both hands them in. Arrays hold one row a joint vector or a
pose: joint values in rad and m, poses as [N, 12], the rotation row by row, then the position in m.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Protocol, TypeAlias

import numpy as np
import numpy.typing as npt

from codegen.armfile import ArmFile
from codegen.explain.structure import Structure, structure_of
from codegen.inverse.tasks import Derivation
from codegen.model import Arm

Array: TypeAlias = npt.NDArray[np.float64]
Integers: TypeAlias = npt.NDArray[np.int64]
Flags: TypeAlias = npt.NDArray[np.bool_]

OK, BAD_INPUT, BAD_BRANCH, OUT_OF_REACH, OVER_LIMIT, SINGULAR = range(6)  # arm_status
WITHIN = (OK, SINGULAR)  # reached, within the limits
STATUS_WORDS = ("reached", "bad input", "no such branch", "out of reach", "over a limit", "reached, singular")


class AllBranches(Protocol):
    """Joint values [N, B, n] and statuses [N, B]."""

    @property
    def q(self) -> Any: ...

    @property
    def status(self) -> Integers: ...


class Compiled(Protocol):
    """The generated functions over arrays; numbers go in and come out in the C's own type."""

    joints: int
    branches: int

    def forward(self, q: Any) -> tuple[Any, Integers]: ...
    def inverse(self, poses: Any, branches: Integers, seeds: Any) -> tuple[Any, Integers]: ...
    def inverse_all(self, poses: Any, seeds: Any) -> AllBranches: ...
    def inverse_nearest(self, poses: Any, seeds: Any) -> tuple[Any, Integers, Integers]: ...
    def branch_of(self, q: Any) -> Integers: ...


@dataclass(frozen=True, slots=True)
class Table:
    """The link table in numbers, without the C.

    poses   joint values [N, n] to poses [N, 12]
    errors  wanted poses [N, 12] and joint values [N, n] to what the task misses: m [N], rad [N]
    lower, upper, speeds  [n] limits (infinite where there are none), rad/s or m/s
    low, high  [n] the span to draw from: the limits, or a turn, or a fair length
    """

    poses: Callable[[Array], Array]
    errors: Callable[[Array, Array], tuple[Array, Array]]
    low: Array
    high: Array
    reach: float


@dataclass(frozen=True)
class Side:
    """One arm: without a derivation its inverse is numeric."""

    file: ArmFile
    derivation: Derivation | None
    code: dict[str, str]
    compiled: Compiled
    table: Table

    @property
    def arm(self) -> Arm:
        return self.file.arm

    @cached_property
    def structure(self) -> Structure:
        return structure_of(self.arm)

    def reached(self, poses: Array, seeds: Array) -> tuple[Flags, Integers]:
        """Whether some branch reaches each pose within the limits, and the status [N] of the best one."""
        status = self.compiled.inverse_all(poses, seeds).status
        within: Flags = np.asarray(np.isin(status, WITHIN).any(axis=1), dtype=np.bool_)
        bad = (status == BAD_INPUT).any(axis=1)
        over = (status == OVER_LIMIT).any(axis=1)
        best = np.where(within, OK, np.where(bad, BAD_INPUT, np.where(over, OVER_LIMIT, OUT_OF_REACH)))
        return within, best.astype(np.int64)

    def middle(self) -> Array:
        """[n] the middle of each joint's span, or zero where that is within it."""
        inside = (self.table.low <= 0.0) & (self.table.high >= 0.0)
        middle: Array = np.where(inside, 0.0, 0.5 * (self.table.low + self.table.high))
        return middle
