"""An arm file that is written reads back to the same Arm (contract, section 1: what each key means)."""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from codegen.armfile import read_arm
from codegen.armwriter import arm_file_text, decimal
from codegen.exact import Angle
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Task

SHIPPED = sorted((Path(__file__).parent.parent / "arms").glob("*.toml"))


def read_text(text: str, folder: Path) -> Arm:
    path = folder / "written.toml"
    path.write_text(text)
    return read_arm(path).arm


@pytest.mark.parametrize("path", SHIPPED, ids=lambda path: path.stem)
def test_shipped_arms_come_back(path: Path, tmp_path: Path) -> None:
    arm = read_arm(path).arm
    assert read_text(arm_file_text(arm), tmp_path) == arm


lengths = st.decimals(-3, 3, places=7).map(Fraction)
radians = st.one_of(
    st.decimals(-3, 3, places=6).map(lambda value: Angle(radians=Fraction(value))),
    st.integers(-24, 24).map(lambda twelfths: Angle(Fraction(twelfths, 12))),
)
degrees = st.decimals(-360, 360, places=6).map(lambda value: Angle.degrees(Fraction(value)))


@st.composite
def arms(draw: st.DrawFn) -> Arm:
    angles = draw(st.sampled_from([("rad", radians), ("deg", degrees)]))
    frames = st.builds(Frame, st.tuples(lengths, lengths, lengths), st.tuples(angles[1], angles[1], angles[1]))
    rows = tuple(draw(_row(f"joint {number}", lengths, angles[1])) for number in range(3))
    unit = draw(st.sampled_from(["m", "mm"]))
    convention = draw(st.sampled_from(Convention))
    return Arm("drawn", convention, Task.POINT, rows, (), draw(frames), draw(frames), unit, angles[0])


@st.composite
def _row(draw: st.DrawFn, name: str, lengths: st.SearchStrategy, angles: st.SearchStrategy) -> JointRow:
    kind = draw(st.sampled_from(JointKind))
    zero = Angle() if kind is JointKind.REVOLUTE else Fraction(0)
    own = angles if kind is JointKind.REVOLUTE else lengths
    end = draw(own)
    value = end.value() if isinstance(end, Angle) else end
    limits = None if value == 0 else ((zero, end) if value > 0 else (end, zero))
    speed = draw(own.filter(lambda found: (found.value() if isinstance(found, Angle) else found) > 0))
    return JointRow(name, kind, draw(lengths), draw(angles), draw(lengths), draw(angles), limits, speed)


@given(arms())
@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_any_arm_comes_back(tmp_path: Path, arm: Arm) -> None:
    assert read_text(arm_file_text(arm, ["a note"]), tmp_path) == arm


def test_ninths_of_a_turn_make_a_file_in_radians_one_in_degrees(tmp_path: Path) -> None:
    """No decimal number of radians is 40 degrees; the reader takes only multiples of 15 for exact."""
    row = JointRow("waist", JointKind.REVOLUTE, alpha=Angle.degrees(40))
    arm = Arm("drawn", Convention.STANDARD, Task.PLANE_POINT, (row, JointRow("elbow", JointKind.REVOLUTE)))
    back = read_text(arm_file_text(arm), tmp_path)
    assert (back.joints, back.angle_unit) == (arm.joints, "deg")


def test_decimals_are_the_shortest() -> None:
    values = ("0", "-0.05", "12", "0.1", "1e-12", "-340.25")
    assert [decimal(Fraction(value)) for value in values] == ["0", "-0.05", "12", "0.1", "0.000000000001", "-340.25"]
    assert decimal(Fraction(1, 3)) == "0.33333333333333333"


def test_notes_become_comments_whatever_they_hold(tmp_path: Path) -> None:
    arm = read_arm(SHIPPED[0]).arm
    text = arm_file_text(arm, ["two\nlines and a \x07 bell", "long " * 400])
    assert read_text(text, tmp_path) == arm
    assert text.startswith("# two\n# lines and a ? bell\n")
    assert max(map(len, text.splitlines())) <= 120
