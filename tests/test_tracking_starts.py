"""The prepared tables: how starts are chosen, what they find, and that they are the same everywhere."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from link_tables import MANSEUR_0M37, MANSEUR_DOTY, RAGHAVAN_ROTH
from test_tracking_conditioning import CALIBRATED
from test_tracking_steps import ARMS

from codegen.model import Task
from codegen.tracking.search import round_step
from codegen.tracking.shape import shape_of
from codegen.tracking.starts import MOST_STARTS, Effort, greedy_order, most_solutions, needed_starts, prepare_starts

SMALL = Effort(choosing_poses=20, candidates=60, deciding_poses=20, measuring_poses=20, dense_starts=60)
PROMISED = 0.995


def test_greedy_order_covers_first():
    """Start 2 finds most, start 0 what is then still unfound; start 1 repeats what is known."""
    hits = np.array([[0, 1, 1], [0, 1, 1], [0, 0, 1], [1, 0, 0]], dtype=bool)
    assert greedy_order(hits, 3) == [2, 0, 1]


def test_needed_starts_by_rates():
    """Solutions that half of all starts find are missed by n with probability 2^-n: below 0.002 at n = 9."""
    hits = np.tile(np.array([True, False]), (10, 50))
    assert needed_starts(hits, 100) == 9
    assert needed_starts(hits, 5) == 5


@pytest.mark.parametrize(
    ("task", "kinds", "most"),
    [
        (Task.POSE, "RRRRRR", 16),  # Primrose 1986; Lee and Liang 1988
        (Task.POSE, "RRPRRR", 16),  # Raghavan and Roth 1993, 5R1P
        (Task.POINT_AXIS, "RRRRR", 16),  # six joints, the last about the tool's axis
    ],
)
def test_proven_bounds(task, kinds, most):
    arm = next(arm for arm in ARMS.values() if arm.task is task and _kinds(arm) == kinds and not arm.held)
    assert most_solutions(shape_of(arm), most_found=3) == (most, True)


def _kinds(arm):
    return "".join("R" if row.kind.value == "revolute" else "P" for row in arm.joints)


def test_unproven_bound_leaves_room():
    assert most_solutions(shape_of(ARMS["point_yaw"]), most_found=6) == (8, False)


def test_steps_of_slides_are_round():
    assert [round_step(least) for least in (0.0011, 0.0019, 0.3, 7.0)] == [
        Fraction(1, 500),
        Fraction(1, 500),
        Fraction(1, 2),
        Fraction(10),
    ]


@pytest.mark.parametrize("name", ["pose with a slide", "point_axis with a joint held", "point_pitch"])
def test_starts_fit_signed_chars(name):
    tables = prepare_starts(ARMS[name], SMALL)
    assert len(tables.steps) == len(tables.starts[0]) == len(ARMS[name].free_indices)
    assert all(-127 <= start <= 127 for row in tables.starts for start in row)


def test_same_table_every_time():
    """And on every machine: these rows were made on another day. A changed method changes them; then say so here."""
    tables = prepare_starts(RAGHAVAN_ROTH, SMALL)
    assert tables.starts == prepare_starts.__wrapped__(RAGHAVAN_ROTH, SMALL).starts
    assert tables.starts[:3] == GOLDEN_ROWS
    assert (tables.measured.found, tables.measured.solutions, tables.measured.mean_steps) == GOLDEN_COUNTS


GOLDEN_ROWS = ((-2, 91, -87, 0, 74, -106), (-111, -51, 118, 94, -49, 90), (-62, -6, -100, 38, -116, -123))
GOLDEN_COUNTS = (55, 56, 680)


@pytest.mark.sweep
@pytest.mark.parametrize(
    ("name", "arm"),
    [
        ("16 real solutions", MANSEUR_DOTY),
        ("Raghavan and Roth", RAGHAVAN_ROTH),
        ("0M37", MANSEUR_0M37),
        ("calibrated", CALIBRATED),
        *ARMS.items(),
    ],
)
def test_share_of_all_solutions(name, arm):
    """The promise of the header: 99.5 % of what a dense search finds over fresh random poses."""
    tables = prepare_starts(arm)
    assert tables.measured.share >= PROMISED
    assert len(tables.starts) < MOST_STARTS, "a table that was cut short"
    assert tables.most_found <= tables.branches
