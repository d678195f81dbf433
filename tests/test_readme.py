"""What the README shows is what the tool does: its arm file, its C, its commands, its example of a control loop."""

from __future__ import annotations

import re
import subprocess
import tomllib
from pathlib import Path

import pytest
from command_line import call
from required_tools import need_programs

from codegen.main import COMMANDS
from codegen.places import ARMS

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```", README, flags=re.DOTALL | re.MULTILINE)


@pytest.fixture
def generated(tmp_path: Path) -> Path:
    """The C of the arm that the README shows, by the command that it shows."""
    (tmp_path / "plotter.toml").write_text(blocks("toml")[0], encoding="utf-8")
    assert call("generate", tmp_path / "plotter.toml", "--out", tmp_path).status == 0
    return tmp_path


def test_the_arm_file_is_the_shipped_one() -> None:
    assert tomllib.loads(blocks("toml")[0]) == tomllib.loads((ARMS / "plotter.toml").read_text(encoding="utf-8"))


def test_the_piece_of_c_comes_out(generated: Path) -> None:
    assert blocks("c")[0] in (generated / "arm_kin.c").read_text(encoding="utf-8")


STRICT = ["-std=c99", "-O2", "-ffp-contract=off", "-Wall", "-Wextra", "-Wpedantic", "-Wconversion", "-Wshadow", "-Werror"]


def compiled(folder: Path, block: str, *others: str) -> None:
    """Compiles a block with the generated files and links it to a program, with nothing else."""
    need_programs("gcc")
    # The first declaration stands for the prototype that a project has in a header of its own.
    prototypes = re.sub(r"^((?:arm_status|bool) \w+\([^)]*\))$", r"\1;\n\1", block, flags=re.MULTILINE)
    text = f"#include <stdbool.h>\n{prototypes}\nint main(void)\n{{\n    return 0;\n}}\n"
    (folder / "example.c").write_text(text, encoding="utf-8")
    command = ["gcc", *STRICT, "-o", "program", "example.c", "arm_kin.c", *others]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr


def test_the_control_loop_compiles_and_links_with_nothing_else(generated: Path) -> None:
    compiled(generated, blocks("c")[1])


def test_the_power_up_test_compiles_and_links(generated: Path) -> None:
    assert call("generate", generated / "plotter.toml", "--out", generated, "--self-test").status == 0
    compiled(generated, blocks("c")[2], "arm_kin_selftest.c")


def test_every_command_has_its_row_and_every_row_its_command() -> None:
    rows = re.findall(r"^\| `linkwright ([a-z]+)", README, flags=re.MULTILINE)
    assert sorted(rows) == sorted(command.__name__ for command in COMMANDS)


def test_every_option_that_the_readme_names_exists() -> None:
    rows = re.findall(r"^\| `linkwright ([a-z]+)[^|]*\|.*\|$", README, flags=re.MULTILINE)
    for name in rows:
        (line,) = re.findall(rf"^\| `linkwright {name}\b.*$", README, flags=re.MULTILINE)
        help_text = call(name, "--help").out
        for option in re.findall(r"--[a-z][a-z-]+", line):
            assert option in help_text, f"{name} {option}"


def test_the_figures_of_agreement_have_the_form_that_agree_prints() -> None:
    """The figures themselves are of one run of one version; the checks are named as they are today."""
    row = re.compile(r"^(.*\S) {2,}[\d,]+ +[\d,]+ +[\d,]+$", flags=re.MULTILINE)
    shown = row.findall(blocks("text")[0])
    printed = row.findall(call("agree", ARMS / "vial_picker.toml", "--samples", "100").out)
    assert len(shown) > 5
    assert [name for name in printed if name in shown] == shown


def test_the_setup_commands_name_what_is_there() -> None:
    main_job, tests = blocks("sh")[:2]
    assert "pip install . && " in main_job
    assert (ROOT / re.findall(r"arms/\w+\.toml", main_job)[0]).is_file()
    assert "pip install -e '.[test]' && .venv/bin/python -m pytest" in tests
