"""The stages of an inverse, as lines of C.

Each step with more than one root opens a stage: a function that is run again only when its choice changes. What a stage
computes and a later one reads is carried in the work structure.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from codegen.emit.expression import Constants, Scope
from codegen.emit.numbers import literal
from codegen.emit.statements import Statements, step_roots
from codegen.geometry import Pair
from codegen.inverse.plan import BalanceStep, DirectionStep, Least, QuarticStep, SlideQuarticStep, Step
from codegen.inverse.tasks import Derivation
from codegen.names import joint_identifiers
from codegen.options import Options
from codegen.program import Node, Op, reachable


@dataclass(frozen=True, slots=True)
class StageText:
    """One stage function.

    name     of the function, without the prefix
    number   from 0; stage 0 prepares what no choice changes
    roots    1 for stage 0, else 2 or 4
    shift    how far the stage's digits stand from the right end of the branch number
    """

    name: str
    number: int
    roots: int
    shift: int
    notes: tuple[str, ...]
    meanings: tuple[str, ...]
    lines: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class WorkField:
    declaration: str
    note: str


@dataclass
class InverseText:
    """Prints all stages of one derivation."""

    derivation: Derivation
    options: Options
    constants: Constants
    carried: dict[Node, str] = field(default_factory=dict)
    extra_fields: list[WorkField] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.goal = self.derivation.goal
        self.builder = self.goal.solver.builder
        self.stages = self._split()
        self.leaves = self._leaves()
        self.unread = self._unread_pairs()
        self._find_carried()

    # -- the split into stages ---------------------------------------------------------------------------------------
    def _split(self) -> list[list[Step]]:
        stages: list[list[Step]] = [[]]
        for step in self.derivation.plan.steps:
            if step.roots > 1:
                stages.append([])
            stages[-1].append(step)
        return stages

    def _leaves(self) -> dict[Node, tuple[str, int]]:
        """Per leaf that a step makes known: how a later function reads it, and the stage that makes it."""
        found: dict[Node, tuple[str, int]] = {}
        for number, steps in enumerate(self.stages):
            for step in steps:
                for value in made_known(step):
                    if isinstance(value, Pair):
                        name = value.cosine.name.removesuffix(".c")
                        found[value.cosine] = (f"{name}.c", number)
                        found[value.sine] = (f"{name}.s", number)
                    else:
                        found[value] = (value.name, number)
        return found

    def _unread_pairs(self) -> frozenset[Pair]:
        """Pairs of which no later step needs the cosine and sine: their angle is all that is wanted."""
        steps = self.derivation.plan.steps
        read = {node for step in steps for node in reachable(step_roots(step))}
        return frozenset(
            step.pair
            for step in steps
            if isinstance(step, DirectionStep)
            and step.joint is not None
            and step.least is Least.NOTHING
            and not {step.pair.cosine, step.pair.sine} & read
        )

    def _find_carried(self) -> None:
        """Values that one stage makes and a later one reads."""
        taken: set[str] = set(joint_identifiers(self.goal.arm))
        for number, roots in enumerate(self._all_roots()):
            for root in roots:
                self._carry_from(root, number, taken)

    def _carry_from(self, node: Node, number: int, taken: set[str]) -> None:
        if node.op is Op.CONSTANT or node.op is Op.INPUT:
            return
        if node.stage < number and not node.is_negation:
            if node not in self.carried:
                wanted = self.builder.names.get(node) or f"{self.builder.topics[node]}_{len(self.carried) + 1}"
                while wanted in taken:
                    wanted += "_too"
                taken.add(wanted)
                self.carried[node] = wanted
                self._carry_from(node, node.stage, taken)
            return
        for arg in node.args:
            self._carry_from(arg, number, taken)

    def _all_roots(self) -> list[list[Node]]:
        per_stage = []
        for number, steps in enumerate(self.stages):
            roots = [node for step in steps for node in step_roots(step)]
            following = self.stages[number + 1 : number + 2]
            roots += [node for steps_ in following for step in steps_[:1] for node in _prepared_roots(step)]
            per_stage.append(roots)
        return per_stage

    # -- printing ----------------------------------------------------------------------------------------------------
    def stage_texts(self) -> list[StageText]:
        shifts = self._shifts()
        return [self._stage(number, steps, shifts[number]) for number, steps in enumerate(self.stages)]

    def _shifts(self) -> list[int]:
        digits = [0] + [{2: 1, 4: 2}[steps[0].roots] for steps in self.stages[1:]]
        return [sum(digits[number + 1 :]) for number in range(len(digits))]

    def scope(self, number: int, roots: list[Node], carried: bool = True) -> Scope:
        """A function's scope: what earlier stages carry is read from the work structure."""
        scope = Scope(self.builder, self.constants, self.options)
        scope.taken |= {"work", "second", "choice", *joint_identifiers(self.goal.arm)}
        for leaf, (name, made) in self.leaves.items():
            scope.names[leaf] = name if made == number else f"work->{name}"
        for i in range(3):
            scope.names[self.goal.position[i]] = f"p[{i}]"
            for j in range(3):
                scope.names[self.goal.rotation[i][j]] = f"r[{i}][{j}]"
        for index in self.goal.arm.held_indices:
            self._name_held(scope, index, number)
        for node, name in self.carried.items() if carried else ():
            if node.stage < number:
                scope.names[node] = f"work->{name}"
            else:
                self.builder.names.setdefault(node, name)
        scope.plan_uses(roots)
        return scope

    def _name_held(self, scope: Scope, index: int, number: int) -> None:
        label = self.goal.solver.labels[index]
        before = "" if number == 0 else "work->"
        if index in self.goal.held_pairs:
            pair = self.goal.held_pairs[index]
            scope.names[pair.cosine], scope.names[pair.sine] = f"{before}{label}.c", f"{before}{label}.s"
        else:
            scope.names[self.goal.held_slides[index]] = f"{before}{label}_slide"

    def _stage(self, number: int, steps: list[Step], shift: int) -> StageText:
        outgoing = [node for node in self.carried if node.stage == number]
        prepared = self.stages[number + 1][0] if number + 1 < len(self.stages) else None
        roots = [node for step in steps for node in step_roots(step)]
        if prepared is not None:
            roots += _prepared_roots(prepared)
        scope = self.scope(number, roots + outgoing)
        printer = Statements(scope, self.goal, self.options, self.unread, self.derivation.plan.retraced)
        if number == 0:
            printer.held_joints()
        for step in steps:
            printer.step(step)
        if prepared is not None:
            printer.prepare(prepared)
        for node in outgoing:
            scope.put(f"work->{self.carried[node]} = {scope.value(node)};")
        name = "start" if number == 0 else steps[0].angle  # type: ignore[union-attr]
        meanings = tuple(getattr(steps[0], "meaning", "").split("|")) if number else ()
        notes = tuple(step.note for step in steps)
        return StageText(name, number, steps[0].roots if number else 1, shift, notes, meanings, tuple(scope.lines))

    # -- what is carried ---------------------------------------------------------------------------------------------
    def fields(self) -> list[WorkField]:
        """The members of the work structure that this plan needs."""
        p = self.options.prefix
        rows = []
        for index in self.goal.arm.held_indices:
            label = self.goal.solver.labels[index]
            kind = f"{p}_pair {label}" if index in self.goal.held_pairs else f"{p}_real {label}_slide"
            rows.append(WorkField(f"{kind};", "held: from the seed"))
        seen = set()
        for name, _ in self.leaves.values():
            stem = name.removesuffix(".c").removesuffix(".s")
            if stem not in seen and self._is_kept(name):
                seen.add(stem)
                rows.append(WorkField(f"{p}_pair {stem};" if "." in name else f"{p}_real {stem};", ""))
        for steps in self.stages:
            if steps and isinstance(steps[0], QuarticStep):
                rows.append(WorkField(f"{p}_turns_found {steps[0].angle}_roots;", "all of them"))
            elif steps and isinstance(steps[0], SlideQuarticStep):
                rows.append(WorkField(f"{p}_slides_found {steps[0].angle}_roots;", "all of them"))
        for node, name in self.carried.items():
            rows.append(WorkField(f"{p}_real {name};", self.builder.notes.get(node, "")))
        return rows

    def _is_kept(self, name: str) -> bool:
        """Roots, rough values and values being polished stay inside their stage."""
        stem = name.removesuffix(".c").removesuffix(".s").removesuffix("_slide")
        return not stem.endswith(("_root", "_now", "_rough", "_side"))

    # -- the check of a solution that was clamped --------------------------------------------------------------------
    def reach_misses(self) -> list[tuple[str, Node]]:
        """(what it is measured in, difference between the pose reached and the pose wanted), as the task reads it."""
        return self.derivation.misses()

    def reach_lines(self) -> list[str]:
        misses = self.reach_misses()
        scope = self.scope(len(self.stages), [node for _, node in misses], carried=False)
        tests = []
        for pair in sorted(self.unread, key=lambda pair: pair.cosine.name):
            name = pair.cosine.name.removesuffix(".c")
            if {pair.cosine, pair.sine} & set(reachable([node for _, node in misses])):
                scope.put(f"{self.options.prefix}_pair {name};")
                zero = literal(0, self.options.real)
                scope.put(f"(void){self.options.prefix}_unit(work->{name}.c, work->{name}.s, {zero}, &{name});")
                scope.names[pair.cosine], scope.names[pair.sine] = f"{name}.c", f"{name}.s"
        for measure, limit in (("length", "LEAST_MISS"), ("angle", "LEAST_TURN")):
            own = [node for kind, node in misses if kind == measure]
            for k, node in enumerate(own):
                text = scope.names.get(node) or scope.value(node)
                scope.put(f"const {self.options.prefix}_real {measure}_{k + 1} = {text};")
            if own:
                squares = " + ".join(f"{measure}_{k + 1} * {measure}_{k + 1}" for k in range(len(own)))
                scope.put(f"const bool {measure}_good = ({squares}) <= {limit} * {limit};")
                tests.append(f"{measure}_good")
        scope.put(f"return {' && '.join(tests)};")
        return scope.lines


def made_known(step: Step) -> list[Pair | Node]:
    """The values that a step makes known, temporary ones included."""
    if hasattr(step, "pair"):
        made: list[Pair | Node] = [step.pair]
        if isinstance(step, BalanceStep):
            made.append(step.root)
        if isinstance(step, QuarticStep):
            made.append(step.bit)
        return made
    if hasattr(step, "variables"):
        return [value for variable in step.variables for value in (variable.during, variable.after)]
    made = [step.value]
    if hasattr(step, "root"):
        made.append(step.root)
    return made


def _prepared_roots(step: Step) -> list[Node]:
    """What must be known before a step with four roots is chosen from."""
    if isinstance(step, QuarticStep | SlideQuarticStep):
        return list(step.coefficients)
    return []
