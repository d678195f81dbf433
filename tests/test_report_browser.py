"""The page of `linkwright report` in a real browser: it moves, it can be used by keys alone, and it fits a phone."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from chromium import Browser, browser
from command_line import PICKER, call
from generated import kinematics
from javascript_bits import bits
from test_tracking_steps import ARMS as WITHOUT_CLOSED_FORM

from build_checks.compile import Kinematics, Status
from build_checks.reference import Poses, Reference
from codegen.armfile import read_arm
from codegen.armwriter import arm_file_text
from codegen.model import Arm
from codegen.places import ARMS

PICKER_ARM = read_arm(PICKER).arm
DEGREE = np.pi / 180
SHOWN = 6e-4  # mm or degrees: half of the last digit that the readouts show, and rounding of the test's own
FOCUSABLE = "a[href], button, input:not([disabled]), [tabindex]"


def page_of(arm_file: Path, folder: Path) -> Path:
    page = folder / f"{arm_file.stem}.html"
    done = call("report", arm_file, "--out", page, "--samples", "150", "--no-cost")
    assert done.status == 0, done.err
    return page


@pytest.fixture(scope="module")
def window() -> Iterator[Browser]:
    with browser() as opened:
        yield opened


@pytest.fixture(scope="module")
def picker_page(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return page_of(PICKER, tmp_path_factory.mktemp("page"))


TRACKED_ARM = WITHOUT_CLOSED_FORM["point_pitch"]


@pytest.fixture(scope="module")
def tracked_page(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("tracked")
    file = folder / "tracked.toml"
    file.write_text(arm_file_text(TRACKED_ARM), encoding="utf-8")
    return page_of(file, folder)


@pytest.fixture
def picker(window: Browser, picker_page: Path) -> Browser:
    """The page of the vial picker, its joints at rest: 4 joints in degrees and millimetres, 4 branches."""
    window.open(picker_page)
    window.find("rest").click()
    return window


def joints_shown(page: Browser, arm: Arm) -> np.ndarray:
    return np.array([page.number(f"value-{i}") for i in range(len(arm.joints))])


def tool_by_c(arm: Arm, degrees: np.ndarray) -> Poses:
    c = kinematics(arm)
    return c.unpack(c.forward(degrees[None] * DEGREE)[0])


def assert_readout(page: Browser, arm: Arm) -> None:
    """The tool pose shown is what the C gives at the joint values shown."""
    wanted = tool_by_c(arm, joints_shown(page, arm))
    shown = [page.number(f"tool-{name}") for name in "xyz"]
    assert shown == pytest.approx(1000 * wanted.position[0], abs=5e-3 * 10)  # joints are shown to 0.01 degrees
    entries = [page.number(f"tool-r{i}{j}") for i in range(3) for j in range(3)]
    assert entries == pytest.approx(wanted.rotation[0].ravel(), abs=1e-3)


# -- the page as a whole -----------------------------------------------------------------------------------------------
def test_the_browser_has_nothing_to_complain_of_and_fetches_nothing(picker: Browser) -> None:
    assert picker.complaints() == []
    assert picker.run("return performance.getEntriesByType('resource').map((entry) => entry.name)") == []


def test_all_three_views_are_drawn(picker: Browser) -> None:
    for view in range(3):
        assert picker.run(f"return document.querySelectorAll('#view-{view} .joint').length") >= 2 * 4
        drawn = picker.run(f"return document.getElementById('view-{view}').innerHTML")
        assert "NaN" not in drawn
        assert "undefined" not in drawn


def self_check(page: Browser) -> str:
    """What the page says of itself, when it has found it out."""
    page.run("checkSelf()")
    return page.text("self-check")


def test_the_page_says_that_this_browser_computes_the_bits_of_the_c(picker: Browser) -> None:
    shown = self_check(picker)
    assert "The same bits." in shown
    assert re.search(r"at 12 poses and on every branch, 0 of \d{3} numbers differ", shown)


def test_the_page_says_so_where_a_number_differs(picker: Browser) -> None:
    picker.run("arm.vectors[3].pose[2] += 1e-16; arm.vectors[5].statuses[1] = 3; arm.vectors[7].branches[2][1] = -0.5")
    shown = self_check(picker)
    assert "Not the same bits." in shown
    assert "3 of" in shown


# -- joints ------------------------------------------------------------------------------------------------------------
def test_a_slider_moves_the_tool_by_keys(picker: Browser) -> None:
    before = picker.number("tool-z")
    picture = picker.run("return document.getElementById('view-0').innerHTML")
    picker.focus("slider-1")
    picker.press(*["\ue014"] * 30)  # arrow right
    assert picker.number("value-1") == pytest.approx(3.0)  # 30 steps of 0.1 degrees
    assert picker.number("tool-z") == pytest.approx(before + 440 * np.sin(3 * DEGREE), abs=SHOWN)
    assert picker.run("return document.getElementById('view-0').innerHTML") != picture
    assert_readout(picker, PICKER_ARM)


def test_a_typed_joint_value_moves_the_tool_and_the_target(picker: Browser) -> None:
    picker.type("value-0", "33")
    picker.type("value-2", "-75.5")
    picker.press("\ue004")  # tab
    assert joints_shown(picker, PICKER_ARM) == pytest.approx([33, 0, -75.5, 0])
    assert_readout(picker, PICKER_ARM)
    assert picker.number("target-x") == pytest.approx(picker.number("tool-x"), abs=SHOWN)
    assert picker.number("slider-2") == pytest.approx(-75.5)


def test_a_joint_past_its_limit_is_named(picker: Browser) -> None:
    picker.type("value-3", "150")
    assert "past its limits" in picker.run(
        "return getComputedStyle(document.querySelector('#row-3 .limits'), '::before').content"
    )
    picker.find("rest").click()
    assert joints_shown(picker, PICKER_ARM) == pytest.approx([0, 0, 0, 0])


# -- postures ----------------------------------------------------------------------------------------------------------
def branches_by_c(c: Kinematics, page: Browser) -> tuple[np.ndarray, np.ndarray]:
    """Of the page's own target, from the page's own joint values."""
    packed = np.array(page.run("return [...state.target.r.flatMap((row) => [...row]), ...state.target.p]"), dtype=float)
    seed = np.array(page.run("return Array.from(state.q)"), dtype=float)
    found = c.inverse_all(packed[None], seed[None])
    return found.q[0], found.status[0]


def test_the_list_has_every_branch_with_the_cs_status_and_values(picker: Browser) -> None:
    for index, value in enumerate(("12", "70", "-80", "-40")):
        picker.type(f"value-{index}", value)
    q, status = branches_by_c(kinematics(PICKER_ARM), picker)
    rows = picker.run("return [...document.querySelectorAll('label.posture')].map((row) => row.textContent)")
    assert len(rows) == len(status) == 4
    words = {Status.OK: "within limits", Status.OVER_LIMIT: "over a limit", Status.OUT_OF_REACH: "out of reach"}
    for row, values, found in zip(rows, q, status, strict=True):
        assert words[Status(found)] in row
        assert all(f"{value / DEGREE:.2f}" in row for value in values) == (found != Status.OUT_OF_REACH)


@pytest.mark.parametrize("branch", range(4))
def test_a_posture_that_is_picked_reaches_the_target(picker: Browser, branch: int) -> None:
    for index, value in enumerate(("12", "70", "-80", "-40")):
        picker.type(f"value-{index}", value)
    q, _ = branches_by_c(kinematics(PICKER_ARM), picker)
    target = [picker.number(f"target-{name}") for name in "xyz"]
    picker.run("document.querySelector(`input[name=posture][value='${arguments[0]}']`).click()", branch)
    assert joints_shown(picker, PICKER_ARM) == pytest.approx(q[branch] / DEGREE, abs=6e-3)
    assert [picker.number(f"tool-{name}") for name in "xyz"] == pytest.approx(target, abs=SHOWN)
    assert picker.number("gap") < 1e-9
    assert picker.run("return state.chosen") == branch
    assert picker.run("return document.querySelectorAll('label.posture.chosen').length") == 1


def test_postures_are_picked_by_keys(picker: Browser) -> None:
    for index, value in enumerate(("12", "70", "-80", "-40")):
        picker.type(f"value-{index}", value)
    chosen = picker.run("return state.chosen")
    picker.run("document.querySelector('input[name=posture]:checked').focus()")
    picker.press("\ue015")  # arrow down
    after = picker.run("return state.chosen")
    assert after != chosen
    assert picker.focused() == str(after)
    assert picker.number("gap") < 1e-9


# -- the target --------------------------------------------------------------------------------------------------------
def test_a_typed_target_lists_its_postures_and_the_arm_moves_on_demand(picker: Browser) -> None:
    picker.type("target-x", "300")
    picker.type("target-z", "260")
    assert "of 4 branches reach this target" in picker.text("status")
    assert joints_shown(picker, PICKER_ARM) == pytest.approx([0, 0, 0, 0])
    assert picker.number("gap") == pytest.approx(np.hypot(140, 118), rel=2e-3)
    picker.focus("nearest")
    picker.press("\ue007")  # enter
    assert picker.number("tool-x") == pytest.approx(300, abs=SHOWN)
    assert picker.number("tool-z") == pytest.approx(260, abs=SHOWN)
    assert picker.number("gap") < 1e-9
    assert_readout(picker, PICKER_ARM)


def test_a_target_out_of_reach_or_half_typed_is_said(picker: Browser) -> None:
    picker.type("target-x", "9999")
    assert picker.text("status") == "No branch reaches this target."
    picker.focus("nearest")
    picker.press("\ue007")
    assert joints_shown(picker, PICKER_ARM) == pytest.approx([0, 0, 0, 0])
    picker.type("target-x", "-")
    assert picker.text("status") == "The target is no pose that can be read."
    picker.find("follow").click()
    assert "reach this target" in picker.text("status")
    assert picker.complaints() == []


# -- the same kinematics as the C --------------------------------------------------------------------------------------
def test_the_page_computes_the_bits_of_the_c(picker: Browser) -> None:
    c, reference = kinematics(PICKER_ARM), Reference(PICKER_ARM)
    rng = np.random.default_rng(11)
    q, seeds = reference.random_joints(rng, 100), reference.random_joints(rng, 100)
    packed, _ = c.forward(q)
    found = picker.run(
        """
        const [joints, seeds] = arguments;
        return joints.map((q, k) => {
          const pose = kinematics.pose();
          kinematics.forward(q, pose);
          const all = Array.from({ length: arm.branches }, () => Array(q.length).fill(0)), statuses = [];
          kinematics.inverse_all(pose, seeds[k], all, statuses);
          return [...pose.r.flatMap((row) => [...row]), ...pose.p, ...statuses, ...all.flat()];
        });
        """,
        q.tolist(),
        seeds.tolist(),
    )
    wanted = c.inverse_all(packed, seeds)
    solved = np.where((wanted.status == Status.OUT_OF_REACH)[:, :, None], 0.0, wanted.q)
    expected = np.concatenate((packed, wanted.status, solved.reshape(100, -1)), axis=1)
    assert np.array_equal(bits(np.array(found, dtype=float)), bits(expected.astype(float)))


# -- keys, names, widths -----------------------------------------------------------------------------------------------
def test_the_tab_key_goes_through_the_controls_in_reading_order(picker: Browser) -> None:
    picker.focus("azimuth")
    order = []
    for _ in range(10):
        picker.press("\ue004")
        order.append(picker.focused())
    joints = [f"{kind}-{i}" for i in range(4) for kind in ("slider", "value")]
    assert order == [*joints, "rest", "target-x"]


def test_everything_that_takes_the_focus_has_a_name_and_no_place_of_its_own(picker: Browser) -> None:
    """WCAG 2.2, success criteria 4.1.2 (name) and 2.4.3 (focus order)."""
    nameless = picker.run(
        f"""
        return [...document.querySelectorAll("{FOCUSABLE}")].filter((one) =>
          !(one.textContent.trim() || one.getAttribute("aria-label") || one.labels?.[0]?.textContent.trim())
          || one.tabIndex > 0).map((one) => one.outerHTML);
        """
    )
    assert nameless == []


@pytest.mark.parametrize("name", ["vial_picker", "seven_held", "gantry_head"])
@pytest.mark.parametrize("width", [360, 768])
def test_nothing_is_wider_than_a_narrow_screen(name: str, width: int, window: Browser, tmp_path: Path) -> None:
    window.open(page_of(ARMS / f"{name}.toml", tmp_path), width, 740)
    assert window.run("return document.documentElement.scrollWidth") <= width
    outside = window.run(
        """
        const inside = (one) => one.closest(".scroll, .unseen, .skip, svg") !== null;
        return [...document.body.querySelectorAll("*")].filter((one) => !inside(one)
          && one.getBoundingClientRect().right > innerWidth + 1).map((one) => one.outerHTML.slice(0, 120));
        """
    )
    assert outside == []


# -- an arm without a closed form --------------------------------------------------------------------------------------
def test_the_postures_of_a_tracked_arm_are_found_and_reached(window: Browser, tracked_page: Path) -> None:
    window.open(tracked_page)
    for index, value in enumerate(("0.4", "-0.7", "0.9", "0.3")):
        window.type(f"value-{index}", value)
    window.run("solve()")  # at once, not when the target has rested
    q, status = branches_by_c(kinematics(TRACKED_ARM), window)
    reached = [b for b in range(len(status)) if status[b] != Status.OUT_OF_REACH]
    assert len(reached) > 1
    for branch in reached:
        window.run("document.querySelector(`input[name=posture][value='${arguments[0]}']`).click()", branch)
        assert window.run("return Array.from(state.q)") == pytest.approx(list(q[branch]), abs=1e-12)
        assert window.number("gap") < 1e-9
    assert "The same bits." in self_check(window)
    assert window.complaints() == []


def test_no_posture_of_an_old_target_can_be_picked_while_a_tracked_arm_searches(
    window: Browser, tracked_page: Path
) -> None:
    window.open(tracked_page)
    choices = "document.querySelectorAll('input[name=posture]:enabled').length"
    before, during, after = window.run(f"""
        solve();
        const before = {choices};
        state.q[0] += 0.1;
        jointsMoved();
        const during = {choices};
        solve();
        return [before, during, {choices}];
    """)
    assert before > 0
    assert during == 0
    assert after > 0
