"""The tracked inverse as text that is ready to place into `tracking.c.j2`, and what the header says of it."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from codegen.emit.numbers import literal
from codegen.emit.tolerances import slowness
from codegen.exact import MP, Real
from codegen.model import Arm, Task
from codegen.options import Options, RealType
from codegen.tracking.batch import DAMPING, LARGEST_MOVE, NEAR, SEARCH_STEPS
from codegen.tracking.shape import ArmShape
from codegen.tracking.starts import HELD_BACK, TrackingTables

ATTEMPTS = 4
MOST_LOOSE = 2
LEGS = 3  # after a first one of a radian: two more radians make more than half a turn
ASIDE = 0.2
CLOSEST = 2.8  # the nearest second solution, in units of `solitude`, over the cases below: measured on nine arms
CLOSEST_CASES = 16000
_LOST = 10**15
_LARGEST_JOINT = {RealType.FLOAT: 2**120, RealType.DOUBLE: 2**1016}  # no sum of some overflows
_SOLVED_UNITS = {RealType.FLOAT: 32, RealType.DOUBLE: 64}  # measured: residuals end below 25 units
_LOOSE = {RealType.FLOAT: Fraction(1, 10**6), RealType.DOUBLE: Fraction(1, 10**12)}
_SURELY_SAME = {RealType.FLOAT: Fraction(1, 10**4), RealType.DOUBLE: Fraction(1, 10**8)}
FINISHING = {RealType.FLOAT: 10, RealType.DOUBLE: 22}  # at a double root the residual shrinks fourfold a step

_ROWS_TEXT = {
    Task.POSE: "position and rotation",
    Task.POINT_AXIS: "position and the tool's z axis",
    Task.POINT_PITCH: "position and one angle",
    Task.POINT_YAW: "position and one angle",
    Task.POINT: "position",
    Task.PLANE_POSE: "position in the plane and one angle",
    Task.PLANE_POINT: "position in the plane",
}
_DIRECTION_ROWS = {Task.POSE: 3, Task.POINT_AXIS: 3, Task.POINT_PITCH: 1, Task.POINT_YAW: 1, Task.PLANE_POSE: 1}
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
    """Every string and number that the templates of the tracked inverse place.

    numbers      (name, literal, comment) of constants
    positions    of the solved joints in q; used only where some joint is held
    units        how far a joint goes for one unit of its unknown; used only where some joint slides
    starts       the table, in `step_values`
    bounded      the reach is known, so targets beyond it need no search
    reads        entries of a pose that the task reads
    branch_text  lines for the header
    """

    task: str
    free_joints: int
    rows: int
    rows_text: str
    attempts: int
    most_loose: int
    legs: int
    search_steps: int
    finishing_steps: int
    held: bool
    positions: tuple[int, ...]
    slides: bool
    turning_bits: str
    turning_joints: str
    units: tuple[str, ...]
    numbers: tuple[tuple[str, str, str], ...]
    starts: tuple[tuple[int, ...], ...]
    step_values: tuple[str, ...]
    last_turning: int | None
    plane: bool
    plane_rows: tuple[tuple[str, str, str], ...]
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
    plane = bool(shape.plane)
    return TrackingContext(
        task=arm.task.key,
        free_joints=len(shape.free),
        rows=(2 if plane else 3) + _DIRECTION_ROWS.get(arm.task, 0),
        rows_text=_ROWS_TEXT[arm.task],
        attempts=ATTEMPTS,
        most_loose=MOST_LOOSE,
        legs=LEGS,
        search_steps=SEARCH_STEPS,
        finishing_steps=FINISHING[real],
        held=len(shape.free) < len(arm.joints),
        positions=shape.free,
        slides=slides,
        turning_bits=f"0x{sum(shape.turning[joint] << j for j, joint in enumerate(shape.free)):X}",
        turning_joints=f"0x{sum(turns << i for i, turns in enumerate(shape.turning)):X}",
        units=tuple(literal(_unit(shape, joint), real) for joint in shape.free),
        numbers=_numbers(arm, shape, real, bounded=not slides and not plane),
        starts=tables.starts,
        step_values=tuple(literal(step, real) for step in tables.steps),
        last_turning=shape.last_turning,
        plane=plane,
        plane_rows=tuple((literal(x, real), literal(y, real), literal(z, real)) for x, y, z in shape.plane),
        bounded=not slides and not plane,
        closest=CLOSEST,
        closest_cases=CLOSEST_CASES,
        reads=("p[0]", "p[1]", "p[2]", *_READS.get(arm.task, ())),
        largest_joint=literal(_LARGEST_JOINT[real], real),
        branches=tables.branches,
        branch_text=branch_text(tables, options),
    )


@dataclass(frozen=True, slots=True)
class MostSteps:
    """Evaluations of the Jacobian at the very worst; `free`: more of them where the pose leaves joints free."""

    tracked: int
    tracked_free: int
    searched: int
    searched_free: int


def most_steps(tables: TrackingTables, options: Options) -> MostSteps:
    """Of tracking from the seed, with all its attempts, and of the whole search.

    A start takes its steps, one look for a free joint, and one look half way to each solution known. Each joint that
    the pose leaves free goes to its seed in legs, each with a look and its own steps, and one more track at the end.
    """
    each = SEARCH_STEPS + FINISHING[options.real] + 1
    loosening = MOST_LOOSE * ((LEGS + 1) * (each + 1) + each + 1)
    tracked = ATTEMPTS * each + 1
    searched = tracked + len(tables.starts) * (each + 1 + tables.branches)
    return MostSteps(tracked, tracked + loosening, searched, searched + (len(tables.starts) + 1) * loosening)


def branch_text(tables: TrackingTables, options: Options) -> tuple[str, ...]:
    """What the header says of this kind of inverse: what a branch number means, what is found, what it costs."""
    branches = f"{options.prefix.upper()}_BRANCHES"
    most, measured = most_steps(tables, options), tables.measured
    found = f"{measured.found} of {measured.solutions} solutions ({100 * measured.share:.2f} %)"
    bound = (
        f"  {branches} is a proven bound; the most solutions seen at one pose were {tables.most_found}."
        if tables.proven
        else f"  The most solutions seen at one pose were {tables.most_found}; {branches} allows for {HELD_BACK} more."
    )
    return (
        "Inverse: numeric, for no closed form is known for this arm. Damped Newton steps with the exact Jacobian.",
        "  branch 0  the solution tracked from the seed: the one for a control loop. A few steps from a near seed,",
        f"            {most.tracked} at the very worst, {most.tracked_free} where the pose leaves joints free.",
        f"  branch b  of the others, looked for from {len(tables.starts)} starts, the b-th to be reached from the",
        f"            seed: it names a solution only within one call. {measured.mean_steps} steps on average,",
        f"            {most.searched} at the very worst, {most.searched_free} where the pose leaves joints free.",
        f"  Found: {found} of {measured.poses} random poses, against a dense search.",
        bound,
        f"  {options.prefix}_inverse_nearest looks no further than branch 0 where that is certainly the nearest.",
    )


def _unit(shape: ArmShape, joint: int) -> Real:
    return MP.mpf(1) if shape.turning[joint] else shape.slide_unit


def _number(value: object) -> Real:
    return MP.mpf(value.numerator) / value.denominator if isinstance(value, Fraction) else value


def _numbers(arm: Arm, shape: ArmShape, real: RealType, bounded: bool) -> tuple[tuple[str, str, str], ...]:
    """(name, literal, comment)."""
    u = real.rounding
    solved = _SOLVED_UNITS[real] * _number(u) * (1 + shape.base_distance / shape.reach)
    least = min(_number(slowness(arm, joint)) * _unit(shape, joint) for joint in shape.free)
    rows: list[tuple[str, Real, str]] = [
        ("LENGTH_SCALE", shape.length_scale, "1/m, a residual length of half the reach counts as 1 rad"),
        ("DAMPING", Fraction(str(DAMPING)), "of the residual"),
        ("LEAST_DAMPING", MP.sqrt(_number(u)), "keeps steps at singular places within rounding"),
        ("LARGEST_MOVE", Fraction(str(LARGEST_MOVE)), "of an unknown in one step"),
        ("CAUGHT", Fraction(str(NEAR)), "a residual from which a start may finish"),
        ("SOLVED", solved, "a residual that rounding alone can explain"),
        ("LOST", _LOST, "a residual beyond all arms"),
        ("LOOSE", _LOOSE[real], "squared length of a column that seems to depend on others"),
        ("LONGEST_LEG", 1, "of a free joint on its way to its seed"),
        ("LEAST_PART", Fraction(1, 8), "that it must take in the motion"),
        ("ASIDE", Fraction(str(ASIDE)), "between attempts from the seed"),
        ("SURELY_SAME", _SURELY_SAME[real], "two solutions as near as this are one"),
        ("PERHAPS_SAME", Fraction(1, 20), "as near as this they may be"),
        ("LEAST_SLOWNESS", least, "s, the least time that one unit of an unknown takes"),
        ("STRAIGHT", MP.pi, "rad, half a turn"),
        ("ONE_TURN", 2 * MP.pi, "rad"),
    ]
    if bounded:
        rows += [
            ("LONGEST", shape.reach * (1 + MP.mpf(10) ** -5), "m, all links end to end"),
            *((f"FRAME_0_{axis}", shape.links[0][k, 3], "m, where they begin") for k, axis in enumerate("XYZ")),
        ]
    return tuple((name, literal(value, real), comment) for name, value, comment in rows)
