"""The derivation of an arm as one Markdown document, from the same plan and the same values as its C."""

from __future__ import annotations

from dataclasses import dataclass

from codegen import VERSION
from codegen.armfile import ArmFile
from codegen.cost_static import forward_count, inverse_count, jacobian_count
from codegen.emit.expression import Constants
from codegen.emit.motion_text import MotionText
from codegen.explain.arm_text import arm_lines, structure_lines
from codegen.explain.cost_text import REMARK, cost_lines, inverse_rows
from codegen.explain.formula import Sheet
from codegen.explain.inverse_text import inverse_lines
from codegen.explain.markdown import block
from codegen.explain.sources import source_lines
from codegen.explain.structure import structure_of
from codegen.explain.tracked import tracked_lines
from codegen.forward import pose_nodes
from codegen.inverse.tasks import Derivation
from codegen.model import Arm
from codegen.options import Options
from codegen.program import reachable

_READING = """\
Lengths are in metres and angles in radians, whatever the file uses. `p[0..2]` is the wanted position of the tool point,
`r[i][j]` row i, column j of its rotation: the columns are the tool's axes. Counting starts at 0, as in the C.
`A2`, `ALPHA2`, `D2`, `THETA2` are row 2 of the table (rows count from 1), `COS_` and `SIN_` their cosine and sine;
`TOOL_X` and `BASE_X` belong to those frames. Right angles and zeros are exact and so do not show. For a joint that
turns, `name.c` and `name.s` are the cosine and the sine of its variable plus theta, or of its variable alone where
theta is a whole number of right angles; for one that slides, `name_slide` is its variable plus d. `^` is a power, `+-`
a choice, and `atan2(y, x)` has y first. Every value is defined above the line that uses it.""".replace("\n", " ")


@dataclass(frozen=True, slots=True)
class Explained:
    """What an explanation is made from; without a derivation the inverse is tracked."""

    file: ArmFile
    derivation: Derivation | None


def document(what: Explained, name: str) -> str:
    """The Markdown text. `name` is the arm file's name without its folder."""
    lines = [
        f"# {what.file.arm.name}: how its kinematics are derived",
        "",
        f"Made by linkwright {VERSION} from {name} (SHA-256 {what.file.digest}).",
    ]
    for heading, text in sections(what):
        lines += ["", f"## {heading}", "", *text]
    return _without_double_gaps(lines)


def sections(what: Explained) -> list[tuple[str, list[str]]]:
    """Heading and Markdown lines of each section, in order."""
    arm = what.file.arm
    plan = what.derivation.plan if what.derivation else None
    return [
        ("The arm", arm_lines(arm)),
        ("How to read the formulas", [_READING]),
        ("Structure", structure_lines(arm, structure_of(arm))),
        ("Forward kinematics", forward_lines(arm)),
        ("Inverse kinematics", inverse_lines(what.derivation) if what.derivation else tracked_lines(arm)),
        ("Cost", _cost_lines(arm, what.derivation)),
        ("Sources", source_lines(plan, arm.task)),
    ]


def _without_double_gaps(lines: list[str]) -> str:
    kept = [line for k, line in enumerate(lines) if line or (k > 0 and lines[k - 1])]
    return "\n".join(kept).rstrip("\n") + "\n"


def forward_lines(arm: Arm) -> list[str]:
    """Every entry of the tool pose."""
    motion = MotionText(arm, Options(), Constants(Options()))
    pose = pose_nodes(motion.carrier)
    results = [(f"p[{i}]", pose.position[i]) for i in range(3)]
    results += [(f"r[{i}][{j}]", pose.rotation[i][j]) for i in range(3) for j in range(3)]
    sheet = Sheet(motion.builder)
    sheet.taken |= {"q", "p", "r"}
    nodes = [node for _, node in results]
    sheet.plan_uses(nodes)
    used = set(reachable(nodes))
    for heading, pair in motion.values.pairs.items():
        if pair.cosine in used or pair.sine in used:
            name = pair.cosine.name.removesuffix(".c")
            note = "parallel axes: their angles add up" if len(heading) > 1 else ""
            sheet.say(f"({name}.c, {name}.s)", f"cos_sin({sheet.text(motion.values.angle(heading))})", note)
    for name, node in results:
        sheet.alias(name, node)
    return [
        "`cos_sin(angle)` is the pair of its cosine and its sine. The tool's point and axes are carried from the tool "
        "to the base as vectors.",
        "",
        *block(sheet.take()),
        "The Jacobian's columns are, for a joint that turns, (z x (p - o), z), and for one that slides (z, 0): z is "
        "the joint's axis, o a point on it, in the world frame.",
    ]


def _cost_lines(arm: Arm, derivation: Derivation | None) -> list[str]:
    options = Options()
    rows = [("`arm_forward`", forward_count(arm, options)), ("`arm_jacobian`", jacobian_count(arm, options, derivation))]
    if derivation is None:
        return cost_lines(rows, [REMARK, "The inverse takes as many steps as its section says."])
    count = inverse_count(derivation, options)
    remarks = [REMARK]
    if count.worst:
        remarks.append("The search for roots is counted at its worst, in float; as a rule it takes a tenth of that.")
    return cost_lines([*rows, *inverse_rows(count)], remarks)
