"""Two arms whose C is written by hand: they show that the checker passes good C and sees faults."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path

from link_tables import PRISMATIC, REVOLUTE

from codegen.exact import Angle
from codegen.model import Arm, Convention, JointKind, JointRow, Quantity, Task
from codegen.options import Mathematics, Options, RealType

FOLDER = Path(__file__).parent / "fixtures"
TURN = Angle.degrees


def joint(
    name: str,
    kind: JointKind,
    table: tuple[str, int, str, int],
    limits: tuple[str, str] | None,
    speed: str,
) -> JointRow:
    """table: a, alpha, d, theta in metres and degrees; limits and speed in radians or metres."""
    a, alpha, d, theta = table

    def quantity(text: str) -> Quantity:
        return Fraction(text) if kind is PRISMATIC else Angle(radians=Fraction(text))

    allowed = None if limits is None else (quantity(limits[0]), quantity(limits[1]))
    row = (Fraction(a), TURN(alpha), Fraction(d), TURN(theta))
    return JointRow(name, kind, *row, allowed, quantity(speed))


@dataclass(frozen=True, slots=True)
class HandWritten:
    """An arm beside its C."""

    arm: Arm

    def files(self, real: RealType = RealType.FLOAT, fault: tuple[str, str] | None = None) -> dict[str, str]:
        """The two files; `fault` replaces one piece of the C by another."""
        name = f"{self.arm.name}_kin"
        code, header = ((FOLDER / f"{name}.{suffix}").read_text() for suffix in "ch")
        if fault is not None:
            assert fault[0] in code, f"{name}.c has no {fault[0]!r}"
            code = code.replace(*fault)
        return {f"{name}.c": code, f"{name}.h": header.replace("typedef float", f"typedef {real.c_name}")}

    def options(self, real: RealType = RealType.FLOAT) -> Options:
        return Options(real, Mathematics.LIBM, self.arm.name)


TURRET = HandWritten(
    Arm(
        "turret",
        Convention.STANDARD,
        Task.POINT,
        (
            joint("yaw", REVOLUTE, ("0", 90, "0.25", 0), ("-4.5", "4.5"), "2"),
            joint("shoulder", REVOLUTE, ("0.3", 0, "0", 0), ("-2", "2.5"), "1"),
            joint("elbow", REVOLUTE, ("0.2", 0, "0", 0), ("-2.75", "2.75"), "4"),
        ),
    )
)
"""Four branches; free yaw on its axis; stretched and folded elbow; a yaw range of more than a turn."""

GANTRY = HandWritten(
    Arm(
        "gantry",
        Convention.STANDARD,
        Task.POSE,
        (
            joint("lift", PRISMATIC, ("0", 90, "0", 0), None, "0.5"),
            joint("across", PRISMATIC, ("0", 90, "0.1", 90), ("-0.5", "0.5"), "1"),
            joint("along", PRISMATIC, ("0", 0, "0", 0), ("-0.3", "0.9"), "0.25"),
            joint("turn", REVOLUTE, ("0", -90, "0", 0), ("-4.5", "4.5"), "3"),
            joint("tilt", REVOLUTE, ("0", 90, "0", 0), ("-2", "2.5"), "1"),
            joint("spin", REVOLUTE, ("0", 0, "0.08", 0), None, "6"),
        ),
    )
)
"""Two branches; a straight wrist; slides with and without limits; a rotation that is read whole."""
