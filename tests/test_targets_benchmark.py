"""The comparison with hand-written C, and where the cycles go."""

from __future__ import annotations

import numpy as np
import pytest
from required_tools import need_target

from build_checks import benchmark_targets
from build_checks.benchmark_peers import PEER_PREFIX, PEERS, peer_files
from build_checks.benchmark_profile import profile
from build_checks.benchmark_targets import Ratio, ratio_table
from build_checks.cost import measure_cost
from build_checks.targets import M4F, RV32, Target
from codegen.options import Options

SCARA = next(peer for peer in PEERS if peer.arm == "tray_scara")
JOINTS = np.random.default_rng(2).uniform([-2, -2, 0, -3], [2, 2, 0.15, 3], (6, 4)).tolist()


@pytest.mark.parametrize("target", [M4F, RV32], ids=lambda target: target.name)
def test_the_profile_adds_up_to_the_cost(target: Target) -> None:
    need_target(target)
    files = peer_files(SCARA)
    report = measure_cost(files, Options(prefix=PEER_PREFIX), [target.name], JOINTS, libm=True)
    spent = profile(files, PEER_PREFIX, target, "inverse", JOINTS, libm=True)
    assert sum(spent.values()) == pytest.approx(report.targets[0].function("inverse").cycles.mean, abs=0.06)
    assert "peer_inverse" in spent


def test_one_run_prints_every_ratio(capsys: pytest.CaptureFixture[str]) -> None:
    need_target(M4F)
    benchmark_targets.main(["--arm", "tray_scara", "--target", "m4f", "--poses", "4"])
    lines = capsys.readouterr().out.splitlines()
    rows = [line for line in lines if line.startswith("| ") and " = " in line]
    assert "| figure | m4f |" in lines
    assert [row.split(" | ")[0].removeprefix("| ") for row in rows] == [
        "forward, cycles",
        "forward, instructions",
        "inverse, cycles",
        "inverse, instructions",
        "inverse_all, cycles",
        "inverse_all, instructions",
        "flash of the three at -O2",
        "flash of the three at -Os",
        "stack, painted",
    ]


def test_a_ratio_is_generated_over_hand_written() -> None:
    ratios = [Ratio("a", "m4f", "x", 30, 100), Ratio("a", "avr", "x", 110, 100)]
    assert ratio_table(ratios).splitlines()[2] == "| x | 30 / 100 = 0.30 | 110 / 100 = 1.10 |"
