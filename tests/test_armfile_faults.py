"""Faulty arm files: every fault is reported, and says where it stands, what it is and how to mend it."""

from __future__ import annotations

import os
import shutil
import subprocess
from pathlib import Path

import pytest

from codegen.armfile import read_arm
from codegen.armfile_keys import LONGEST_LINE, MOST_BYTES
from codegen.armfile_names import KEYWORDS
from codegen.errors import ArmFileError, Fault

HEAD = '[arm]\nname = "x"\nconvention = "standard"\ntask = "plane_point"\n'
FIRST = '[[joint]]\nname = "arm link"\ntype = "revolute"\na = 1\n'
LAST = '[[joint]]\ntype = "revolute"\na = 1\n'
GOOD = HEAD + FIRST + LAST


def faults(folder: Path, text: str | bytes) -> tuple[Fault, ...]:
    path = folder / "arm.toml"
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    with pytest.raises(ArmFileError) as caught:
        read_arm(path)
    assert caught.value.exit_status == 2
    assert all(fault.where.startswith(str(path)) for fault in caught.value.faults)
    return caught.value.faults


def only(folder: Path, text: str | bytes) -> str:
    """The one fault's text, the path left out."""
    found = faults(folder, text)
    assert len(found) == 1, "\n".join(str(fault) for fault in found)
    return str(found[0]).removeprefix(str(folder / "arm.toml"))


def test_the_file_that_every_row_changes_is_good(tmp_path: Path) -> None:
    (tmp_path / "arm.toml").write_text(GOOD)
    assert read_arm(tmp_path / "arm.toml").warnings == ()


def test_names_that_cannot_be_printed_are_shown_by_their_codes(tmp_path: Path) -> None:
    """A name of the file in a hint, too: a soft hyphen would not be seen, a line feed would break the message."""
    text = GOOD.replace('[[joint]]\nname = "arm link"', 'held = ["arm\\u00ADlin"]\n[[joint]]\nname = "arm\\u00ADlink"')
    found = "\n".join(str(fault) for fault in faults(tmp_path, text))
    assert 'did you mean "arm\\xadlink"?' in found
    assert found.replace("\n", "").isprintable()


# Lines added to the second joint, and the whole message.
JOINT_FAULTS = [
    ("aplha = 1", 'unknown key "aplha"\n  hint: did you mean "alpha"?'),
    ("zzz = 1", 'unknown key "zzz"\n  hint: accepted are a, alpha, d, limits, max_speed, name, theta, type'),
    ("task = 1", 'unknown key "task"\n  hint: it belongs under [arm]'),
    ("xyz = [0, 0, 0]", 'unknown key "xyz"\n  hint: it belongs under [base] or [tool]'),
    (
        'd = "150"',
        'd = "150" is not a number; a number in metres, at most 10000, is accepted\n  hint: write d = 150 without',
    ),
    ('d = "\\t150\\n"', "hint: write d = 150 without"),
    ('d = "pi/2"', 'd = "pi/2" is not a number; a number in metres, at most 10000, is accepted'),
    ("d = true", "d = true is not a number"),
    ("d = [1]", "d = [1] is not a number"),
    ("d = " + "[" * 450 + "]" * 450, "d = [[...]] is not a number"),
    ("d = {a = 1}", "d = a table is not a number"),
    ("d = 1979-05-27", "d = 1979-05-27 is not a number"),
    ("d = nan", "d = NaN is not a finite number"),
    ("d = -inf", "d = -Infinity is not a finite number"),
    ("d = 1e5", "d = 1E+5 is absurdly large; a number in metres, at most 10000, is accepted"),
    ("d = 1e999999999", "d = 1E+999999999 is absurdly large"),
    ("d = 1e99999999999999999999999", "d = Infinity is not a finite number"),
    ("d = 1e-999999999", "d = 1E-999999999 is closer to zero than 1e-30 without being zero"),
    ("d = 0." + "1" * 50, "has more than 40 digits"),
    ("d = " + "9" * 900, "d = an integer of very many digits is absurdly large"),
    ("theta = -20000", "theta = -20000 is absurdly large; a number in radians, at most 17453, is accepted"),
    ("limits = 3", "limits = 3: a list of 2 numbers in radians is accepted\n  hint: write limits = [lower, upper]"),
    ("limits = [1]", "limits = [1]: a list of 2 numbers"),
    ("limits = [-1, 1, 2]", "limits = [-1, 1, 2]: a list of 2 numbers"),
    ("limits = [-1, true]", "limits[1] = true is not a number"),
    ("limits = [-inf, 1]", "limits[0] = -Infinity is not a finite number; a number in radians"),
    ("limits = [0, inf]", "is accepted\n  hint: leave limits out when the joint has none"),
    ("limits = [1, -1]", "limits = [1, -1] stand the wrong way round\n  hint: write limits = [-1, 1]"),
    ("limits = [1, 1.0]", "limits = [1, 1.0] leave the joint no way to move\n  hint: a joint that cannot move"),
    ("max_speed = 0", "max_speed = 0: a number above zero, in radians per second, is accepted"),
    ("max_speed = -1.5", "max_speed = -1.5: a number above zero"),
    ("name = 5", 'name = 5: a name in quotes is accepted\n  hint: write name = "..."'),
    ('name = ""', 'name = "" is empty'),
    (f'name = "{"n" * 41}"', "has 41 characters; at most 40 are accepted"),
    ('name = "arm link"', "has the name of joint 1\n  hint: give every joint its own name"),
]


@pytest.mark.parametrize(("line", "message"), JOINT_FAULTS, ids=[line[:24] for line, _ in JOINT_FAULTS])
def test_a_fault_in_a_joint(tmp_path: Path, line: str, message: str) -> None:
    said = only(tmp_path, GOOD + line + "\n")
    assert said.startswith(": joint 2")
    assert message in said


@pytest.mark.parametrize(
    "name", ["a*/b", "/*", "a\\\\b", "a\\nb", "a\\u0000", "a\\u202eb", 'a\\"b', "Ellbögen", " a", "a ", "??/", "%d"]
)
def test_a_joint_name_that_could_break_a_comment(tmp_path: Path, name: str) -> None:
    said = only(tmp_path, f'{GOOD}name = "{name}"\n')
    assert "holds a character that is not accepted" in said
    assert said.isprintable() or said.replace("\n", "").isprintable()


@pytest.mark.parametrize("name", ["elbow", "wrist 1", "J-2", "no. 3", "_x", "4th_axis"])
def test_a_joint_name_that_is_accepted(tmp_path: Path, name: str) -> None:
    (tmp_path / "arm.toml").write_text(f'{GOOD}name = "{name}"\n')
    assert read_arm(tmp_path / "arm.toml").arm.joints[1].name == name


# A text that replaces a part of the good file, and the whole message.
ARM_FAULTS = [
    ('name = "x"', 'nmae = "x"', '[arm]: unknown key "nmae"\n  hint: did you mean "name"?'),
    ('name = "x"\n', "", "[arm]: name is missing\n  hint: name of the arm, a C identifier"),
    ('name = "x"', "name = 3", '[arm]: name = 3: a C identifier in quotes is accepted\n  hint: write name = "..."'),
    (
        'name = "x"',
        'name = "my arm"',
        '[arm]: name = "my arm" is not a C identifier\n  hint: letters, digits and _ only',
    ),
    ('name = "x"', 'name = "6dof"', 'write "arm_6dof", say'),
    ('name = "x"', 'name = "ünï"', "is not a C identifier"),
    ('name = "x"', 'name = "x\\n"', 'name = "x\\n" is not a C identifier'),
    ('name = "x"', 'name = ""', 'name = "" is not a C identifier'),
    (
        'name = "x"',
        'name = "register"',
        'name = "register" is a keyword of C or C++\n  hint: write "register_arm", say',
    ),
    ('name = "x"', 'name = "__x"', 'name = "__x" is reserved for the C compiler\n  hint: write "x", say'),
    ('name = "x"', 'name = "_X"', 'name = "_X" is reserved'),
    ('name = "x"', f'name = "{"x" * 41}"', "has 41 characters; at most 40 are accepted"),
    ('convention = "standard"\n', "", "convention is missing\n  hint: how a row is read"),
    (
        '"standard"',
        '"Standard"',
        'convention = "Standard": one of "modified", "standard" is accepted\n  hint: did you mean "st',
    ),
    ('"standard"', "1", 'convention = 1: one of "modified", "standard" is accepted\n  hint: write it in quotes'),
    ('task = "plane_point"\n', "", "task is missing\n  hint: what inverse kinematics must reach"),
    ('"plane_point"', '"plane_pont"', 'hint: did you mean "plane_point"?'),
    ('"plane_point"', '["pose"]', 'task = ["pose"]: one of "plane_point", "plane_pose", "point", "point_axis"'),
    ("[[joint]]\nname", 'length_unit = "cm"\n[[joint]]\nname', 'length_unit = "cm": one of "m", "mm" is accepted'),
    ("[[joint]]\nname", 'angle_unit = "degrees"\n[[joint]]\nname', '"rad" is accepted\n  hint: did you mean "deg"?'),
    (
        "[[joint]]\nname",
        'held = "a"\n[[joint]]\nname',
        'held = "a": a list of joint names in quotes is accepted\n  hint: write held = ["a"]',
    ),
    (
        "[[joint]]\nname",
        'held = ["arm lnk"]\n[[joint]]\nname',
        'held: no joint is named "arm lnk"\n  hint: did you mean "arm link"?',
    ),
    ("[[joint]]\nname", 'held = ["z"]\n[[joint]]\nname', 'hint: the joints are "arm link", "joint2"'),
    ("[[joint]]\nname", "held = [1]\n[[joint]]\nname", "held = [1]: a list of joint names in quotes is accepted"),
    ("[[joint]]\nname", "[tol]\n[[joint]]\nname", 'unknown table "tol"\n  hint: did you mean "tool"?'),
    ("[arm]", 'task = "pose"\n[arm]', 'unknown key "task"\n  hint: it belongs under [arm]'),
    (
        "[[joint]]\nname",
        "[tool]\nxyz = 5\n[[joint]]\nname",
        "[tool]: xyz = 5: a list of 3 numbers in metres is accepted\n  hint: write xyz = [0, 0, 0]",
    ),
    (
        "[[joint]]\nname",
        "[base]\nrpy = [0, 1]\n[[joint]]\nname",
        "[base]: rpy = [0, 1]: a list of 3 numbers in radians",
    ),
    ("[[joint]]\nname", '[base]\nxyz = [0, "1", 0]\n[[joint]]\nname', '[base]: xyz[1] = "1" is not a number'),
    (
        "[[joint]]\nname",
        "[[base]]\nxyz = [0, 0, 0]\n[[joint]]\nname",
        "[base]: [a table] stands where a table is accepted",
    ),
    (
        'type = "revolute"\na = 1\n[[',
        "a = 1\n[[",
        'joint 1 ("arm link"): type is missing\n  hint: what the joint does: "prismatic" or "revolute"',
    ),
    ('type = "revolute"\na = 1\n[[', 'type = "revolut"\na = 1\n[[', 'did you mean "revolute"?'),
]


@pytest.mark.parametrize(("old", "new", "message"), ARM_FAULTS, ids=[new[:30] for _, new, _ in ARM_FAULTS])
def test_a_fault_elsewhere(tmp_path: Path, old: str, new: str, message: str) -> None:
    assert old in GOOD
    assert message in only(tmp_path, GOOD.replace(old, new, 1))


def test_no_unit_is_guessed_from_two_letters(tmp_path: Path) -> None:
    """A hint that "cm" may mean "m" would be a hundredfold error."""
    (fault,) = faults(tmp_path, GOOD.replace("[[joint]]", 'length_unit = "cm"\n[[joint]]', 1))
    assert fault.hint == ""


def chain(task: str, joints: int, held: str = "") -> str:
    return HEAD.replace("plane_point", task) + held + LAST * joints


# Task, joints, held, what, hint.
COUNT_FAULTS = [
    ("pose", 5, "", '5 joints that are not held, task "pose" needs 6', 'task "point_axis" fits 5 joints'),
    ("pose", 7, "", '7 joints that are not held, task "pose" needs 6', 'hold one joint, e.g. held = ["joint3"]'),
    ("pose", 4, "", "4 joints", 'task "point_pitch" or "point_yaw" fits 4 joints'),
    ("point", 2, "", "2 joints", 'task "plane_point" fits 2 joints'),
    ("point", 1, "", "1 joint that is not held", "no task fits 1 joint that is not held"),
    (
        "point",
        5,
        "",
        "5 joints",
        'hold two joints, e.g. held = ["joint2", "joint3"]; or task "point_axis" fits 5 joints',
    ),
    ("pose", 6, 'held = ["joint6"]', "5 joints", 'take one joint out of held; or task "point_axis" fits 5 joints'),
    (
        "point_axis",
        7,
        'held = ["joint7"]',
        "6 joints",
        'e.g. held = ["joint2", "joint7"]; or task "pose" fits 6 joints',
    ),
    ("plane_point", 2, 'held = ["joint1", "joint2"]', "0 joints", "take two joints out of held"),
]


@pytest.mark.parametrize(("task", "joints", "held", "what", "hint"), COUNT_FAULTS)
def test_a_joint_count_that_does_not_fit_the_task(
    tmp_path: Path, task: str, joints: int, held: str, what: str, hint: str
) -> None:
    (fault,) = faults(tmp_path, chain(task, joints, held + "\n"))
    assert fault.where.endswith(": [arm]")
    assert what in fault.what
    assert hint in fault.hint


@pytest.mark.parametrize(("task", "joints"), [("pose", 7), ("point", 7), ("plane_point", 7), ("point_yaw", 5)])
def test_the_proposed_held_joints_mend_the_file(tmp_path: Path, task: str, joints: int) -> None:
    (fault,) = faults(tmp_path, chain(task, joints))
    held = fault.hint.split("e.g. ")[1].split(";")[0]
    (tmp_path / "arm.toml").write_text(chain(task, joints, held + "\n"))
    assert read_arm(tmp_path / "arm.toml").arm.task.key == task


# A whole file, and the message.
FILES = [
    ("", "the table [arm] is missing"),
    (HEAD, "the table [[joint]] is missing"),
    (HEAD + "joint = []", '[arm]: unknown key "joint"'),
    ("joint = []\n" + HEAD, "there is no joint\n  hint: an arm has 1 to 7"),
    ("joint = 3\n" + HEAD, "[joint]: joints are not a list of tables\n  hint: begin each joint with [[joint]]"),
    (HEAD + '[joint]\ntype = "revolute"', "begin each joint with [[joint]], in double brackets"),
    (HEAD + LAST * 8, "8 joints; 1 to 7 are accepted"),
    ("arm = 3\n" + FIRST + LAST, "[arm]: 3 stands where a table is accepted"),
    (HEAD + "[[joints]]\n" + LAST[10:], 'unknown table "joints"\n  hint: did you mean "joint"?'),
    (GOOD + '[[joint]]\nname = "joint2"\ntype = "revolute"', 'joint 3 ("joint2"): has the name of joint 2'),
]


@pytest.mark.parametrize(("text", "message"), FILES)
def test_a_file_with_the_wrong_tables(tmp_path: Path, text: str, message: str) -> None:
    assert any(message in str(fault) for fault in faults(tmp_path, text))


# A whole file, and where and what. TOML 1.0.0 (toml.io) says what is one.
NO_TOML = [
    ("[arm]\nname = x\n", ":2:8: not TOML: Invalid value"),
    ("[arm]\nd = pi/2\n", "a value is a number (0.5, not .5 or pi/2)"),
    ("[arm]\nd = .5\n", "the line reads: d = .5"),
    ("[arm]\nd = 1,5\n", ":2:6: not TOML: Expected newline"),
    ("[arm\n", ":1:5: not TOML"),
    ("[arm]\nd: 3\n", "hint: write key = value"),
    ("[arm]\nlimits = [-090, 90]\n", "no number begins with a spare zero"),
    ("[arm]\nlimits = [1, 2\n", ":2:15: not TOML: Unclosed array"),
    ("[arm]\nd = 1\nd = 2\n", ":3:6: not TOML: Cannot overwrite a value"),
    ("[arm]\n[arm]\n", ":2:5: not TOML: Cannot declare"),
    ("[joint]\n[[joint]]\n", "each joint has its own [[joint]]"),
    ("d = " + "9" * 5000, ":1: a line of 5004 characters; at most 1000 are accepted"),
    ("d = [" + "[\n" * 20_000, "lists or tables nested too deeply"),
    (b'[arm]\nname = "\xe9"\n', ":2: byte 0xe9 is not UTF-8 text\n  hint: save the file with the encoding UTF-8"),
    (b"\xff\xfe[\0a\0r\0m\0]\0", ":1: byte 0xff is not UTF-8 text"),
    ('[arm]\nname = "\0"\n', ":2:9: not TOML: Illegal character"),
    ("a." * (LONGEST_LINE // 2) + "a = 1", "at most 1000 are accepted"),
]


@pytest.mark.parametrize(("text", "message"), NO_TOML, ids=[str(text[:24]) for text, _ in NO_TOML])
def test_a_file_that_is_no_toml(tmp_path: Path, text: str | bytes, message: str) -> None:
    assert message in only(tmp_path, text)


def test_a_long_comment_is_no_fault(tmp_path: Path) -> None:
    (tmp_path / "arm.toml").write_text("# " + "word " * 1000 + "\n" + GOOD)
    assert read_arm(tmp_path / "arm.toml").arm.name == "x"


def test_a_huge_file_is_refused_before_it_is_parsed(tmp_path: Path) -> None:
    assert f"larger than {MOST_BYTES} bytes" in only(tmp_path, GOOD + "# spare\n" * 150_000)


def test_an_endless_file_is_refused() -> None:
    with pytest.raises(ArmFileError, match="/dev/zero: larger than"):
        read_arm(Path("/dev/zero"))


def test_a_missing_file_names_its_neighbour(tmp_path: Path) -> None:
    (tmp_path / "vial_picker.toml").write_text(GOOD)
    with pytest.raises(ArmFileError, match=r'no such file\n  hint: did you mean ".*vial_picker.toml"'):
        read_arm(tmp_path / "vial_piker.toml")


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("", "this is a directory"),
        ("no/arm.toml", "no such file"),
        ("x" * 300, "cannot be read"),
        ("a\0b", "cannot be read"),
    ],
)
def test_a_path_that_leads_to_no_file(tmp_path: Path, name: str, message: str) -> None:
    with pytest.raises(ArmFileError, match=message):
        read_arm(tmp_path / name)


@pytest.mark.skipif(os.geteuid() == 0, reason="root may read every file")
def test_a_file_without_permission(tmp_path: Path) -> None:
    (tmp_path / "arm.toml").write_text(GOOD)
    (tmp_path / "arm.toml").chmod(0)
    with pytest.raises(ArmFileError, match="no permission"):
        read_arm(tmp_path / "arm.toml")


def test_permission_denied_as_the_system_says_it(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def denied(*_: object, **__: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", denied)
    with pytest.raises(ArmFileError, match="no permission to read this file"):
        read_arm(tmp_path / "arm.toml")


MANY = """
[arm]
name = "double"
convention = "dh"
task = "pose"
held = ["ebow"]
[[joint]]
name = "elbow"
type = "revolute"
alfa = 90
limits = [3, 1]
[[joint]]
type = "slide"
d = true
[tool]
rpy = [0, nan, 1e9]
"""


def test_every_fault_of_a_file_is_reported_at_once_in_the_order_of_the_file(tmp_path: Path) -> None:
    said = [f"{fault.where.removeprefix(str(tmp_path / 'arm.toml'))}: {fault.what}" for fault in faults(tmp_path, MANY)]
    starts = [
        ': [arm]: name = "double"',
        ': [arm]: convention = "dh"',
        ': joint 1 ("elbow"): unknown key "alfa"',
        ': joint 1 ("elbow"): limits = [3, 1]',
        ': joint 2: type = "slide"',
        ": joint 2: d = true",
        ": [tool]: rpy[1] = NaN",
        ": [tool]: rpy[2] = 1E+9",
        ': [arm]: held: no joint is named "ebow"',
    ]
    assert len(said) == len(starts)
    assert all(text.startswith(start) for text, start in zip(said, starts, strict=True))


def test_a_flood_of_faults_is_cut_short(tmp_path: Path) -> None:
    found = faults(tmp_path, GOOD + "".join(f"zz{number} = 1\n" for number in range(250)))
    assert len(found) == 101
    assert found[-1].what == "150 more faults"


@pytest.mark.skipif(shutil.which("g++") is None, reason="needs a C++ compiler")
def test_every_refused_word_is_refused_by_a_compiler(tmp_path: Path) -> None:
    """As the name of a constant, in C23 or in C++20, by gcc; a word that this gcc is too old for is left out."""
    words = sorted(KEYWORDS - {"typeof", "typeof_unqual"})
    source = "".join(f"enum {{ {word} }};\n" for word in words)
    refused: set[int] = set()
    for language, standard in (("c", "c2x"), ("c++", "c++20")):
        command = ["gcc", f"-x{language}", f"-std={standard}", "-fsyntax-only", "-fmax-errors=0", "-"]
        run = subprocess.run(command, input=source, capture_output=True, text=True, cwd=tmp_path, check=False)
        errors = [line for line in run.stderr.splitlines() if line.startswith("<stdin>:") and "error" in line]
        refused |= {int(line.split(":")[1]) for line in errors}
    assert [word for number, word in enumerate(words, start=1) if number not in refused] == []
