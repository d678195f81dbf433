"""What the C costs: the report's figures against each other and against code whose cost is known."""

from __future__ import annotations

import json

import numpy as np
import pytest
from required_tools import need_target

from build_checks.benchmark_peers import PEER_PREFIX, PEERS, peer_files
from build_checks.cost import CostReport, measure_cost
from build_checks.cost_budget import exceeded, parse_budget
from build_checks.cost_table import cost_table
from build_checks.targets import AVR, M4F, TARGETS, Target
from codegen.errors import CallError
from codegen.options import Options

OPTIONS = Options(prefix=PEER_PREFIX)
SCARA = next(peer for peer in PEERS if peer.arm == "tray_scara")
JOINTS = np.random.default_rng(2).uniform([-2, -2, 0, -3], [2, 2, 0.15, 3], (12, 4)).tolist()

each_target = pytest.mark.parametrize("target", TARGETS, ids=lambda target: target.name)


def measured(*targets: Target) -> CostReport:
    for target in targets:
        need_target(target)
    return measure_cost(peer_files(SCARA), OPTIONS, [target.name for target in targets], JOINTS, libm=True)


@each_target
def test_the_computed_stack_is_never_below_the_painted_one(target: Target) -> None:
    (cost,) = measured(target).targets
    for function in cost.functions:
        assert function.stack_computed >= function.stack_painted > 0


@each_target
def test_parts_add_up(target: Target) -> None:
    (cost,) = measured(target).targets
    alone = [function.flash for function in cost.functions]
    assert [function.function for function in cost.functions] == ["forward", "inverse", "inverse_all"]
    assert max(alone) < cost.flash < sum(alone)
    assert cost.core_flash == cost.flash
    for function in cost.functions:
        assert 0 < function.instructions.mean <= function.instructions.worst
        assert function.instructions.mean <= function.cycles.mean <= function.cycles.worst


def test_only_avr_cycles_are_called_exact() -> None:
    report = measured(M4F, AVR)
    assert [cost.cycles_exact for cost in report.targets] == [False, True]
    text = cost_table(report)
    assert "Arm Cortex-M4F (m4f), float, 12 poses, cycles estimated" in text
    assert "AVR ATmega2560 (avr), float, 12 poses, cycles exact" in text


def test_the_same_run_gives_the_same_report() -> None:
    first, second = measured(M4F), measured(M4F)
    assert first.to_json() == second.to_json()
    assert json.loads(first.to_json())["targets"][0]["functions"][0]["cycles"]["worst"] > 0


def test_a_target_that_is_not_here_gets_one_line(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PATH", "/nowhere")
    report = measure_cost(peer_files(SCARA), OPTIONS, [], JOINTS, libm=True)
    assert report.targets == ()
    assert len(report.not_measured) == len(TARGETS)
    assert all("apt-get install" in line for line in report.not_measured)
    assert cost_table(report).count("not measured here") == len(TARGETS)


def test_double_is_not_measured_where_there_is_none() -> None:
    """GCC's AVR options: double has 32 bits (there was no other choice before version 10)."""
    header = "#define ARM_JOINTS 1\n#define ARM_BRANCHES 1\ntypedef double arm_real;\n"
    report = measure_cost({"arm_kin.h": header}, Options(), ["avr"], [[0.0]])
    assert report.targets == ()
    assert "its compiler's double is a float" in report.not_measured[0]


def test_a_budget_names_every_excess() -> None:
    report = measured(M4F)
    (cost,) = report.targets
    exact = parse_budget(f"cycles={cost.cycles},flash={cost.flash},stack={cost.stack}")
    one_less = parse_budget(f"cycles={cost.cycles - 1}, flash={cost.flash - 1}, stack={cost.stack - 1}")
    assert exceeded(report, exact) == ()
    assert [excess.quantity for excess in exceeded(report, one_less)] == ["cycles", "flash", "stack"]
    assert str(exceeded(report, one_less)[1]) == f"m4f: flash {cost.flash} exceeds the budget of {cost.flash - 1}"


BAD_BUDGETS = [
    ("speed=3", 'cannot read "speed=3"'),
    ("cycles", 'cannot read "cycles"'),
    ("", 'cannot read ""'),
    ("cycles=", 'cycles: "" is no whole number above 0'),
    ("flash=8k", 'flash: "8k" is no whole number above 0'),
    ("stack=-1", 'stack: "-1" is no whole number above 0'),
    ("stack=0", 'stack: "0" is no whole number above 0'),
    ("stack=1,stack=2", '"stack" is given more than once'),
]


@pytest.mark.parametrize(("text", "message"), BAD_BUDGETS, ids=[row[0] for row in BAD_BUDGETS])
def test_a_budget_that_cannot_be_read_says_why(text: str, message: str) -> None:
    with pytest.raises(CallError) as caught:
        parse_budget(text)
    assert message in str(caught.value)
    assert "hint" in str(caught.value)


def test_all_faults_of_a_budget_come_at_once() -> None:
    with pytest.raises(CallError) as caught:
        parse_budget("speed=3,stack=x")
    assert len(caught.value.faults) == 2
