"""The reachable region and the singular places, against closed forms of simple arms."""

from __future__ import annotations

import math
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from build_checks.reference import Reference
from codegen.armfile import read_arm
from codegen.draw import draw
from codegen.draw.section import SAMPLES, Region, Section, r_sequence, ranges, reached_region, section_of
from codegen.draw.singular import singular_sets, task_jacobians
from codegen.exact import Angle
from codegen.link_product import tool_points
from codegen.model import Arm, Convention, JointKind, JointRow, Task

ARMS_FOLDER = Path(__file__).parent.parent / "arms"


def planar(first: str, second: str, *limits: tuple[int, int] | None) -> Arm:
    """Two links that turn in a plane; limits in degrees."""
    rows = tuple(
        JointRow(
            f"j{i}",
            JointKind.REVOLUTE,
            a=Fraction(length),
            limits=end and (Angle.degrees(end[0]), Angle.degrees(end[1])),
        )
        for i, (length, end) in enumerate(zip((first, second), limits, strict=True))
    )
    return Arm("made", Convention.STANDARD, Task.PLANE_POINT, rows)


def region_of(arm: Arm, samples: int = SAMPLES) -> tuple[Section, Region]:
    lower, upper, _ = ranges(arm)
    q = lower + r_sequence(samples, len(lower)) * (upper - lower)
    points = tool_points(arm, q)
    section = section_of(arm, points)
    return section, reached_region(section, lambda vectors: tool_points(arm, vectors), lower, upper, q, points)


def reaches(x: np.ndarray, y: np.ndarray, first: float, second: float, turn: float, bend: float) -> np.ndarray:
    """Whether two links reach (x, y) with joint 1 in [-turn, turn] and joint 2 in [-bend, bend], in closed form (Craig,
    "Introduction to Robotics", section 4.4: the law of cosines for joint 2, then joint 1 by two arc tangents).
    """
    cosine = (x**2 + y**2 - first**2 - second**2) / (2 * first * second)
    within = np.zeros(x.shape, dtype=bool)
    for sign in (1, -1):
        elbow = sign * np.arccos(np.clip(cosine, -1, 1))
        shoulder = np.arctan2(y, x) - np.arctan2(second * np.sin(elbow), first + second * np.cos(elbow))
        shoulder = (shoulder + np.pi) % (2 * np.pi) - np.pi
        within |= (np.abs(cosine) <= 1) & (np.abs(elbow) <= bend) & (np.abs(shoulder) <= turn)
    return within


@pytest.mark.parametrize(("turn", "bend", "samples"), [(180, 180, 2_000), (100, 75, 2_000), (180, 150, SAMPLES)])
def test_two_links_reach_what_the_closed_form_says(turn: int, bend: int, samples: int) -> None:
    """A cell that the closed form reaches all over is filled; a filled one has points that it reaches, in it or at
    most a
    tenth of a cell off. Growing mends a sample that is far too thin."""
    _, region = region_of(planar("0.3", "0.2", (-turn, turn), (-bend, bend)), samples)
    cell = region.right[1] - region.right[0]
    middles = np.meshgrid(region.right[:-1] + cell / 2, region.up[:-1] + cell / 2)
    inside = [
        reaches(middles[0] + dx * cell, middles[1] + dy * cell, 0.3, 0.2, math.radians(turn), math.radians(bend))
        for dx in np.linspace(-0.6, 0.6, 11)
        for dy in np.linspace(-0.6, 0.6, 11)
    ]
    assert not (np.all(inside, axis=0) & ~region.filled).any()
    assert not (region.filled & ~np.any(inside, axis=0)).any()
    assert region.filled.any()


def test_a_turning_first_joint_is_shown_as_distance_and_height() -> None:
    arm = read_arm(ARMS_FOLDER / "vial_picker.toml").arm
    q = Reference(arm).random_joints(np.random.default_rng(4), 500)
    points = tool_points(arm, q)
    section = section_of(arm, points)
    assert section.polar
    assert np.allclose(section.coordinates(points)[:, 0], np.hypot(points[:, 0], points[:, 1]))
    assert np.allclose(section.coordinates(points)[:, 1], points[:, 2])


def test_a_sliding_first_joint_is_looked_along() -> None:
    arm = read_arm(ARMS_FOLDER / "gantry_head.toml").arm
    q = Reference(arm).random_joints(np.random.default_rng(4), 500)
    section = section_of(arm, tool_points(arm, q))
    moved = q.copy()
    moved[:, 0] += 0.1
    assert np.allclose(section.coordinates(tool_points(arm, q)), section.coordinates(tool_points(arm, moved)))


def test_the_r_sequence_is_the_golden_one_in_one_dimension() -> None:
    """Roberts 2018: in one dimension the step is 1 / golden ratio; in two, 1 / plastic number 1.32471795724."""
    assert np.diff(r_sequence(2, 1)[:, 0])[0] % 1 == pytest.approx((math.sqrt(5) - 1) / 2)
    assert (r_sequence(1, 2)[0] - 0.5) % 1 == pytest.approx([1 / 1.32471795724, 1 / 1.32471795724**2])


# --- singular places ---


def test_two_links_are_singular_when_straight() -> None:
    """det J = l1 l2 sin q2 (Craig, section 5.8): the elbow at zero, whatever joint 1."""
    (found,) = singular_sets(planar("0.3", "0.2", None, (-150, 150)), np.array([-3.0, -2.6]), np.array([3.0, 2.6]))
    assert found.joints == (1, 2)
    assert np.abs(found.q[:, 1]).max() < 1e-9


def test_a_wrist_is_singular_when_straight() -> None:
    """Joints 4 and 6 undo each other when joint 5 lines their axes up (Paul and Stevenson, Int. J. Robotics Research
    2(1),
    1983); the other sets of an elbow arm are its shoulder and its elbow."""
    arm = read_arm(ARMS_FOLDER / "bench_six.toml").arm
    lower, upper, _ = ranges(arm)
    sets = {group.joints: group.q for group in singular_sets(arm, lower, upper)}
    assert set(sets) == {(4, 6), (2, 3, 4, 5, 6), (1, 2, 3, 4, 5, 6)}
    assert np.abs(sets[4, 6][:, 4]).max() < 1e-9


@pytest.mark.parametrize("name", ["bench_six", "parallel_six", "railed_six"])
def test_the_pose_jacobian_is_the_references(name: str) -> None:
    """Up to the unit of length, which scales the rows of the tool point alike."""
    arm = read_arm(ARMS_FOLDER / f"{name}.toml").arm
    q = Reference(arm).random_joints(np.random.default_rng(4), 5)
    found, want = task_jacobians(arm, q), Reference(arm).jacobian(q)[:, :, list(arm.free_indices)]
    assert np.allclose(found[:, 3:], want[:, 3:])
    scale = found[:, :3].ravel() @ want[:, :3].ravel() / (want[:, :3].ravel() @ want[:, :3].ravel())
    assert np.allclose(found[:, :3], scale * want[:, :3])


@pytest.mark.parametrize("path", sorted(ARMS_FOLDER.glob("*.toml")), ids=lambda path: path.stem)
def test_at_a_singular_joint_vector_the_task_loses_a_direction(path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The task's Jacobian has no full rank there."""
    monkeypatch.setattr("codegen.draw.singular._LINES", 1_000)
    arm = read_arm(path).arm
    lower, upper, _ = ranges(arm)
    for group in singular_sets(arm, lower, upper):
        sizes = np.linalg.svd(task_jacobians(arm, group.q[:50]), compute_uv=False)
        assert (sizes[:, -1] / sizes[:, 0]).max() < 1e-8


def test_the_region_is_drawn_and_may_come_from_another_forward_function(tmp_path: Path) -> None:
    arm = read_arm(ARMS_FOLDER / "plotter.toml").arm
    calls: list[int] = []

    def positions(q: np.ndarray) -> np.ndarray:
        calls.append(len(q))
        return tool_points(arm, q)

    draw(arm, tmp_path / "arm.svg", reach=True, positions=positions)
    assert sum(calls) > SAMPLES


def test_a_slide_without_limits_is_told(tmp_path: Path) -> None:
    rows = (JointRow("lift", JointKind.PRISMATIC), JointRow("swing", JointKind.REVOLUTE, a=Fraction(1, 2)))
    arm = Arm("made", Convention.STANDARD, Task.PLANE_POINT, rows)
    notes = draw(arm, tmp_path / "arm.svg", reach=True)
    assert any('joint "lift" has no limits' in note for note in notes)
