"""Random arms of every structure: each derives in closed form, agrees with its link table and has all its solutions.

The search that completeness is judged by knows nothing of structure: damped Newton steps from a thousand random starts.
"""

from __future__ import annotations

import numpy as np
import pytest
from arms_random import (
    AROUND_2_3_4,
    AROUND_3_4_5,
    AXIS_ARMS,
    BEHIND_A_SHOULDER,
    HELD_ARMS,
    PARALLEL,
    PARTIAL_ARMS,
    PITCH_ARMS,
    PLANE_ARMS,
    POINT_ARMS,
    POSE_ARMS,
    SLIDE_AND_PARALLEL,
    SPHERICAL,
    THREE_SLIDES,
    UNDER_A_WRIST,
    YAW_ARMS,
    Structure,
    random_arm,
)
from generated import compiled_arm, farthest, searched, solutions

from build_checks.agree import Settings, agree
from build_checks.reference import Poses, Reference
from build_checks.reference_task import TaskReading
from build_checks.report import Check
from build_checks.report_text import to_text
from codegen.inverse.tasks import derive
from codegen.model import Arm
from codegen.options import Options, RealType
from codegen.pipeline import generate

NEAR = 1e-5  # how far rounding may move a solution of a pose that is not quite singular; rad, or m in reaches
SOME = [  # one or two of each family, whatever else is drawn
    *SPHERICAL[:1],
    *SPHERICAL[6:8],
    SPHERICAL[9],
    SPHERICAL[13],
    *PARALLEL[5:8],
    UNDER_A_WRIST[1],
    UNDER_A_WRIST[5],
    BEHIND_A_SHOULDER[2],
    AROUND_2_3_4[3],
    AROUND_3_4_5[1],
    *THREE_SLIDES[:2],
    SLIDE_AND_PARALLEL[0],
    *POINT_ARMS[:5],
    *PLANE_ARMS[:4],
    *YAW_ARMS[:2],
    *PITCH_ARMS[:2],
    *AXIS_ARMS[:1],
    HELD_ARMS[0],
]
ALL = [*POSE_ARMS, *PARTIAL_ARMS]


AGREEING = [
    SPHERICAL[0],
    PARALLEL[7],
    UNDER_A_WRIST[1],
    UNDER_A_WRIST[5],
    AROUND_2_3_4[3],
    THREE_SLIDES[0],
    *POINT_ARMS[1:3],
    *PLANE_ARMS[:4],
    PITCH_ARMS[0],
]


def named(structure: Structure) -> str:
    return structure.name


def check_agreement(arm: Arm, real: RealType, samples: int) -> None:
    options = Options(real=real)
    report = agree(arm, generate(arm, options), options, Settings(samples=samples, processes=1))
    assert report.agreed, to_text(report)


def check_completeness(arm: Arm, poses: int) -> None:
    """The C's set of solutions is the search's; a start near a solution is not enough, it must be found from afar."""
    reference = Reference(arm)
    rng = np.random.default_rng(5)
    with compiled_arm(arm, Options(real=RealType.DOUBLE)) as c:
        for q in reference.random_joints(rng, poses):
            pose = reference.forward(q[None])
            seed = q + rng.uniform(-0.5, 0.5, len(q))
            seed[reference.held] = q[reference.held]
            found = solutions(c, arm, pose, seed)
            assert farthest(reference, q[None], found) < NEAR
            assert farthest(reference, all_of(arm, pose, q), found) < NEAR


def all_of(arm: Arm, pose: Poses, seed: np.ndarray) -> np.ndarray:
    return searched(arm, pose, seed, starts=1000).q


@pytest.mark.parametrize("structure", SOME, ids=named)
def test_some_structures_have_all_solutions(structure: Structure):
    check_completeness(random_arm(structure, 0), 1)


@pytest.mark.parametrize("structure", AGREEING, ids=named)
def test_some_structures_agree(structure: Structure):
    check_agreement(random_arm(structure, 0), RealType.FLOAT, 300)


@pytest.mark.sweep
@pytest.mark.parametrize("structure", ALL, ids=named)
def test_every_structure_has_all_solutions(structure: Structure):
    check_completeness(random_arm(structure, 1), 2)


@pytest.mark.sweep
@pytest.mark.parametrize("real", list(RealType), ids=lambda real: real.c_name)
@pytest.mark.parametrize("structure", AGREEING, ids=named)
def test_structures_agree_throughout(structure: Structure, real: RealType):
    check_agreement(random_arm(structure, 0), real, 2000)


def test_slides_that_become_parallel_leave_the_others_to_make_up():
    """Two slides fixed to one link, and one behind a turn that makes it parallel to one of them: no solution is lost."""
    structure = next(structure for structure in AXIS_ARMS if structure.name == "axis, three slides RPPRP")
    arm, options = random_arm(structure, 0), Options()
    report = agree(arm, generate(arm, options), options, Settings(samples=1000, processes=1))
    free = next(result for result in report.results if result.check is Check.FREE_JOINT)
    assert free.cases > 100
    assert free.failed == 0, to_text(report)


MOST_SOLUTIONS = {  # counted with complex starts on two arms per row by a search that shares nothing with this project
    "wrist": 8,
    "wrist, odd arm with 1 meeting 2": 8,
    "wrist, 1 parallel to 2": 8,
    "wrist, 2 parallel to 3": 8,
    "wrist, 2 meeting 3": 8,
    "wrist, PUMA type": 8,
    "wrist, shoulder and elbow offset": 8,
    "shoulder": 8,
    "middle 2-3-4": 8,
    "middle 3-4-5": 8,
    "parallel 1-2-3": 8,
    "parallel 2-3-4": 8,
    "parallel 3-4-5": 8,
    "parallel 4-5-6": 8,
    "parallel 2-3-4, collaborative": 8,
    "parallel 2-3-4, right angles": 8,
    "three slides PPPRRR": 2,
    "three slides RPRPRP": 2,
    "wrist under RRPRRR": 8,
    "wrist under RPPRRR": 4,
    "wrist under PPPRRR": 2,
    "scara RRPR": 2,
    "plane pose RRR": 2,
}


@pytest.mark.parametrize("name", MOST_SOLUTIONS)
def test_number_of_branches(name: str):
    """As many branches as the structure has solutions at most: none missing, none that can never be."""
    structure = next(structure for structure in ALL if structure.name == name)
    for number in (0, 1):
        derivation = derive(random_arm(structure, number))
        assert derivation is not None
        assert derivation.plan.branches == MOST_SOLUTIONS[name]


# name, number, joint values to start from or None for random ones, what once went wrong
PAST_FAULTS = [
    ("wrist under PRPRRR", 1, None, "a sum that is zero but for 1e-63 had no float literal"),
    ("scara PRRR", 0, None, "a joint whose axis is turned round was declared twice"),
    ("point RRR", 0, None, "the roots of a quartic were declared before their type"),
    (
        "parallel 2-3-4, seven, 1 held",
        0,
        (-1.27272190, 0.15964562, -1.94737689, 1.91974465, -2.74728969, 1.43176150, -0.86406768),
        "every branch out of reach: good roots were thrown away by too tight a check of the pose",
    ),
    (
        "three slides PPRPRR",
        0,
        (2.96856658, 0.04175121, 1.18461737, 0.48047978, -0.26823941, -1.60493861),
        "three slides kept their seeds where they are dependent, and the pose was missed by metres",
    ),
]


@pytest.mark.parametrize(("name", "number", "joints", "fault"), PAST_FAULTS, ids=lambda value: str(value)[:40])
def test_past_faults(name: str, number: int, joints: tuple[float, ...] | None, fault: str):
    """Compiles for both number types, and whatever comes back from another seed reaches the pose."""
    arm = random_arm(next(structure for structure in ALL if structure.name == name), number)
    reference = Reference(arm)
    q = reference.random_joints(np.random.default_rng(2), 1) if joints is None else np.array([joints])
    pose = reference.forward(q)
    seed = q[0] + 0.3
    seed[reference.held] = q[0, reference.held]
    for real, budget in ((RealType.FLOAT, 1e-5), (RealType.DOUBLE, 1e-12)):
        with compiled_arm(arm, Options(real=real)) as c:
            found = solutions(c, arm, pose, seed)
            assert len(found), fault
            misses = TaskReading(reference).misses(pose, reference.chain(found))
            assert np.abs(misses.linear).max() < budget * reference.reach, fault
            assert np.abs(misses.angular).max(initial=0.0) < budget, fault
