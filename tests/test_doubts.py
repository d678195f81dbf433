"""Doubtful numbers of a good arm file, each with advice in the file's own units.

The bounds are common practice, no published source. The measured table is printed in the driver documentation of
Universal Robots, page "Calibration correction algorithm", as taken from a real arm.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from codegen.armfile import read_arm
from codegen.doubts import doubts
from codegen.errors import Fault

ARMS = sorted((Path(__file__).parent.parent / "arms").glob("*.toml"))


def found(folder: Path, head: str, *rows: str, convention: str = "standard", frames: str = "") -> tuple[Fault, ...]:
    """The doubts about a plane arm of two joints, or of as many as there are rows; each row's lines are given."""
    task = {2: "plane_point", 3: "point", 6: "pose"}[len(rows)]
    text = f'[arm]\nname = "x"\nconvention = "{convention}"\ntask = "{task}"\n{head}\n'
    text += "".join(
        f"[[joint]]\n{row}\n" if "type" in row else f'[[joint]]\ntype = "revolute"\n{row}\n' for row in rows
    )
    path = folder / "arm.toml"
    path.write_text(text + frames)
    return doubts(read_arm(path).arm)


DEG_MM = 'length_unit = "mm"\nangle_unit = "deg"'
SLIDE = 'type = "prismatic"\na = 100'

# Head, first row, second row, frames; where, what, hint.
ROWS = [
    (
        DEG_MM,
        "a = 100\nalpha = 89.97",
        "a = 90",
        "",
        "joint 1",
        "alpha = 89.97 deg is 0.03 deg from",
        "write alpha = 90 if",
    ),
    (
        DEG_MM,
        "a = 100\ntheta = -179.96",
        "a = 90",
        "",
        "joint 1",
        "theta = -179.96 deg is 0.04",
        "write theta = -180 if",
    ),
    (DEG_MM, "a = 100\ntheta = 0.01", "a = 90", "", "joint 1", "theta = 0.01 deg is 0.01", "write theta = 0 if"),
    (
        "",
        "a = 1\nalpha = 1.5712",
        "a = 1",
        "",
        "joint 1",
        "alpha = 1.5712 rad is 0.023",
        "alpha = 1.5707963267948966 if",
    ),
    (
        DEG_MM,
        "a = 100",
        "a = 90",
        "[tool]\nrpy = [0, 90.02, 0]",
        "[tool]",
        "rpy[1] = 90.02 deg",
        "write rpy[1] = 90 if",
    ),
    (DEG_MM, "a = 100\nd = 0.001", "a = 90", "", "joint 1", "d = 0.001 mm is nearly zero", "write d = 0 if"),
    (DEG_MM, "a = 100\nalpha = 0.03", "a = 90", "", "joint 1", "joints 1 and 2 nearly parallel", "write alpha = 0 if"),
    (
        DEG_MM,
        "a = 100\nalpha = 179.5",
        "a = 90",
        "",
        "joint 1",
        "joints 1 and 2 nearly parallel",
        "write alpha = 180 if",
    ),
    (
        DEG_MM,
        "a = 100\nalpha = 0.03\nd = 9000",
        "a = 90\nd = -9000",
        "[tool]\nxyz = [0, 5, 6]",
        "joint 1",
        "d of joint 1 = 9000 mm and d of joint 2 = -9000 mm cancel",
        "write alpha = 0",
    ),
    (DEG_MM, "a = 100\nd = 90", "a = 100000", "", "joint 2", "a = 100000 mm is 1000 times as long", "is it in mm"),
    (
        DEG_MM,
        "a = 100\ntheta = 30",
        "a = 90",
        "[base]\nrpy = [0, 0, 45]",
        "joint 1",
        "theta = 30 deg and the base's yaw = 45 deg turn about the same axis",
        "leave one of them out",
    ),
    (
        DEG_MM,
        "a = 100\nd = 150",
        "a = 90",
        "[base]\nxyz = [0, 0, 150]",
        "joint 1",
        "d = 150 mm and the base's z = 150 mm lie along the same axis",
        "the same height",
    ),
    (
        DEG_MM,
        "a = 100",
        "a = 90\nd = 80",
        "[tool]\nxyz = [0, 0, 80]",
        "joint 2",
        "d = 80 mm and the tool's z = 80 mm lie along the same axis",
        "the same tool",
    ),
    (DEG_MM, "a = 100", "a = 200000", "", "joint 2", "a = 200000 mm is 1000 times as long", "is it in mm"),
    (
        DEG_MM,
        "a = 100\nlimits = [10, 90]",
        "a = 90",
        "",
        "joint 1",
        "[10 deg, 90 deg] leave out 0",
        "before theta is added",
    ),
    ("", "a = 1\nlimits = [-2, -1]", "a = 1", "", "joint 1", "[-2 rad, -1 rad] leave out 0", "before theta"),
    (
        DEG_MM,
        SLIDE + "\nlimits = [0.5, 9]",
        "a = 90",
        "",
        "joint 1",
        "limits = [0.5 mm, 9 mm] leave out 0",
        "before d is added",
    ),
    (
        DEG_MM,
        "a = 100\nlimits = [-185, 180]",
        "a = 90",
        "",
        "joint 1",
        "limits span more than a turn",
        "nearest to its seed",
    ),
    (DEG_MM, SLIDE, "a = 90", "", "joint 1", "a prismatic joint without limits", "limits = [lowest, highest]"),
    (
        DEG_MM,
        "a = 100\nmax_speed = 90",
        "a = 90",
        "",
        "joint 2",
        "no max_speed, while other joints have one",
        "1 rad/s",
    ),
]


@pytest.mark.parametrize(("head", "first", "second", "frames", "where", "what", "hint"), ROWS)
def test_one_doubt(
    tmp_path: Path, head: str, first: str, second: str, frames: str, where: str, what: str, hint: str
) -> None:
    doubt = found(tmp_path, head, first, second, frames=frames)
    assert len(doubt) == 1, "\n".join(str(fault) for fault in doubt)
    assert doubt[0].where.startswith(where)
    assert what in doubt[0].what
    assert hint in doubt[0].hint


QUIET = [  # first row, second row, frames: what lies just beside a doubt
    ("a = 100\nalpha = 89.9", "a = 90", ""),
    ("a = 100\nalpha = 90", "a = 90\ntheta = 45", ""),
    ("a = 100\nalpha = 1.5", "a = 90", ""),
    ("a = 100\nd = 0.02", "a = 90", ""),
    ("a = 100\nlimits = [0, 360]", "a = 90", ""),
    ("a = 100\nd = 150", "a = 90\nd = 80", "[base]\nxyz = [0, 0, 100]\n[tool]\nxyz = [0, 0, 81]"),
    (
        "a = 100\nd = 150",
        "a = 90\nd = 80\nalpha = 90",
        "[base]\nxyz = [0, 0, 150]\nrpy = [90, 0, 0]\n[tool]\nxyz = [0, 0, 80]",
    ),
    ("a = 100\ntheta = 30", "a = 90", "[base]\nrpy = [0, 90, 45]"),
    ("a = 0", "a = 0", ""),
]


@pytest.mark.parametrize(("first", "second", "frames"), QUIET)
def test_no_doubt(tmp_path: Path, first: str, second: str, frames: str) -> None:
    assert found(tmp_path, DEG_MM, first, second, frames=frames) == ()


def test_a_modified_table_has_the_twist_in_the_later_row(tmp_path: Path) -> None:
    (doubt,) = found(tmp_path, DEG_MM, "a = 100", "a = 90\nalpha = 0.4", convention="modified")
    assert doubt.where.startswith("joint 2")
    assert "joints 1 and 2 nearly parallel" in doubt.what


def test_a_first_axis_that_lies_down_shares_no_axis_with_the_base(tmp_path: Path) -> None:
    frames = "[base]\nxyz = [0, 0, 150]\nrpy = [0, 0, 45]"
    assert (
        found(tmp_path, DEG_MM, "alpha = 90\nd = 150\ntheta = 30", "a = 90", convention="modified", frames=frames) == ()
    )


def test_what_the_reader_warns_of_is_not_said_twice(tmp_path: Path) -> None:
    assert found(tmp_path, "", "a = 1\nalpha = 1.5708", "a = 1") == ()
    assert found(tmp_path, "", "a = 1\nalpha = 3.1416", "a = 1") == ()


MEASURED = [  # theta rad, a m, d m, alpha rad
    (-2.4147806894359e-07, 2.12234865571206e-05, 0.180539811714259, 1.57014608044242),
    (1.60233952386695, 0.0193171326277006, 439.140974079901, 0.0013941666682559),
    (-1.68607190752171, -0.569251663611088, -446.027059806332, 0.00693818880325995),
    (0.0837331147700119, -4.61409023720934e-05, 7.0603368964236, 1.56998468543761),
    (-1.01260355871158e-07, -6.39280053471802e-05, 0.119811341150314, -1.57038520649543),
    (3.91986209186124e-08, 0, 0.115670917257426, 0),
]


def test_a_measured_table_is_recognised(tmp_path: Path) -> None:
    """One doubt about the whole table, one for each pair of nearly parallel axes, none about huge offsets alone."""
    rows = [f"theta = {theta}\na = {a}\nd = {d}\nalpha = {alpha}" for theta, a, d, alpha in MEASURED]
    whole, second, third = found(tmp_path, "", *rows)
    assert whole.where == "[[joint]]"
    assert "the table looks measured" in whole.what
    assert "d of joint 2 = 439.140974079901 m and d of joint 3 = -446.027059806332 m cancel" in second.what
    assert "joints 3 and 4 nearly parallel" in third.what


@pytest.mark.parametrize("path", ARMS, ids=lambda path: path.stem)
def test_a_shipped_arm_raises_no_doubt_but_for_wide_limits(path: Path) -> None:
    assert {doubt.what for doubt in doubts(read_arm(path).arm)} <= {"limits span more than a turn"}
