"""What the agreement vectors reach in the generated C, branch by branch."""

from __future__ import annotations

from pathlib import Path

import pytest
from required_tools import need_programs

from build_checks.coverage import coverage
from build_checks.coverage_known import KNOWN, why_unreached
from codegen.armfile import read_arm
from codegen.options import Options, RealType
from codegen.pipeline import generate

ARMS = Path(__file__).parents[1] / "arms"
SAMPLES = 20_000
EXPLAINED = ("bench_six", "tray_scara", "vial_picker")


def test_code_that_nothing_reaches_is_listed() -> None:
    """With forty samples much is left out, and every line that is listed stands in the C."""
    need_programs("gcc", "gcov")
    found = coverage(ARMS / "plotter.toml", Options(), 40)
    assert 0 < found.lines_run < found.lines
    assert 0 < found.branches_taken < found.branches
    assert len(found.unreached) >= found.lines - found.lines_run
    text = generate(read_arm(ARMS / "plotter.toml").arm, Options())["arm_kin.c"]
    assert {row.code for row in found.unreached} <= {line.strip() for line in text.splitlines()}


@pytest.mark.sweep
@pytest.mark.parametrize("real", RealType, ids=lambda real: real.c_name)
@pytest.mark.parametrize("name", EXPLAINED)
def test_every_branch_is_reached_or_explained(name: str, real: RealType) -> None:
    need_programs("gcc", "gcov")
    found = coverage(ARMS / f"{name}.toml", Options(real=real), SAMPLES)
    assert [str(row) for row in found.unexplained] == []


def test_a_reason_holds_for_its_arms_only() -> None:
    named = next(row for row in KNOWN if "shoulder" in row.code)
    assert why_unreached("another_arm", "arm_stage_1", "shoulder = arm_turn(work->q[1]);") == ""
    assert why_unreached(min(named.arms), "arm_stage_1", "shoulder = arm_turn(work->q[1]);") == named.reason
