"""Where each method comes from; a document lists those that it uses."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from codegen.inverse.plan import BalanceStep, DirectionStep, Plan, QuarticStep, RefineStep, SlideQuarticStep
from codegen.model import Task


@dataclass(frozen=True, slots=True)
class Source:
    """A work, what is taken from it, and which plans use it; None stands for an inverse without a plan."""

    what: str
    work: str
    used_by: Callable[[Plan | None, Task], bool]


def _has(*kinds: type) -> Callable[[Plan | None, Task], bool]:
    return lambda plan, _: plan is not None and any(isinstance(step, kinds) for step in plan.steps)


def _says(word: str) -> Callable[[Plan | None, Task], bool]:
    return lambda plan, _: plan is not None and any(word in line for line in plan.structure)


SOURCES = (
    Source(
        "The link table and its transforms",
        "Hartenberg and Denavit, A kinematic notation for lower-pair mechanisms based on matrices, J. Appl. Mech. 22 "
        "(1955); proximal frames: Craig, Introduction to Robotics",
        lambda plan, task: True,
    ),
    Source(
        "Vectors carried through the frames, and the geometric Jacobian",
        "Craig, Introduction to Robotics, sections on computational considerations and on Jacobians",
        lambda plan, task: True,
    ),
    Source(
        "The search for equations in one joint, from products of link transforms",
        "Paul, Robot Manipulators (1981), chapter 3",
        lambda plan, task: plan is not None,
    ),
    Source(
        "A pair (cos, sin) from two linear equations",
        "Paul, Robot Manipulators (1981), chapter 3; Craig, Introduction to Robotics, appendix C",
        _has(DirectionStep),
    ),
    Source(
        "A cos + B sin = C",
        "Paul, Robot Manipulators (1981), chapter 3; Craig, Introduction to Robotics, appendix C",
        _has(BalanceStep),
    ),
    Source(
        "Three axes that meet: their point is placed by the other joints, then they give the orientation",
        "Pieper, The Kinematics of Manipulators under Computer Control (1968)",
        _says("meet in one point"),
    ),
    Source(
        "Elimination to an equation of fourth degree in the half angle",
        "Pieper, The Kinematics of Manipulators under Computer Control (1968)",
        _has(QuarticStep, SlideQuarticStep),
    ),
    Source(
        "Roots polished on two equations",
        "Newton's method",
        _has(RefineStep),
    ),
    Source(
        "A rotation completed from its third column",
        "Duff et al., Building an Orthonormal Basis, Revisited, JCGT 6(1) (2017)",
        lambda plan, task: plan is not None and task is Task.POINT_AXIS,
    ),
    Source(
        "Whether a coefficient vanishes for every pose, decided at random points with 60 digits",
        "Schwartz (1980), Zippel (1979)",
        lambda plan, task: plan is not None,
    ),
    Source(
        "Damped Newton steps",
        "Levenberg (1944)",
        lambda plan, task: plan is None,
    ),
)


def source_lines(plan: Plan | None, task: Task) -> list[str]:
    return [f"- {source.what}: {source.work}." for source in SOURCES if source.used_by(plan, task)]
