"""Arms that cannot do their task are refused by rank, whatever their numbers; arms that can are never refused.

Why each cannot: common knowledge of mechanisms, a sentence beside it; that the rank is short is checked with singular
values of a Jacobian that shares nothing with the generator.
"""

from __future__ import annotations

import numpy as np
import pytest
from arms_random import PARTIAL_ARMS, POSE_ARMS, SEVEN, SIX, Structure, any_arm, random_arm

from build_checks.reference import Reference
from build_checks.reference_task import TaskReading
from codegen.ability import lack_of
from codegen.errors import CannotSolveError
from codegen.model import Task
from codegen.options import Options
from codegen.pipeline import generate

NOTHING = 1e-9

CANNOT = [
    (Structure("two spherical joints", Task.POSE, SIX, meet="123 456"), "their centres stay at one distance"),
    (Structure("a plane and a wrist", Task.POSE, SIX, parallel="123", meet="456"), "the wrist's height is fixed"),
    (Structure("two planes", Task.POSE, SIX, parallel="123 456"), "the planes keep their angle"),
    (Structure("four parallel", Task.POSE, SIX, parallel="1234"), "only three planar motions"),
    (Structure("four meeting", Task.POSE, SIX, meet="3456"), "only three turns about a point"),
    (Structure("four slides", Task.POSE, "PPRPRP"), "two turns do not orient"),
    (Structure("elbow held", Task.POSE, SEVEN, meet="123 567", held="4"), "two spherical joints are left"),
    (Structure("two directions of turns", Task.POSE, "PRRRRP", parallel="234"), "orientation has three freedoms"),
    (Structure("point, parallel", Task.POINT, "RRR", parallel="123"), "the height is fixed"),
    (Structure("point, meeting", Task.POINT, "RRR", meet="123"), "the point stays on a sphere"),
    (Structure("point, slides alike", Task.POINT, "PRP", right="12"), "all moves normal to the turning axis"),
    (Structure("yaw, no height", Task.POINT_YAW, "RRRR", parallel="1234", upright=True), "nothing lifts"),
    (Structure("axis, two spherical", Task.POINT_AXIS, "RRRRR", meet="123 456"), "one distance"),
]


@pytest.mark.parametrize(("structure", "reason"), CANNOT, ids=lambda value: getattr(value, "name", ""))
def test_arms_that_cannot_are_refused(structure: Structure, reason: str):
    """The refusal says how many motions are missing and which."""
    for number in (0, 1):
        arm = any_arm(structure, number)
        reference = Reference(arm)
        q = reference.random_joints(np.random.default_rng(number), 30)
        assert TaskReading(reference).smallest_singular(q).max() < NOTHING, reason
        lack = lack_of(arm)
        assert lack is not None, reason
        assert lack.found < lack.wanted
        assert lack.missing
        with pytest.raises(CannotSolveError):
            generate(arm, Options())


@pytest.mark.parametrize("structure", POSE_ARMS[::9] + PARTIAL_ARMS[::9], ids=lambda structure: structure.name)
def test_arms_that_can_are_not_refused(structure: Structure):
    assert lack_of(random_arm(structure, 0)) is None


@pytest.mark.sweep
@pytest.mark.parametrize("structure", POSE_ARMS + PARTIAL_ARMS, ids=lambda structure: structure.name)
def test_no_arm_that_can_is_refused(structure: Structure):
    for number in (1, 2):
        assert lack_of(random_arm(structure, number)) is None
