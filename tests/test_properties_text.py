"""What must hold of the generated text itself: the same on every run, a small change is a small difference, two arms in
one firmware image, C and C++ alike, outputs left alone."""

from __future__ import annotations

import dataclasses
import difflib
import os
import re
import subprocess
import sys
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from arms_random import PITCH_ARMS, POSE_ARMS, Structure, random_arm
from generated import kinematics, pose_at
from required_tools import need_programs

from build_checks.compile import CANARY, CANARY_BRANCH, Status
from build_checks.reference import Poses, Reference
from codegen.armfile import read_arm
from codegen.exact import Angle
from codegen.model import Arm, Frame
from codegen.options import Options, RealType
from codegen.pipeline import generate

ROOT = Path(__file__).resolve().parent.parent
SHIPPED = sorted((ROOT / "arms").glob("*.toml"))
C99 = ["cc", "-std=c99", "-Wall", "-Wextra", "-Wpedantic", "-Werror"]


def shipped(path: Path) -> Arm:
    return read_arm(path).arm


def stem(path: Path) -> str:
    return path.stem


# -- the same bytes ----------------------------------------------------------------------------------------------------
DIGESTS = """
import hashlib, sys
from pathlib import Path
from codegen.armfile import read_arm
from codegen.options import Options
from codegen.pipeline import generate
for name in sys.argv[1:] * 2:
    for file, text in sorted(generate(read_arm(Path(name)).arm, Options()).items()):
        print(hashlib.sha256(text.encode()).hexdigest(), file)
"""
OF_EACH_KIND = [path for path in SHIPPED if path.stem in ("column_gantry", "dosing_trio", "torch_five", "vial_picker")]


def digests(seed: str) -> list[str]:
    done = subprocess.run(
        [sys.executable, "-c", DIGESTS, *map(str, OF_EACH_KIND)],
        env={**os.environ, "PYTHONHASHSEED": seed},
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=True,
    )
    return done.stdout.splitlines()


def test_the_same_bytes_in_every_process():
    """Python orders sets by hashes that change with PYTHONHASHSEED; the text must not. Nor on a second run."""
    first = digests("1")
    half = len(first) // 2
    assert len(first) == 4 * len(OF_EACH_KIND) > 0
    assert first[:half] == first[half:]
    assert digests("271") == first


# -- a small change ----------------------------------------------------------------------------------------------------
CONSTANT = re.compile(r"static const arm_real \w+ = \S+;")
ONE_TURN = re.compile(r"static const unsigned ONE_TURN_JOINTS = \S+;")
RANGE = re.compile(r"    \{.*\},?  /\* .* \*/")
CHANGED = Fraction(10_037, 10_000)


def scaled_lengths(arm: Arm) -> list[Arm]:
    """The arm with each of its lengths changed in turn by less than a hundredth."""
    changed = []
    for index, row in enumerate(arm.joints):
        for key in ("a", "d"):
            if getattr(row, key):
                rows = list(arm.joints)
                rows[index] = dataclasses.replace(row, **{key: getattr(row, key) * CHANGED})
                changed.append(dataclasses.replace(arm, joints=tuple(rows)))
    for axis in range(3):
        if arm.tool.xyz[axis]:
            xyz = tuple(value * CHANGED if i == axis else value for i, value in enumerate(arm.tool.xyz))
            changed.append(dataclasses.replace(arm, tool=Frame(xyz, arm.tool.rpy)))
    return changed


def moved_limits(arm: Arm) -> list[Arm]:
    changed = []
    for index, row in enumerate(arm.joints):
        if row.limits is not None:
            low, high = row.limits
            step = Angle.degrees(-1) if isinstance(high, Angle) else Fraction(-1, 100)
            rows = list(arm.joints)
            rows[index] = dataclasses.replace(row, limits=(low, high + step))
            changed.append(dataclasses.replace(arm, joints=tuple(rows)))
    return changed


def differing(before: dict[str, str], after: dict[str, str]) -> list[str]:
    """Lines of either version that the other does not have."""
    lines = []
    for name, text in before.items():
        pair = (text.splitlines(), after[name].splitlines())
        lines += [line[2:] for line in difflib.ndiff(*pair) if line[:1] in "+-"]
    return lines


def check_small_changes(path: Path, others: int | None) -> None:
    """A length: lines that define a constant. A limit: its row of the table and which joints have one turn only as well."""
    arm = shipped(path)
    before = generate(arm, Options())
    for other in scaled_lengths(arm)[:others]:
        lines = differing(before, generate(other, Options()))
        assert lines
        assert [line for line in lines if not CONSTANT.match(line)] == []
    for other in moved_limits(arm)[:others]:
        lines = differing(before, generate(other, Options()))
        assert lines
        assert [line for line in lines if not any(kind.match(line) for kind in (CONSTANT, RANGE, ONE_TURN))] == []


@pytest.mark.parametrize("path", OF_EACH_KIND, ids=stem)
def test_a_changed_number_changes_constants_only(path):
    check_small_changes(path, 2)


@pytest.mark.sweep
@pytest.mark.parametrize("path", SHIPPED, ids=stem)
def test_any_changed_number_changes_constants_only(path):
    check_small_changes(path, None)


# -- in a firmware build -----------------------------------------------------------------------------------------------
BOTH = """
#include "left_kin.h"
#include "right_kin.h"
int main(void)
{
    const left_real p[LEFT_JOINTS] = {0};
    const right_real q[RIGHT_JOINTS] = {0};
    left_pose a;
    right_pose b;
    return (left_forward(p, &a) == LEFT_OK && right_forward(q, &b) == RIGHT_OK && a.p[0] != b.p[0]) ? 0 : 1;
}
"""


def written(folder: Path, files: dict[str, str]) -> list[str]:
    for name, text in files.items():
        (folder / name).write_text(text, encoding="utf-8")
    return sorted(name for name in files if name.endswith(".c"))


def test_two_prefixes_link_into_one_image(tmp_path):
    """Different arms, different number types; each external name starts with its prefix."""
    need_programs("cc", "nm")
    left = generate(random_arm(POSE_ARMS[7], 1), Options(prefix="left"))
    right = generate(random_arm(PITCH_ARMS[0], 1), Options(real=RealType.DOUBLE, prefix="right"))
    sources = written(tmp_path, {**left, **right, "main.c": BOTH})
    subprocess.run([*C99, "-o", "both", *sources], cwd=tmp_path, check=True)
    subprocess.run([tmp_path / "both"], check=True)
    for prefix in ("left", "right"):
        subprocess.run([*C99, "-c", f"{prefix}_kin.c"], cwd=tmp_path, check=True)
        names = subprocess.run(
            ["nm", "-g", "--defined-only", f"{prefix}_kin.o"], cwd=tmp_path, capture_output=True, text=True, check=True
        )
        defined = [line.split()[-1] for line in names.stdout.splitlines()]
        assert len(defined) == 7
        assert all(name.startswith(f"{prefix}_") for name in defined)


@pytest.mark.parametrize(
    "structure", [POSE_ARMS[0], POSE_ARMS[20], PITCH_ARMS[0]], ids=lambda structure: structure.name
)
def test_compiles_as_cxx(structure: Structure, tmp_path):
    need_programs("g++")
    sources = written(tmp_path, generate(random_arm(structure, 1), Options()))
    flags = ["-std=c++17", "-Wall", "-Wextra", "-Wpedantic", "-Wconversion", "-Wshadow", "-Werror", "-x", "c++", "-c"]
    subprocess.run(["g++", *flags, *sources], cwd=tmp_path, check=True)


# -- outputs -----------------------------------------------------------------------------------------------------------
def test_outputs_without_a_solution_are_left_alone():
    """Out of reach, no such branch, no number: joint values and branch as they were before the call."""
    arm = random_arm(POSE_ARMS[7], 1)
    c, reference = kinematics(arm), Reference(arm)
    q = np.zeros((1, 6))
    good = pose_at(arm, q[0])
    far = Poses(good.rotation, good.position + 10 * reference.reach)
    torn = Poses(np.where(np.eye(3) > 0, np.nan, good.rotation), good.position)
    cases = [(far, 0, Status.OUT_OF_REACH), (good, c.branches, Status.BAD_BRANCH), (torn, 0, Status.BAD_INPUT)]
    for pose, branch, wanted in cases:
        found, status = c.inverse(c.pack(pose), np.array([branch]), q)
        assert list(status) == [wanted]
        assert (found == CANARY).all()
    found, branches, status = c.inverse_nearest(c.pack(far), q)
    assert list(status) == [Status.OUT_OF_REACH]
    assert (found == CANARY).all()
    assert list(branches) == [CANARY_BRANCH]
    packed, status = c.forward(np.full((1, 6), np.nan))
    assert list(status) == [Status.BAD_INPUT]
    assert (packed == CANARY).all()
