"""Installed by pip, the tool works from any folder: templates, shipped arms and the C of the checks go along."""

from __future__ import annotations

import ast
import importlib.util
import os
import re
import shutil
import subprocess
import sys
import sysconfig
import tomllib
import venv
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
SHIPPED = ("codegen", "templates_c", "arms", "build_checks")
SUFFIXES = (".py", ".toml", ".j2", ".css", ".js", ".c", ".h", ".ld")
# Import name where it is not the distribution's.
DISTRIBUTIONS = {"elftools": "pyelftools", "markdown_it": "markdown-it-py"}


def shipped_files(folder: Path) -> set[str]:
    """Paths below the folder of all that the tool consists of."""
    return {
        path.relative_to(folder).as_posix()
        for name in SHIPPED
        for path in (folder / name).rglob("*")
        if path.suffix in SUFFIXES
    }


def can_build() -> bool:
    """Whether a setuptools that builds wheels by itself is here; otherwise pip fetches one."""
    return bool(importlib.util.find_spec("setuptools")) and bool(
        importlib.util.find_spec("setuptools.command.bdist_wheel")
    )


@pytest.fixture(scope="module")
def installed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The bin folder of a new virtual environment with a normal, not an editable, installation.

    The packages that the tool needs are lent by the environment that runs the tests, which keeps this quick; that
    pyproject.toml names them all is tested below.
    """
    place = tmp_path_factory.mktemp("install")
    source = place / "source"
    skipped = shutil.ignore_patterns(".*", "*.egg-info", "__pycache__", "build")
    shutil.copytree(ROOT, source, ignore=skipped)  # pip would leave its build folders in the working copy
    venv.create(place / "env", with_pip=False)
    python = place / "env" / "bin" / "python"
    (site,) = (place / "env").glob("lib/python*/site-packages")
    (site / "lent.pth").write_text(sysconfig.get_path("purelib") + "\n", encoding="utf-8")
    isolation = ["--no-build-isolation"] if can_build() else []
    pip = [sys.executable, "-m", "pip", "--python", str(python), "--disable-pip-version-check"]
    command = [*pip, "install", "--quiet", "--no-deps", "--ignore-installed", *isolation, str(source)]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    shutil.rmtree(source)
    return python.parent


def run(program: Path, folder: Path, *arguments: str) -> subprocess.CompletedProcess[str]:
    """Calls a program of the new environment, and lets no variable lead it to the working copy."""
    environment = {name: value for name, value in os.environ.items() if not name.startswith("PYTHON")}
    command = [str(program), *arguments]
    return subprocess.run(command, cwd=folder, env=environment, capture_output=True, text=True, check=False)


def test_every_file_of_the_tool_is_installed(installed: Path) -> None:
    (site,) = installed.parent.glob("lib/python*/site-packages")
    assert shipped_files(site) == shipped_files(ROOT)
    assert not (site / "tests").exists()


def test_the_installed_command_generates_and_agrees_from_another_folder(installed: Path, tmp_path: Path) -> None:
    shutil.copy(ROOT / "arms" / "vial_picker.toml", tmp_path / "my arm.toml")
    generated = run(installed / "linkwright", tmp_path, "generate", "my arm.toml", "--out", "out")
    assert generated.returncode == 0, generated.stderr
    assert sorted(path.name for path in (tmp_path / "out").iterdir()) == ["arm_kin.c", "arm_kin.h"]
    agreed = run(installed / "linkwright", tmp_path, "agree", "my arm.toml", "--samples", "200")
    assert agreed.returncode == 0, agreed.stdout + agreed.stderr
    assert "The C agrees with the link table" in agreed.stdout


def test_the_installed_command_is_not_the_working_copy(installed: Path, tmp_path: Path) -> None:
    program = "import codegen, build_checks, codegen.places as places; print(codegen.__file__, places.TEMPLATES)"
    done = run(installed / "python", tmp_path, "-c", program)
    assert done.returncode == 0, done.stderr
    assert str(ROOT) not in done.stdout


# --- what pyproject.toml says ---


def imported_packages(*folders: str) -> set[str]:
    """Names of the packages of others that are imported anywhere in the folders."""
    found: set[str] = set()
    for path in (path for folder in folders for path in (ROOT / folder).rglob("*.py")):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                found.update(alias.name.partition(".")[0] for alias in node.names)
            elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
                found.add(node.module.partition(".")[0])
    own = {*SHIPPED, *(path.stem for path in (ROOT / "tests").glob("*.py"))}
    return {DISTRIBUTIONS.get(name, name) for name in found - own - set(sys.stdlib_module_names)}


def named(requirements: list[str]) -> set[str]:
    found = (re.match(r"[A-Za-z0-9_.-]+", requirement) for requirement in requirements)
    return {match[0].lower().replace("_", "-") for match in found if match}


def test_every_package_that_is_imported_is_named_with_a_lower_bound() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    needed, extras = project["dependencies"], project["optional-dependencies"]
    optional = {name for extra in extras.values() for name in named(extra)}
    tool = {name.replace("_", "-") for name in imported_packages("codegen", "build_checks")}
    assert tool <= named(needed) | optional
    assert named(needed) <= tool
    tests = {name.replace("_", "-") for name in imported_packages("tests")}
    assert tests <= named(needed) | named(extras["test"])
    for requirement in [*needed, *(name for extra in extras.values() for name in extra)]:
        assert ">=" in requirement or requirement.startswith("linkwright["), requirement


def test_the_version_is_the_same_everywhere() -> None:
    from codegen import VERSION

    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert project["version"] == VERSION
