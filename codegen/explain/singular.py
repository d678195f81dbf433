"""Where a step leaves its joint free, and where two of its solutions become one, in words."""

from __future__ import annotations

from codegen.inverse.plan import (
    BalanceStep,
    DirectionStep,
    Least,
    QuarticStep,
    SlideQuarticStep,
    SlideRootsStep,
    SlideStep,
    Step,
)
from codegen.model import Task

_ALONG = "the direction that it has to turn is parallel to its axis"
_ON_AXIS = "the point that it has to move lies on its axis"
_DIRECTION = {
    Least.ANGLE: "the pose shows no direction across its axis",
    Least.ANGLE_SQUARED: _ALONG,
    Least.LENGTH: _ON_AXIS,
    Least.LENGTH_SQUARED: _ON_AXIS,
    Least.AREA: f"{_ON_AXIS}, or the equation has lost this joint",
}
_BALANCE = {**_DIRECTION, Least.ANGLE: _ALONG}
_GROUP = {
    Task.POINT_PITCH: "the tool's z axis is square to the arm's plane and has no angle in it",
    Task.POINT_YAW: "the tool's x axis is vertical and has no heading",
    Task.PLANE_POSE: "the wanted rotation turns the plane of motion over",
}
Freeing = DirectionStep | BalanceStep | SlideStep


def free_text(step: Freeing, task: Task) -> list[str]:
    """A paragraph; nothing for a step that always decides its joint."""
    condition = free_condition(step, task)
    return [f"Singular where {condition}. {_consequence(step)}", ""] if condition else []


def free_condition(step: Freeing, task: Task) -> str:
    """When the joint is free, as formula and in words; empty where it never is."""
    if isinstance(step, SlideStep):
        if step.denominator.is_constant:
            return ""
        return f"`{step.value.name}_below` vanishes: {step.angle} slides square to what the equation measures"
    if step.least is Least.NOTHING or (isinstance(step, BalanceStep) and step.size is None):
        return ""
    name = step.pair.cosine.name.removesuffix(".c")
    if isinstance(step, BalanceStep):
        return f"`{name}_A` and `{name}_B` both vanish: {_BALANCE[step.least]}"
    words = _GROUP.get(task, _DIRECTION[step.least]) if _is_group(step) else _DIRECTION[step.least]
    return f"`{name}_x` and `{name}_y` both vanish: {words}"


def _is_group(step: DirectionStep) -> bool:
    """The angle of a whole group, which is read off the pose."""
    return step.joint is None and step.least is Least.ANGLE


def _consequence(step: Freeing) -> str:
    if isinstance(step, DirectionStep) and step.joint is None:
        return "Every angle then serves: the seed's is taken, and the status is SINGULAR."
    return (
        f"{step.angle} then keeps its seed: the status is SINGULAR, or OUT_OF_REACH where the other joints cannot make up "
        "for it."
    )


def merging_text(step: BalanceStep | SlideRootsStep) -> list[str]:
    """A paragraph on where the two roots are one; nothing where that is where the joint is free."""
    place = meeting_place(step)
    if not place:
        return []
    return [f"The two branches meet where {place}. Where it is negative neither of them reaches the pose.", ""]


def meeting_place(step: Step) -> str:
    """Where roots of a step become one; empty for a step with one root."""
    match step:
        case BalanceStep():
            if step.target.is_exactly(0):
                return ""
            return f"`{step.pair.cosine.name.removesuffix('.c')}_square` is zero{_posture(step)}"
        case SlideRootsStep():
            return f"`{step.value.name}_square` is zero: {step.angle} has one place only"
        case QuarticStep() | SlideQuarticStep():
            return f"two roots of the equation of {step.angle} are one"
        case _:
            return ""


def _posture(step: BalanceStep) -> str:
    if step.meaning.startswith("sin("):
        return f": `{step.angle}.s` is zero, {step.angle} is straight or folded back"
    if step.meaning.startswith("cos("):
        return f": `{step.angle}.c` is zero"
    return ", at the edge of the reach or in a fold"
