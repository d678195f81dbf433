"""What an adopted description becomes, and what is said of one that cannot be adopted.

URDF is read as its maintainers define it (the joint and link pages of the ROS wiki, "urdf/XML"). Poses of invented
chains are compared with scipy's rotations (scipy.spatial.transform.Rotation), multiplied out here.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from build_checks.reference import Reference
from codegen.adopt import Adoption, Wanted, adopt, adopt_file
from codegen.adopt.snapping import read_number, snap_angle, snap_limit
from codegen.adopt.table import link_table as link_table_of_the_tool
from codegen.armfile import read_arm
from codegen.armwriter import arm_file_text
from codegen.errors import CallError, CannotSolveError, CheckFailedError, Fault
from codegen.exact import Angle
from codegen.model import Arm, JointKind, Task

Array = npt.NDArray[np.float64]
TINY = Angle(radians=Fraction(1, 10**6))
WALL_LIFT = Path(__file__).parent / "data" / "wall_lift.urdf"


def joint(
    number: int, kind: str = "revolute", xyz: str = "0.3 0 0", rpy: str = "0 0 0", axis: str = "0 0 1", more: str = ""
) -> str:
    limit = '<limit lower="-1" upper="1" velocity="1" effort="1"/>' if kind in ("revolute", "prismatic") else ""
    return (
        f'<link name="link{number}"/><joint name="joint{number}" type="{kind}"><parent link="link{number - 1}"/>'
        f'<child link="link{number}"/><origin xyz="{xyz}" rpy="{rpy}"/><axis xyz="{axis}"/>{limit}{more}</joint>\n'
    )


def robot(*joints: str) -> str:
    return f'<robot name="made up">\n<link name="link0"/>\n{"".join(joints)}</robot>'


def adopted(text: str, tip: str, **wanted: object) -> Adoption:
    return adopt(text.encode(), "made.urdf", Wanted(tip, **wanted))  # type: ignore[arg-type]


THREE = robot(joint(1), joint(2), joint(3))


# --- poses ---

numbers = st.sampled_from(["0", "0", "0.1", "-0.25", "0.3127", "1e-17", "-0.0481"])
angles = st.sampled_from(["0", "0", "1.5708", "-1.57079632679", "3.14159", "0.7854", "-2.083", "7.9e-08", "0.0481"])
axes = st.sampled_from(
    ["0 0 1", "0 0 -1", "1 0 0", "0 -1 0", "0 1 4.37e-08", "0.6 0 0.8", "0.573576 0.819152 1e-7", "1 1 0"]
)
kinds = st.sampled_from(["revolute", "revolute", "continuous", "prismatic", "fixed"])


@st.composite
def chains(draw: st.DrawFn) -> list[tuple[str, str, str, str]]:
    def triple(of: st.SearchStrategy[str]) -> str:
        return " ".join(draw(of) for _ in range(3))

    count = draw(st.integers(2, 8))
    drawn = [(draw(kinds), triple(numbers), triple(angles), draw(axes)) for _ in range(count)]
    return drawn


def scipy_pose(chain: list[tuple[str, str, str, str]], q: Array) -> Array:
    """The chain's transforms multiplied, with scipy's rotations: fixed-axis "xyz" is roll, pitch, yaw."""
    pose, variables = np.eye(4), iter(q)
    for kind, xyz, rpy, axis in chain:
        origin, motion = np.eye(4), np.eye(4)
        origin[:3, :3] = Rotation.from_euler("xyz", np.array(rpy.split(), float)).as_matrix()
        origin[:3, 3] = np.array(xyz.split(), float)
        unit = np.array(axis.split(), float)
        unit /= np.linalg.norm(unit)
        if kind == "prismatic":
            motion[:3, 3] = unit * next(variables)
        elif kind != "fixed":
            motion[:3, :3] = Rotation.from_rotvec(unit * next(variables)).as_matrix()
        pose = pose @ origin @ motion
    return pose


@given(chains().filter(lambda chain: 2 <= sum(kind != "fixed" for kind, *_ in chain) <= 7))
@settings(max_examples=50, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_any_serial_chain_keeps_its_tool_pose(tmp_path: Path, chain: list[tuple[str, str, str, str]]) -> None:
    """Through the written file; the budget is what the snaps in the strategies above add up to on a 3 m chain."""
    text = robot(*(joint(i, *row) for i, row in enumerate(chain, start=1)))
    adoption = adopted(text, f"link{len(chain)}")
    path = tmp_path / "adopted.toml"
    path.write_text(arm_file_text(adoption.arm, adoption.notes))
    file = read_arm(path)
    assert file.arm == adoption.arm
    q = np.random.default_rng(3).uniform(-1, 1, (5, len(file.arm.joints)))
    tool = Reference(file.arm).chain(q).tool
    for index, values in enumerate(q):
        want = scipy_pose(chain, values)
        assert np.abs(tool.position[index] - want[:3, 3]).max() < 3e-4
        assert np.abs(tool.rotation[index] - want[:3, :3]).max() < 1e-4


def test_exact_zeros_and_right_angles_are_recognised() -> None:
    arm = adopt_file(WALL_LIFT, Wanted("plate")).arm
    swing = arm.joints[1]
    assert all(row.alpha.quarter_turns is not None for row in arm.joints[:2])
    assert float(arm.joints[0].limits[1]) == 0.6
    assert (swing.limits[0].half_turns * 180, swing.max_speed.half_turns * 180) == (-150, 90)
    assert arm.joints[4].max_speed is None
    assert arm.name == "wall_lift_2"


def test_notes_tell_every_snap_with_its_size_and_what_it_does() -> None:
    notes = "\n".join(adopt_file(WALL_LIFT, Wanted("plate")).notes)
    assert 'joint "turn" roll' in notes
    assert "7.9e-08 -> 0 deg (off by 7.9e-08 rad)" in notes
    assert "3.14159 -> 180 deg (off by 2.7e-06 rad), moves the tool by at most" in notes


@pytest.mark.parametrize(
    ("typed", "degrees"),
    [
        ("1.5708", 90), ("1.57", 90), ("-1.57079632679", -90), ("3.14159", 180), ("3.1415", 180), ("4.71239", 270),
        ("1.570796325", 90), ("7.9e-8", 0), ("0.7854", 45), ("0.5235987755982988", 30), ("0.122173", 7),
        ("1.56", None), ("1.6", None), ("1.57086", None), ("0.01", None), ("5.4949E-05", None), ("0.78", None),
        ("3.15", None),
    ],
)  # fmt: skip
def test_an_angle_is_exact_when_it_is_one_rounded_to_the_digits_typed(typed: str, degrees: int | None) -> None:
    number = read_number(typed)
    assert number is not None
    angle, snap = snap_angle(number, "here")
    assert (snap is not None) == (degrees is not None)
    assert angle.half_turns * 180 == (degrees or 0)


@pytest.mark.parametrize(("typed", "inward"), [("2.8973", -1), ("-2.8973", 1), ("3.14", -1), ("-0.5", 1)])
def test_a_limit_is_never_widened_by_rounding_to_degrees(typed: str, inward: int) -> None:
    number = read_number(typed)
    assert number is not None
    angle, snap = snap_limit(number, "here", inward)
    assert snap is None
    assert 0 <= (float(angle.value()) - float(typed)) * inward < 2e-11


@pytest.mark.parametrize("text", ["nan", "inf", "0x10", "1,5", "", "1e400", "--1", "1" * 61])
def test_what_is_no_finite_number(text: str) -> None:
    assert read_number(text) is None


def test_a_table_that_disagrees_is_never_given_out(monkeypatch: pytest.MonkeyPatch) -> None:
    """Each number of the table spoilt in turn by a micrometre or a microradian: the check against the description's own
    transforms refuses it."""
    good = link_table_of_the_tool
    for row in range(5):
        for key, off in (("a", Fraction(1, 10**6)), ("d", Fraction(1, 10**6)), ("alpha", TINY), ("theta", TINY)):

            def spoilt(*arguments: object, row: int = row, key: str = key, off: object = off) -> object:
                table = good(*arguments)
                rows = list(table.rows)
                rows[row] = replace(rows[row], **{key: getattr(rows[row], key) + off})
                return replace(table, rows=tuple(rows), snaps=())

            monkeypatch.setattr("codegen.adopt.link_table", spoilt)
            with pytest.raises(CheckFailedError, match="nothing was written"):
                adopt_file(WALL_LIFT, Wanted("plate"))


# --- tasks ---


@pytest.mark.parametrize(
    ("text", "tip", "task"),
    [
        (THREE, "link3", Task.PLANE_POSE),
        (THREE, "link2", Task.PLANE_POINT),
        (robot(joint(1), joint(2, axis="0 1 0"), joint(3, axis="0 1 0")), "link3", Task.POINT),
        (robot(joint(1), joint(2, "prismatic"), joint(3, "prismatic", axis="1 0 0")), "link3", Task.POINT),
        (
            robot(joint(1, axis="0 1 0"), joint(2, "prismatic", axis="1 0 0"), joint(3, axis="0 1 0")),
            "link3",
            Task.PLANE_POSE,
        ),
        (robot(joint(1), joint(2), joint(3, "prismatic", axis="0 0 -1"), joint(4)), "link4", Task.POINT_YAW),
        (robot(joint(1), *(joint(i, axis="0 1 0") for i in (2, 3, 4))), "link4", Task.POINT_PITCH),
        (
            robot(joint(1), *(joint(i, axis="0 1 0") for i in (2, 3, 4)), joint(5, axis="1 0 0")),
            "link5",
            Task.POINT_AXIS,
        ),
    ],
)
def test_the_task_fits_the_chain(text: str, tip: str, task: Task) -> None:
    assert adopted(text, tip).arm.task is task


def test_the_task_and_the_held_joints_can_be_asked_for() -> None:
    assert adopted(THREE, "link3", task=Task.POINT).arm.task is Task.POINT
    arm = adopted(THREE, "link3", held=("joint1",)).arm
    assert (arm.held, arm.task) == (("joint1",), Task.PLANE_POINT)


def test_the_derivation_may_choose_the_joint_to_hold() -> None:
    text = robot(*(joint(i, axis="0 1 0" if i % 2 else "0 0 1") for i in range(1, 8)))
    adoption = adopt(text.encode(), "made.urdf", Wanted("link7"), solvable=lambda arm: arm.held == ("joint5",))
    assert adoption.arm.held == ("joint5",)
    adoption = adopt(text.encode(), "made.urdf", Wanted("link7"), solvable=gives_up)
    assert adoption.arm.held == ("joint3",)


def gives_up(arm: Arm) -> bool:
    raise CannotSolveError(Fault(arm.name, "no closed form"))


# --- errors ---

MANY = robot(*(joint(i) for i in range(1, 9)))
BRANCHED = robot(joint(1), joint(2), '<link name="side"/>' + joint(3).replace('"link2"', '"link1"'))
CLOSING = joint(3).replace('child link="link3"', 'child link="link1"')
BOMB = (
    '<?xml version="1.0"?>\n<!DOCTYPE lolz [<!ENTITY a "lol"><!ENTITY b "&a;&a;&a;&a;">]>\n'
    '<robot name="&b;"><link name="x"/></robot>'
)
OUTSIDE = '<!DOCTYPE robot [<!ENTITY x SYSTEM "file:///etc/passwd">]><robot name="r"><link name="&x;"/></robot>'

FAULTS = [
    # text, tip, root, and what the message must say
    (BOMB, "x", None, ["line 2", "document type declaration"]),
    (OUTSIDE, "x", None, ["document type declaration"]),
    ("", "x", None, ["not well-formed", "no element found"]),
    ("<robot><link name='a'></robot>", "a", None, ["line 1", "mismatched tag"]),
    ("<sdf version='1.6'/>", "a", None, ["<sdf>", "not <robot>"]),
    ("<robot name='r'/>", "a", None, ["no <link>"]),
    ("<a>" * 100, "a", None, ["nested"]),
    ('<robot xmlns:xacro="x"><xacro:macro name="m"/></robot>', "a", None, ["line 1", "<xacro:macro>", "expand"]),
    (robot(joint(1, xyz="${length} 0 0")), "link1", None, ['joint "joint1"', "macro", "expand it first"]),
    (THREE, "link9", None, ["--tip", '"link9"', "did you mean"]),
    (THREE, "link3", "plate", ["--root", '"plate"', "links in this file: link0, link1"]),
    (THREE, "link0", None, ["no joint between them moves"]),
    (THREE, "link1", None, ["no task fits 1 joint"]),
    (THREE, "link1", "link3", ['"link1" is not below link "link3"', "--root link1 --tip link3"]),
    (BRANCHED, "link3", "link2", ['"link3" is not below link "link2"', "--root link1, where the two branches part"]),
    (MANY, "link8", None, ["8 joints move", "joint1, joint2", "at most 7"]),
    (robot(joint(1), joint(2), joint(2)), "link2", None, ['another link "link2"', "line 4"]),
    (robot(joint(1), joint(2).replace('<link name="link2"/>', "")), "link1", None, ['child link "link2" does not']),
    (robot(joint(1), joint(2).replace('"joint2"', '"joint1"')), "link2", None, ['another joint "joint1"']),
    (robot(joint(1), joint(2), CLOSING), "link2", None, ["is also the child"]),
    (robot(joint(1)).replace('"link0"/><child', '"link1"/><child'), "link1", None, ["loop"]),
    (robot(joint(1).replace('<parent link="link0"/>', "")), "link1", None, ["has no one <parent>"]),
    (robot(joint(1), joint(2, "floating")), "link2", None, ['joint "joint2"', '"floating"', "--root below"]),
    (robot(joint(1), joint(2, "planar")), "link2", None, ['"planar"', "continuous, fixed, prismatic, revolute"]),
    (robot(joint(1), joint(2, "hinge")), "link2", None, ['"hinge"']),
    (robot(joint(1), joint(2, more='<mimic joint="joint1"/>')), "link2", None, ['"joint2"', 'mimics joint "joint1"']),
    (robot(joint(1), joint(2, xyz="0 nan 0")), "link2", None, ['joint "joint2"', '"nan" is no finite number']),
    (robot(joint(1), joint(2, xyz="0 0")), "link2", None, ["has 2 numbers"]),
    (robot(joint(1), joint(2, xyz="0 0 300000")), "link2", None, ["absurdly large"]),
    (robot(joint(1), joint(2, axis="0 0 0")), "link2", None, ["its axis is 0 0 0"]),
    (robot(joint(1), joint(2, more="<origin/>")), "link2", None, ["2 elements <origin>"]),
    (robot(joint(1), joint(2).replace('lower="-1"', 'lower="1"')), "link2", None, ['lower="1" is not below upper="1"']),
    (robot(joint(1), joint(2).replace('velocity="1"', 'velocity="-1"')), "link2", None, ["is negative"]),
]  # fmt: skip


@pytest.mark.parametrize(("text", "tip", "root", "said"), FAULTS, ids=[f"{i}" for i in range(len(FAULTS))])
def test_a_faulty_description_gets_a_clear_error(text: str, tip: str, root: str | None, said: list[str]) -> None:
    with pytest.raises(CallError) as caught:
        adopted(text, tip, root=root)
    message = str(caught.value)
    assert [part for part in said if part not in message] == []
    assert "hint:" in message
    assert "made" in message


def test_all_faults_of_the_chain_come_at_once() -> None:
    text = robot(joint(1, xyz="0 inf 0"), joint(2, "floating"), joint(3, axis="0 0 0", more='<mimic joint="joint1"/>'))
    with pytest.raises(CallError) as caught:
        adopted(text, "link3")
    assert len(caught.value.faults) == 4


def test_faults_beside_the_chain_do_not_matter() -> None:
    text = robot(joint(1), joint(2), joint(3, "floating", xyz="nan nan nan"))
    assert len(adopted(text, "link2").arm.joints) == 2


@pytest.mark.parametrize(
    ("wanted", "said"),
    [
        ({"held": ("elbow",)}, 'no joint "elbow"'),
        ({"task": Task.POSE}, 'task "pose" takes 6 joints'),
        ({"task": Task.POINT, "held": ("joint1",)}, "tasks that fit: plane_point"),
    ],
)
def test_a_task_that_does_not_fit_is_refused(wanted: dict[str, object], said: str) -> None:
    with pytest.raises(CallError, match=said):
        adopted(THREE, "link3", **wanted)


def test_a_huge_file_and_a_missing_one_are_refused(tmp_path: Path) -> None:
    with pytest.raises(CallError, match="at most"):
        adopt(b" " * (17 * 1024 * 1024), "made.urdf", Wanted("tip"))
    with pytest.raises(CallError, match="cannot be read"):
        adopt_file(tmp_path / "none.urdf", Wanted("tip"))


def test_limits_that_mean_none_and_names_that_c_cannot_carry_are_noted() -> None:
    wide = joint(2).replace('lower="-1" upper="1"', 'lower="-1e16" upper="1e16"').replace('"joint2"', '"left/joint*2"')
    adoption = adopted(robot(joint(1), wide), "link2")
    assert adoption.arm.joints[1].limits is None
    assert adoption.arm.joints[1].name == "left_joint_2"
    assert any("mean none" in note for note in adoption.notes)
    assert any('is called "left_joint_2"' in note for note in adoption.notes)


def test_axes_almost_parallel_are_doubted() -> None:
    adoption = adopted(robot(joint(1), joint(2, xyz="0.3 0.1 0", rpy="0.00012345678 0 0")), "link2")
    assert any("almost parallel" in note for note in adoption.notes)
    assert any("off a right angle" in note for note in adoption.notes)


def test_continuous_joints_have_no_limits() -> None:
    adoption = adopted(robot(joint(1, "continuous", more='<limit lower="-1" upper="1"/>'), joint(2)), "link2")
    assert adoption.arm.joints[0].limits is None
    assert adoption.arm.joints[0].kind is JointKind.REVOLUTE
