"""One step of a plan as text: the equation, the values that it is made of, the root that is taken, the joint."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import assert_never

from codegen.emit.tolerances import NEARLY_ALONG, ROUGH, reach_of
from codegen.explain.formula import Line, Sheet
from codegen.explain.markdown import block
from codegen.explain.singular import free_text, merging_text
from codegen.geometry import Pair
from codegen.inverse.plan import (
    BalanceStep,
    DirectionStep,
    QuarticStep,
    RefineStep,
    SlideQuarticStep,
    SlideRootsStep,
    SlideStep,
    Step,
    Variable,
)
from codegen.inverse.tasks import Derivation
from codegen.model import Task
from codegen.options import RealType
from codegen.program import Node, substituted

Digits = tuple[int, ...]  # positions of a step's bits in the branch number, the lowest first


@dataclass
class StepText:
    """Writes steps in order onto one sheet."""

    derivation: Derivation
    sheet: Sheet

    def lines(self, step: Step, digits: Digits) -> list[str]:
        """Markdown of one step, without its heading."""
        match step:
            case DirectionStep():
                return self._direction(step)
            case BalanceStep():
                return self._balance(step, digits)
            case SlideStep():
                return self._slide(step)
            case SlideRootsStep():
                return self._slide_roots(step, digits)
            case QuarticStep():
                return self._quartic(step, digits)
            case SlideQuarticStep():
                return self._slide_quartic(step, digits)
            case RefineStep():
                return self._refine(step)
            case _:
                assert_never(step)

    @property
    def task(self) -> Task:
        return self.derivation.goal.arm.task

    # -- joints ------------------------------------------------------------------------------------------------------
    def _settle_turn(self, joint: int | None, name: str) -> None:
        """The angle that is returned."""
        if joint is not None:
            self.sheet.say(f"q[{joint}]", self._less_offset(joint, f"atan2({name}.s, {name}.c)"))

    def _settle_slide(self, joint: int | None, name: str) -> None:
        if joint is not None:
            self.sheet.say(f"q[{joint}]", self._less_offset(joint, name))

    def _less_offset(self, joint: int, text: str) -> str:
        offset = self.derivation.goal.chain.joints[joint].offset
        return text if offset.is_exactly(0) else f"{text} - {self.sheet.text(offset)}"

    def _unit(self, pair: Pair, x: Node, y: Node) -> None:
        """(c, s) along (x, y)."""
        name = _stem(pair)
        left, right = self.sheet.define(f"{name}_x", x), self.sheet.define(f"{name}_y", y)
        self.sheet.say(f"({name}.c, {name}.s)", f"({left}, {right})/sqrt({left}^2 + {right}^2)")

    # -- forms -------------------------------------------------------------------------------------------------------
    def _direction(self, step: DirectionStep) -> list[str]:
        name = _stem(step.pair)
        self._unit(step.pair, step.x, step.y)
        self._settle_turn(step.joint, name)
        lines = [
            f"Two equations linear in the cosine and the sine of {step.angle} give both, so its angle has one value.",
            "",
            *block(self.sheet.take()),
            *free_text(step, self.task),
        ]
        return [*lines, *self._absorbed(step)]

    def _absorbed(self, step: DirectionStep) -> list[str]:
        if step.absorbed is None:
            return []
        name = _stem(step.absorbed.pair)
        left = self.sheet.define(f"{name}_rest_x", step.absorbed.x)
        right = self.sheet.define(f"{name}_rest_y", step.absorbed.y)
        self.sheet.say(f"({name}.c, {name}.s)", f"({left}, {right})/sqrt({left}^2 + {right}^2)")
        text = f"There {name}, solved before, is taken again so that the pose stays exact:"
        return [text, "", *block(self.sheet.take())]

    def _balance(self, step: BalanceStep, digits: Digits) -> list[str]:
        name, sheet = _stem(step.pair), self.sheet
        a_part, b_part = self._parts(step)
        sheet.alias(f"{name}_A", a_part)
        sheet.alias(f"{name}_B", b_part)
        sheet.alias(f"{name}_target", step.target)
        unit = "1" if step.size is None else sheet.alias(f"{name}_size", step.size, f"{name}_A^2 + {name}_B^2")
        note = "" if step.target.is_exactly(0) else f"{unit} - {name}_target^2, so written that it keeps its digits"
        square = sheet.alias(f"{name}_square", step.square, note)
        sheet.say(f"{name}_root", f"+-sqrt({square})", _signs(digits))
        self._unit(step.pair, step.x, step.y)
        self._settle_turn(step.joint, name)
        scaled = ", where A^2 + B^2 = 1" if step.size is None else ""
        return [
            f"One equation in {step.angle} alone{scaled}:",
            "",
            "```text",
            f"{name}_A*{name}.c + {name}_B*{name}.s = {name}_target",
            "```",
            "",
            "It has two solutions:",
            "",
            *block(sheet.take()),
            f"`{name}_A*{name}.s - {name}_B*{name}.c` is the root again: its sign tells the two apart.",
            "",
            *merging_text(step),
            *free_text(step, self.task),
        ]

    def _parts(self, step: BalanceStep) -> tuple[Node, Node]:
        """A and B, read off side = A s - B c."""
        builder = self.sheet.builder
        zero, one = builder.integer(0), builder.integer(1)
        (a_part,) = substituted(builder, [step.side], {step.pair.sine: one, step.pair.cosine: zero})
        (minus_b,) = substituted(builder, [step.side], {step.pair.sine: zero, step.pair.cosine: one})
        return a_part, builder.neg(minus_b)

    def _slide(self, step: SlideStep) -> list[str]:
        name = step.value.name
        quotient = self._quotient(step)
        self.sheet.say(name, quotient)
        self._settle_slide(step.joint, name)
        said = f"One equation linear in the slide of {step.angle}."
        return [said, "", *block(self.sheet.take()), *free_text(step, self.task)]

    def _quotient(self, step: SlideStep) -> str:
        if step.denominator.is_constant:
            return self.sheet.value(self.sheet.builder.div(step.numerator, step.denominator))
        above = self.sheet.alias(f"{step.value.name}_above", step.numerator)
        below = self.sheet.alias(f"{step.value.name}_below", step.denominator)
        return f"{above}/{below}"

    def _slide_roots(self, step: SlideRootsStep, digits: Digits) -> list[str]:
        name, sheet = step.value.name, self.sheet
        middle = sheet.alias(f"{name}_middle", step.middle)
        square = sheet.alias(f"{name}_square", step.square)
        sheet.say(step.root.name, f"+-sqrt({square})", _signs(digits))
        sheet.say(name, f"{middle} + {step.root.name}")
        self._settle_slide(step.joint, name)
        return [
            f"The point keeps its distance from an axis: an equation of second degree in the slide of {step.angle}.",
            "",
            *block(sheet.take()),
            *merging_text(step),
        ]

    def _quartic(self, step: QuarticStep, digits: Digits) -> list[str]:
        name = step.angle
        shape = f"{name}_f0 + {name}_f1*c + {name}_f2*s + {name}_f3*c^2 + {name}_f4*c*s = 0"
        lines = self._four_roots(step, shape, f"in the cosine c and the sine s of {name}", digits)
        return [*lines, *self._nearly_equal(step)]

    def _nearly_equal(self, step: QuarticStep) -> list[str]:
        """What tells roots apart where the two equations of the elimination are nearly one."""
        if step.det is None or step.det.is_constant:
            return []
        name = step.angle
        self.sheet.alias(f"{name}_det", step.det)
        self.sheet.say("REACH", f"{float(reach_of(self.derivation.goal.arm)):.9g}", "m, all links end to end")
        along = {real: float(NEARLY_ALONG * real.rounding) for real in RealType}
        self.sheet.say(
            "NEARLY_ALONG",
            f"{along[RealType.FLOAT]:.3g}",
            f"in float; {along[RealType.DOUBLE]:.3g} in double: a squared sine below which two lines hardly cross",
        )
        rough = {real: math.sqrt(ROUGH * real.rounding) for real in RealType}
        self.sheet.say(
            "LEAST_ROUGH",
            f"{rough[RealType.FLOAT]:.3g}",
            f"in float; {rough[RealType.DOUBLE]:.3g} in double: part of a unit vector that a double root leaves unknown",
        )
        return [
            f"The equation rises through roots on the positive side where `{name}_det` is positive, and falls through them "
            f"where it is negative. Where it vanishes, roots come in equal pairs that differ in the other joint: below, "
            f"`{name}_side`, +1 on the positive side and -1 on the other, tells them apart.",
            "",
            *block(self.sheet.take()),
        ]

    def _slide_quartic(self, step: SlideQuarticStep, digits: Digits) -> list[str]:
        name = step.angle
        shape = f"{name}_f0 + {name}_f1*d + {name}_f2*d^2 + {name}_f3*d^3 + {name}_f4*d^4 = 0"
        return self._four_roots(step, shape, f"in the slide d of {name}", digits)

    def _four_roots(self, step: QuarticStep | SlideQuarticStep, shape: str, unknown: str, digits: Digits) -> list[str]:
        """The coefficients, and which root each choice is."""
        for k, node in enumerate(step.coefficients):
            self.sheet.alias(f"{step.angle}_f{k}", node)
        return [
            f"The other unknown joint is eliminated: an equation of up to four roots {unknown},",
            "",
            "```text",
            shape,
            "```",
            "",
            "Its roots are found between the places where its slope changes sign, in a bounded number of steps.",
            _numbering(step, digits),
            "",
            *block(self.sheet.take()),
            "Where two roots become one, two branches meet: at the edge of the reach or in a fold.",
            "",
        ]

    def _refine(self, step: RefineStep) -> list[str]:
        first, second = (variable.name for variable in step.variables)
        start = [Line(_known_name(v.during), _known_name(v.before)) for v in step.variables]
        self._residuals(step)
        formulas = self.sheet.take()
        for variable in step.variables:
            self._finish(variable)
        return [
            f"Squaring and expanding cost digits. So {first} and {second} are polished together on the two equations "
            f"`{first}_{second}_e1 = 0` and `{first}_{second}_e2 = 0` that the elimination started from: from",
            "",
            *block(start),
            f"{step.passes} of Newton's steps, each with the slopes of e1 and e2 by both joints",
            "",
            *block(formulas),
            *block(self.sheet.take()),
        ]

    def _residuals(self, step: RefineStep) -> None:
        both = "_".join(variable.name for variable in step.variables)
        for k, (residual, slopes) in enumerate(zip(step.residuals, step.slopes, strict=True), start=1):
            self.sheet.alias(f"{both}_e{k}", residual)
            for variable, slope in zip(step.variables, slopes, strict=True):
                self.sheet.alias(f"{both}_e{k}_by_{variable.name}", slope)

    def _finish(self, variable: Variable) -> None:
        name = _known_name(variable.after)
        self.sheet.say(name, _known_name(variable.during), "as the last step left it")
        if isinstance(variable.after, Pair):
            is_real = variable.joint < len(self.derivation.goal.chain.joints)
            self._settle_turn(variable.joint if is_real else None, name)
        else:
            self._settle_slide(variable.joint, name)


def _signs(digits: Digits) -> str:
    return f"bit {digits[0]} of the branch number: 0 takes +, 1 takes -"


def _stem(pair: Pair) -> str:
    return pair.cosine.name.removesuffix(".c")


def _known_name(value: Pair | Node) -> str:
    return _stem(value) if isinstance(value, Pair) else value.name


def _numbering(step: QuarticStep | SlideQuarticStep, digits: Digits) -> str:
    """Which of the roots a branch's two bits name."""
    if isinstance(step, QuarticStep) and step.side is not None:
        return (
            f"Bit {digits[0]} is the side of the Jacobian that a root lies on: the sign of the determinant of the slopes of "
            f"the two equations that {step.angle} came from, 0 where it is positive. It changes where the arm folds, and "
            f"nowhere else. Bit {digits[1]} counts the roots of one side in rising order, from an angle of -142.93 degrees."
        )
    return (
        f"Bit {digits[0]} is 0 where the left side rises through zero as {step.angle} grows, 1 where it falls; "
        f"bit {digits[1]} counts such roots in rising order."
    )
