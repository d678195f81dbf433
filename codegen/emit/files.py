"""The two files of an arm: everything printed, then placed into the templates."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING

import jinja2

from codegen import VERSION
from codegen.elementary import maths_context
from codegen.emit.branch_text import BranchText
from codegen.emit.check_text import PoseCheck, pose_check
from codegen.emit.expression import Constants
from codegen.emit.inverse_text import InverseText, StageText
from codegen.emit.motion_text import MotionText
from codegen.emit.numbers import literal
from codegen.emit.tolerances import limit_texts, slowness, tolerance_rows, within_one_turn
from codegen.inverse.plan import BY_SIDE
from codegen.inverse.tasks import Derivation
from codegen.model import Arm, JointKind
from codegen.options import Arithmetic, Options
from codegen.places import TEMPLATES
from codegen.program import Node

if TYPE_CHECKING:
    from codegen.tracking.steps_context import StepsContext

_HELPERS = (
    "abs", "sqrt", "root", "exceeds", "angle_of", "sin_cos", "is_finite", "turn", "unit", "keep", "turns",
    "settle_turn", "opposite", "settle_slide", "signed_root", "within", "all_usable", "tidy", "clean_rotation", "other_turn",
    "turn_roots", "slide_roots", "keep_free", "turn_number", "slide_number", "quartic_roots", "newton2",
    "turn_by", "doubt",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Source:
    """Where an arm came from: its file's name and the digest of its bytes."""

    name: str
    digest: str = ""


@dataclass(frozen=True, slots=True)
class JointText:
    text: str
    lower: str
    upper: str
    slowness: str
    offset: str = ""


@cache
def environment() -> jinja2.Environment:
    """Templates as shipped beside the tool: strict about names, blocks trimmed."""

    def load(name: str) -> str:
        return (TEMPLATES / name).read_text(encoding="utf-8")

    return jinja2.Environment(
        loader=jinja2.FunctionLoader(load),
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=False,
        keep_trailing_newline=True,
        autoescape=False,
    )


def closed_form_files(
    arm: Arm, derivation: Derivation, options: Options, source: Source, steps: StepsContext | None = None
) -> dict[str, str]:
    """`<prefix>_kin.c` and `<prefix>_kin.h` of an arm whose inverse is in closed form.

    `steps`: what the templates of the last steps place, for an arm whose formulas lose digits.
    """
    context = _context(arm, derivation, options, source, steps)
    p = options.prefix
    return {f"{p}_kin.h": rendered("kin.h.j2", context), f"{p}_kin.c": pruned("kin.c.j2", context)}


def rendered(template: str, context: dict[str, object]) -> str:
    text = environment().get_template(template).render(context)
    return re.sub(r"\n{3,}", "\n\n", text).rstrip("\n") + "\n"


def pruned(template: str, context: dict[str, object]) -> str:
    """The file without the helpers that nothing in it calls, and without the constants that nothing in it reads.

    A helper may be needed by another only.
    """
    used, p = frozenset(_HELPERS), context["p"]
    kept: dict[str, list[tuple[str, str, str]]] = {key: context[key] for key in ("constants", "tolerances")}  # type: ignore[misc]
    while True:
        text = rendered(template, {**context, "used": used, "uses": used | {"atan2"}, **kept})
        code = re.sub(r"/\*.*?\*/", "", text, flags=re.DOTALL)
        called = frozenset(name for name in used if len(re.findall(rf"\b{p}_{name}\(", code)) > 1)
        read = {key: [row for row in rows if len(re.findall(rf"\b{row[0]}\b", code)) > 1] for key, rows in kept.items()}
        if called == used and read == kept:
            return text
        used, kept = called, read


def _context(
    arm: Arm, derivation: Derivation, options: Options, source: Source, steps: StepsContext | None
) -> dict[str, object]:
    constants = Constants(options)
    forward = MotionText(arm, options, constants).forward()
    inverse = InverseText(derivation, options, constants)
    stages = inverse.stage_texts()
    reach = inverse.reach_lines()
    branch_of = BranchText(derivation, options, constants).lines()
    motion = MotionText(arm, options, constants)
    jacobian = motion.jacobian() if steps is None else motion.core()
    check = pose_check(derivation, options, constants)
    offsets = [joint.offset for joint in derivation.goal.chain.joints]
    joints = [
        joint_text(arm, k, options, offset if arm.joints[k].kind is JointKind.REVOLUTE else None)
        for k, offset in enumerate(offsets)
    ]
    return {
        **words(options),
        "arm": {
            "name": arm.name,
            "task": arm.task.key,
            "matches": arm.task.matches,
            "held": arm.held,
            "joints": joints,
            "branch_text": [*_branch_text(stages, derivation.plan.branches), *_last_steps_text(steps)],
        },
        "command": command_line(source, options),
        "digest": source.digest,
        "version": VERSION,
        "numeric": False,
        "s": steps,
        "branches": derivation.plan.branches,
        "maths": maths_context(options),
        "constants": constants.declarations(),
        "tolerances": tolerance_rows(arm, options, derivation.plan.approximate),
        "forward": forward,
        "jacobian": jacobian,
        "stages": [_stage_context(stage) for stage in stages],
        "levels": [_level_context(stage) for stage in reversed(stages[1:])],
        "mirror": [{"joint": flip.joint, "image": flip.image(options.prefix)} for flip in inverse.mirror()],
        "half_turned": any(flip.cosine for flip in inverse.mirror()),
        "mirror_mask": f"0x{sum(1 << flip.joint for flip in inverse.mirror()):X}",
        "held_mask": f"0x{sum(1 << index for index in derivation.goal.arm.held_indices):X}",
        "known_fields": inverse.known_fields(),
        "work_fields": inverse.work_fields(),
        **_one_turn(arm),
        "sliding": [k for k, row in enumerate(arm.joints) if row.kind is not JointKind.REVOLUTE],
        "turning": any(row.kind is JointKind.REVOLUTE for row in arm.joints),
        "turning_joints": _turning_joints(arm, joints),
        "offsets": any(joint.offset for joint in joints),
        "reach": reach,
        "reach_rotation": any(re.search(r"\br\[", line) for line in reach),
        "reach_point": any(re.search(r"\bp\[", line) for line in reach),
        "branch_of": branch_of,
        "check": check.kind,
        "reads": check.reads,
        "reads_position": [entry for entry in check.reads if entry.startswith("p")],
        "plane_lines": check.lines,
    }


def _turning_joints(arm: Arm, joints: list[JointText]) -> list[dict[str, object]]:
    return [
        {"number": k, "bit": f"0x{1 << k:X}", "offset": text.offset}
        for k, (row, text) in enumerate(zip(arm.joints, joints, strict=True))
        if row.kind is JointKind.REVOLUTE
    ]


def _one_turn(arm: Arm) -> dict[str, object]:
    """The turning joints whose limits leave less than a whole turn: all of them, none, or a mask."""
    turning = [k for k, row in enumerate(arm.joints) if row.kind is JointKind.REVOLUTE]
    within = [k for k in turning if within_one_turn(arm, k)]
    mask = f"0x{sum(1 << k for k in within):X}"
    return {"one_turn": "all" if within == turning else "some" if within else "none", "one_turn_mask": mask}


def words(options: Options) -> dict[str, object]:
    """Literals and names that every template may place."""

    def number(value: float) -> str:
        return literal(value, options.real)

    return {
        "p": options.prefix,
        "P": options.prefix.upper(),
        "real": options.real,
        "zero": number(0),
        "half": number(0.5),
        "one_and_half": number(1.5),
        "one": number(1),
        "two": number(2),
        "six": number(6),
        "edge": number(1.0625),
        "minus_edge": number(-1.0625),
        "number": number,
        "root_steps": 30 if options.real.bits < 30 else 60,
        "most_turns": number(2**22),
        "matrix_slack": number(0.001),
        "passes": 3 if options.real.bits < 30 else 4,
    }


def _stage_context(stage: StageText) -> dict[str, object]:
    return {
        "name": stage.name,
        "number": stage.number,
        "roots": stage.roots,
        "shift": stage.shift,
        "mask": f"0x{sum(1 << joint for joint in stage.turning):X}",
        "notes": stage.notes,
        "lines": stage.lines,
        "reads_rotation": any(re.search(r"\br\[", line) for line in stage.lines),
        "reads_point": any(re.search(r"\bp\[", line) for line in stage.lines),
        "uses_work": any(re.search(r"\bwork\b|\b[pr]\[", line) for line in stage.lines),
        "uses_known": any(re.search(r"\bknown\b", line) for line in stage.lines),
        "can_fail": stage.number > 0 or any("return false;" in line for line in stage.lines),
    }


def _level_context(stage: StageText) -> dict[str, object]:
    others = "each with all that follows" if stage.shift else "each to its end"
    what = f"The roots of stage {stage.number} that are wanted, {others}; `branch` holds the digits chosen before."
    return {**_stage_context(stage), "digit": f"0x{stage.roots - 1:X}", "comment": what}


def joint_text(arm: Arm, index: int, options: Options, offset: Node | None = None) -> JointText:
    row = arm.joints[index]
    motion = "turns, rad" if row.kind.value == "revolute" else "slides, m"
    lower, upper = limit_texts(arm, index, options)
    held = ", held by the inverse" if row.name in arm.held else ""
    return JointText(
        f"{row.name}: {motion}{held}",
        lower,
        upper,
        literal(slowness(arm, index), options.real),
        "" if offset is None or offset.is_exactly(0) else literal(offset.value, options.real),
    )


def _branch_text(stages: list[StageText], branches: int) -> list[str]:
    """What each digit of a branch number means."""
    if branches == 1:
        return ["Inverse: closed form. One branch: a pose that can be reached has one solution."]
    lines = ["Inverse: closed form. A branch number names the same posture all over the workspace:"]
    for stage in stages[1:]:
        if stage.roots == 2:
            zero, one = stage.meanings
            lines.append(f"  bit {stage.shift}   0: {zero}   1: {one}")
        else:
            lines += _quartic_text(stage)
    return lines


def _last_steps_text(steps: StepsContext | None) -> list[str]:
    if steps is None:
        return []
    return [
        "  Where its formulas lose digits, damped Newton steps bring a branch onto the pose: at the very worst",
        f"  {steps.most} evaluations of the Jacobian, {steps.most_free} where the pose leaves joints free.",
    ]


def _quartic_text(stage: StageText) -> list[str]:
    low, high = stage.shift, stage.shift + 1
    head = f"  bits {high} and {low}   {stage.name}, one of up to four roots: bit {low} by "
    if stage.meanings == (BY_SIDE,):
        return [
            head + "the sign of a Jacobian",
            f"             determinant, which changes where the arm folds, bit {high} by the order of such roots,",
            "             counted from an angle of -143 degrees: passing there renumbers them",
        ]
    return [
        head + "whether its equation rises or falls",
        f"             through the root (0 rises), bit {high} by the order of such roots",
    ]


def command_line(source: Source, options: Options) -> str:
    name = re.sub(r"[^\w.+-]", "_", source.name, flags=re.ASCII)
    return f"linkwright generate {name} {option_words(options)}"


def option_words(options: Options) -> str:
    """The options as they are typed."""
    mathematics = options.mathematics.value
    text = f"--real {options.real.c_name} --math {mathematics} --prefix {options.prefix}"
    text += "" if options.angle_error == 2 else f" --angle-error {options.angle_error}"
    return text if options.angles is Arithmetic.REAL else f"{text} --angles {options.angles.value}"


def check_of(derivation: Derivation, options: Options) -> PoseCheck:
    """Which entries of a pose the generated inverse reads, and how it checks them."""
    return pose_check(derivation, options, Constants(options))
