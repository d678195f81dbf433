"""What `linkwright check` says of an arm file: the arm in its own units, how it can be solved, what looks doubtful."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import asdict, dataclass
from typing import Any

from codegen.ability import lack_of
from codegen.armfile import ArmFile
from codegen.armfile_text import angle_number, length_number
from codegen.doubts import doubts
from codegen.errors import Fault
from codegen.exact import Angle
from codegen.inverse.plan import Plan, RefineStep
from codegen.inverse.tasks import derive
from codegen.model import Arm, Convention, Frame, JointRow, Quantity
from codegen.pipeline import lack_fault

_FRAMES = {Convention.STANDARD: "distal frames", Convention.MODIFIED: "proximal frames"}
_COLUMNS = ("", "joint", "type", "a", "alpha", "d", "theta", "limits", "max_speed", "")
_FLUSH_LEFT = (1, 2, 9)


@dataclass(frozen=True, slots=True)
class Stage:
    """One step of a closed form: what it finds, how many roots it has, from what."""

    finds: str
    roots: int
    found_from: str


@dataclass(frozen=True, slots=True)
class Inverse:
    """How the inverse is solved.

    kind       in a few words; empty where it cannot be solved
    branches   None where their numbers hold within one call only
    structure  what was found in the chain
    order      the steps of a closed form
    reasons    why it cannot be solved
    """

    kind: str = ""
    branches: int | None = None
    structure: tuple[str, ...] = ()
    order: tuple[Stage, ...] = ()
    reasons: tuple[Fault, ...] = ()


@dataclass(frozen=True, slots=True)
class Overview:
    """All that check tells."""

    file: ArmFile
    inverse: Inverse
    doubts: tuple[Fault, ...]

    @property
    def solved(self) -> bool:
        return bool(self.inverse.kind)

    def content(self) -> dict[str, Any]:
        """Plain values for JSON; lengths and angles in the file's units."""
        return {
            "solved": self.solved,
            "file": self.file.path,
            "digest": self.file.digest,
            "arm": _arm_content(self.file.arm),
            "inverse": {**asdict(self.inverse), "reasons": faults_content(self.inverse.reasons)},
            "warnings": faults_content(self.file.warnings),
            "doubts": faults_content(self.doubts),
        }


def overview(file: ArmFile) -> Overview:
    return Overview(file, _inverse(file.arm, file.path), doubts(file.arm))


def faults_content(faults: Iterable[Fault]) -> list[dict[str, str]]:
    return [asdict(fault) for fault in faults]


def _inverse(arm: Arm, where: str) -> Inverse:
    """As the generator decides, without generating: preparing starts for an arm without a closed form takes long."""
    lack = lack_of(arm)
    if lack is not None:
        return Inverse(reasons=(lack_fault(arm, lack, where),))
    derivation = derive(arm)
    if derivation is None:
        return Inverse("no closed form: solutions are tracked in bounded steps")
    plan = derivation.plan
    return Inverse("closed form", plan.branches, plan.structure, _order(plan))


def _order(plan: Plan) -> tuple[Stage, ...]:
    return tuple(Stage(step.angle, step.roots, step.note) for step in plan.steps if not isinstance(step, RefineStep))


# --- as text ---


def overview_text(found: Overview) -> str:
    """The arm and its inverse, for a person to read; warnings and doubts are shown apart."""
    arm = found.file.arm
    lines = [*_head(arm), "", *_table(arm), *_frame_lines(arm), "", *_inverse_lines(found.inverse)]
    return "\n".join(lines) + "\n"


def _head(arm: Arm) -> list[str]:
    task, free = arm.task, len(arm.free_indices)
    held = f", {', '.join(arm.held)} held" if arm.held else ""
    return [
        f"{arm.name}: {_counted(len(arm.joints), 'joint')}{held}; {arm.convention.value} convention "
        f"({_FRAMES[arm.convention]}); {arm.length_unit}, {arm.angle_unit}",
        f"task {task.key}: {task.matches}",
        f"it needs {_counted(task.joints, 'joint')} not held and has {free}",
    ]


def _counted(count: int, noun: str) -> str:
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"


def _table(arm: Arm) -> list[str]:
    rows = [_COLUMNS, *(_row(arm, number, row) for number, row in enumerate(arm.joints, start=1))]
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    return ["  ".join(_cells(row, widths)).rstrip() for row in rows]


def _cells(row: Sequence[str], widths: Sequence[int]) -> list[str]:
    cells = enumerate(zip(row, widths, strict=True))
    return [text.ljust(width) if column in _FLUSH_LEFT else text.rjust(width) for column, (text, width) in cells]


def _row(arm: Arm, number: int, row: JointRow) -> tuple[str, ...]:
    limits = " to ".join(_number(arm, limit) for limit in row.limits) if row.limits else "none"
    speed = _number(arm, row.max_speed) if row.max_speed is not None else "none"
    numbers = tuple(_number(arm, quantity) for quantity in (row.a, row.alpha, row.d, row.theta))
    return (str(number), row.name, row.kind.value, *numbers, limits, speed, "held" if row.name in arm.held else "")


def _number(arm: Arm, quantity: Quantity) -> str:
    return angle_number(arm, quantity) if isinstance(quantity, Angle) else length_number(arm, quantity)


def _frame_lines(arm: Arm) -> list[str]:
    frames = [(name, frame) for name, frame in (("base", arm.base), ("tool", arm.tool)) if frame != Frame()]
    return [f"{name}  xyz {_numbers(arm, frame.xyz)}  rpy {_numbers(arm, frame.rpy)}" for name, frame in frames]


def _numbers(arm: Arm, quantities: Sequence[Quantity]) -> str:
    return " ".join(_number(arm, quantity) for quantity in quantities)


def _inverse_lines(inverse: Inverse) -> list[str]:
    if not inverse.kind:
        return ["inverse: cannot be solved"]
    branches = f", {inverse.branches} branches" if (inverse.branches or 0) > 1 else ""
    width = max((len(stage.finds) for stage in inverse.order), default=0)
    return [
        f"inverse: {inverse.kind}{branches}",
        *(f"  {line}" for line in inverse.structure),
        *(_stage_line(stage, width) for stage in inverse.order),
    ]


def _stage_line(stage: Stage, width: int) -> str:
    roots = f"{stage.roots} roots" if stage.roots > 1 else "1 root "
    return f"  {stage.finds.ljust(width)}  {roots}  {stage.found_from}"


# --- as JSON ---


def _arm_content(arm: Arm) -> dict[str, Any]:
    return {
        "name": arm.name,
        "convention": arm.convention.value,
        "length_unit": arm.length_unit,
        "angle_unit": arm.angle_unit,
        "task": {"name": arm.task.key, "matches": arm.task.matches, "joints_needed": arm.task.joints},
        "joints_not_held": len(arm.free_indices),
        "held": list(arm.held),
        "base": _frame_content(arm, arm.base),
        "joints": [_joint_content(arm, row) for row in arm.joints],
        "tool": _frame_content(arm, arm.tool),
    }


def _frame_content(arm: Arm, frame: Frame) -> dict[str, Any]:
    return {"xyz": [_plain(arm, x) for x in frame.xyz], "rpy": [_plain(arm, x) for x in frame.rpy]}


def _joint_content(arm: Arm, row: JointRow) -> dict[str, Any]:
    return {
        "name": row.name,
        "type": row.kind.value,
        **{key: _plain(arm, getattr(row, key)) for key in ("a", "alpha", "d", "theta")},
        "limits": [_plain(arm, limit) for limit in row.limits] if row.limits else None,
        "max_speed": _plain(arm, row.max_speed) if row.max_speed is not None else None,
    }


def _plain(arm: Arm, quantity: Quantity) -> float:
    return float(_number(arm, quantity))
