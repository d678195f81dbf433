"""A comparison as sections for a reader, in the units of the old arm file; how they look is decided elsewhere."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import astuple, dataclass

from codegen.compare.comparison import Comparison, Cost
from codegen.compare.motion import JointMoves, ToolMotion
from codegen.compare.reach import Example, Exchange, Verdict
from codegen.compare.sides import OK, STATUS_WORDS, Array
from codegen.compare.table import angle_number, angle_text, joint_number, joint_text, length_number, length_text
from codegen.cost_static import OperationCount
from codegen.explain.cost_text import HEAD
from codegen.model import Arm

REACHED = STATUS_WORDS[OK]
_MOST_ROWS = 30  # of the user's poses
_EXAMPLES = 3
_MOST_CODE = 120  # lines of the difference


@dataclass(frozen=True, slots=True)
class Grid:
    """A table; columns in `right` are numbers."""

    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    right: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Code:
    """Lines to be shown as they are; `language` for colours."""

    lines: tuple[str, ...]
    language: str = ""


@dataclass(frozen=True, slots=True)
class Points:
    """A list."""

    lines: tuple[str, ...]


Item = str | Grid | Code | Points


@dataclass(frozen=True, slots=True)
class Section:
    heading: str
    items: tuple[Item, ...]


def sections(found: Comparison) -> tuple[Section, ...]:
    """The summary first."""
    parts: list[tuple[str, Iterable[Item]]] = [
        ("Summary", [Points(summary(found))]),
        ("Link table", _table(found)),
        ("Structure", _shape(found)),
        ("Interface of the C", _interface(found)),
        ("The tool at the same joint values", _tool(found.old.arm, found.tool)),
        ("Joint values for the same poses", _moves(found.old.arm, found.moves)),
        ("Poses lost and gained", _reach(found)),
        ("Your poses", _verdicts(found)),
        ("Cost", _costs(found.costs)),
        ("Accuracy of the C", _accuracy(found)),
        ("Difference of the C", _code(found.code)),
    ]
    return tuple(Section(heading, filled) for heading, items in parts if (filled := tuple(items)))


# -- the summary -------------------------------------------------------------------------------------------------------
def summary(found: Comparison) -> tuple[str, ...]:
    """One line an answer."""
    changed = found.interface_changes
    lines = [
        f"link table: {_counted(len(found.table), 'change') if found.table else 'no change'}",
        f"structure: {'the same' if found.shape.same else 'changed'}",
        f"interface of the C: {'changed: ' + ', '.join(changed) if changed else 'the same'}",
        f"branch numbers: {found.numbers.means}",
    ]
    if found.tool is not None:
        lines.append(f"tool at the same joint values: {_moved(found.old.arm, found.tool)}")
    off_branch = Exchange(found.lost.poses, found.lost.off_branch or 0, None, ())
    other = f", {_percent(off_branch)} reached on another branch only" if off_branch.missing else ""
    lines.append(f"poses: {_percent(found.lost)} lost{other}, {_percent(found.gained)} new")
    if found.verdicts is not None:
        lines.append(f"your poses: {_verdict_sentence(found.verdicts).removeprefix('Of ').rstrip('.')}")
    return tuple(lines)


def _moved(arm: Arm, tool: ToolMotion) -> str:
    if tool.worst == tool.worst_turn == 0.0:
        return "stands still"
    moved = f"moves {length_text(arm, tool.worst)} at the worst, {length_text(arm, tool.mean)} in the mean"
    return f"{moved}; turns {angle_text(arm, tool.worst_turn)} at the worst" if tool.worst_turn > 0.0 else moved


def _counted(count: int, noun: str) -> str:
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"


def _percent(exchange: Exchange) -> str:
    if exchange.missing == 0:
        return "none"
    share = 100 * exchange.share
    return f"{share:.2g} %" if share < 10 else f"{share:.0f} %"


# -- the sections ------------------------------------------------------------------------------------------------------
def _table(found: Comparison) -> list[Item]:
    rows = tuple((c.where, c.what, c.old or "-", c.new or "-") for c in found.table)
    return [Grid(("where", "what", "old", "new"), rows)] if rows else ["Nothing changed."]


def _shape(found: Comparison) -> list[Item]:
    if found.shape.same:
        return ["The same: the axes lie as before, the joints are solved in the same order."]
    rows = [(f"- {line}" for line in found.shape.gone), (f"+ {line}" for line in found.shape.come)]
    return ["Changed: the C has other formulas.", Code(tuple(line for lines in rows for line in lines), "diff")]


def _interface(found: Comparison) -> list[Item]:
    changed = [facet for facet in found.facets if not facet.same]
    items: list[Item] = []
    if changed:
        rows = tuple((facet.what, facet.old, facet.new, facet.means) for facet in changed)
        items.append(Grid(("what", "old", "new", "what it means"), rows))
    same = [facet.what for facet in found.facets if facet.same]
    items.append(f"The same: {', '.join(same)}." if same else "Nothing is the same.")
    return [*items, f"Branch numbers: {found.numbers.means}."]


_NOT_COMPARED = "Not compared: the joints of the two arms are not the same ones."


def _tool(arm: Arm, tool: ToolMotion | None) -> list[Item]:
    if tool is None:
        return [_NOT_COMPARED]
    rows = (
        _tool_row("moves", length_text, arm, (tool.worst, tool.mean), tool.worst_at),
        _tool_row("turns", angle_text, arm, (tool.worst_turn, tool.mean_turn), tool.turned_at),
    )
    head = ("", "worst", "mean", f"worst at ({_names(arm)})")
    return [Grid(head, rows, right=(1, 2)), f"At {tool.samples} random joint values within the limits of both."]


def _tool_row(
    name: str, text: Callable[[Arm, float], str], arm: Arm, values: tuple[float, float], q: Array
) -> tuple[str, ...]:
    """The place of the worst is nowhere when nothing moves."""
    return (name, *(text(arm, value) for value in values), _values(arm, q) if values[0] > 0.0 else "-")


def _names(arm: Arm) -> str:
    return ", ".join(row.name for row in arm.joints)


def _values(arm: Arm, q: Array) -> str:
    """Joint values in the file's units, ready to paste: into --at of draw, or as a joint row of a poses file."""
    return ",".join(_short(joint_number(arm, index, float(value))) for index, value in enumerate(q))


def _short(value: float) -> str:
    return f"{value + 0.0:.6g}"  # no minus before a zero


def _moves(arm: Arm, moves: JointMoves | None) -> list[Item]:
    if moves is None:
        return [_NOT_COMPARED]
    how = "on the same branch number" if moves.by_branch else "the solution nearest to the old joint values"
    said = f"Of {moves.poses} poses that the old arm reaches, {moves.solved} are reached again: {how}."
    rows = tuple(
        (arm.joints[m.joint].name, joint_text(arm, m.joint, m.worst), joint_text(arm, m.joint, m.mean))
        for m in moves.joints
    )
    return [said, Grid(("joint", "worst change", "mean change"), rows, right=(1, 2))] if rows else [said]


def _reach(found: Comparison) -> list[Item]:
    old, new = found.old.arm, found.new.arm
    lost, gained = found.lost, found.gained
    items: list[Item] = []
    if old.task is not new.task:
        items.append(f"Each arm takes a pose as its own task reads it: {old.task.matches}; now {new.task.matches}.")
    if found.old.derivation is None or found.new.derivation is None:
        items.append("Fewer poses than asked for: a numeric inverse takes its time.")
    items.append(f"Lost: {_of(lost)} random poses of the old arm.")
    items += _examples(old, lost.examples, "Joint values of the old arm, why the new one fails, the poses:")
    if lost.off_branch:
        items.append(
            f"{lost.off_branch} more are reached, but not within the limits on the branch of the same number: a "
            "program that asks for a stored branch fails there."
        )
    items.append(f"Gained: {_of(gained)} random poses of the new arm.")
    return items + _examples(new, gained.examples, "Joint values of the new arm, why the old one failed, the poses:")


def _of(exchange: Exchange) -> str:
    if exchange.missing == 0:
        return f"none of {exchange.poses}"
    return f"{exchange.missing} of {exchange.poses} ({_percent(exchange)})"


def _examples(arm: Arm, examples: Sequence[Example], said: str) -> list[Item]:
    """Rows that can be pasted into a poses file."""
    if not examples:
        return []
    lines = [f"# {_names(arm)}: {arm.angle_unit}, {arm.length_unit}"]
    examples = examples[:_EXAMPLES]
    lines += [f"{_values(arm, example.q)}  # {example.why}" for example in examples]
    lines.append(f"# as poses: rotation row by row, then the position in {arm.length_unit}")
    lines += [_pose_row(arm, example.pose) for example in examples]
    return [said, Code(tuple(lines), "text")]


def _pose_row(arm: Arm, pose: Array) -> str:
    entries = [*(float(x) for x in pose[:9]), *(length_number(arm, float(x)) for x in pose[9:])]
    return ",".join(_short(entry) for entry in entries)


def _verdicts(found: Comparison) -> list[Item]:
    """Those whose lot changes."""
    if found.verdicts is None:
        return []
    told = [verdict for verdict in found.verdicts if verdict.lost or verdict.gained or verdict.off_branch]
    rows = tuple(_verdict_row(verdict) for verdict in told[:_MOST_ROWS])
    items: list[Item] = [_verdict_sentence(found.verdicts)]
    if rows:
        items.append(Grid(("line", "label", "old", "new"), rows, right=(0,)))
    return [*items, f"and {len(told) - len(rows)} more"] if len(told) > len(rows) else items


def _verdict_sentence(verdicts: Sequence[Verdict]) -> str:
    counts = [
        (sum(verdict.lost for verdict in verdicts), "lost"),
        (sum(verdict.off_branch for verdict in verdicts), "reached, but not on the branch of their joint values"),
        (sum(verdict.gained for verdict in verdicts), "gained"),
        (sum(verdict.old != REACHED and not verdict.gained for verdict in verdicts), "reached by neither arm"),
    ]
    told = [f"{count} {what}" for count, what in counts if count] or ["all as before"]
    return f"Of {_counted(len(verdicts), 'pose')}: {', '.join(told)}."


def _verdict_row(verdict: Verdict) -> tuple[str, ...]:
    new = "reached on another branch only" if verdict.off_branch else verdict.new
    return (str(verdict.pose.line), verdict.pose.label or "-", verdict.old, new)


def _costs(costs: Sequence[Cost]) -> list[Item]:
    rows = tuple((cost.function, *_cost_cells(cost.old, cost.new)) for cost in costs)
    items: list[Item] = [Grid(HEAD, rows, right=tuple(range(1, len(HEAD))))]
    if any(cost.old is None or cost.new is None for cost in costs):
        items.append("?: a numeric inverse takes as many steps as it needs; its header tells the most.")
    return items


def _cost_cells(old: OperationCount | None, new: OperationCount | None) -> list[str]:
    """A number where nothing changes, else old -> new; a numeric inverse has no fixed count."""
    before = [str(count) for count in astuple(old)] if old else ["?"] * (len(HEAD) - 1)
    after = [str(count) for count in astuple(new)] if new else ["?"] * (len(HEAD) - 1)
    return [one if one == other else f"{one} -> {other}" for one, other in zip(before, after, strict=True)]


def _accuracy(found: Comparison) -> list[Item]:
    arm = found.old.arm
    before, after = found.accuracy
    forward = [text for one in (before, after) for text in _errors(arm, one.forward, one.forward_turn)]
    inverse = [text for one in (before, after) for text in _errors(arm, one.inverse, one.inverse_turn)]
    rows = (("forward kinematics", *forward), ("inverse, pose reached", *inverse))
    head = ("worst error", "old: point", "turn", "new: point", "turn")
    return [Grid(head, rows, right=(1, 2, 3, 4))]


def _errors(arm: Arm, length: float, angle: float) -> tuple[str, str]:
    return f"{length_number(arm, length):.2g} {arm.length_unit}", f"{angle_number(arm, angle):.2g} {arm.angle_unit}"


def _code(lines: tuple[str, ...]) -> list[Item]:
    if not lines:
        return ["None but comments."]
    more = len(lines) - _MOST_CODE
    shown = lines if more <= 0 else (*lines[:_MOST_CODE], f"... and {more} more lines")
    return ["Without comments and empty lines.", Code(shown, "diff")]
