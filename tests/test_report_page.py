"""The page of `linkwright report` as a file: complete, self-contained, true to what it shows, the same bytes each time."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest
from command_line import CANNOT_REACH, PICKER, PLOTTER, call, names_in
from required_tools import need_target

import build_checks.cost
import codegen.pipeline
from build_checks.compile import Kinematics, compiled
from build_checks.error_map import error_maps, round_trips
from build_checks.reference import Reference
from build_checks.targets import TARGETS
from codegen.armfile import read_arm
from codegen.errors import CheckFailedError, Fault
from codegen.options import Options, RealType
from codegen.page.content import ErrorMap
from codegen.page.derivation import html_of
from codegen.page.heat_map import COLOURS, shown_classes, svg
from codegen.pipeline import generate
from codegen.places import ARMS, PAGE_TEMPLATES

QUICK = ("--samples", "150", "--no-cost")
_VOID = {"meta", "link", "input", "br", "hr", "img"}  # HTML Living Standard, 13.1.2: elements without an end


class Reader(HTMLParser):
    """Follows the elements of a page: what is open, what has an id, what refers to one."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.faults: list[str] = []
        self.ids: list[str] = []
        self.references: list[str] = []
        self.tags: Counter[str] = Counter()

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        named = dict(attributes)
        self.tags[tag] += 1
        self.ids += [named["id"] or ""] if "id" in named else []
        self.references += [(named["href"] or "")[1:]] if (named.get("href") or "").startswith("#") else []
        self.references += [named[key] or "" for key in ("for", "aria-labelledby") if key in named]
        if tag not in _VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attributes)
        if tag not in _VOID:
            self.open.pop()

    def handle_endtag(self, tag: str) -> None:
        if not self.open or self.open.pop() != tag:
            self.faults.append(f"</{tag}> at {self.getpos()}")


def read(text: str) -> Reader:
    reader = Reader()
    reader.feed(text)
    reader.close()
    return reader


def page_text(folder: Path, arm_file: Path, *options: str) -> str:
    page = folder / "page.html"
    done = call("report", arm_file, "--out", page, *(options or QUICK))
    assert done.status == 0, done.err
    return page.read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def picker(tmp_path_factory: pytest.TempPathFactory) -> str:
    return page_text(tmp_path_factory.mktemp("page"), PICKER)


# -- the file ----------------------------------------------------------------------------------------------------------
@pytest.mark.parametrize("name", ["vial_picker", "slide_plotter", "seven_held"])
def test_the_page_is_well_formed(name: str, tmp_path: Path) -> None:
    found = read(page_text(tmp_path, ARMS / f"{name}.toml"))
    assert (found.faults, found.open) == ([], [])
    assert [identity for identity, count in Counter(found.ids).items() if count > 1] == []
    assert set(found.references) <= set(found.ids)
    assert found.tags["h1"] == 1


def test_the_page_refers_to_nothing_outside_itself(picker: str) -> None:
    assert re.findall(r"https?:|//[a-z]|@import|@font-face", re.sub(r"^\s*//.*$", "", picker, flags=re.MULTILINE)) == []
    assert re.findall(r"\bsrc\s*=|\bsrcset\s*=", picker) == []
    assert set(re.findall(r"url\((.*?)\)", picker)) <= {"#hatch"}
    assert set(re.findall(r'href="([^#"][^"]*)"', picker)) == {"data:,"}
    assert "default-src 'none'" in picker


def test_the_same_call_gives_the_same_bytes(picker: str, tmp_path: Path) -> None:
    assert page_text(tmp_path, PICKER) == picker


def test_no_folder_of_this_machine_is_in_the_page(picker: str, tmp_path: Path) -> None:
    assert str(ARMS) not in picker
    assert str(tmp_path.parent) not in picker


def test_the_command_on_the_page_gives_the_page_again(
    picker: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / PICKER.name).write_bytes(PICKER.read_bytes())
    monkeypatch.chdir(tmp_path)
    command = re.search(r">linkwright (report .*?)</pre>", picker)
    assert command is not None
    assert call(*command[1].split()).status == 0
    assert (tmp_path / "vial_picker.html").read_text(encoding="utf-8") == picker


# -- what it shows -----------------------------------------------------------------------------------------------------
def test_every_section_is_there(picker: str) -> None:
    headings = re.findall(r"<h2[^>]*>(.*?)</h2>", picker)
    assert headings == ["Model", "Arm", "Derivation", "Agreement", "Error maps", "Cost", "Cautions", "Repeat"]
    for caution in ("not a safety function", "emergency stop", "ISO 10218", "ISO/TS 15066"):
        assert caution in picker
    assert read_arm(PICKER).digest in picker


def test_the_table_is_in_the_units_of_the_file(picker: str) -> None:
    assert "lengths in mm, angles in deg" in picker
    row = re.search(r"<td>elbow</td>(.*?)</tr>", picker, re.DOTALL)
    assert row is not None
    assert re.findall(r">([^<>\n]+)</td>", row[1]) == ["revolute", "160", "0", "0", "0", "-150 to 150"]


def test_the_figures_are_those_of_agree(picker: str) -> None:
    agreed = call("agree", PICKER, "--samples", "150").out
    for title in ("every solution reaches its pose", "branch_of and inverse give joint values back"):
        line = next(line for line in agreed.splitlines() if line.startswith(title))
        cases, failed, undecided = line.removeprefix(title).split()
        assert f'<th scope="row">{title}</th><td>{cases}</td><td>{failed}</td><td>{undecided}</td>' in picker


def test_c_that_disagrees_is_shown_and_fails(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    def faulty(arm: object, options: Options, source: object = None) -> dict[str, str]:
        files = generate(arm, options, source)  # type: ignore[arg-type]
        text = files["arm_kin.c"].replace("A2 = 0.185f", "A2 = 0.186f")
        return files | {"arm_kin.c": text}

    monkeypatch.setattr(codegen.pipeline, "generate", faulty)
    page = tmp_path / "page.html"
    done = call("report", PICKER, "--out", page, *QUICK)
    assert done.status == 1
    assert "does not agree with the link table" in done.err
    text = page.read_text(encoding="utf-8")
    assert "Not agreed." in text
    assert "The C does NOT agree" in text
    assert read(text).faults == []


def test_the_options_reach_the_c_that_is_checked(tmp_path: Path) -> None:
    text = page_text(tmp_path, PLOTTER, *QUICK, "--real", "double", "--math", "libm", "--prefix", "plot")
    assert "The C in double, with the compiler's mathematics" in re.sub(r"\s+", " ", text).replace("&#39;", "'")
    assert "--real double --math libm --prefix plot" in text
    assert "--prefix arm --angles integer" in page_text(tmp_path, PLOTTER, *QUICK, "--angles", "integer")


def test_cost_is_measured_where_it_can_be(tmp_path: Path) -> None:
    need_target(TARGETS[0])
    text = page_text(tmp_path, PLOTTER, "--samples", "100")
    assert TARGETS[0].title in text
    assert re.search(r'<th scope="row">arm_inverse</th><td>[\d,]+</td>', text)


def test_a_target_whose_measurement_fails_is_said_and_the_page_still_comes(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    def fails(*_: object, **__: object) -> None:
        raise CheckFailedError(Fault("arm_inverse", "used more stack than there is"))

    monkeypatch.setattr(build_checks.cost, "measure_cost", fails)
    text = page_text(tmp_path, PLOTTER, "--samples", "100")
    for target in TARGETS:
        assert f"{target.title}: not measured: arm_inverse: used more stack than there is" in text


def test_cost_that_is_left_out_is_said(picker: str) -> None:
    assert "Left out: --no-cost was given." in picker


# -- error maps --------------------------------------------------------------------------------------------------------
def test_the_map_holds_the_worst_round_trip_of_each_cell() -> None:
    """Against the worst error over all poses, and the same poses one by one."""
    arm = read_arm(PICKER).arm
    files = generate(arm, Options())
    position, angle = error_maps(arm, files, Options(), samples=600, seed=3)
    with compiled(files, Options()) as library:
        trips = round_trips(Kinematics(library), Reference(arm), 600, np.random.default_rng(3))
    millimetres = trips.position / 0.001
    assert max(value for row in position.values for value in row if value is not None) == millimetres.max()
    assert max(value for row in angle.values for value in row if value is not None) == trips.angle.max()
    for k in range(0, 600, 50):  # the section through axis 1, which is the world's z: distance and height
        right, up = 1000 * np.hypot(*trips.points[k, :2]), 1000 * trips.points[k, 2]
        row, column = np.searchsorted(position.up, up) - 1, np.searchsorted(position.right, right) - 1
        value = position.values[row][column]
        assert value is not None
        assert value >= millimetres[k]


def test_errors_in_double_are_as_small_as_double_is() -> None:
    arm = read_arm(PICKER).arm
    options = Options(RealType.DOUBLE)
    (position, _) = error_maps(arm, generate(arm, options), options, samples=200, seed=1)
    assert 0 < max(value for row in position.values for value in row if value is not None) < 1e-11  # mm


MAP = ErrorMap(
    "Position error", "a note", "mm", ((1.0, None, 64.0), (2.0, 4.0, None)), (0.0, 1.0, 2.0, 3.0), (0.0, 1.0, 2.0),
    "right", "up", "mm",
)  # fmt: skip


def test_the_legend_counts_every_cell_and_ends_at_the_largest_error() -> None:
    classes = shown_classes(MAP)
    assert [row.colour for row in classes] == list(COLOURS[::-1])
    assert classes[0].text.endswith("to 64 mm")
    assert sum(int(row.share.removesuffix(" %")) for row in classes) == 100


def test_cells_of_one_class_are_joined_and_empty_ones_left_out() -> None:
    alike = replace(MAP, values=((1.0, 1.0, 1.0), (None, None, None)))
    drawn = re.findall(r'<path fill="(#\w+)" d="(.*?)"/>', svg(alike))
    assert [(colour, path.count("M")) for colour, path in drawn] == [(COLOURS[-1], 1)]


def test_a_map_without_any_error_can_be_drawn() -> None:
    """Slides alone may be exact."""
    flat = replace(MAP, values=((0.0, 0.0, 0.0), (0.0, 0.0, 0.0)))
    assert "nan" not in svg(flat).lower()
    assert len(shown_classes(flat)) == len(COLOURS)


# -- colours and Markdown ----------------------------------------------------------------------------------------------
def _luminance(colour: str) -> float:
    """Relative luminance (WCAG 2.2, definition)."""
    parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    linear = [part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


@pytest.mark.parametrize("scheme", [0, 1], ids=["light", "dark"])
def test_words_stand_out_from_their_ground(scheme: int) -> None:
    """WCAG 2.2, success criterion 1.4.3: contrast of 4.5 to 1 at least."""
    blocks = re.findall(r":root \{(.*?)\}", (PAGE_TEMPLATES / "page.css").read_text(encoding="utf-8"), re.DOTALL)
    colours = dict(re.findall(r"--(\w+): (#[0-9a-f]{6})", blocks[scheme]))
    for word in ("ink", "soft", "accent", "good", "bad"):
        for ground in ("paper", "panel"):
            light, dark = sorted((_luminance(colours[word]), _luminance(colours[ground])), reverse=True)
            assert (light + 0.05) / (dark + 0.05) >= 4.5, (word, ground)


def test_the_classes_of_a_map_grow_darker_with_the_error() -> None:
    """So that they read without colour too."""
    lightness = [_luminance(colour) for colour in COLOURS]
    assert lightness == sorted(lightness, reverse=True)


def test_markdown_becomes_html_that_nothing_can_slip_through() -> None:
    html = html_of(["### A < B & C", "", "| a | b |", "| --: | --- |", "| 1 | `<script>` |", "", "<b>bold</b>"])
    assert '<h4 id="a-b-c">A &lt; B &amp; C</h4>' in html
    assert '<td style="text-align:right">1</td>' in html
    assert "<code>&lt;script&gt;</code>" in html
    assert "<b>" not in html


# -- refusals ----------------------------------------------------------------------------------------------------------
def test_a_page_has_to_be_named_as_one(tmp_path: Path) -> None:
    done = call("report", PLOTTER, "--out", tmp_path / "page.pdf", *QUICK)
    assert done.status == 2
    assert "is not named as a page" in done.err
    assert "Traceback" not in done.err
    assert names_in(tmp_path) == []


def test_an_arm_that_cannot_do_its_task_gives_no_page(tmp_path: Path) -> None:
    (tmp_path / "flat.toml").write_text(CANNOT_REACH, encoding="utf-8")
    done = call("report", tmp_path / "flat.toml", "--out", tmp_path / "page.html", *QUICK)
    assert done.status == 1
    assert "flat.toml" in done.err
    assert names_in(tmp_path) == ["flat.toml"]


def test_without_a_compiler_there_is_one_clear_error(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setenv("CC", "no-such-compiler")
    done = call("report", PLOTTER, "--out", tmp_path / "page.html", *QUICK)
    assert done.status == 2
    assert "no-such-compiler" in done.err
    assert names_in(tmp_path) == []


def test_a_folder_that_is_not_there_is_said(tmp_path: Path) -> None:
    done = call("report", PLOTTER, "--out", tmp_path / "none" / "page.html", *QUICK)
    assert done.status == 2
    assert "make its folder first" in done.err
