"""Which entries of a pose an inverse reads, and what makes them good input."""

from __future__ import annotations

import re
from dataclasses import dataclass

from codegen.emit.expression import Constants, Scope
from codegen.inverse.plan import Step
from codegen.inverse.tasks import Derivation, plane_block, step_nodes
from codegen.model import Task
from codegen.options import Options
from codegen.program import Node, Op, reachable

_KINDS = {
    Task.POSE: "rotation",
    Task.POINT_AXIS: "axis",
    Task.POINT_PITCH: "axis",
    Task.POINT_YAW: "heading",
    Task.PLANE_POSE: "plane",
}


@dataclass(frozen=True, slots=True)
class PoseCheck:
    """kind of check, the entries that must be finite, and lines that read the turn in the plane of motion."""

    kind: str
    reads: tuple[str, ...]
    lines: tuple[str, ...]


def pose_check(derivation: Derivation, options: Options, constants: Constants) -> PoseCheck:
    kind = _KINDS.get(derivation.goal.arm.task, "none")
    roots = [node for step in derivation.plan.steps for node in _read_by(step)]
    block = plane_block(derivation.goal) if kind == "plane" else None
    if block is not None:
        roots += [entry for row in block for entry in row]
    entries = {node for node in reachable(roots) if node.op is Op.INPUT and re.fullmatch(r"r\d\d|p\d", node.name)}
    if kind == "axis":
        entries |= {row[2] for row in derivation.goal.rotation}
    names = tuple(_entry(node) for node in sorted(entries, key=lambda node: node.name))
    return PoseCheck(kind, names, _plane_lines(derivation, options, constants, block))


def _read_by(step: Step) -> list[Node]:
    return step_nodes(step)


def _entry(node: Node) -> str:
    return f"p[{node.name[1]}]" if node.name[0] == "p" else f"r[{node.name[1]}][{node.name[2]}]"


def _plane_lines(
    derivation: Derivation, options: Options, constants: Constants, block: tuple[tuple[Node, Node], ...] | None
) -> tuple[str, ...]:
    if block is None:
        return ()
    b = derivation.goal.solver.builder
    (a, c), (d, e) = block
    values = {
        "turn_c": b.add(a, e),
        "turn_s": b.sub(d, c),
        "mirror_c": b.sub(a, e),
        "mirror_s": b.add(d, c),
    }
    scope = Scope(b, constants, options, taken={"pose", "clean"})
    for i, row in enumerate(derivation.goal.rotation):
        for j, entry in enumerate(row):
            scope.names[entry] = f"pose->r[{i}][{j}]"
    scope.plan_uses(list(values.values()))
    for index, pair in sorted(derivation.goal.held_pairs.items()):
        if pair.cosine in scope.uses or pair.sine in scope.uses:
            joint, p = derivation.goal.chain.joints[index], options.prefix
            name = derivation.goal.solver.labels[index]
            offset = "" if joint.offset.is_exactly(0) else f" + {constants.text(joint.offset)}"
            scope.put(f"const {p}_pair {name} = {p}_turn(work->seed[{index}]{offset});  /* held: from the seed */")
            scope.names[pair.cosine], scope.names[pair.sine] = f"{name}.c", f"{name}.s"
            scope.taken.add(name)
    for name, node in values.items():
        scope.put(f"const {options.prefix}_real {name} = {scope.value(node)};")
    return tuple(scope.lines)
