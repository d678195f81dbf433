"""Damped Newton steps as text that is ready to place into the templates: what both kinds of inverse take them with."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from codegen.emit.numbers import literal
from codegen.exact import MP, Real
from codegen.model import Arm, Task
from codegen.options import Options, RealType
from codegen.tracking.settings import DAMPING, LARGEST_MOVE, NEAR
from codegen.tracking.shape import ArmShape

MOST_LOOSE = 2
LEGS = 4  # of a radian each: more than half a turn
_LOST = 10**15
_SOLVED_UNITS = {RealType.FLOAT: 32, RealType.DOUBLE: 64}  # measured: residuals end below 25 units
_LOOSE = {RealType.FLOAT: Fraction(1, 10**6), RealType.DOUBLE: Fraction(1, 10**12)}
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


@dataclass(frozen=True, slots=True)
class StepsContext:
    """Every string and number that the templates of the steps place.

    numbers      (name, literal, comment) of constants
    positions    of the solved joints in q; used only where some joint is held
    units        how far a joint goes for one unit of its unknown; used only where some joint slides
    """

    task: str
    free_joints: int
    rows: int
    rows_text: str
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
    last_turning: int | None
    plane: bool
    plane_rows: tuple[tuple[str, str, str], ...]


    @property
    def most(self) -> int:
        """Evaluations of the Jacobian from one place at the very worst, where the pose leaves no joint free: the steps,
        and one look for a free joint."""
        return self._each + 1

    @property
    def most_free(self) -> int:
        """The same where the pose leaves joints free."""
        return self.most + most_loosening(self._each)

    @property
    def _each(self) -> int:
        return self.search_steps + self.finishing_steps + 1


def most_loosening(each: int) -> int:
    """What free joints add, `each` being the evaluations of one track: every joint goes to its seed in legs, each leg with
    a look and its own steps, then comes one more track and a look for the next."""
    return MOST_LOOSE * ((LEGS + 2) * (each + 1) + each + 1)


def steps_context(arm: Arm, shape: ArmShape, options: Options, search_steps: int) -> StepsContext:
    real = options.real
    plane = bool(shape.plane)
    return StepsContext(
        task=arm.task.key,
        free_joints=len(shape.free),
        rows=(2 if plane else 3) + _DIRECTION_ROWS.get(arm.task, 0),
        rows_text=_ROWS_TEXT[arm.task],
        most_loose=MOST_LOOSE,
        legs=LEGS,
        search_steps=search_steps,
        finishing_steps=FINISHING[real],
        held=len(shape.free) < len(arm.joints),
        positions=shape.free,
        slides=not all(shape.turning[joint] for joint in shape.free),
        turning_bits=f"0x{sum(shape.turning[joint] << j for j, joint in enumerate(shape.free)):X}",
        turning_joints=f"0x{sum(turns << i for i, turns in enumerate(shape.turning)):X}",
        units=tuple(literal(unit_of(shape, joint), real) for joint in shape.free),
        numbers=_numbers(shape, real),
        last_turning=shape.last_turning,
        plane=plane,
        plane_rows=tuple((literal(x, real), literal(y, real), literal(z, real)) for x, y, z in shape.plane),
    )


def unit_of(shape: ArmShape, joint: int) -> Real:
    return MP.mpf(1) if shape.turning[joint] else shape.slide_unit


def _numbers(shape: ArmShape, real: RealType) -> tuple[tuple[str, str, str], ...]:
    """(name, literal, comment)."""
    u = MP.mpf(real.rounding.numerator) / real.rounding.denominator
    solved = _SOLVED_UNITS[real] * u * (1 + shape.base_distance / shape.reach)
    rows: list[tuple[str, Real | Fraction | int, str]] = [
        ("LENGTH_SCALE", shape.length_scale, "1/m, a residual length of half the reach counts as 1 rad"),
        ("DAMPING", Fraction(str(DAMPING)), "of the residual"),
        ("LEAST_DAMPING", MP.sqrt(u), "keeps steps at singular places within rounding"),
        ("LARGEST_MOVE", Fraction(str(LARGEST_MOVE)), "of an unknown in one step"),
        ("CAUGHT", Fraction(str(NEAR)), "a residual from which a start may finish"),
        ("SOLVED", solved, "a residual that rounding alone can explain"),
        ("LOST", _LOST, "a residual beyond all arms"),
        ("LOOSE", _LOOSE[real], "squared length of a column that seems to depend on others"),
        ("LONGEST_LEG", 1, "of a free joint on its way to its seed"),
        ("SHORT_LEG", Fraction(1, 4), "by which it must be able to go either way"),
        ("LEAST_PART", Fraction(1, 8), "that it must take in the motion"),
        ("STRAIGHT", MP.pi, "rad, half a turn"),
        ("ONE_TURN", 2 * MP.pi, "rad"),
    ]
    return tuple((name, literal(value, real), comment) for name, value, comment in rows)
