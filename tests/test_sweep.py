"""Arms swept by one joint: the derivation, the samples, and that the C finds every solution that a search finds.

That a pair of neighbouring axes which meet or are parallel leaves 16 solutions: Tsai and Morgan, ASME J. Mech. Trans.
Autom. 107 (1985).
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from generated import REACHED, apart, distinct, kinematics, pose_at, searched
from javascript_bits import bits, by_c, by_node, inputs_of
from link_tables import MANSEUR_0M37, MANSEUR_DOTY, RAGHAVAN_ROTH
from required_tools import need_programs
from sweep_arms import MEETING_LAST, ODD_TWISTS, ONE_PAIR, SEVEN_HELD, SWEPT, WITH_A_SLIDE
from test_tracking_generated import OFFSET_WRIST

from build_checks.reference import Reference
from codegen.emit.files import Source
from codegen.explain.tracked import tracked_lines
from codegen.inverse.sweep import Sweep, sweeps
from codegen.inverse.tasks import derive
from codegen.model import Arm
from codegen.options import Options, RealType
from codegen.tracking.batch import Batch
from codegen.tracking.beside import softest
from codegen.tracking.context import most_steps, percent
from codegen.tracking.files import tracked_files
from codegen.tracking.lanes import angle_of
from codegen.tracking.placing import Placing
from codegen.tracking.prepared import prepared
from codegen.tracking.search import Search
from codegen.tracking.shape import shape_of
from codegen.tracking.starts import Measured
from codegen.tracking.sweeping import SweepEffort, prepare_sweep
from codegen.tracking.walking import Walk

SMALL = SweepEffort(choosing_poses=8, choosing_starts=60, measuring_poses=10, dense_starts=100)
SAME = {RealType.DOUBLE: 1e-6, RealType.FLOAT: 1e-2}  # rad: two roots that nearly touch are known to half their digits
POSES = 8


@cache
def light_sweeps(arm: Arm) -> list[Sweep]:
    return [sweep for sweep in sweeps(arm) if all(step.roots <= 2 for step in sweep.plan.steps)]


# -- the derivation ----------------------------------------------------------------------------------------------------
@pytest.mark.parametrize("arm", SWEPT.values(), ids=SWEPT)
def test_an_arm_with_two_special_pairs_has_no_closed_form_but_a_sweep(arm: Arm) -> None:
    assert derive(arm) is None
    assert light_sweeps(arm)


@pytest.mark.parametrize("arm", [RAGHAVAN_ROTH, MANSEUR_0M37])
def test_an_arm_whose_neighbouring_axes_neither_meet_nor_are_parallel_has_none(arm: Arm) -> None:
    assert not list(sweeps(arm))
    assert prepare_sweep(arm, SMALL) is None


def test_a_plan_with_a_quartic_is_not_swept() -> None:
    assert list(sweeps(ONE_PAIR))
    assert not light_sweeps(ONE_PAIR)
    assert prepare_sweep(ONE_PAIR, SMALL) is None


@pytest.mark.parametrize("arm", [*SWEPT.values(), OFFSET_WRIST, MANSEUR_DOTY], ids=lambda arm: arm.name)
def test_every_sweep_passes_through_the_joint_values_a_pose_came_from(arm: Arm) -> None:
    """With the swept joint where it stood, one branch gives the other joints, and nothing is left over."""
    shape = shape_of(arm)
    search = Search(arm, shape, seed=5)
    joints = search.true_values(6)
    target = search.batch.poses(joints)
    for sweep in light_sweeps(arm):
        placing = Placing(sweep, float(shape.reach))
        offset = float(sweep.goal.chain.joints[sweep.swept].offset.value)
        found = placing.everywhere(target, joints, joints[sweep.swept] + offset)
        for lane in range(6):
            misses = []
            for samples in found:
                q = placing.joint_values(samples.place, joints)
                gap = np.array([q[k][lane] - joints[k][lane] for k in shape.free])
                turning = np.array([shape.turning[k] for k in shape.free])
                gap = np.where(turning, gap - 2 * np.pi * np.rint(gap / (2 * np.pi)), gap)
                misses.append(max(np.abs(gap).max(), abs(samples.miss[lane])) if samples.spare[lane] >= 0 else np.inf)
            assert min(misses) < 1e-6, (sweep.label, sweep.plan.structure)


# -- the lanes ---------------------------------------------------------------------------------------------------------
def test_the_angle_of_a_pair() -> None:
    angle = np.concatenate((np.linspace(-np.pi, np.pi, 4001), np.arange(-4, 5) * (np.pi / 4)))
    gap = angle_of(np.cos(angle), np.sin(angle)) - angle
    assert np.abs(gap - 2 * np.pi * np.rint(gap / (2 * np.pi))).max() < 1e-15


def test_the_motion_along_which_nothing_changes() -> None:
    """Columns of which the last is the sum of the first two: that motion is (1, 1, -1)."""
    generator = np.random.default_rng(4)
    first, second = generator.normal(size=(2, 3, 5))
    rows = [[first[i], second[i], first[i] + second[i]] for i in range(3)]
    motion, touching = softest(rows)
    assert touching.all()
    assert np.abs(np.array(motion) - np.array([1.0, 1.0, -1.0])[:, None]).max() < 1e-9
    rows[0][2] = rows[0][2] + 10.0
    assert not softest(rows)[1].any()


def test_solutions_that_nearly_touch_are_both_found() -> None:
    """Among so many poses of the offset wrist are some with two solutions 0.02 to 0.1 rad apart."""
    swept = prepare_sweep(
        OFFSET_WRIST, SweepEffort(choosing_poses=8, choosing_starts=60, measuring_poses=80, dense_starts=200)
    )
    assert swept is not None
    assert swept.found == swept.solutions


def test_the_same_launches_every_time() -> None:
    shape = shape_of(ODD_TWISTS)
    sweep = light_sweeps(ODD_TWISTS)[0]

    def made() -> list[bytes]:
        search = Search(ODD_TWISTS, shape, seed=3)
        joints = search.true_values(5)
        launches = Walk(Placing(sweep, float(shape.reach)), Batch(shape).poses(joints), joints, 32).launches()
        return [launches.pose.tobytes(), *(entry.tobytes() for entry in launches.q)]

    assert made() == made()


# -- the C -------------------------------------------------------------------------------------------------------------
@pytest.mark.parametrize(
    "real", [RealType.FLOAT, pytest.param(RealType.DOUBLE, marks=pytest.mark.sweep)], ids=lambda real: real.c_name
)
@pytest.mark.parametrize("arm", [*SWEPT.values(), OFFSET_WRIST, MANSEUR_DOTY], ids=lambda arm: arm.name)
def test_the_c_finds_every_solution_that_a_search_finds(arm: Arm, real: RealType) -> None:
    c, reference, rng = kinematics(arm, real), Reference(arm), np.random.default_rng(11)
    low, high = reference.span()
    wanted = 0
    for _ in range(POSES):
        q = rng.uniform(low, high)
        pose = pose_at(arm, q)
        found = c.inverse_all(c.pack(pose), c.rounded(q[None]))
        own = distinct(reference, found.q[0][np.isin(found.status[0], REACHED)].astype(np.float64))
        for solution in searched(arm, pose, q).q:
            if (reference.revolute | ((solution >= low) & (solution <= high))).all():
                wanted += 1
                assert apart(reference, own, solution).min() < SAME[real]
    assert wanted > 2 * POSES


@pytest.mark.parametrize("arm", [WITH_A_SLIDE, SEVEN_HELD], ids=lambda arm: arm.name)
def test_the_javascript_of_a_swept_arm_computes_the_bits_of_its_c(arm: Arm, tmp_path) -> None:
    need_programs("node")
    c = kinematics(arm)
    given = inputs_of(arm, c, 6, seed=7)
    assert np.array_equal(bits(by_c(c, given)), bits(by_node(arm, c, given, tmp_path)))


# -- what is said ------------------------------------------------------------------------------------------------------
def test_the_header_says_how_all_solutions_are_found() -> None:
    tables = prepared(MEETING_LAST)
    assert tables.swept is not None
    header = tracked_files(MEETING_LAST, Options(), Source("m.toml"), tables)["arm_kin.h"]
    words = " ".join(header.replace("*", " ").split())
    most = most_steps(tables, Options())
    assert f"a sweep: {tables.swept.sweep.label} goes all the way round" in words
    assert f"at the very worst {most.searched} steps" in words
    assert f"and {most.placed} places." in words
    assert f"Found: {tables.measured.found} of {tables.measured.solutions} solutions" in words


def test_explain_tells_the_steps_of_the_sweep() -> None:
    text = "\n".join(tracked_lines(MEETING_LAST))
    swept = prepared(MEETING_LAST).swept
    assert swept is not None
    assert all(step.note in text for step in swept.sweep.plan.steps)
    assert f"in `{swept.sweep.label}` alone" in text


def test_a_share_is_never_rounded_up_to_all() -> None:
    assert percent(Measured(200, 100000, 99999, 0)) == "99.99"
    assert percent(Measured(200, 100000, 100000, 0)) == "100.00"
