"""The generated C under AddressSanitizer, UndefinedBehaviorSanitizer and valgrind, and that each would see a fault."""

from __future__ import annotations

import re
from functools import cache
from pathlib import Path

import pytest
from required_tools import need_programs

from build_checks.sanitize import SANITIZERS, Sanitizer, sanitizer_findings
from codegen.armfile import read_arm
from codegen.options import Mathematics, Options, RealType
from codegen.pipeline import generate

ARMS = Path(__file__).parents[1] / "arms"
FEW_ARMS = ("bench_six", "tray_scara", "vial_picker")
MORE_ARMS = tuple(sorted(path.stem for path in ARMS.glob("*.toml") if path.stem not in FEW_ARMS))

each_sanitizer = pytest.mark.parametrize("sanitizer", SANITIZERS, ids=lambda row: row.name)
each_real = pytest.mark.parametrize("real", RealType, ids=lambda real: real.c_name)


@cache
def generated(name: str, options: Options) -> dict[str, str]:
    return generate(read_arm(ARMS / f"{name}.toml").arm, options)


def findings(name: str, options: Options, sanitizer: Sanitizer, files: dict[str, str] | None = None) -> list[str]:
    need_programs(*sanitizer.programs)
    arm = read_arm(ARMS / f"{name}.toml").arm
    return [str(row) for row in sanitizer_findings(arm, files or generated(name, options), options, sanitizer)]


@each_sanitizer
@each_real
@pytest.mark.parametrize("name", FEW_ARMS)
def test_nothing_is_reported(name: str, real: RealType, sanitizer: Sanitizer) -> None:
    assert findings(name, Options(real=real), sanitizer) == []


@each_sanitizer
def test_nothing_is_reported_with_the_mathematics_library(sanitizer: Sanitizer) -> None:
    assert findings("bench_six", Options(mathematics=Mathematics.LIBM), sanitizer) == []


@pytest.mark.sweep
@each_sanitizer
@each_real
@pytest.mark.parametrize("name", MORE_ARMS)
def test_nothing_is_reported_of_the_other_arms(name: str, real: RealType, sanitizer: Sanitizer) -> None:
    assert findings(name, Options(real=real), sanitizer) == []


FAULTS = [  # what is put at the start of forward kinematics, and what each sanitizer calls it
    ("volatile int whole = (int)(1e30f * q[0]); (void)whole;", "outside the range", "outside the range", None),
    ("volatile float none = q[0] / (q[0] - q[0]); (void)none;", "division by zero", "division by zero", None),
    ("volatile int sum = 2147483647; sum += 1 + (q[0] > 0.0f); (void)sum;", "signed integer", "signed integer", None),
    ("pose[1].p[0] = q[0];", "AddressSanitizer", "AddressSanitizer", None),
    ("int unset[9]; if (unset[q[0] > 0.0f] > 3) { return ARM_BAD_INPUT; }", None, None, "uninitialised"),
]


@pytest.mark.parametrize(
    ("sanitizer", "fault", "name"),
    [(row, fault, name) for fault, *names in FAULTS for row, name in zip(SANITIZERS, names, strict=True) if name],
)
def test_a_planted_fault_is_reported(sanitizer: Sanitizer, fault: str, name: str) -> None:
    files = dict(generated("plotter", Options()))
    start = re.compile(r"(arm_status arm_forward\([^)]*\)\n\{\n)")
    assert start.search(files["arm_kin.c"])
    files["arm_kin.c"] = start.sub(rf"\1    {fault}\n", files["arm_kin.c"])
    assert name in "\n".join(findings("plotter", Options(), sanitizer, files))


@each_sanitizer
def test_a_broken_promise_is_reported(sanitizer: Sanitizer) -> None:
    """An infinity that comes out is no fault to a sanitizer; the target itself sees it."""
    files = dict(generated("plotter", Options()))
    files["arm_kin.c"] = files["arm_kin.c"].replace("pose->p[0] = ", "pose->p[0] = 1e38f * (q[0] + 9.0f) + ", 1)
    assert "broken promise: forward gives a NaN" in "\n".join(findings("plotter", Options(), sanitizer, files))
