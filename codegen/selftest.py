"""`generate --self-test`: C that a board runs at power-up, golden vectors in flash and one function that checks them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from codegen import VERSION
from codegen.emit.files import Source, command_line, environment
from codegen.emit.numbers import literal
from codegen.emit.tolerances import reach_of
from codegen.exact import MP, Real
from codegen.golden import GoldenVector, golden_vectors
from codegen.model import Arm, JointKind
from codegen.options import Options, RealType

DEFAULT_SIZE = 8
_ROOM = 2  # times what is promised: golden numbers are rounded too, and so is what the test computes
_PROMISED = {
    RealType.FLOAT: (Fraction(1, 10**6), Fraction(2, 10**6)),
    RealType.DOUBLE: (Fraction(1, 10**14), Fraction(2, 10**14)),
}
_LEAST_ANGLE_ERROR = 2  # ulp, with which the promise holds
_SEED_TURN = Fraction(1, 2)  # rad
_SEED_SLIDE = Fraction(1, 10)  # of the reach
_REFUSED = 1000000


@dataclass(frozen=True, slots=True)
class VectorText:
    """One vector as literals: joint values, rows of the rotation, position."""

    joints: tuple[str, ...]
    rotation: tuple[tuple[str, ...], ...]
    position: tuple[str, ...]


def selftest_files(
    arm: Arm, options: Options, source: Source, size: int = DEFAULT_SIZE, *, numeric: bool = False
) -> dict[str, str]:
    """`<prefix>_kin_selftest.c` and `.h` with `size` vectors. `numeric`: the inverse tracks from its seed."""
    vectors = golden_vectors(arm, size)
    p = options.prefix
    context = {
        "p": p,
        "P": p.upper(),
        "arm": arm.name,
        "command": f"{command_line(source, options)} --self-test --self-test-size {size}",
        "version": VERSION,
        "vectors": [_vector_text(vector, options.real) for vector in vectors],
        "zero": literal(0, options.real),
        "one": literal(1, options.real),
        "refused": literal(_REFUSED, options.real),
        "refused_text": f"{_REFUSED:,}".replace(",", " "),
        "seed_away": [literal(away, options.real) for away in _seed_away(arm, numeric)],
        **_allowances(arm, options, vectors),
    }
    return {f"{p}_kin_selftest.{end}": _render(f"selftest.{end}.j2", context) for end in ("h", "c")}


def is_numeric(files: dict[str, str], prefix: str) -> bool:
    """Whether the generated header says that the inverse tracks from its seed."""
    return f"#define {prefix.upper()}_INVERSE_NUMERIC" in files[f"{prefix}_kin.h"]


def _render(template: str, context: dict[str, object]) -> str:
    return environment().get_template(template).render(context)


def _vector_text(vector: GoldenVector, real: RealType) -> VectorText:
    def texts(values: Sequence[Real | Fraction]) -> tuple[str, ...]:
        return tuple(literal(value, real) for value in values)

    rows = tuple(texts(vector.rotation[3 * i : 3 * i + 3]) for i in range(3))
    return VectorText(texts(vector.joints), rows, texts(vector.position))


def _seed_away(arm: Arm, numeric: bool) -> list[Real | Fraction]:
    """Held joints are taken from the seed, and a numeric inverse follows it: there it stays."""
    return [
        Fraction(0) if numeric or index in arm.held_indices else _seed_step(arm, index)
        for index in range(len(arm.joints))
    ]


def _seed_step(arm: Arm, index: int) -> Fraction:
    return _SEED_TURN if arm.joints[index].kind is JointKind.REVOLUTE else _SEED_SLIDE * reach_of(arm)


def _allowances(arm: Arm, options: Options, vectors: Sequence[GoldenVector]) -> dict[str, object]:
    """One over each allowed deviation; a joint moves by at most 1 / sharpness of what its pose moves."""
    share, angle = _PROMISED[options.real]
    looser = Fraction(max(options.angle_error, _LEAST_ANGLE_ERROR), _LEAST_ANGLE_ERROR)
    room = _ROOM * looser
    reach = reach_of(arm) + sum((abs(length) for length in arm.base.xyz), Fraction(0))
    sharpness = min(vector.sharpness for vector in vectors)
    joint = sharpness / MP.mpf(_as_real(room * (share + angle)))

    def text(value: Real | Fraction) -> str:
        return literal(value, options.real)

    return {
        "per_position": text(1 / (room * share * reach)),
        "per_rotation": text(1 / (room * angle)),
        "per_joint": [
            text(joint if row.kind is JointKind.REVOLUTE else joint / _as_real(reach_of(arm))) for row in arm.joints
        ],
    }


def _as_real(value: Fraction) -> Real:
    return MP.mpf(value.numerator) / value.denominator
