"""The page's text: everything printed, then placed into the template."""

from __future__ import annotations

import json
import re
from dataclasses import asdict, dataclass
from typing import Any

import jinja2

from codegen import VERSION
from codegen.armfile import ArmFile
from codegen.explain.document import Explained, sections
from codegen.inverse.tasks import Derivation
from codegen.javascript import javascript
from codegen.model import Arm, Task
from codegen.options import Mathematics, Options, RealType
from codegen.page.arm_data import Control, arm_data, controls
from codegen.page.content import Agreement, ErrorMap, Measured, Table
from codegen.page.derivation import html_of, slug
from codegen.page.heat_map import Class, shown_classes, svg
from codegen.places import PAGE_TEMPLATES

SCRIPT_OPTIONS = Options(RealType.DOUBLE, Mathematics.OWN, "arm")  # of the C that the page's script is made from
_SCRIPTS = ("picture.js", "controls.js", "self_check.js")
_APART = ("The arm", "Cost")  # sections of the explanation that the page shows elsewhere

CAUTIONS = (
    "The C computes positions; it is not a safety function, and nothing in it may be relied on to protect people.",
    "Verify a new arm file on the machine at low speed, with an emergency stop in reach.",
    "ISO 10218, ISO/TS 15066, local codes and a risk assessment by licensed practice decide what the machine may do.",
    "The agreement shows that the C is the link table; only the machine shows that the link table is the arm.",
    "The model moves the joints at once and through anything: it knows no obstacles, no collisions, no speeds.",
)


@dataclass(frozen=True, slots=True)
class Subject:
    """What the page is about.

    name        of the arm file, without its folder
    derivation  None where the inverse is tracked
    command     that repeats the page
    script      {file name: text} of the arm's C by SCRIPT_OPTIONS
    """

    file: ArmFile
    name: str
    derivation: Derivation | None
    options: Options
    command: str
    script: dict[str, str]


@dataclass(frozen=True, slots=True)
class MapText:
    title: str
    note: str
    svg: str
    classes: tuple[Class, ...]


@dataclass(frozen=True, slots=True)
class PageText:
    """All holes of the template. What is HTML, a style or a script already is named as safe there."""

    version: str
    name: str
    summary: str
    style: str
    controls: list[Control]
    length_unit: str
    angle_unit: str
    task_hint: str
    branch_hint: str
    arm_html: str
    derivation: tuple[tuple[str, str, str], ...]
    real: str
    agreement: Agreement
    maps: tuple[MapText, ...]
    cost_html: str
    costs: tuple[Table, ...]
    cost_remarks: tuple[str, ...]
    cautions: tuple[str, ...]
    command: str
    digest: str
    data: str
    kinematics: str
    script: str


def page(subject: Subject, measured: Measured) -> str:
    """The whole page, as one text without any reference to another file or place."""
    environment = jinja2.Environment(undefined=jinja2.StrictUndefined, trim_blocks=True, autoescape=True)
    text = environment.from_string(_shipped("page.html.j2")).render(p=_page_text(subject, measured))
    return re.sub(r"\n{3,}", "\n\n", text).strip() + "\n"


def _shipped(name: str) -> str:
    return (PAGE_TEMPLATES / name).read_text(encoding="utf-8")


def _page_text(subject: Subject, measured: Measured) -> PageText:
    arm = subject.file.arm
    told = dict(sections(Explained(subject.file, subject.derivation)))
    return PageText(
        version=VERSION,
        name=arm.name,
        summary=_summary(arm, subject.derivation),
        style=_shipped("page.css").strip(),
        controls=controls(arm),
        length_unit=arm.length_unit,
        angle_unit=arm.angle_unit,
        task_hint=_task_hint(arm),
        branch_hint=_branch_hint(subject.derivation),
        arm_html=html_of(told["The arm"]),
        derivation=tuple(
            (heading, slug(heading), html_of(lines)) for heading, lines in told.items() if heading not in _APART
        ),
        real=f"{subject.options.real.c_name}, with {_mathematics(subject.options)}",
        agreement=measured.agreement,
        maps=tuple(_map_text(found) for found in measured.maps),
        cost_html=html_of(told["Cost"]),
        costs=measured.costs,
        cost_remarks=measured.cost_remarks,
        cautions=CAUTIONS,
        command=subject.command,
        digest=subject.file.digest,
        data=_data(
            arm_data(arm, _branches(subject.script), subject.derivation is None)
            | {"vectors": [asdict(vector) for vector in measured.vectors]}
        ),
        kinematics=javascript(subject.script, SCRIPT_OPTIONS.prefix),
        script="\n".join(_shipped(name) for name in _SCRIPTS).strip(),
    )


def _summary(arm: Arm, derivation: Derivation | None) -> str:
    joints = f"{len(arm.joints)} joint{'s' if len(arm.joints) > 1 else ''}"
    held = f", {', '.join(arm.held)} held" if arm.held else ""
    solved = "tracked in bounded steps" if derivation is None else "in closed form"
    return f"{joints}{held}; task {arm.task.key}: {arm.task.matches}; inverse {solved}."


def _mathematics(options: Options) -> str:
    return "its own mathematics" if options.mathematics is Mathematics.OWN else "the compiler's mathematics"


_HINTS = {
    Task.POSE: "The whole pose is read.",
    Task.POINT_AXIS: "Read: the position and the direction of z.",
    Task.POINT_PITCH: "Read: the position and the angle of z in the arm's vertical plane.",
    Task.POINT_YAW: "Read: the position and the heading of x about the world's z.",
    Task.POINT: "Read: the position only.",
    Task.PLANE_POSE: "Read: the position in the plane of motion and the angle in it.",
    Task.PLANE_POINT: "Read: the position in the plane of motion.",
}


def _task_hint(arm: Arm) -> str:
    held = f" Held: {', '.join(arm.held)}; the inverse takes it from the joints." if arm.held else ""
    return _HINTS[arm.task] + held


def _branch_hint(derivation: Derivation | None) -> str:
    if derivation is None:
        return "Branch 0 is tracked from where the joints are; the other numbers hold for this list only."
    return '<a href="#what-a-branch-number-means">What a branch number means</a>'


def _branches(script: dict[str, str]) -> int:
    found = re.search(r"#define ARM_BRANCHES (\d+)", script["arm_kin.h"])
    assert found is not None
    return int(found[1])


def _map_text(found: ErrorMap) -> MapText:
    return MapText(found.title, found.note, svg(found), tuple(shown_classes(found)))


def _data(content: dict[str, Any]) -> str:
    """JSON that cannot end the element it stands in."""
    return json.dumps(content, ensure_ascii=False, allow_nan=False).replace("<", "\\u003c")
