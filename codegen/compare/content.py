"""A comparison as plain values for JSON. Lengths, angles and joint values are in the old arm file's units."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from codegen.compare.comparison import Comparison
from codegen.compare.motion import Accuracy, JointMoves, ToolMotion
from codegen.compare.reach import Exchange, Verdict
from codegen.compare.sides import Array
from codegen.compare.table import angle_number, joint_number, length_number
from codegen.model import Arm


def content(found: Comparison) -> dict[str, Any]:
    arm = found.old.arm
    before, after = found.accuracy
    return {
        "old": _file(found, "old"),
        "new": _file(found, "new"),
        "units": {"length": arm.length_unit, "angle": arm.angle_unit},
        "table": [asdict(change) for change in found.table],
        "structure": {"same": found.shape.same, "gone": found.shape.gone, "come": found.shape.come},
        "interface": {
            "same": not found.interface_changes,
            "parts": [{**asdict(facet), "same": facet.same} for facet in found.facets],
        },
        "branch_numbers": {
            "numbering": found.numbers.numbering.value,
            "same_share": found.numbers.same,
            "translation": dict(found.numbers.translation),
            "means": found.numbers.means,
        },
        "tool_at_the_same_joints": _tool(arm, found.tool),
        "joints_for_the_same_poses": _moves(arm, found.moves),
        "lost": _exchange(arm, found.lost),
        "gained": _exchange(found.new.arm, found.gained),
        "poses": None if found.verdicts is None else [_verdict(verdict) for verdict in found.verdicts],
        "cost": [asdict(cost) for cost in found.costs],
        "accuracy": {"old": _accuracy(arm, before), "new": _accuracy(arm, after)},
        "code": list(found.code),
    }


def _file(found: Comparison, which: str) -> dict[str, str]:
    side = found.old if which == "old" else found.new
    return {"file": side.file.path, "digest": side.file.digest, "arm": side.arm.name}


def _joint_values(arm: Arm, q: Array) -> list[float]:
    return [joint_number(arm, index, float(value)) for index, value in enumerate(q)]


def _tool(arm: Arm, tool: ToolMotion | None) -> dict[str, Any] | None:
    if tool is None:
        return None
    return {
        "samples": tool.samples,
        "worst": length_number(arm, tool.worst),
        "mean": length_number(arm, tool.mean),
        "worst_at": _joint_values(arm, tool.worst_at),
        "worst_turn": angle_number(arm, tool.worst_turn),
        "mean_turn": angle_number(arm, tool.mean_turn),
        "worst_turn_at": _joint_values(arm, tool.turned_at),
    }


def _moves(arm: Arm, moves: JointMoves | None) -> dict[str, Any] | None:
    if moves is None:
        return None
    return {
        "poses": moves.poses,
        "solved": moves.solved,
        "by_branch": moves.by_branch,
        "joints": [
            {
                "name": arm.joints[move.joint].name,
                "worst": joint_number(arm, move.joint, move.worst),
                "mean": joint_number(arm, move.joint, move.mean),
            }
            for move in moves.joints
        ],
    }


def _exchange(arm: Arm, exchange: Exchange) -> dict[str, Any]:
    return {
        "poses": exchange.poses,
        "missing": exchange.missing,
        "share": exchange.share,
        "off_branch": exchange.off_branch,
        "examples": [
            {"joints": _joint_values(arm, example.q), "pose": _pose(arm, example.pose), "why": example.why}
            for example in exchange.examples
        ],
    }


def _pose(arm: Arm, pose: Array) -> list[float]:
    """Twelve numbers: the rotation row by row, then the position."""
    return [*(float(x) + 0.0 for x in pose[:9]), *(length_number(arm, float(x) + 0.0) for x in pose[9:])]


def _verdict(verdict: Verdict) -> dict[str, Any]:
    return {
        "line": verdict.pose.line,
        "label": verdict.pose.label,
        "old": verdict.old,
        "new": verdict.new,
        "lost": verdict.lost,
        "gained": verdict.gained,
        "off_branch": verdict.off_branch,
    }


def _accuracy(arm: Arm, worst: Accuracy) -> dict[str, float]:
    return {
        "forward": length_number(arm, worst.forward),
        "forward_turn": angle_number(arm, worst.forward_turn),
        "inverse": length_number(arm, worst.inverse),
        "inverse_turn": angle_number(arm, worst.inverse_turn),
    }
