"""The branch that joint values lie on: the same plan, with every choice read off instead of made."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.emit.expression import Constants, Scope
from codegen.emit.numbers import literal
from codegen.inverse.plan import BalanceStep, QuarticStep, SlideQuarticStep, SlideRootsStep, Step
from codegen.inverse.tasks import Derivation
from codegen.names import joint_identifiers
from codegen.options import Options
from codegen.program import Node, substituted

_Choice = BalanceStep | SlideRootsStep | QuarticStep | SlideQuarticStep


@dataclass
class BranchText:
    derivation: Derivation
    options: Options
    constants: Constants

    def lines(self) -> list[str]:
        """The body of the function, from joint values to a branch number."""
        goal = self.derivation.goal
        solver = goal.solver
        choices = [step for step in self.derivation.plan.steps if step.roots > 1]
        values = self.derivation.known_values()
        roots = [root for step in choices for root in _roots(step)]
        nodes = iter(substituted(goal.solver.builder, roots, _closed(solver.builder, values)))
        per_choice = [(step, [next(nodes) for _ in _roots(step)]) for step in choices]
        scope = Scope(solver.builder, self.constants, self.options)
        scope.taken |= {"branch", "q", *joint_identifiers(goal.arm)}
        scope.plan_uses([node for _, own in per_choice for node in own])
        self._declare_joints(scope)
        scope.put("unsigned branch = 0u;")
        shift = sum({2: 1, 4: 2}[step.roots] for step in choices)
        for step, own in per_choice:
            shift -= {2: 1, 4: 2}[step.roots]
            self._choice(scope, step, own, shift)
        return scope.lines

    def _declare_joints(self, scope: Scope) -> None:
        goal, p = self.derivation.goal, self.options.prefix
        pairs = {**goal.held_pairs, **{k: v for k, v in goal.solver.known_pairs.items() if k < len(goal.chain.joints)}}
        slides = {**goal.held_slides, **goal.solver.known_slides}
        for joint in goal.chain.joints:
            k, label = joint.index, goal.solver.labels[joint.index]
            offset = "" if joint.offset.is_exactly(0) else f" + {scope.constants.text(joint.offset)}"
            if joint.turns and (pairs[k].cosine in scope.uses or pairs[k].sine in scope.uses):
                scope.put(f"const {p}_pair {label} = {p}_turn(q[{k}]{offset});")
                scope.names[pairs[k].cosine], scope.names[pairs[k].sine] = f"{label}.c", f"{label}.s"
            elif not joint.turns and slides[k] in scope.uses:
                scope.put(f"const {p}_real {label} = q[{k}]{offset};")
                scope.names[slides[k]] = label

    def _choice(self, scope: Scope, step: Step, own: list[Node], shift: int) -> None:
        p = self.options.prefix
        assert isinstance(step, _Choice)
        scope.put(f"/* {' or '.join(step.meaning.split('|'))} */")
        if isinstance(step, BalanceStep | SlideRootsStep):
            side = scope.value(own[0])
            scope.put(f"branch |= ({side} < {literal(0, self.options.real)}) ? {1 << shift}u : 0u;")
            return
        name = step.angle
        kind = "turn" if isinstance(step, QuarticStep) else "slide"
        texts = [scope.value(node) for node in own]
        known = f"{{{texts[5]}, {texts[6]}}}" if kind == "turn" else texts[5]
        scope.put(f"const {p}_quartic {name}_equation = {{{{{', '.join(texts[:5])}}}}};")
        scope.put(f"const {p}_{'pair' if kind == 'turn' else 'real'} {name}_known = {known};")
        if kind == "slide":
            scope.put(f"branch |= {p}_slide_number(&{name}_equation, {name}_known) << {shift}u;")
            return
        zero = literal(0, self.options.real)
        if len(texts) == 7:  # numbered by the slope
            scope.put(f"branch |= {p}_turn_number(&{name}_equation, {name}_known, 2u) << {shift}u;")
            return
        scope.put(f"const unsigned {name}_flipped = ({texts[8]} > {zero}) ? 0u : 1u;  /* rising roots have the other side */")
        scope.put(f"const unsigned {name}_kind = (({texts[7]} < {zero}) ? 1u : 0u) ^ {name}_flipped;")
        found = f"{p}_turn_number(&{name}_equation, {name}_known, {name}_kind)"
        scope.put(f"branch |= ({found} ^ {name}_flipped) << {shift}u;")


def _roots(step: Step) -> list[Node]:
    if isinstance(step, BalanceStep | SlideRootsStep):
        return [step.side]
    if isinstance(step, QuarticStep):
        own = [*step.coefficients, step.known.cosine, step.known.sine]
        return own if step.det is None or step.side is None else [*own, step.side, step.det]
    assert isinstance(step, SlideQuarticStep)
    return [*step.coefficients, step.known]


def _closed(builder: object, values: dict[Node, Node]) -> dict[Node, Node]:
    """The mapping with its own right sides already in terms of known joints only."""
    from codegen.program import Builder

    assert isinstance(builder, Builder)
    keys = list(values)
    return dict(zip(keys, substituted(builder, [values[key] for key in keys], _poses(values)), strict=True))


def _poses(values: dict[Node, Node]) -> dict[Node, Node]:
    """Entries of the pose; the known turn of a virtual joint is made from them."""
    return {key: value for key, value in values.items() if key.name[:1] in "rp" and len(key.name) in (2, 3)}


