"""What rounding alone can explain, per number type and size of the arm.

Each bound is a small multiple of u, half a unit in the last place of 1. They were chosen from measured rounding: a pose
from forward kinematics differs from the exact one by 2 u to 4 u of the reach; the multiples leave room for the inverse's
own steps and stay below the accuracy that is promised.
"""

from __future__ import annotations

from fractions import Fraction

from codegen.emit.numbers import literal
from codegen.exact import MP, Angle
from codegen.model import Arm, JointKind, Task
from codegen.options import Options

FREE_TURN, SLACK, STEP, EXCESS, FLAT = 32, 4096, 4, 16, 8
FREE = {24: 16, 53: 32}  # a pose in double is often computed in double: its own rounding counts
# by significand bits: of the reach, and an angle, rad: with the rounding of the joint values no more than twice what is
# promised, as at any edge
MISS = {24: (16, 60), 53: (86, 320)}
RETRACED = {24: (8, 24), 53: (40, 110)}
ROUGH = 512  # a double root is known to the root of this many roundings
NEARLY_ALONG = 1024  # below, two nearly equal roots are told apart otherwise
_ROUNDED_AT_MOST = 1e-3  # rad: more than rounding ever moves an angle within one turn
FAR = 4096  # times the reach: beyond it no answer is worth having, and products of four lengths still have a value


def reach_of(arm: Arm) -> Fraction:
    """The links, the slides' travel and the tool end to end: a distance from the base that the tool never exceeds; m."""
    total = sum((abs(x) for x in arm.tool.xyz), Fraction(0))
    for row in arm.joints:
        total += abs(row.a) + abs(row.d)
        if row.kind is JointKind.PRISMATIC and row.limits is not None:
            total += max(abs(limit) for limit in row.limits if isinstance(limit, Fraction))
    return total or Fraction(1)


def tolerance_rows(arm: Arm, options: Options, approximate: bool = False) -> list[tuple[str, str, str]]:
    """(name, literal, comment). `approximate`: a solution from approximate roots is brought nearer where it need not be."""
    u, reach = options.real.rounding, reach_of(arm)
    high, low = _full_turn(options)
    spread = MP.sqrt(2) if arm.task is Task.POSE else MP.mpf(1)  # a small turn's share in the entries of its matrix
    miss, turn = (RETRACED if approximate else MISS)[options.real.bits]

    def row(name: str, value: object, comment: str) -> tuple[str, str, str]:
        return name, literal(value, options.real), comment

    return [
        row("LARGEST", Fraction(2) ** (120 if options.real.bits < 30 else 1016), "rad or m: a joint value beyond it is none"),
        row("REACH", reach, "m, all links end to end"),
        row("FAR", FAR * (reach + _base_distance(arm)), "m, farther than any pose worth trying"),
        row("LEAST_LENGTH", FREE[options.real.bits] * u * reach, "m, a distance from an axis below which it is zero"),
        row("LEAST_ANGLE", FREE_TURN * u, "the same for entries of unit vectors"),
        row("SLACK", SLACK * u, "how negative a square may be before its root is out of reach"),
        row("WIDE_SLACK", _root(SLACK * u), "the same behind another root, known to half its digits where that one is double"),
        row("FLAT", FLAT * u, "how large it may be and still be zero but for rounding"),
        row("LEAST_ROUGH", _root(ROUGH * u), "part of a unit vector that a double root leaves unknown"),
        row("NEARLY_ALONG", NEARLY_ALONG * u, "squared sine of the angle between two lines that hardly cross"),
        row("LEAST_MISS", miss * u * reach, "m, a clamped solution may miss the point by this"),
        row("LEAST_TURN", turn * spread * MP.mpf(u.numerator) / u.denominator, "and what it reads of the rotation, summed up"),
        row("LEAST_STEP", STEP * u, "of a limit and of 1 rad or m: by this a joint may pass it"),
        row("LEAST_EXCESS", EXCESS * u, "a rotation's columns are this near to unit length and right angles"),
        row("HALF_TURN", MP.pi, "pi"),
        row("TURNS_PER_RADIAN", 1 / (2 * MP.pi), "1 / (2 pi)"),
        row("SHIFT", 3 * Fraction(2) ** (options.real.bits - 2), "adding it rounds to a whole number"),
        row("FULL_TURN", high, "2 pi in two parts: this one is exact when multiplied"),
        row("FULL_TURN_REST", low, "and what is left of it"),
    ]


def _root(value: Fraction) -> object:
    return MP.sqrt(MP.mpf(value.numerator) / value.denominator)


def _base_distance(arm: Arm) -> Fraction:
    return sum((abs(x) for x in arm.base.xyz), Fraction(0))


def _full_turn(options: Options) -> tuple[object, object]:
    """2 pi as a number with few digits, whose multiples are exact, and a remainder."""
    high = MP.mpf(2 * MP.pi, prec=options.real.bits // 2)
    return high, 2 * MP.pi - high


def slowness(arm: Arm, index: int) -> object:
    """1 / max_speed, s/rad or s/m; 1 where the file gives none (contract: a missing max_speed counts as 1)."""
    speed = arm.joints[index].max_speed
    if speed is None:
        return Fraction(1)
    return 1 / speed.value() if isinstance(speed, Angle) else 1 / speed


def limit_texts(arm: Arm, index: int, options: Options) -> tuple[str, str]:
    """The limits as literals; far beyond any joint where there are none."""
    limits = arm.joints[index].limits
    if limits is None:
        return literal(-(10**30), options.real), literal(10**30, options.real)
    low, high = (x.value() if isinstance(x, Angle) else x for x in limits)
    return literal(low, options.real), literal(high, options.real)


def within_one_turn(arm: Arm, index: int) -> bool:
    """Whether a turning joint's limits leave less than a whole turn, whatever rounding adds to it."""
    limits = arm.joints[index].limits
    if limits is None:
        return False
    low, high = (x.value() if isinstance(x, Angle) else x for x in limits)
    return bool(high - low < 2 * MP.pi - _ROUNDED_AT_MOST)
