"""The tracked inverse as text that is ready to place into `tracking.c.j2`, and what the header says of it."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from codegen.emit.numbers import literal
from codegen.emit.tolerances import slowness
from codegen.exact import MP, Real
from codegen.model import Arm, Task
from codegen.options import Options, RealType
from codegen.tracking.settings import SEARCH_STEPS
from codegen.tracking.shape import ArmShape
from codegen.tracking.starts import HELD_BACK, Measured, TrackingTables
from codegen.tracking.steps_context import FINISHING, most_loosening, unit_of
from codegen.tracking.sweeping import Swept
from codegen.tracking.walking import MOST_LAUNCHES, most_placed

ATTEMPTS = 4
ASIDE = 0.2
CLOSEST = 2.8  # the nearest second solution, in units of `solitude`, over the cases below: measured on nine arms
CLOSEST_CASES = 16000
_LARGEST_JOINT = {RealType.FLOAT: 2**120, RealType.DOUBLE: 2**1016}  # no sum of some overflows
_SURELY_SAME = {RealType.FLOAT: Fraction(1, 10**4), RealType.DOUBLE: Fraction(1, 10**8)}

_ALL = tuple(f"r[{i}][{j}]" for i in range(3) for j in range(3))
_READS = {
    Task.POSE: _ALL,
    Task.POINT_AXIS: ("r[0][2]", "r[1][2]", "r[2][2]"),
    Task.POINT_PITCH: ("r[0][2]", "r[1][2]", "r[2][2]"),
    Task.POINT_YAW: ("r[0][0]", "r[1][0]"),
    Task.PLANE_POSE: _ALL,
}


@dataclass(frozen=True, slots=True)
class TrackingContext:
    """Every string and number that the templates of the tracked inverse place, beside those of its steps.

    numbers      (name, literal, comment) of constants
    starts       the table, in `step_values`
    bounded      the reach is known, so targets beyond it need no search
    reads        entries of a pose that the task reads
    branch_text  lines for the header
    """

    attempts: int
    numbers: tuple[tuple[str, str, str], ...]
    starts: tuple[tuple[int, ...], ...]
    step_values: tuple[str, ...]
    bounded: bool
    closest: float
    closest_cases: int
    reads: tuple[str, ...]
    largest_joint: str
    branches: int
    branch_text: tuple[str, ...]


def tracking_context(arm: Arm, tables: TrackingTables, options: Options) -> TrackingContext:
    shape, real = tables.shape, options.real
    slides = not all(shape.turning[joint] for joint in shape.free)
    bounded = not slides and not shape.plane
    return TrackingContext(
        attempts=ATTEMPTS,
        numbers=_numbers(arm, shape, real, bounded),
        starts=tables.starts,
        step_values=tuple(literal(step, real) for step in tables.steps),
        bounded=bounded,
        closest=CLOSEST,
        closest_cases=CLOSEST_CASES,
        reads=("p[0]", "p[1]", "p[2]", *_READS.get(arm.task, ())),
        largest_joint=literal(_LARGEST_JOINT[real], real),
        branches=tables.branches,
        branch_text=branch_text(tables, options),
    )


@dataclass(frozen=True, slots=True)
class MostSteps:
    """Evaluations of the Jacobian at the very worst; `free`: more of them where the pose leaves joints free.

    placed  places of a sweep at the very worst; 0 where there is none
    """

    tracked: int
    tracked_free: int
    searched: int
    searched_free: int
    placed: int = 0


def most_steps(tables: TrackingTables, options: Options) -> MostSteps:
    """Of tracking from the seed, with all its attempts, and of the whole search.

    A start takes its steps, one look for a free joint, and one look half way to each solution known. A solution of a sweep
    takes one more look for another beside it, and perhaps two starts.
    """
    each = SEARCH_STEPS + FINISHING[options.real] + 1
    loosening = most_loosening(each)
    tracked = ATTEMPTS * each + 1
    starts = len(tables.starts) if tables.swept is None else MOST_LAUNCHES + 2 * tables.branches
    looks = 0 if tables.swept is None else tables.branches
    searched = tracked + starts * (each + 1 + tables.branches) + looks
    placed = 0 if tables.swept is None else most_placed(tables.swept.sweep.plan.branches, tables.swept.samples)
    return MostSteps(tracked, tracked + loosening, searched, searched + (starts + 1) * loosening, placed)


def branch_text(tables: TrackingTables, options: Options) -> tuple[str, ...]:
    """What the header says of this kind of inverse: what a branch number means, what is found, what it costs."""
    branches = f"{options.prefix.upper()}_BRANCHES"
    most, measured = most_steps(tables, options), tables.measured
    found = f"{measured.found} of {measured.solutions} solutions ({percent(measured)} %)"
    bound = (
        f"  {branches} is a proven bound; the most solutions seen at one pose were {tables.most_found}."
        if tables.proven
        else f"  The most solutions seen at one pose were {tables.most_found}; {branches} allows for {HELD_BACK} more."
    )
    return (
        "Inverse: numeric, for no closed form is known for this arm. Damped Newton steps with the exact Jacobian.",
        "  branch 0  the solution tracked from the seed: the one for a control loop. A few steps from a near seed,",
        f"            {most.tracked} at the very worst, {most.tracked_free} where the pose leaves joints free.",
        *(_table_text(tables, most) if tables.swept is None else _sweep_text(tables.swept, most)),
        f"  Found: {found} of {measured.poses} random poses, against a dense search.",
        bound,
        f"  {options.prefix}_inverse_nearest looks no further than branch 0 where that is certainly the nearest.",
    )


def percent(measured: Measured) -> str:
    """Of all solutions those that were found, rounded down: 100.00 means that none was missed."""
    hundredths = 10000 * measured.found // measured.solutions if measured.solutions else 10000
    return f"{hundredths // 100}.{hundredths % 100:02}"


def _table_text(tables: TrackingTables, most: MostSteps) -> tuple[str, ...]:
    return (
        f"  branch b  of the others, looked for from {len(tables.starts)} starts, the b-th to be reached from the",
        f"            seed: it names a solution only within one call. {tables.measured.mean_steps} steps on average,",
        f"            {most.searched} at the very worst, {most.searched_free} where the pose leaves joints free.",
    )


def _sweep_text(swept: Swept, most: MostSteps) -> tuple[str, ...]:
    branches, label = swept.sweep.plan.branches, swept.sweep.label
    return (
        "  branch b  of the others the b-th to be reached from the seed: it names a solution only within one call.",
        f"            They are looked for by a sweep: {label} goes all the way round, and at {swept.samples} places",
        f"            on each of {branches} branches the other joints follow in closed form, with one equation left over.",
        "            Steps start where that is nearly met.",
        f"            {swept.mean_steps} steps and {swept.mean_placed} places on average;",
        f"            at the very worst {most.searched} steps, {most.searched_free} where the pose leaves joints free,",
        f"            and {most.placed} places.",
    )


def _numbers(arm: Arm, shape: ArmShape, real: RealType, bounded: bool) -> tuple[tuple[str, str, str], ...]:
    """(name, literal, comment)."""
    least = min(_number(slowness(arm, joint)) * unit_of(shape, joint) for joint in shape.free)
    rows: list[tuple[str, Real | Fraction, str]] = [
        ("ASIDE", Fraction(str(ASIDE)), "between attempts from the seed"),
        ("SURELY_SAME", _SURELY_SAME[real], "two solutions as near as this are one"),
        ("PERHAPS_SAME", Fraction(1, 20), "as near as this they may be"),
        ("LEAST_SLOWNESS", least, "s, the least time that one unit of an unknown takes"),
    ]
    if bounded:
        rows += [
            ("LONGEST", shape.reach * (1 + MP.mpf(10) ** -5), "m, all links end to end"),
            *((f"FRAME_0_{axis}", shape.links[0][k, 3], "m, where they begin") for k, axis in enumerate("XYZ")),
        ]
    return tuple((name, literal(value, real), comment) for name, value, comment in rows)


def _number(value: object) -> Real:
    return MP.mpf(value.numerator) / value.denominator if isinstance(value, Fraction) else value
