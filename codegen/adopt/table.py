"""The link table of a chain of motions: which numbers a, alpha, d, theta give the same tool pose at every joint vector.

A chain is  T = K0 J1 K1 J2 ... Jn Kn,  each J a turn about its own z axis or a slide along it, each K constant. Row i
of a standard table is  J_i A_i,  A_i = Rot_z(theta) Trans_z(d) Trans_x(a) Rot_x(alpha): it places the next z axis,
with the x axis on their common normal (Denavit and Hartenberg, "A kinematic notation for lower-pair mechanisms based
on matrices", 1955). What A_i leaves over of K_i is a motion that commutes with the next joint, and is carried past it
into K_(i+1):

    Ki' = Ci Ki = A_i C(i+1)       C = Trans_z(e) Rot_z(phi) past a turn, Trans(any) Rot_z(phi) past a slide

K0 and the leftovers at both ends go into the base and tool frames. The z axes are the description's axes with their
signs, so that joint values keep sign and zero. Left free are the sign of each x axis, where a slide's axis lies, and
how much is left to base and tool; all combinations are tried, and the one with the fewest numbers that are not zero
is taken.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from codegen.adopt.rigid import (
    NO_SHIFT,
    NO_TURN,
    Motion,
    Rotation,
    about_x,
    about_z,
    angle_of,
    apply,
    clean,
    frame_of,
    multiply,
    shortest_decimal,
    transpose,
)
from codegen.adopt.snapping import LENGTH_NOISE, Snap
from codegen.exact import MP, Angle, Real
from codegen.model import Frame, JointKind

PARALLEL = 1e-6  # rad: axes nearer than this to parallel have no usable common normal
DERIVED_NOISE = 2e-6  # rad: what six typed digits of two directions add up to

# Costs. Any number is worth avoiding; a joint offset is more trouble than others, one in base or tool a little; a
# minus is ugly.
_NUMBER, _OFFSET, _IN_FRAME, _MINUS = 100, 20, 10, 1


@dataclass(frozen=True, slots=True)
class Links:
    """The four numbers of one row."""

    a: Fraction
    alpha: Angle
    d: Fraction
    theta: Angle


@dataclass(frozen=True, slots=True)
class Table:
    """Rows, base and tool; and each derived number that was taken for an exact one."""

    rows: tuple[Links, ...]
    base: Frame
    tool: Frame
    snaps: tuple[Snap, ...] = ()
    cost: int = 0


@dataclass(frozen=True, slots=True)
class _Step:
    """One row fitted to one constant motion, and what is left over."""

    links: Links
    left: Motion
    snaps: tuple[Snap, ...] = ()


def link_table(constants: Sequence[Motion], kinds: Sequence[JointKind], names: Sequence[str]) -> Table:
    """The table with the fewest numbers. constants K0..Kn, kinds and names of joints 1..n.

    Row by row. What later rows cost depends on the leftover alone, so of all tables with the same leftover the cheapest
    is kept (Bellman's principle), and the choices do not multiply.
    """
    tables = [
        (Table((), frame_of(base), Frame(), cost=_frame_cost(base)), left)
        for base, left in _bases(constants[0], kinds[0])
    ]
    for index, name in enumerate(names[:-1]):
        longer = [
            (_with_row(table, step, kinds[index]), step.left)
            for table, left in tables
            for step in _steps(left @ constants[index + 1], kinds[index + 1], name)
        ]
        tables = _cheapest_of_each_leftover(longer)
    finished = [
        _with_tool(_with_row(table, step, kinds[-1]), step.left)
        for table, left in tables
        for step in _last_steps(left @ constants[-1])
    ]
    return min(finished, key=lambda table: table.cost)  # the first of the cheapest: the same on every machine


def _with_row(table: Table, step: _Step, kind: JointKind) -> Table:
    cost = table.cost + _row_cost(step.links, kind)
    return replace(table, rows=(*table.rows, step.links), snaps=table.snaps + step.snaps, cost=cost)


def _with_tool(table: Table, tool: Motion) -> Table:
    return replace(table, tool=frame_of(tool), cost=table.cost + _frame_cost(tool))


def _cheapest_of_each_leftover(tables: list[tuple[Table, Motion]]) -> list[tuple[Table, Motion]]:
    best: dict[tuple[float, ...], tuple[Table, Motion]] = {}
    for table, left in tables:
        key = tuple(round(float(value), 12) + 0.0 for row in (*left.turn, left.shift) for value in row)
        if key not in best or table.cost < best[key][0].cost:
            best[key] = (table, left)
    return list(best.values())


def _row_cost(links: Links, kind: JointKind) -> int:
    lengths = (links.a, links.d)
    angles = (links.alpha.value(), links.theta.value())
    cost = sum(_NUMBER + _MINUS * (value < 0) for value in (*lengths, *angles) if value)
    offset = links.theta if kind is JointKind.REVOLUTE else links.d
    return cost + (_OFFSET if offset else 0)


def _frame_cost(motion: Motion) -> int:
    frame = frame_of(motion)
    angles = tuple(angle.value() for angle in frame.rpy)
    return sum(_NUMBER + _IN_FRAME + _MINUS * (value < 0) for value in (*frame.xyz, *angles) if value)


def _bases(constant: Motion, kind: JointKind) -> Iterator[tuple[Motion, Motion]]:
    """Ways to split K0 into a base and a motion that commutes with joint 1."""
    back = transpose(constant.turn)
    along = apply(back, constant.shift)
    shifts = [NO_SHIFT, (0, 0, along[2])]
    if kind is JointKind.PRISMATIC:
        shifts.append(along)
    for shift in dict.fromkeys(shifts):
        for turn in _turns_to_try(constant.turn):
            carried = Motion(turn, shift)
            yield constant @ carried.inverse(), carried


def _turns_to_try(turn: Rotation) -> list[Rotation]:
    """Turns about z to set apart from a rotation: quarter turns, and its own turn where the z axis stays upright."""
    turns = [about_z(1, 0), about_z(0, 1), about_z(-1, 0), about_z(0, -1)]
    if abs(turn[2][2]) == 1:
        turns.append(about_z(turn[0][0], -turn[0][1]))
    return list(dict.fromkeys(turns))


def _steps(motion: Motion, following: JointKind, name: str) -> Iterator[_Step]:
    """Rows that put the next z axis where the motion has it."""
    straightened, snaps = _straighten(motion, name)
    across = MP.sqrt(straightened.turn[0][2] ** 2 + straightened.turn[1][2] ** 2)
    for sign in (1, -1):
        if across:
            yield _common_normal(straightened, across, sign, name)
        else:
            yield _parallel(straightened, sign, name, snaps)
        if following is JointKind.PRISMATIC:
            yield _free_axis(straightened, across, sign, name, snaps)


def _straighten(motion: Motion, name: str) -> tuple[Motion, tuple[Snap, ...]]:
    """Makes axes parallel that are so but for rounding."""
    turn = motion.turn
    across = MP.sqrt(turn[0][2] ** 2 + turn[1][2] ** 2)
    if across == 0 or across > PARALLEL:
        return motion, ()
    size = MP.sqrt(turn[0][0] ** 2 + turn[1][0] ** 2)
    flat = about_z(turn[0][0] / size, turn[1][0] / size)
    parallel = flat if turn[2][2] > 0 else multiply(flat, about_x(-1, 0))
    degrees = "0" if turn[2][2] > 0 else "180"
    typed = f"axes {MP.nstr(MP.asin(across) * 180 / MP.pi, 3)} deg from parallel"
    return Motion(parallel, motion.shift), (
        Snap(f'row "{name}" alpha', typed, f"{degrees} deg", float(across), "rad", derived=True),
    )


def _common_normal(motion: Motion, across: Real, sign: int, name: str) -> _Step:
    """Axes that are not parallel: x along their common normal, in one of its two directions."""
    u, p = tuple(row[2] for row in motion.turn), motion.shift
    cosine, sine = clean(-sign * u[1] / across), clean(sign * u[0] / across)
    sin_alpha = clean(u[0] * sine - u[1] * cosine)  # -(u . y), where y = (-sine, cosine, 0)
    along_next = (p[1] * cosine - p[0] * sine) / sin_alpha  # from the motion's origin to the normal's foot
    a = clean(p[0] * cosine + p[1] * sine)
    d = clean(p[2] + along_next * u[2])
    left_turn = multiply(about_x(u[2], -sin_alpha), multiply(about_z(cosine, -sine), motion.turn))
    return _rounded(name, a, (u[2], sin_alpha), d, (cosine, sine), Motion(left_turn, (0, 0, clean(-along_next))))


def _parallel(motion: Motion, sign: int, name: str, snaps: tuple[Snap, ...]) -> _Step:
    """Parallel axes: d is free, and carried on whole, where it joins the next row's."""
    x, y, z = motion.shift
    a = MP.sqrt(x * x + y * y)
    cosine, sine = (clean(sign * x / a), clean(sign * y / a)) if a > LENGTH_NOISE else (1, 0)
    cos_alpha = motion.turn[2][2]
    left_turn = multiply(about_x(cos_alpha, 0), multiply(about_z(cosine, -sine), motion.turn))
    left = Motion(left_turn, (0, 0, cos_alpha * z))
    step = _rounded(name, clean(sign * a) if a > LENGTH_NOISE else a, (cos_alpha, 0), 0, (cosine, sine), left)
    return replace(step, snaps=snaps + step.snaps)


def _free_axis(motion: Motion, across: Real, sign: int, name: str, snaps: tuple[Snap, ...]) -> _Step:
    """A slide may lie anywhere: through this origin, with the whole shift carried on past it."""
    u = tuple(row[2] for row in motion.turn)
    cosine, sine = (clean(-sign * u[1] / across), clean(sign * u[0] / across)) if across else (sign, 0)
    sin_alpha = clean(u[0] * sine - u[1] * cosine)
    back = multiply(about_x(u[2], -sin_alpha), about_z(cosine, -sine))
    left = Motion(multiply(back, motion.turn), apply(back, motion.shift))
    step = _rounded(name, 0, (u[2], sin_alpha), 0, (cosine, sine), left)
    return replace(step, snaps=snaps + step.snaps)


def _rounded(name: str, a: Real, alpha: tuple[Real, Real], d: Real, theta: tuple[Real, Real], left: Motion) -> _Step:
    """The four numbers as the file will hold them, exact ones recognised."""
    lengths = [_exact_length(value, f'row "{name}" {key}') for key, value in (("a", a), ("d", d))]
    angles = [_exact_angle(pair, f'row "{name}" {key}') for key, pair in (("alpha", alpha), ("theta", theta))]
    snaps = tuple(snap for _, snap in (*lengths, *angles) if snap is not None)
    return _Step(Links(lengths[0][0], angles[0][0], lengths[1][0], angles[1][0]), left, snaps)


def _exact_length(value: Real, where: str) -> tuple[Fraction, Snap | None]:
    if value == 0 or abs(value) >= LENGTH_NOISE:
        return shortest_decimal(value), None
    return Fraction(0), Snap(where, f"{MP.nstr(value, 3)} m", "0 m", float(abs(value)), "m", derived=True)


def _exact_angle(pair: tuple[Real, Real], where: str) -> tuple[Angle, Snap | None]:
    found = angle_of(*pair)
    if found.quarter_turns is not None:
        return found, None
    exact = Angle.degrees(90 * round(found.half_turns * 2))
    size = abs((found - exact).value())
    if size >= DERIVED_NOISE:
        return found, None
    degrees = int(exact.half_turns * 180)
    return exact, Snap(
        where, f"{MP.nstr(found.value() * 180 / MP.pi, 10)} deg", f"{degrees} deg", float(size), "rad", derived=True
    )


def _last_steps(motion: Motion) -> Iterator[_Step]:
    """Ways to share the last constant motion between the last row and the tool frame."""
    whole = _as_one_row(motion)
    if whole is not None:
        yield whole
    for shift in dict.fromkeys([NO_SHIFT, (0, 0, motion.shift[2])]):
        for turn in _turns_to_try(transpose(motion.turn)):
            part = Motion(transpose(turn), shift)
            yield _Step(
                Links(
                    a=Fraction(0),
                    alpha=Angle(),
                    d=shortest_decimal(shift[2]),
                    theta=angle_of(part.turn[0][0], part.turn[1][0]),
                ),
                part.inverse() @ motion,
            )


def _as_one_row(motion: Motion) -> _Step | None:
    """The motion as one row and no tool frame, where it has that form."""
    turn, (x, y, z) = motion.turn, motion.shift
    cosine, sine = turn[0][0], turn[1][0]
    across = clean(x * sine - y * cosine)
    if turn[2][0] != 0 or across != 0:
        return None
    links = Links(
        shortest_decimal(clean(x * cosine + y * sine)),
        angle_of(turn[2][2], turn[2][1]),
        shortest_decimal(z),
        angle_of(cosine, sine),
    )
    return _Step(links, Motion(NO_TURN))
