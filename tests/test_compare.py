"""`linkwright compare`: every answer against what plain geometry says of arms of two links."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from command_line import CANNOT_REACH, Done, call, names_in

from codegen.armfile import read_arm
from codegen.compare.branches import Numbering, branch_numbers
from codegen.compare.code_diff import code_diff
from codegen.compare.joints import match_joints
from codegen.compare.table import Change, table_changes
from codegen.places import ARMS

# Two links that turn in a plane (Craig, Introduction to Robotics, the planar arm): 180 and 150 mm.
TWO_LINKS = """\
[arm]
name = "two_links"
convention = "standard"
length_unit = "mm"
angle_unit = "deg"
task = "plane_point"

[[joint]]
name = "shoulder"
type = "revolute"
a = 180
limits = [-30, 170]
max_speed = 90

[[joint]]
name = "elbow"
type = "revolute"
a = 150
limits = [-140, 140]

[tool]
xyz = [0, 0, 12]
"""
FIRST, SECOND = 180.0, 150.0
Edit = Callable[[str], str]


def edited(*changes: tuple[str, str]) -> str:
    text = TWO_LINKS
    for before, after in changes:
        assert before in text
        text = text.replace(before, after)
    return text


def compared(folder: Path, new: str, *arguments: str | Path, old: str = TWO_LINKS) -> Done:
    (folder / "old.toml").write_text(old, encoding="utf-8")
    (folder / "new.toml").write_text(new, encoding="utf-8")
    return call("compare", folder / "old.toml", folder / "new.toml", "--samples", "2000", *arguments)


def content(folder: Path, new: str, *arguments: str | Path, old: str = TWO_LINKS) -> dict:
    done = compared(folder, new, "--json", "--real", "double", *arguments, old=old)
    assert done.status == 0, done.err
    return json.loads(done.out)


# -- an arm that did not change ----------------------------------------------------------------------------------------
def test_an_arm_against_itself_has_nothing_to_tell(tmp_path: Path) -> None:
    found = content(tmp_path, TWO_LINKS, "--fail-on", "lost-poses,interface")
    assert found["table"] == []
    assert found["structure"]["same"]
    assert found["interface"]["same"]
    assert found["branch_numbers"]["numbering"] == "kept"
    assert found["branch_numbers"]["same_share"] == 1.0
    assert found["tool_at_the_same_joints"]["worst"] == 0.0
    assert [joint["worst"] for joint in found["joints_for_the_same_poses"]["joints"]] == [0.0, 0.0]
    assert found["lost"]["missing"] == found["gained"]["missing"] == 0
    assert found["code"] == []
    assert all(row["old"] == row["new"] for row in found["cost"])


def test_a_comment_or_a_unit_changes_the_file_and_not_the_arm(tmp_path: Path) -> None:
    in_metres = edited(('"mm"', '"m"'), ("180", "0.18"), ("150\n", "0.15\n"), ("12]", "0.012]"), ("[arm]", "# new\n[arm]"))
    found = content(tmp_path, in_metres)
    assert [(c["what"], c["old"], c["new"]) for c in found["table"]] == [("length_unit", "mm", "m")]
    assert found["code"] == []
    assert found["tool_at_the_same_joints"]["worst"] < 1e-12


# -- the table ---------------------------------------------------------------------------------------------------------
TABLE = [
    (("a = 180", "a = 182.5"), 'joint 1 ("shoulder")', "a", "180 mm", "182.5 mm"),
    (("[-140, 140]", "[-140, 135]"), 'joint 2 ("elbow")', "limits", "-140 deg to 140 deg", "-140 deg to 135 deg"),
    (("limits = [-140, 140]\n", ""), 'joint 2 ("elbow")', "limits", "-140 deg to 140 deg", "none"),
    (("max_speed = 90", "max_speed = 95"), 'joint 1 ("shoulder")', "max_speed", "90 deg/s", "95 deg/s"),
    (("a = 150", "a = 150\ntheta = 5"), 'joint 2 ("elbow")', "theta", "0 deg", "5 deg"),
    (("a = 150", "a = 150\nd = 3"), 'joint 2 ("elbow")', "d", "0 mm", "3 mm"),
    (("12]", "14]"), "tool", "z", "12 mm", "14 mm"),
    (("12]", "12]\nrpy = [0, 0, 90]"), "tool", "yaw", "0 deg", "90 deg"),
    (('"elbow"', '"forearm"'), 'joint 2 ("elbow")', "name", "elbow", "forearm"),
    (('"two_links"', '"other"'), "arm", "name", "two_links", "other"),
]


@pytest.mark.parametrize(("change", "where", "what", "old", "new"), TABLE, ids=lambda part: str(part)[:24])
def test_what_changed_in_the_table_is_told_in_the_file_s_units(
    tmp_path: Path, change: tuple[str, str], where: str, what: str, old: str, new: str
) -> None:
    (tmp_path / "old.toml").write_text(TWO_LINKS, encoding="utf-8")
    (tmp_path / "new.toml").write_text(edited(change), encoding="utf-8")
    before, after = (read_arm(tmp_path / name).arm for name in ("old.toml", "new.toml"))
    assert table_changes(before, after, match_joints(before, after)) == (Change(where, what, old, new),)


# -- motion ------------------------------------------------------------------------------------------------------------
def test_a_longer_link_moves_the_tool_by_what_it_grew(tmp_path: Path) -> None:
    """Along the link, whatever the joints are."""
    tool = content(tmp_path, edited(("a = 180", "a = 182.5")))["tool_at_the_same_joints"]
    assert tool["worst"] == pytest.approx(2.5, rel=1e-12)
    assert tool["mean"] == pytest.approx(2.5, rel=1e-12)
    assert tool["worst_turn"] == 0.0


def test_a_shifted_zero_turns_the_tool_about_the_joint_and_the_joint_gives_way(tmp_path: Path) -> None:
    """A chord of ten degrees about the shoulder; for the same poses the shoulder stands ten degrees lower."""
    found = content(tmp_path, edited(("a = 180\n", "a = 180\ntheta = 10\n"), ("[-30, 170]", "[-40, 160]")))
    tool, moves = found["tool_at_the_same_joints"], found["joints_for_the_same_poses"]
    elbow = math.radians(tool["worst_at"][1])
    radius = math.sqrt(FIRST**2 + SECOND**2 + 2 * FIRST * SECOND * math.cos(elbow))
    assert tool["worst"] == pytest.approx(2 * radius * math.sin(math.radians(5)), rel=1e-9)
    assert tool["worst_turn"] == pytest.approx(10, rel=1e-9)
    assert tool["mean_turn"] == pytest.approx(10, rel=1e-9)
    assert moves["solved"] == moves["poses"] == 2000
    assert moves["by_branch"]
    shoulder, elbow_move = moves["joints"]
    assert (shoulder["worst"], shoulder["mean"]) == (pytest.approx(10, rel=1e-6), pytest.approx(10, rel=1e-6))
    assert elbow_move["worst"] == pytest.approx(0, abs=1e-5)
    assert found["lost"]["missing"] == found["gained"]["missing"] == 0


# -- reach -------------------------------------------------------------------------------------------------------------
def both_postures(x: float, y: float, first: float = FIRST, second: float = SECOND) -> list[tuple[float, float]]:
    """Joint angles in degrees of two links that reach a point (law of cosines)."""
    cosine = (x * x + y * y - first**2 - second**2) / (2 * first * second)
    if abs(cosine) > 1:
        return []
    found = []
    for elbow in (math.acos(cosine), -math.acos(cosine)):
        heading = math.atan2(y, x) - math.atan2(second * math.sin(elbow), first + second * math.cos(elbow))
        found.append((math.degrees(heading), math.degrees(elbow)))
    return found


def reachable(x: float, y: float, elbow_limits: tuple[float, float], first: float = FIRST) -> bool:
    low, high = elbow_limits
    return any(
        low <= elbow <= high and any(-30 <= shoulder + turn <= 170 for turn in (-360, 0, 360))
        for shoulder, elbow in both_postures(x, y, first)
    )


def tip(shoulder: float, elbow: float, first: float = FIRST) -> tuple[float, float]:
    one, both = math.radians(shoulder), math.radians(shoulder + elbow)
    return first * math.cos(one) + SECOND * math.cos(both), first * math.sin(one) + SECOND * math.sin(both)


def share_lost(count: int, old: tuple[float, float], new: tuple[float, float]) -> float:
    """Of poses at random joint values of the old arm, by geometry alone."""
    rng = np.random.default_rng(99)
    shoulder, elbow = rng.uniform(-30, 170, count), rng.uniform(*old, count)
    return sum(not reachable(*tip(a, b), new) for a, b in zip(shoulder, elbow, strict=True)) / count


def test_a_tighter_limit_loses_the_poses_that_geometry_says(tmp_path: Path) -> None:
    """The share within four standard deviations of its own count; every example out of the new arm's reach."""
    found = content(tmp_path, edited(("[-140, 140]", "[-60, 140]")), "--samples", "6000")
    wanted = share_lost(20_000, (-140, 140), (-60, 140))
    assert 0.05 < wanted < 0.5
    assert found["lost"]["share"] == pytest.approx(wanted, abs=4 * math.sqrt(wanted / 6000))
    assert found["gained"]["missing"] == 0
    for example in found["lost"]["examples"]:
        x, y = example["pose"][9:11]
        assert (x, y) == pytest.approx(tip(*example["joints"]), abs=1e-9)
        assert reachable(x, y, (-140, 140))
        assert not reachable(x, y, (-60, 140))
        assert example["why"] == "over a limit"


def test_a_longer_link_gains_what_lies_beyond_the_old_reach(tmp_path: Path) -> None:
    found = content(tmp_path, edited(("a = 180", "a = 220")))
    assert found["gained"]["missing"] > 0
    for example in found["gained"]["examples"]:
        x, y = example["pose"][9:11]
        assert reachable(x, y, (-140, 140), first=220)
        assert not reachable(x, y, (-140, 140))


# -- poses of the user's own -------------------------------------------------------------------------------------------
def test_each_pose_of_a_file_is_judged(tmp_path: Path) -> None:
    """A row whose elbow is past the new limit is lost where the other posture does not reach it either."""
    low = [(shoulder, -100) for shoulder in (-20, 60, 150)]
    kept = [reachable(*tip(*row), (-60, 140)) for row in low]
    assert kept == [False, True, True]
    rows = "# taught\nlabel,elbow,shoulder\n" + "".join(f"{name},{e},{s}\n" for name, (s, e) in zip("abc", low, strict=True))
    (tmp_path / "taught.csv").write_text(rows, encoding="utf-8")
    found = content(tmp_path, edited(("[-140, 140]", "[-60, 140]")), "--poses", tmp_path / "taught.csv")
    assert [(row["line"], row["label"], row["lost"]) for row in found["poses"]] == [
        (3, "a", True),
        (4, "b", False),
        (5, "c", False),
    ]
    assert [row["off_branch"] for row in found["poses"]] == [False, True, True]


def test_pose_rows_are_read_in_the_file_s_units(tmp_path: Path) -> None:
    """Distances from the shoulder against the sum of the links; at 100 mm the elbow stands at 146 and at 139 degrees."""
    poses = "1,0,0,0,1,0,0,0,1,350,0,12\n1,0,0,0,1,0,0,0,1,300,0,12\n1;0;0;0;1;0;0;0;1;100;0;12\n"
    (tmp_path / "poses.csv").write_text(poses, encoding="utf-8")
    found = content(tmp_path, edited(("a = 180", "a = 100")), "--poses", tmp_path / "poses.csv")
    assert [(row["old"], row["new"], row["lost"], row["gained"]) for row in found["poses"]] == [
        ("out of reach", "out of reach", False, False),  # 350 > 180 + 150
        ("reached", "out of reach", True, False),  # 300 > 100 + 150
        ("over a limit", "reached", False, True),
    ]


BAD_POSES = [
    ("", "holds no pose"),
    ("# nothing\n", "holds no pose"),
    ("1,2,3\n", "line 1: holds 3 numbers; 2 joint values (shoulder, elbow) or the 12 numbers of a pose are accepted"),
    ("shoulder,elbo\n1,2\n", 'line 1: unknown column "elbo"\n  hint: did you mean "elbow"?'),
    ("shoulder,shoulder\n1,2\n", 'line 1: the column "shoulder" stands twice'),
    ("shoulder\n1\n", "line 1: columns are missing: elbow"),
    ("shoulder,elbow\n", "holds no pose below its line of names"),
    ("1,2\n3,x\n4\n", 'line 2: "x" is no number'),
    ("1,2\n3,nan\n", 'line 2: "nan" is no number'),
    ("1,2\n4\n", "line 2: holds 1 cells; 2 are accepted"),
]


@pytest.mark.parametrize(("text", "message"), BAD_POSES, ids=lambda part: repr(part)[:24])
def test_a_faulty_poses_file_is_one_clear_error(tmp_path: Path, text: str, message: str) -> None:
    (tmp_path / "bad.csv").write_text(text, encoding="utf-8")
    done = compared(tmp_path, TWO_LINKS, "--poses", tmp_path / "bad.csv")
    assert (done.status, done.out) == (2, "")
    assert f"error: {tmp_path / 'bad.csv'}" in done.err
    assert message in done.err


def test_a_matrix_that_is_no_rotation_is_named_by_its_line(tmp_path: Path) -> None:
    (tmp_path / "bad.csv").write_text("1,0,0,0,1,0,0,0,2,1,1,1\n", encoding="utf-8")
    six = ARMS / "parallel_six.toml"
    done = call("compare", six, six, "--poses", tmp_path / "bad.csv")
    assert done.status == 2
    assert "line 1: the first nine numbers are no rotation\n  hint: " in done.err


# -- interface, structure, branches ------------------------------------------------------------------------------------
def changed_facets(found: dict) -> list[str]:
    return [part["what"] for part in found["interface"]["parts"] if not part["same"]]


THIRD = '\n[[joint]]\nname = "pen"\ntype = "revolute"\na = 20\n\n[tool]'
INTERFACE = [
    ((('"elbow"', '"forearm"'),), ["joint names"]),
    ((("[tool]", THIRD.lstrip()), ('"plane_point"', '"plane_pose"')), ["joint count", "joint names", "joint types", "task"]),
    (
        (("[tool]", THIRD.lstrip()), ("task =", 'held = ["pen"]\ntask =')),
        ["joint count", "joint names", "joint types", "held joints", "branch bits"],
    ),
]  # fmt: skip


@pytest.mark.parametrize(("changes", "facets"), INTERFACE, ids=["renamed", "joint added", "held joint added"])
def test_the_parts_of_the_interface_that_change_are_named(
    tmp_path: Path, changes: tuple[tuple[str, str], ...], facets: list[str]
) -> None:
    found = content(tmp_path, edited(*changes), "--samples", "200")
    assert changed_facets(found) == facets
    assert not found["interface"]["same"]
    if "joint count" in facets:
        assert found["tool_at_the_same_joints"] is None
        assert found["branch_numbers"]["numbering"] == "void"


def test_joints_in_another_order_are_matched_by_their_names(tmp_path: Path) -> None:
    """A spindle that turns and then slides places the tool as one that slides and then turns."""
    scara = (ARMS / "tray_scara.toml").read_text(encoding="utf-8")
    head, *joints = scara.split("[[joint]]\n")
    turn, tool = joints[3].split("[tool]")
    swapped = "[[joint]]\n".join([head, joints[0], joints[1], turn, f"{joints[2]}[tool]{tool}"])
    found = content(tmp_path, swapped, "--samples", "500", old=scara)
    assert changed_facets(found) == ["joint order", "joint types"]
    assert found["tool_at_the_same_joints"]["worst"] == 0.0
    assert max(joint["worst"] for joint in found["joints_for_the_same_poses"]["joints"]) < 1e-9
    assert found["lost"]["missing"] == found["gained"]["missing"] == 0


def test_a_wrist_that_no_longer_meets_is_another_structure(tmp_path: Path) -> None:
    picker = (ARMS / "vial_picker.toml").read_text(encoding="utf-8")
    found = content(tmp_path, picker.replace("alpha = 90", "alpha = 88"), "--samples", "300", old=picker)
    assert found["structure"]["gone"] == ["waist and shoulder: meeting, at a right angle"]
    assert found["structure"]["come"] == ["waist and shoulder: meeting, at an odd angle"]


def test_a_link_turned_round_voids_stored_branch_numbers(tmp_path: Path) -> None:
    """With the upper arm's length negative, the same joint values are another posture."""
    shoulder = (ARMS / "bench_six.toml").read_text(encoding="utf-8")
    turned = shoulder.replace("a = 290", "a = -290")
    found = content(tmp_path, turned, "--samples", "500", old=shoulder)
    assert found["branch_numbers"]["numbering"] in ("void", "renumbered")
    assert changed_facets(found) == []
    assert not found["interface"]["same"]
    done = compared(tmp_path, turned, "--samples", "300", "--fail-on", "interface", old=shoulder)
    assert done.status == 1
    assert "--fail-on interface: changed: meaning of branch numbers" in done.err


class Fake:
    """A side that only knows on which branch joint values lie."""

    derivation = object()

    def __init__(self, numbers: list[int]) -> None:
        self.compiled = self
        self.branches = 4
        self._numbers = np.array(numbers)

    def branch_of(self, q: np.ndarray) -> np.ndarray:
        return self._numbers


BEFORE = [0] * 100 + [1] * 100 + [2] * 100 + [3] * 100
RULES = [
    (BEFORE, Numbering.KEPT, "stored branch numbers stay valid"),
    ([1, *BEFORE[1:]], Numbering.KEPT, "but for 0.25 % of postures"),
    ([(1, 0, 2, 3)[b] for b in BEFORE], Numbering.RENUMBERED, "translate stored branch numbers: 0 is now 1, 1 is now 0"),
    ([3 - b if k % 2 else b for k, b in enumerate(BEFORE, start=1)], Numbering.VOID, "no fixed rule"),
    ([0] * 400, Numbering.VOID, "no fixed rule"),
]  # fmt: skip


@pytest.mark.parametrize(("after", "numbering", "means"), RULES, ids=["same", "border", "swapped", "mixed", "merged"])
def test_a_rule_for_stored_numbers_is_given_where_there_is_one(after: list[int], numbering: Numbering, means: str) -> None:
    q = np.zeros((400, 1))
    found = branch_numbers(Fake(BEFORE), Fake(after), q, q, comparable=True)  # type: ignore[arg-type]
    assert found.numbering is numbering
    assert means in found.means


# -- the C -------------------------------------------------------------------------------------------------------------
OLD_C = """\
/*
 * Made from one file.
 */
static const float A2 = 0.1f;  /* m, a of row 2 */
static const float FAR = 10.0f;  /* m */

/* what it does */
static int f(int x)
{
    return x + 1;  /* one */
}
"""


def diff(*changes: tuple[str, str]) -> list[str]:
    new = OLD_C
    for before, after in changes:
        new = new.replace(before, after)
    lines = code_diff({"arm_kin.c": OLD_C}, {"arm_kin.c": new}, frozenset({"FAR"}))
    return [line for line in lines if line[0] in "+-"]


def test_comments_empty_lines_and_bounds_on_rounding_are_no_difference() -> None:
    changes = [("one file", "another"), ("\n\n", "\n"), ("what it", "why it"), ("one */", "two */"), ("10.0f", "11.0f")]
    for change in changes:
        assert diff(change) == []
    assert diff(*changes) == []


def test_code_that_changed_is_shown_with_its_comment() -> None:
    assert diff(("0.1f", "0.2f"), ("x + 1", "x + 2")) == [
        "--- old/arm_kin.c",
        "+++ new/arm_kin.c",
        "-static const float A2 = 0.1f;  /* m, a of row 2 */",
        "+static const float A2 = 0.2f;  /* m, a of row 2 */",
        "-    return x + 1;  /* one */",
        "+    return x + 2;  /* one */",
    ]


# -- the command -------------------------------------------------------------------------------------------------------
def test_a_gate_for_lost_poses(tmp_path: Path) -> None:
    tighter = edited(("[-140, 140]", "[-60, 140]"))
    assert compared(tmp_path, tighter).status == 0
    assert compared(tmp_path, tighter, "--fail-on", "interface").status == 0
    done = compared(tmp_path, tighter, "--fail-on", "lost-poses,interface")
    assert done.status == 1
    assert "--fail-on lost-poses: poses are lost" in done.err
    (tmp_path / "kept.csv").write_text("60,-30\n", encoding="utf-8")
    assert compared(tmp_path, tighter, "--fail-on", "lost-poses", "--poses", tmp_path / "kept.csv").status == 0


def test_the_text_begins_with_a_summary_in_the_file_s_units(tmp_path: Path) -> None:
    done = compared(tmp_path, edited(("a = 180", "a = 182.5")))
    assert done.status == 0
    title, empty, heading, *lines = done.out.splitlines()
    assert title == f"{tmp_path / 'old.toml'} -> {tmp_path / 'new.toml'}"
    assert (empty, heading) == ("", "SUMMARY")
    assert lines[:3] == ["  link table: 1 change", "  structure: the same", "  interface of the C: the same"]
    assert lines[4] == "  tool at the same joint values: moves 2.5 mm at the worst, 2.5 mm in the mean"
    assert "  joint 1 (\"shoulder\")  a     180 mm  182.5 mm" in lines
    assert re.search(r"^    \+static const arm_real A1 = 0\.1825f;", done.out, re.MULTILINE)


def test_markdown_for_a_pull_request(tmp_path: Path) -> None:
    done = compared(tmp_path, edited(("a = 180", "a = 182.5")), "--markdown")
    assert done.out.startswith(f"## {tmp_path / 'old.toml'} -> ")
    assert '| joint 1 ("shoulder") | a    | 180 mm | 182.5 mm |' in done.out
    assert "```diff\n--- old/arm_kin.c\n" in done.out
    assert done.out.count("```") % 2 == 0


def test_the_same_seed_gives_the_same_answer_and_another_seed_other_poses(tmp_path: Path) -> None:
    tighter = edited(("[-140, 140]", "[-60, 140]"))
    first, again, other = (compared(tmp_path, tighter, "--seed", seed).out for seed in ("4", "4", "5"))
    assert first == again
    assert first != other


BAD_CALLS = [
    (("--fail-on", "lost"), 'error: --fail-on: unknown word "lost"'),
    (("--json", "--markdown"), "error: --json, --markdown: one form at a time"),
    (("--real", "long"), 'error: --real: unknown word "long"'),
]


@pytest.mark.parametrize(("arguments", "message"), BAD_CALLS, ids=lambda part: str(part)[:20])
def test_a_bad_call_is_refused_before_anything_is_made(tmp_path: Path, arguments: tuple[str, ...], message: str) -> None:
    done = compared(tmp_path, TWO_LINKS, *arguments)
    assert (done.status, done.out) == (2, "")
    assert message in done.err
    assert names_in(tmp_path) == ["new.toml", "old.toml"]


def test_a_new_arm_that_cannot_do_its_task_is_named(tmp_path: Path) -> None:
    done = compared(tmp_path, CANNOT_REACH)
    assert (done.status, done.out) == (1, "")
    assert 'error: new.toml: task "point" asks for 3 independent motions' in done.err
