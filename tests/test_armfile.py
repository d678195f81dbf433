"""Good arm files: every key is read, every number stays exact.

What a key means is the arm file's own definition; the doubles nearest to multiples of pi/12 come from mpmath.
"""

from __future__ import annotations

import hashlib
from fractions import Fraction
from pathlib import Path

import mpmath
import pytest

from codegen.armfile import ArmFile, read_arm
from codegen.exact import Angle
from codegen.model import Convention, Frame, JointKind, JointRow, Task

FULL = """
[arm]
name = "lab_arm"
convention = "modified"
length_unit = "mm"
angle_unit = "deg"
task = "point"
held = ["slide"]

[base]
xyz = [1, 2.5, -3]
rpy = [180, 0, 22.5]

[[joint]]
name = "waist"
type = "revolute"
a = 0.1
alpha = 90
d = 150
theta = -45.5
limits = [-160, 400]
max_speed = 90

[[joint]]
name = "slide"
type = "prismatic"
d = 7
theta = 30
limits = [-20, 1e2]
max_speed = 12.5

[[joint]]
type = "revolute"

[[joint]]
type = "revolute"
a = 1_000

[tool]
xyz = [0, 0, 80]
"""
HEAD = '[arm]\nname = "x"\nconvention = "standard"\ntask = "plane_point"\n'
SECOND = '[[joint]]\ntype = "revolute"\na = 1\n'


def read(folder: Path, text: str | bytes) -> ArmFile:
    path = folder / "arm.toml"
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return read_arm(path)


def test_every_key_arrives_exactly(tmp_path: Path) -> None:
    arm = read(tmp_path, FULL).arm
    degree = Fraction(1, 180)
    assert (arm.name, arm.convention, arm.task, arm.held) == ("lab_arm", Convention.MODIFIED, Task.POINT, ("slide",))
    assert (arm.length_unit, arm.angle_unit) == ("mm", "deg")
    assert arm.base == Frame(
        (Fraction(1, 1000), Fraction(1, 400), Fraction(-3, 1000)), (Angle(Fraction(1)), Angle(), Angle(Fraction(1, 8)))
    )
    assert arm.joints[0] == JointRow(
        name="waist",
        kind=JointKind.REVOLUTE,
        a=Fraction(1, 10_000),
        alpha=Angle(Fraction(1, 2)),
        d=Fraction(15, 100),
        theta=Angle(degree * Fraction(-91, 2)),
        limits=(Angle(-160 * degree), Angle(400 * degree)),
        max_speed=Angle(Fraction(1, 2)),
    )
    assert arm.joints[1] == JointRow(
        name="slide",
        kind=JointKind.PRISMATIC,
        d=Fraction(7, 1000),
        theta=Angle(Fraction(1, 6)),
        limits=(Fraction(-2, 100), Fraction(1, 10)),
        max_speed=Fraction(125, 10_000),
    )
    assert arm.joints[2] == JointRow(name="joint3", kind=JointKind.REVOLUTE)
    assert arm.joints[3] == JointRow(name="joint4", kind=JointKind.REVOLUTE, a=Fraction(1))
    assert arm.tool == Frame((Fraction(0), Fraction(0), Fraction(8, 100)))


def test_metres_and_radians_are_the_defaults(tmp_path: Path) -> None:
    arm = read(tmp_path, HEAD + '[[joint]]\ntype = "revolute"\na = 0.25\ntheta = 0.1\n' + SECOND).arm
    assert (arm.length_unit, arm.angle_unit, arm.held) == ("m", "rad", ())
    assert (arm.joints[0].a, arm.joints[0].theta) == (Fraction(1, 4), Angle(radians=Fraction(1, 10)))
    assert (arm.base, arm.tool) == (Frame(), Frame())


def test_the_digest_is_that_of_the_bytes(tmp_path: Path) -> None:
    """SHA-256 as the standard library has it (FIPS 180-4), line ends and all."""
    content = FULL.replace("\n", "\r\n").encode()
    file = read(tmp_path, content)
    assert file.digest == hashlib.sha256(content).hexdigest()
    assert file.path == str(tmp_path / "arm.toml")
    assert file.warnings == ()


def test_a_byte_order_mark_is_no_fault(tmp_path: Path) -> None:
    assert read(tmp_path, b"\xef\xbb\xbf" + FULL.encode()).arm == read(tmp_path, FULL).arm


def theta_of(folder: Path, typed: str) -> Angle:
    return read(folder, HEAD + f'[[joint]]\ntype = "revolute"\ntheta = {typed}\n' + SECOND).arm.joints[0].theta


@pytest.mark.parametrize("twelfths", range(-30, 31))
def test_a_double_nearest_to_a_multiple_of_15_degrees_is_that_multiple(tmp_path: Path, twelfths: int) -> None:
    with mpmath.workdps(60):
        double = float(twelfths * mpmath.pi / 12)
    assert theta_of(tmp_path, repr(double)) == Angle(Fraction(twelfths, 12))


EXACT = [  # typed in radians, half turns
    ("1.5707963267948966", Fraction(1, 2)),
    ("1.570796326794897", Fraction(1, 2)),  # 15 decimals, as many programs print
    ("0.785398163397448", Fraction(1, 4)),
    ("-3.14159265358979", Fraction(-1)),
    ("3.14159265358979323846264338327950288", Fraction(1)),
    ("0", Fraction(0)),
    ("-0.0", Fraction(0)),
    ("0e999999999", Fraction(0)),
]


@pytest.mark.parametrize(("typed", "half_turns"), EXACT)
def test_an_angle_right_to_all_its_digits_is_exact(tmp_path: Path, typed: str, half_turns: Fraction) -> None:
    assert theta_of(tmp_path, typed) == Angle(half_turns)


@pytest.mark.parametrize("typed", ["1.5708", "1.57", "1.5707963267949", "1.5707963267948971", "1", "1.5707964"])
def test_an_angle_with_fewer_digits_stays_as_typed(tmp_path: Path, typed: str) -> None:
    assert theta_of(tmp_path, typed) == Angle(radians=Fraction(typed))


WARNED = [  # head lines, first joint's lines, part of the warning, part of its hint
    ("", "d = 150", "[150]", "joint 1 d = 150, joint 2 a = 150: longer than 20 m", 'length_unit = "mm"'),
    ('length_unit = "mm"', "d = 0.15\na = 0.2", "[0.1]", "d = 0.15", 'length_unit = "m"'),
    ("", "alpha = 90", "[1]", "joint 1 alpha = 90: very large for radians", 'angle_unit = "deg"'),
    ("", "limits = [-160, 160]", "[1]", "limits[0] = -160", 'angle_unit = "deg"'),
    ("", "max_speed = 180", "[1]", "max_speed = 180", 'angle_unit = "deg"'),
    ('angle_unit = "deg"', "alpha = 1.5708", "[1]", "alpha = 1.5708", 'angle_unit = "rad"'),
    ("", "alpha = 1.5708", "[1]", "alpha = 1.5708: near a right angle but not one", "or 1.5707963267948966"),
    ("", "alpha = -3.14", "[1]", "alpha = -3.14: near a right angle", "-3.141592653589793"),
    ("", "alpha = 1.57079", "[1]", "near a right angle", 'angle_unit = "deg" under [arm] and 90'),
]


@pytest.mark.parametrize(("head", "joint", "second", "what", "hint"), WARNED)
def test_a_number_in_the_wrong_unit_is_warned_of(
    tmp_path: Path, head: str, joint: str, second: str, what: str, hint: str
) -> None:
    """The bounds are common practice, no published source."""
    length = second.strip("[]")
    text = f'{HEAD}{head}\n[[joint]]\ntype = "revolute"\n{joint}\n[[joint]]\ntype = "revolute"\na = {length}\n'
    warnings = read(tmp_path, text).warnings
    assert len(warnings) == 1
    assert what in warnings[0].what
    assert hint in warnings[0].hint


UNWARNED = [  # head lines, first joint's lines
    ("", "limits = [-12.566, 12.566]"),
    ("", "alpha = 1.5707963267948966"),
    ("", "alpha = 0.31"),
    ('angle_unit = "deg"', "alpha = 90\nlimits = [-720, 720]\nmax_speed = 400"),
    ('length_unit = "mm"', "d = 0.5"),
    ("", "d = 439.14\nalpha = 0.0013941666682559"),  # nearly parallel axes, as a measured table has
]


@pytest.mark.parametrize(("head", "joint"), UNWARNED)
def test_an_ordinary_number_is_not_warned_of(tmp_path: Path, head: str, joint: str) -> None:
    length = "150" if "mm" in head else "0.3"
    text = f'{HEAD}{head}\n[[joint]]\ntype = "revolute"\n{joint}\n[[joint]]\ntype = "revolute"\na = {length}\n'
    assert read(tmp_path, text).warnings == ()
