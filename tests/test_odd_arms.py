"""Arms with twists, offsets and orders of joints that nobody would build first: each once showed a fault.

All are invented. What the C gives is compared with the link table, multiplied by itself, and with an independent search.
"""

from __future__ import annotations

from functools import cache
from pathlib import Path

import numpy as np
import pytest

from build_checks.agree import Settings, agree
from build_checks.compile import Kinematics, compiled
from build_checks.reference import Poses, Reference
from build_checks.report import AgreeReport, Check
from build_checks.report_text import to_text
from build_checks.search import all_solutions
from codegen.armfile import read_arm
from codegen.options import Options, RealType
from codegen.pipeline import generate

FOLDER = Path(__file__).parent / "fixtures" / "odd_arms"
# on these the elbow's fold, or a free joint, may coincide with a place where the elimination degenerates
COUPLED = ("offset_wrist", "parallel_wrist")
# two folds in one place: float leaves more unknown of the second than there is of it
FOLDED = "flat_crank"
WHOLE = sorted(path.stem for path in FOLDER.glob("*.toml") if path.stem not in (*COUPLED, FOLDED))
SAMPLES = 1000

each_real = pytest.mark.parametrize(
    "real", [RealType.FLOAT, pytest.param(RealType.DOUBLE, marks=pytest.mark.sweep)], ids=lambda real: real.c_name
)


@cache
def report_of(name: str, real: RealType) -> AgreeReport:
    arm, options = read_arm(FOLDER / f"{name}.toml").arm, Options(real)
    return agree(arm, generate(arm, options), options, Settings(samples=SAMPLES, processes=1))


@each_real
@pytest.mark.parametrize("name", WHOLE)
def test_the_c_agrees(name: str, real: RealType) -> None:
    report = report_of(name, real)
    assert report.agreed, to_text(report)


@each_real
@pytest.mark.parametrize("name", COUPLED)
def test_only_places_where_two_things_degenerate_at_once_are_lost(name: str, real: RealType) -> None:
    """A known limit: joints at right angles bring a fold and a degenerate elimination together."""
    report = report_of(name, real)
    failed = {result.check: result for result in report.results if result.failed}
    assert failed.keys() <= {Check.EDGE, Check.FREE_JOINT}, to_text(report)
    assert all(result.failed <= 0.005 * result.cases for result in failed.values()), to_text(report)


@each_real
def test_a_fold_hides_no_fold_behind_it(real: RealType) -> None:
    """A joint whose equation is smaller than what the fold before it leaves unknown is looked for from its seed."""
    edges = next(result for result in report_of(FOLDED, real).results if result.check is Check.EDGE)
    assert edges.cases > 30
    assert edges.failed == 0, edges.failure


@pytest.mark.parametrize("name", COUPLED)
def test_a_tool_that_points_straight_down_is_solved_completely(name: str) -> None:
    """There the height along the first axis says nothing of the last joint, and two equations become one."""
    arm, options = read_arm(FOLDER / f"{name}.toml").arm, Options(RealType.DOUBLE)
    reference, rng = Reference(arm), np.random.default_rng(5)
    down = np.diag([1.0, -1.0, -1.0])
    found = 0
    with compiled(generate(arm, options), options) as library:
        c = Kinematics(library)
        for _ in range(12):
            yaw = rng.uniform(-np.pi, np.pi)
            turn = np.array([[np.cos(yaw), -np.sin(yaw), 0.0], [np.sin(yaw), np.cos(yaw), 0.0], [0.0, 0.0, 1.0]])
            # as far out as such a tool reaches at most, and from the floor up
            position = reference.base_position + rng.uniform(-0.4, 0.4, 3) * reference.reach
            wanted = all_solutions(reference, turn @ down, position, starts=1500, rng=rng)
            packed = c.pack(Poses((turn @ down)[None], position[None]))
            given = c.inverse_all(packed, np.zeros((1, reference.count)))
            q = given.q[0][given.status[0] != 3]
            apart = np.abs(np.angle(np.exp(1j * (wanted.q[:, None] - q[None])))).max(axis=2)
            assert (apart.min(axis=1, initial=np.inf) < 1e-6).all(), f"of {wanted.q} the C gives {q}"
            found += len(wanted)
    assert found > 20
