"""The command line: names, options and exit statuses of the contract; clear errors; data and messages apart."""

from __future__ import annotations

import hashlib
import json
import re
import subprocess
import sys
from pathlib import Path

import jsonschema
import pytest
from command_line import CANNOT_REACH, PICKER, PLOTTER, call, names_in

from codegen import VERSION
from codegen.armfile import read_arm
from codegen.emit.files import Source
from codegen.main import COMMANDS
from codegen.options import Mathematics, Options, RealType
from codegen.pipeline import generate
from codegen.places import ARMS

NAMES = [command.__name__ for command in COMMANDS]
# Every command that users can rely on; those that do not work yet are not to be seen.
PROMISED = ["generate", "agree", "compare", "explain", "draw", "cost", "adopt", "check", "stale", "report", "schema"]


def listed_commands() -> list[str]:
    """The first word of every line of the help below "Commands:"."""
    return re.findall(r"^  ([a-z]+) ", call("--help").out.split("Commands:")[1], flags=re.MULTILINE)


def test_the_help_lists_every_command_that_works() -> None:
    assert listed_commands() == NAMES
    assert set(NAMES) <= set(PROMISED)
    assert len(NAMES) >= 8


@pytest.mark.parametrize("command", NAMES)
def test_the_help_of_a_command_holds_an_example_that_can_be_typed(command: str) -> None:
    done = call(command, "--help")
    assert done.status == 0
    assert re.search(rf"^ +linkwright {command}\b", done.out, flags=re.MULTILINE)


def test_no_short_help_is_cut_off() -> None:
    assert "..." not in call("--help").out.split("Commands:")[1]


def test_version() -> None:
    assert call("--version") == call("--version", "generate")
    assert call("--version").out == f"linkwright {VERSION}\n"


@pytest.mark.parametrize(
    "arguments",
    [
        ["generate"],
        ["generate", str(PLOTTER)],
        ["nonsense"],
        ["generate", "--nonsense"],
        ["agree", str(PLOTTER), "--samples", "0"],
    ],
    ids=lambda arguments: " ".join(Path(word).name for word in arguments),
)
def test_a_bad_call_exits_with_two_and_says_why(arguments: list[str]) -> None:
    done = call(*arguments)
    assert done.status == 2
    assert done.out == ""
    assert "Error: " in done.err


def test_a_call_without_a_command_shows_the_help() -> None:
    done = call()
    assert done.status == 2
    assert "Commands:" in done.out + done.err


# --- generate ---


def test_generate_writes_what_the_pipeline_gives_and_only_messages_on_standard_error(tmp_path: Path) -> None:
    done = call("generate", PICKER, "--out", tmp_path / "new" / "folder")
    file = read_arm(PICKER)
    assert (done.status, done.out) == (0, "")
    assert "wrote" in done.err
    written = {path.name: path.read_text(encoding="utf-8") for path in (tmp_path / "new" / "folder").iterdir()}
    assert written == generate(file.arm, Options(), Source("vial_picker.toml", file.digest))


def test_every_option_reaches_the_c(tmp_path: Path) -> None:
    done = call("generate", PLOTTER, "--out", tmp_path, "--real", "double", "--math", "libm", "--prefix", "left")
    assert done.status == 0
    file = read_arm(PLOTTER)
    options = Options(RealType.DOUBLE, Mathematics.LIBM, "left")
    assert names_in(tmp_path) == ["left_kin.c", "left_kin.h"]
    expected = generate(file.arm, options, Source(PLOTTER.name, file.digest))
    assert (tmp_path / "left_kin.c").read_text(encoding="utf-8") == expected["left_kin.c"]


def test_the_c_does_not_depend_on_where_the_arm_file_lies(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / PLOTTER.name).write_bytes(PLOTTER.read_bytes())
    monkeypatch.chdir(tmp_path)
    assert call("generate", PLOTTER, "--out", "first").status == 0
    assert call("generate", PLOTTER.name, "--out", "second").status == 0
    for name in names_in(tmp_path / "first"):
        assert (tmp_path / "first" / name).read_bytes() == (tmp_path / "second" / name).read_bytes()


BAD_OPTIONS = [
    (
        ["--real", "fixed"],
        "error: --real: fixed-point numbers cannot be generated yet\n  hint: choose float or double\n",
    ),
    (["--real", "flaot"], 'error: --real: unknown word "flaot"\n  hint: did you mean "float"?\n'),
    (["--real", "x"], 'error: --real: unknown word "x"\n  hint: accepted are double, float\n'),
    (["--math", "x"], 'error: --math: unknown word "x"\n  hint: accepted are libm, own\n'),
    (["--prefix", "left arm"], 'error: --prefix: "left arm" is not a C identifier\n'),
    (["--prefix", "int"], 'error: --prefix: "int" is a keyword of C or C++\n  hint: write "int_arm", say\n'),
    (["--prefix", "class"], 'error: --prefix: "class" is a keyword of C or C++\n'),
    (["--prefix", "_arm"], 'error: --prefix: "_arm" is reserved for the C compiler\n  hint: write "arm", say\n'),
    (["--prefix", ""], 'error: --prefix: "" is not a C identifier\n'),
    (["--prefix", "a*/x"], 'error: --prefix: "a*/x" is not a C identifier\n'),
    (["--angle-error", "1"], "error: --angle-error: 1 ulp cannot be promised\n  hint: give 2 or more\n"),
    (["--angle-error", "16", "--math", "libm"], "error: --angle-error: says nothing about --math libm\n"),
    (["--angles", "whole"], 'error: --angles: unknown word "whole"\n  hint: accepted are integer, real\n'),
    (["--angles", "integer", "--math", "libm"], "error: --angles: says nothing about --math libm\n"),
    (["--angles", "integer", "--real", "double"], "error: --angles: whole numbers of 32 bits hold no double\n"),
]


@pytest.mark.parametrize("command", ["generate", "stale", "agree"])
@pytest.mark.parametrize(("options", "message"), BAD_OPTIONS, ids=[" ".join(row[0]) for row in BAD_OPTIONS])
def test_a_bad_option_gets_one_clear_error(command: str, options: list[str], message: str, tmp_path: Path) -> None:
    out = [] if command == "agree" else ["--out", tmp_path / "out"]
    done = call(command, PLOTTER, *out, *options)
    assert (done.status, done.out) == (2, "")
    assert done.err.startswith(message)
    assert names_in(tmp_path) == []


def test_all_faults_of_the_options_come_at_once(tmp_path: Path) -> None:
    done = call("generate", PLOTTER, "--out", tmp_path, "--real", "fixed", "--math", "x", "--prefix", "int")
    assert done.err.count("error: ") == 3


def test_a_faulty_arm_file_shows_every_fault_and_writes_nothing(tmp_path: Path) -> None:
    faulty = tmp_path / "faulty.toml"
    faulty.write_text(PLOTTER.read_text(encoding="utf-8").replace("limits", "limit"), encoding="utf-8")
    done = call("generate", faulty, "--out", tmp_path / "out")
    assert (done.status, done.out) == (2, "")
    assert done.err.count(f"error: {faulty}: joint ") == 2
    assert 'did you mean "limits"?' in done.err
    assert "Traceback" not in done.err
    assert names_in(tmp_path) == ["faulty.toml"]


def test_an_arm_that_cannot_do_its_task_exits_with_one_and_writes_nothing(tmp_path: Path) -> None:
    (tmp_path / "flat.toml").write_text(CANNOT_REACH, encoding="utf-8")
    done = call("generate", tmp_path / "flat.toml", "--out", tmp_path / "out")
    assert done.status == 1
    assert "error: " in done.err
    assert "Traceback" not in done.err
    assert names_in(tmp_path) == ["flat.toml"]


def test_a_warning_of_the_arm_file_does_not_stop_it(tmp_path: Path) -> None:
    doubtful = tmp_path / "doubtful.toml"
    doubtful.write_text(PICKER.read_text(encoding="utf-8").replace('"mm"', '"m"'), encoding="utf-8")
    done = call("generate", doubtful, "--out", tmp_path / "out")
    assert done.status == 0
    assert "warning: " in done.err


def test_a_bug_of_the_tool_keeps_its_traceback(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(*_: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr("codegen.pipeline.generate", broken)
    with pytest.raises(ZeroDivisionError):
        call("generate", PLOTTER, "--out", tmp_path)


def test_generate_starts_without_the_packages_that_only_checks_need(tmp_path: Path) -> None:
    """numpy alone would take longer to import than a small arm to generate."""
    program = (
        "import sys; from codegen.main import app\n"
        f"app(['generate', {str(PLOTTER)!r}, '--out', {str(tmp_path)!r}], standalone_mode=False)\n"
        "print(sorted({'numpy', 'sympy', 'scipy', 'cffi', 'matplotlib', 'rich'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert done.stdout == "[]\n"


# --- stale ---


@pytest.fixture
def generated(tmp_path: Path) -> Path:
    assert call("generate", PLOTTER, "--out", tmp_path).status == 0
    return tmp_path


def test_c_that_was_just_generated_is_not_stale(generated: Path) -> None:
    done = call("stale", PLOTTER, "--out", generated)
    assert (done.status, done.out) == (0, "")


def test_the_files_beside_the_c_can_be_stale_too(generated: Path) -> None:
    done = call("stale", PLOTTER, "--out", generated, "--self-test")
    assert done.status == 1
    assert done.out == "".join(
        f"{generated / name}: missing\n" for name in ("arm_kin_selftest.c", "arm_kin_selftest.h")
    )
    assert call("generate", PLOTTER, "--out", generated, "--self-test").status == 0
    assert call("stale", PLOTTER, "--out", generated, "--self-test").status == 0
    assert call("stale", PLOTTER, "--out", generated, "--self-test", "--self-test-size", "3").status == 1


def test_a_change_by_hand_is_shown_with_its_lines(generated: Path) -> None:
    header = generated / "arm_kin.h"
    text = header.read_text(encoding="utf-8")
    header.write_text(text.replace("#define ARM_JOINTS   2", "#define ARM_JOINTS   3"), encoding="utf-8")
    done = call("stale", PLOTTER, "--out", generated)
    assert done.status == 1
    assert f"--- {header}\n" in done.out
    assert "\n-#define ARM_JOINTS   3\n+#define ARM_JOINTS   2\n" in done.out


def test_a_forgotten_generate_is_stale_and_other_options_are_too(generated: Path, tmp_path: Path) -> None:
    longer = tmp_path / PLOTTER.name
    text = PLOTTER.read_text(encoding="utf-8")
    changed, count = re.subn(r"limits = \[0, \d+", "limits = [0, 123", text, count=1)
    assert count == 1
    longer.write_text(changed, encoding="utf-8")
    assert call("stale", longer, "--out", generated).status == 1
    assert call("stale", PLOTTER, "--out", generated, "--real", "double").status == 1


def test_missing_files_say_so(generated: Path) -> None:
    (generated / "arm_kin.c").unlink()
    done = call("stale", PLOTTER, "--out", generated)
    assert done.status == 1
    assert done.out == f"{generated / 'arm_kin.c'}: missing\n"


def test_line_ends_that_a_checkout_changed_are_named(generated: Path) -> None:
    source = generated / "arm_kin.c"
    source.write_bytes(source.read_bytes().replace(b"\n", b"\r\n"))
    done = call("stale", PLOTTER, "--out", generated)
    assert done.status == 1
    assert "only its line ends differ" in done.out


def test_a_long_difference_is_cut(generated: Path) -> None:
    (generated / "arm_kin.c").write_bytes(b"\xff\n" * 500)
    done = call("stale", PLOTTER, "--out", generated)
    assert done.status == 1
    assert len(done.out.splitlines()) < 40
    assert re.search(r"\.\.\. and \d+ more lines", done.out)


def test_stale_changes_nothing(generated: Path) -> None:
    before = {name: hashlib.sha256((generated / name).read_bytes()).digest() for name in names_in(generated)}
    call("stale", PLOTTER, "--out", generated, "--real", "double")
    assert {name: hashlib.sha256((generated / name).read_bytes()).digest() for name in names_in(generated)} == before


# --- schema ---


def test_schema_prints_a_json_schema(tmp_path: Path) -> None:
    done = call("schema")
    assert (done.status, done.err) == (0, "")
    jsonschema.Draft202012Validator.check_schema(json.loads(done.out))


# --- adopt, draw, cost ---


def test_adopt_writes_an_arm_file_that_the_reader_takes(tmp_path: Path) -> None:
    description = Path(__file__).parent / "data" / "wall_lift.urdf"
    done = call("adopt", description, "--tip", "plate", "--out", tmp_path / "arm.toml")
    assert (done.status, done.out) == (0, ""), done.err
    assert read_arm(tmp_path / "arm.toml").arm.joints


@pytest.mark.parametrize(
    ("options", "message"),
    [(["--tip", "nowhere"], "nowhere"), (["--tip", "plate", "--task", "poze"], 'did you mean "pose"?')],
)
def test_adopt_says_what_is_wrong_and_writes_nothing(options: list[str], message: str, tmp_path: Path) -> None:
    description = Path(__file__).parent / "data" / "wall_lift.urdf"
    done = call("adopt", description, *options, "--out", tmp_path / "arm.toml")
    assert done.status == 2
    assert message in done.err
    assert names_in(tmp_path) == []


def test_draw_writes_a_picture(tmp_path: Path) -> None:
    pytest.importorskip("matplotlib")
    done = call("draw", PLOTTER, "--out", tmp_path / "arm.svg")
    assert done.status == 0, done.err
    assert (tmp_path / "arm.svg").read_text(encoding="utf-8").startswith("<?xml")


def test_cost_refuses_a_target_that_it_does_not_know_before_it_derives() -> None:
    done = call("cost", PLOTTER, "--target", "z80")
    assert (done.status, done.out) == (2, "")
    assert 'unknown target "z80"' in done.err


def test_a_target_that_was_named_and_is_missing_is_a_failed_check(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PATH", "/nowhere")
    done = call("cost", PLOTTER, "--target", "avr", "--json")
    assert done.status == 1
    assert "apt-get install" in json.loads(done.out)["not_measured"][0]
    assert call("cost", PLOTTER).status == 0
    assert call("cost", PLOTTER, "--budget", "flash=1").status == 1


@pytest.mark.parametrize("arm", sorted(ARMS.glob("*.toml")), ids=lambda path: path.stem)
def test_every_shipped_arm_generates(arm: Path, tmp_path: Path) -> None:
    done = call("generate", arm, "--out", tmp_path)
    assert done.status == 0, done.err
    assert names_in(tmp_path) == ["arm_kin.c", "arm_kin.h"]
