"""The closed form of an inverse: the order of its steps, each step's formulas, what a branch number means."""

from __future__ import annotations

from codegen.explain.formula import Sheet
from codegen.explain.markdown import table
from codegen.explain.singular import free_condition, meeting_place
from codegen.explain.steps import Digits, StepText
from codegen.inverse.plan import (
    BalanceStep,
    DirectionStep,
    QuarticStep,
    RefineStep,
    SlideQuarticStep,
    SlideRootsStep,
    SlideStep,
    Step,
)
from codegen.inverse.tasks import Derivation, step_nodes
from codegen.model import Task
from codegen.names import joint_identifiers
from codegen.program import Node

_BITS = {1: 0, 2: 1, 4: 2}


def digits_of(steps: tuple[Step, ...]) -> list[Digits]:
    """Per step the positions of its bits in a branch number; the first choice has the highest."""
    shift = sum(_BITS[step.roots] for step in steps)
    found: list[Digits] = []
    for step in steps:
        shift -= _BITS[step.roots]
        found.append(tuple(range(shift, shift + _BITS[step.roots])))
    return found


def inverse_lines(derivation: Derivation) -> list[str]:
    steps = derivation.plan.steps
    digits = digits_of(steps)
    writer = StepText(derivation, _sheet(derivation))
    lines = [*_opening(derivation), "", *_order(steps, digits), ""]
    for number, (step, bits) in enumerate(zip(steps, digits, strict=True), start=1):
        lines += [f"### Step {number}: {_title(step)}", "", f"{_sentence(step)}", "", *writer.lines(step, bits)]
    return [*lines, *_branch_lines(derivation, digits), *_singular_lines(steps, derivation.goal.arm.task)]


def _sheet(derivation: Derivation) -> Sheet:
    goal = derivation.goal
    leaves: dict[Node, str] = {}
    for i in range(3):
        leaves[goal.position[i]] = f"p[{i}]"
        leaves.update({goal.rotation[i][j]: f"r[{i}][{j}]" for j in range(3)})
    for index, pair in goal.held_pairs.items():
        label = goal.solver.labels[index]
        leaves[pair.cosine], leaves[pair.sine] = f"{label}.c", f"{label}.s"
    leaves.update({slide: f"{goal.solver.labels[index]}_slide" for index, slide in goal.held_slides.items()})
    sheet = Sheet(goal.solver.builder, leaves, {"q", "p", "r", *joint_identifiers(goal.arm)})
    sheet.plan_uses([node for step in derivation.plan.steps for node in step_nodes(step)])
    return sheet


def _opening(derivation: Derivation) -> list[str]:
    plan, held = derivation.plan, derivation.goal.arm.held
    count = f"{plan.branches} branches" if plan.branches > 1 else "one branch"
    lines = [f"Closed form, {count}."]
    if plan.structure:
        lines[0] += f" It rests on this: {'; '.join(plan.structure)}."
    if held:
        lines += ["", f"Known from the seed: {', '.join(held)}."]
    return lines


def _order(steps: tuple[Step, ...], digits: list[Digits]) -> list[str]:
    rows = [
        (str(number), _title(step), str(step.roots), ", ".join(map(str, reversed(bits))) or "none", step.note)
        for number, (step, bits) in enumerate(zip(steps, digits, strict=True), start=1)
    ]
    return table(("step", "finds", "roots", "bits", "from"), rows, right=(0, 2))


def _title(step: Step) -> str:
    if isinstance(step, RefineStep):
        return f"{step.variables[0].name} and {step.variables[1].name} polished"
    return step.angle


def _sentence(step: Step) -> str:
    return f"{step.note[0].upper()}{step.note[1:]}."


# -- branch numbers ----------------------------------------------------------------------------------------------------
def _branch_lines(derivation: Derivation, digits: list[Digits]) -> list[str]:
    lines = ["### What a branch number means", ""]
    if derivation.plan.branches == 1:
        return [*lines, "There is one branch: a pose that can be reached has one solution.", ""]
    rows = [row for step, bits in zip(derivation.plan.steps, digits, strict=True) for row in _bit_rows(step, bits)]
    steady = (
        "Two-root bits name the same posture all over the workspace; the roots of a four-root step are numbered as "
        "steadily as their equation allows."
        if any(step.roots == 4 for step in derivation.plan.steps)
        else "A number names the same posture all over the workspace."
    )
    rows.sort(key=lambda row: -int(row[0]))
    return [*lines, steady, "", *table(("bit", "joint", "0", "1", "decided by"), rows, right=(0,)), ""]


def _bit_rows(step: Step, bits: Digits) -> list[tuple[str, ...]]:
    match step:
        case BalanceStep() | SlideRootsStep():
            return [(str(bits[0]), step.angle, *step.meaning.split("|"), _decided_by(step))]
        case QuarticStep() | SlideQuarticStep():
            first, second = str(bits[0]), str(bits[1])
            return [
                (first, step.angle, "equation rises", "equation falls", "slope at the root"),
                (second, step.angle, "first of these", "second of these", "rising order of the roots"),
            ]
        case _:
            return []


def _decided_by(step: BalanceStep | SlideRootsStep) -> str:
    if isinstance(step, SlideRootsStep):
        return f"1 where `{step.value.name} - {step.value.name}_middle` < 0"
    name = step.pair.cosine.name.removesuffix(".c")
    return f"1 where `{name}_A*{name}.s - {name}_B*{name}.c` < 0"


# -- singularities -----------------------------------------------------------------------------------------------------
def _singular_lines(steps: tuple[Step, ...], task: Task) -> list[str]:
    """All of them in one place: a reviewer's list."""
    free = [
        f"- {step.angle} is free where {condition}"
        for step in steps
        if isinstance(step, DirectionStep | BalanceStep | SlideStep) and (condition := free_condition(step, task))
    ]
    meet = [f"- two branches meet where {place}" for step in steps if (place := meeting_place(step))]
    found = [*free, *meet] or ["Nowhere: every step decides its joint at every pose."]
    return ["### Where it is singular", "", *found, ""]
