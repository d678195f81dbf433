"""What an agreement run found: counts per check, worst errors and the joint values that gave them, the first failure.

Every value is a frozen dataclass of plain numbers and texts, so that results from several processes or machines join
in any order to the same report.
"""

from __future__ import annotations

import dataclasses
import json
import math
from collections.abc import Iterable
from dataclasses import dataclass
from enum import Enum
from typing import Any


class Check(Enum):
    """One row of the report: what must hold."""

    INTERFACE = "constants and types are the contract's"
    FORWARD = "forward kinematics is the link table's"
    JACOBIAN = "the Jacobian is the link table's"
    ATAN2 = "atan2 is right in every quadrant and special case"
    ROUND_TRIP = "every solution reaches its pose"
    EDGE_TRIP = "so does every solution at singular and boundary poses"
    KNOWN = "the joint values a pose came from are among its solutions"
    CLOSED = "each solution, as a new start, gives the same set"
    DISTINCT = "no two branches give one solution"
    BRANCH_OF = "branch_of and inverse give joint values back"
    STEADY = "a branch number stands for one posture: it changes at singularities only"
    TURNS = "joints come back at the turn nearest to the seed within limits"
    LIMITS = "OVER_LIMIT exactly when a joint has no turn within limits"
    HELD = "held joints keep their seed"
    ALL = "inverse_all repeats inverse and counts its solutions"
    NEAREST = "inverse_nearest takes the solution soonest reached"
    UNTOUCHED = "a status without a solution leaves the outputs alone"
    FINITE = "no NaN, no infinity and no unknown status comes out"
    OVERRUN = "no function writes past the end of its outputs"
    FREE_JOINT = "a pose that leaves a joint free gives SINGULAR"
    NOT_FREE = "SINGULAR only where a joint is free, and it keeps its seed"
    EDGE = "poses at singularities and at the edge of the reach are solved"
    UNREACHABLE = "poses out of reach give OUT_OF_REACH"
    BAD_INPUT = "NaN, infinity and matrices that are no rotation give BAD_INPUT"
    BAD_BRANCH = "a branch that does not exist gives BAD_BRANCH"
    UNREAD = "entries that the task does not read may hold anything"
    DRIFTED = "a drifted rotation is solved for the rotation it stands for"
    SEARCH = "an independent search finds no solution that inverse_all lacks"


@dataclass(frozen=True, slots=True)
class Worst:
    """The largest error seen, and the joint values (rad, m) of that case."""

    error: float
    joints: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Failure:
    """One case that failed: what was wrong, and everything that repeats it."""

    what: str
    details: dict[str, Any]


@dataclass(frozen=True, slots=True)
class CheckResult:
    """What one check found.

    cases       judged
    failed      of them
    undecided   not judged: rounding of the pose alone could account for the difference
    position    worst position error, m
    angle       worst angle error, rad
    lacking     of the cases, solutions that a numeric inverse did not find; it promises most, not all
    """

    check: Check
    cases: int = 0
    failed: int = 0
    undecided: int = 0
    position: Worst | None = None
    angle: Worst | None = None
    failure: Failure | None = None
    lacking: int = 0


def _worse(first: Worst | None, second: Worst | None) -> Worst | None:
    if first is None or second is None:
        return first or second
    return max(first, second, key=_badness)


def _badness(worst: Worst) -> tuple[float, str]:
    """An error that is no number is as large as can be. Equal errors are told apart by their joint values."""
    return math.inf if math.isnan(worst.error) else worst.error, repr(worst)


def _kept(first: Failure | None, second: Failure | None) -> Failure | None:
    if first is None or second is None:
        return first or second
    return min(first, second, key=repr)


def join(first: CheckResult, second: CheckResult) -> CheckResult:
    """Both together, the same in either order: of two failures, or of equal errors, the text decides which stands."""
    return CheckResult(
        first.check,
        first.cases + second.cases,
        first.failed + second.failed,
        first.undecided + second.undecided,
        _worse(first.position, second.position),
        _worse(first.angle, second.angle),
        _kept(first.failure, second.failure),
        first.lacking + second.lacking,
    )


def join_all(results: Iterable[CheckResult]) -> tuple[CheckResult, ...]:
    """One result per check, in the order of the report."""
    found: dict[Check, CheckResult] = {}
    for result in results:
        found[result.check] = join(found[result.check], result) if result.check in found else result
    return tuple(found[check] for check in Check if check in found)


@dataclass(frozen=True, slots=True)
class Run:
    """What was checked and how: all that repeats the run. Lengths in m, angles in rad."""

    arm: str
    task: str
    real: str
    mathematics: str
    prefix: str
    joints: int
    branches: int
    numeric: bool
    seed: int
    samples: int
    thorough: int
    reach: float
    position_budget: float
    angle_budget: float
    length_unit: str = "m"
    angle_unit: str = "rad"


@dataclass(frozen=True, slots=True)
class AgreeReport:
    """The outcome of `linkwright agree`."""

    run: Run
    results: tuple[CheckResult, ...]

    @property
    def agreed(self) -> bool:
        return not any(result.failed for result in self.results)

    @property
    def first_failure(self) -> tuple[Check, Failure] | None:
        for result in self.results:
            if result.failure is not None:
                return result.check, result.failure
        return None

    @property
    def worst_position(self) -> Worst | None:
        """Of every pose that a solution or forward kinematics gave, m."""
        return max((r.position for r in self.results if r.position), key=lambda worst: worst.error, default=None)

    @property
    def worst_angle(self) -> Worst | None:
        return max((r.angle for r in self.results if r.angle), key=lambda worst: worst.error, default=None)

    def result(self, check: Check) -> CheckResult:
        """What a check found; all zero when it did not apply to the arm."""
        return next((r for r in self.results if r.check is check), CheckResult(check))

    def to_json(self) -> str:
        """Every figure of the report; the same run gives the same text."""
        content = {
            "agreed": self.agreed,
            "run": dataclasses.asdict(self.run),
            "checks": [_check_content(result) for result in self.results],
        }
        return json.dumps(_writable(content), indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def _check_content(result: CheckResult) -> dict[str, Any]:
    content = dataclasses.asdict(result)
    content["check"] = result.check.name.lower()
    return {"check": content.pop("check"), "what": result.check.value, **content}


def _writable(value: Any) -> Any:
    """JSON has no NaN and no infinity: they become texts."""
    if isinstance(value, dict):
        return {key: _writable(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [_writable(item) for item in value]
    return str(value) if isinstance(value, float) and not math.isfinite(value) else value
