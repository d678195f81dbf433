"""Pictures: what they show, that labels can be read, that the same arm gives the same bytes; and errors of the call.

Positions are compared with the float64 reference of the checks, which multiplies the link table by itself.
"""

from __future__ import annotations

import importlib.util
import math
import os
import subprocess
import sys
from fractions import Fraction
from functools import lru_cache
from itertools import combinations
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from build_checks.reference import Reference
from codegen.armfile import read_arm
from codegen.draw import draw, joint_values, resting_values
from codegen.draw.labels import Box, Placer, Wanted
from codegen.draw.page import compose
from codegen.draw.picture import round_length
from codegen.draw.scene import scene_of
from codegen.draw.solids import hull
from codegen.draw.views import side_view
from codegen.errors import CallError
from codegen.exact import Angle
from codegen.link_product import tool_points, tool_poses
from codegen.model import Arm, Convention, JointKind, JointRow, Task

ARMS = {path.stem: read_arm(path).arm for path in sorted((Path(__file__).parent.parent / "arms").glob("*.toml"))}
CROWDED = ("bench_six", "column_gantry", "gantry_head", "parallel_six", "railed_six", "seven_held", "wall_sorter")
CROWDED_ARM = pytest.mark.parametrize("name", CROWDED)
EVERY_ARM = pytest.mark.parametrize("name", ARMS)


def random_values(arm: Arm, count: int) -> np.ndarray:
    return Reference(arm).random_joints(np.random.default_rng(2), count)


@EVERY_ARM
def test_the_chain_runs_from_the_world_to_the_tool(name: str) -> None:
    """Pieces follow on one another, the last ends at the reference's tool point, and joints stand on their axes."""
    arm = ARMS[name]
    q = random_values(arm, 1)
    scene, chain = scene_of(arm, q[0]), Reference(arm).chain(q)
    for before, after in zip(scene.segments, scene.segments[1:], strict=False):
        assert np.allclose(before.end, after.start, atol=1e-12)
    assert np.allclose(scene.segments[0].start, 0)
    assert np.allclose(scene.segments[-1].end, chain.tool.position[0], atol=1e-12)
    for index, joint in enumerate(scene.joints):
        axis = chain.axes[0, index]
        assert np.allclose(joint.axis, axis, atol=1e-12)
        assert np.allclose(np.cross(joint.centre - chain.origins[0, index], axis), 0, atol=1e-12)


@EVERY_ARM
def test_points_and_poses_are_the_references(name: str) -> None:
    arm = ARMS[name]
    q = random_values(arm, 20)
    tool = Reference(arm).chain(q).tool
    assert np.allclose(tool_points(arm, q), tool.position, atol=1e-12)
    assert np.allclose(tool_poses(arm, q)[:, :3, 3], tool.position, atol=1e-12)
    assert np.allclose(tool_poses(arm, q)[:, :3, :3], tool.rotation, atol=1e-12)


@lru_cache
def composed(name: str) -> Figure:
    figure = Figure(figsize=(12, 8.6))
    FigureCanvasAgg(figure)
    compose(figure, ARMS[name], np.array(resting_values(ARMS[name])), reach=False, positions=None)
    return figure


@CROWDED_ARM
def test_labels_neither_cover_one_another_nor_leave_their_view(name: str) -> None:
    arm = ARMS[name]
    figure = composed(name)
    for axes in figure.axes[:3]:
        frame = axes.get_window_extent()
        boxes = [(text.get_text(), text.get_window_extent()) for text in axes.texts if "$" in text.get_text()]
        assert len(boxes) >= len(arm.joints)
        for text, box in boxes:
            assert frame.x0 <= box.x0, text
            assert box.x1 <= frame.x1, text
            assert frame.y0 <= box.y0, text
            assert box.y1 <= frame.y1, text
        for (first, box), (second, other) in combinations(boxes, 2):
            assert not Box(box.x0, box.y0, box.x1, box.y1).overlaps(Box(other.x0, other.y0, other.x1, other.y1)), (
                first,
                second,
            )


@CROWDED_ARM
def test_the_tables_text_stays_on_the_page_and_in_its_columns(name: str) -> None:
    figure = composed(name)
    table = figure.axes[3]
    boxes = [text.get_window_extent() for text in table.texts if text.get_text()]
    for box in boxes:
        assert box.x0 >= 0
        assert box.x1 <= figure.bbox.x1
        assert box.y0 >= 0
    for first, second in combinations(boxes, 2):
        assert not (
            min(first.x1, second.x1) - max(first.x0, second.x0) > 0.5
            and min(first.y1, second.y1) - max(first.y0, second.y0) > 0.5
        )


def test_every_joint_variable_frame_and_length_has_its_symbol() -> None:
    figure = composed("bench_six")
    oblique, side = ({part for text in axes.texts for part in text.get_text().split(", ")} for axes in figure.axes[:2])
    assert {f"$\\theta_{{{number}}}$" for number in range(1, 7)} <= oblique & side
    assert {f"$x_{{{number}}}$" for number in range(7)} <= oblique
    assert {"$a_{1}$", "$a_{2}$", "$d_{1}$", "$d_{4}$"} <= side
    assert any(text.endswith("mm") for text in side)


def test_the_same_arm_gives_the_same_bytes(tmp_path: Path) -> None:
    """In this process and in a fresh one with another hash seed, language and day; no date is in it."""
    source = Path(__file__).parent.parent / "arms" / "plotter.toml"
    program = (
        "import sys; from pathlib import Path; from codegen.armfile import read_arm; from codegen.draw import draw; "
        "[draw(read_arm(Path(sys.argv[1])).arm, Path(name)) for name in sys.argv[2:]]"
    )
    environment = {**os.environ, "PYTHONHASHSEED": "7", "LC_ALL": "C", "SOURCE_DATE_EPOCH": "86400"}
    others = [tmp_path / f"other{suffix}" for suffix in (".svg", ".png", ".pdf")]
    subprocess.run([sys.executable, "-c", program, source, *others], check=True, env=environment)
    for other, start in zip(others, (b"<?xml", b"\x89PNG", b"%PDF"), strict=True):
        own = tmp_path / f"own{other.suffix}"
        assert draw(ARMS["plotter"], own) == ()
        assert own.read_bytes().startswith(start)
        assert own.read_bytes() == other.read_bytes()
        assert b"Date" not in own.read_bytes()


def test_the_svg_is_well_formed_and_needs_nothing_from_outside(tmp_path: Path) -> None:
    out = tmp_path / "arm.svg"
    draw(ARMS["column_gantry"], out)
    root = ElementTree.parse(out).getroot()
    links = [value for element in root.iter() for key, value in element.attrib.items() if key.endswith("href")]
    assert root.tag == "{http://www.w3.org/2000/svg}svg"
    assert [link for link in links if not link.startswith("#")] == []


# --- joint values ---


def test_joint_values_are_in_the_files_units() -> None:
    arm = ARMS["gantry_head"]  # three slides in millimetres, then a turn in degrees
    assert joint_values(arm, "100, 20,3.5 ,90") == pytest.approx([0.1, 0.02, 0.0035, math.pi / 2])


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("1,2,3", "3 joint values, and the arm has 4 joints (along, across, down, head)"),
        ("", "0 joint values"),
        ("1,2,x,4", 'joint 3 ("down"): "x" is no finite number\n  hint: give its value in mm'),
        ("1,2,3,nan", "give its value in deg"),
    ],
)
def test_joint_values_that_do_not_fit_are_refused(text: str, said: str) -> None:
    with pytest.raises(CallError) as caught:
        joint_values(ARMS["gantry_head"], text)
    assert said in str(caught.value)


def test_joints_rest_within_their_limits() -> None:
    half = Fraction(1, 2)
    rows = (
        JointRow("a", JointKind.REVOLUTE, limits=(Angle.degrees(20), Angle.degrees(60))),
        JointRow("b", JointKind.REVOLUTE),
        JointRow("c", JointKind.PRISMATIC, limits=(Fraction(0), half)),
    )
    arm = Arm("made", Convention.STANDARD, Task.POINT, rows)
    assert resting_values(arm) == pytest.approx([math.radians(20), 0, 0.25])


def test_a_joint_beyond_its_limits_is_drawn_and_told(tmp_path: Path) -> None:
    arm = ARMS["vial_picker"]
    notes = draw(arm, tmp_path / "arm.svg", at=[math.radians(175), 0, 0, 0])
    assert notes == ('joint "waist" is drawn at 175, outside its limits −170 to 170',)


# --- errors ---


@pytest.mark.parametrize(
    ("name", "said"), [("arm.jpg", '".jpg" is no format'), ("arm", "no suffix"), ("no/arm.svg", "cannot be written")]
)
def test_a_path_that_cannot_be_drawn_to_is_refused(tmp_path: Path, name: str, said: str) -> None:
    with pytest.raises(CallError, match=said):
        draw(ARMS["plotter"], tmp_path / name)
    assert list(tmp_path.iterdir()) == []


def test_without_matplotlib_the_extra_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(importlib.util, "find_spec", lambda name: None)
    with pytest.raises(CallError, match=r"linkwright\[draw\]"):
        draw(ARMS["plotter"], tmp_path / "arm.svg")


# --- parts ---


@pytest.mark.parametrize(("most", "length"), [(1, 1), (1.9, 1), (2, 2), (7, 5), (49, 20), (0.06, 0.05), (1000, 1000)])
def test_the_scale_is_a_round_length(most: float, length: float) -> None:
    assert round_length(most) == pytest.approx(length)


def test_the_hull_of_a_square_with_points_inside() -> None:
    points = np.array([[0, 0], [1, 1], [0.5, 0.5], [1, 0], [0, 1], [0.2, 0.9], [0.5, 0]])
    assert sorted(map(tuple, hull(points))) == [(0, 0), (0, 1), (1, 0), (1, 1)]


def test_labels_of_one_place_are_put_beside_one_another() -> None:
    placer = Placer(Box(0, 0, 200, 200), [Box(90, 90, 110, 110)], [])
    placed = [placer.place(Wanted(str(number), (100.0, 100.0), 20.0, 12.0, clear=(10.0, 10.0))) for number in range(10)]
    boxes = [Box(x - 10, y - 6, x + 10, y + 6) for x, y in (label.centre for label in placed)]
    assert not any(first.overlaps(second) for first, second in combinations(boxes, 2))
    assert not any(box.overlaps(Box(90, 90, 110, 110)) for box in boxes)


@pytest.mark.parametrize(("degrees", "name"), [(0, "x"), (90, "y"), (-90, "-y"), (180, "-x"), (30, "30° from x")])
def test_the_side_view_turns_with_the_arm(degrees: float, name: str) -> None:
    """The vial picker swings in a vertical plane that its waist turns: it is seen square to that plane, in true
    lengths."""
    arm = ARMS["vial_picker"]
    scene = scene_of(arm, np.radians([degrees, 30, -40, 20]))
    view = side_view(scene)
    assert view.right == name
    for segment in scene.segments:
        assert np.hypot(*view.project(segment.end - segment.start)) == pytest.approx(segment.length, abs=1e-12)
