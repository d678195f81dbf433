"""The page's JavaScript computes the very bits of the C in doubles: every function, branch and status.

Not to a tolerance: both round every operation to a double (ECMA-262, 6.1.6.1; ISO/IEC 60559), and neither fuses any.
"""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from arms_random import AROUND_3_4_5, AXIS_ARMS, HELD_ARMS, PARALLEL, PITCH_ARMS, SPHERICAL, THREE_SLIDES, Structure
from arms_random import random_arm
from generated import kinematics
from javascript_bits import ANGLES, bits, by_c, by_node, inputs_of
from required_tools import need_programs
from test_tracking_steps import ARMS as WITHOUT_CLOSED_FORM

from codegen.armfile import read_arm
from codegen.javascript import javascript
from codegen.javascript.preprocess import preprocessed
from codegen.javascript.types import NotTranslatable
from codegen.model import Arm
from codegen.places import ARMS

EXAMPLES = sorted(ARMS.glob("*.toml"))
RANDOM = [*SPHERICAL[6:8], *PARALLEL[5:7], AROUND_3_4_5[1], THREE_SLIDES[0], AXIS_ARMS[0], PITCH_ARMS[1], HELD_ARMS[0]]
TRACKED = ["pose with a slide", "point_axis with a joint held", "point_pitch", "plane_pose"]


def assert_same_bits(arm: Arm, folder: Path, count: int) -> None:
    need_programs("node")
    c = kinematics(arm)
    given = inputs_of(arm, c, count, seed=7)
    wanted, found = by_c(c, given), by_node(arm, c, given, folder)
    assert len(found) == len(wanted)
    different = np.flatnonzero(bits(found) != bits(wanted))
    assert len(different) == 0, (different[:5], wanted[different[:5]], found[different[:5]])


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_the_javascript_of_an_example_computes_the_bits_of_its_c(path: Path, tmp_path: Path) -> None:
    assert_same_bits(read_arm(path).arm, tmp_path, 40)


@pytest.mark.parametrize("structure", RANDOM, ids=lambda structure: structure.name)
def test_so_does_that_of_a_random_arm(structure: Structure, tmp_path: Path) -> None:
    assert_same_bits(random_arm(structure, 1), tmp_path, 24)


@pytest.mark.parametrize("name", TRACKED)
def test_so_does_that_of_an_arm_without_a_closed_form(name: str, tmp_path: Path) -> None:
    assert_same_bits(WITHOUT_CLOSED_FORM[name], tmp_path, 8)
