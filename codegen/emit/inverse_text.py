"""The stages of an inverse, as lines of C.

Each step with more than one root opens a stage: a function that is run again only when its choice changes. What a stage
computes and a later one reads is carried in the work structure.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from codegen.emit.expression import Constants, Scope
from codegen.emit.mirror import Flip, mirror_of
from codegen.emit.numbers import literal
from codegen.emit.statements import Kept, Statements, step_roots
from codegen.geometry import Pair
from codegen.inverse.plan import BalanceStep, DirectionStep, Least, QuarticStep, RefineStep, SlideQuarticStep, Step
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
    turning  the turning joints that it solves
    """

    name: str
    number: int
    roots: int
    shift: int
    notes: tuple[str, ...]
    meanings: tuple[str, ...]
    lines: tuple[str, ...]
    turning: tuple[int, ...]


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

    def __post_init__(self) -> None:
        self.goal = self.derivation.goal
        self.builder = self.goal.solver.builder
        self.stages = self._split()
        self.leaves = self._leaves()
        self.unread = self._unread_pairs()
        self.held = {node: name for index in self.goal.arm.held_indices for node, name in self._held_leaves(index)}
        self.known: set[str] = set()
        self._find_carried()
        reached = set(reachable([node for _, node in self.reach_misses()]))
        leaves = {**{leaf: name for leaf, (name, _) in self.leaves.items()}, **self.held}
        self.pair_stems = {_stem(name) for name in leaves.values() if name != _stem(name)}
        self.kept = Kept(
            frozenset(self.known), frozenset(_stem(name) for leaf, name in leaves.items() if leaf in reached)
        )

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
        for node in list(self.carried):
            if self._is_quickly_made(node):
                del self.carried[node]
        self._carry_common_origins(taken)

    def _carry_common_origins(self, taken: set[str]) -> None:
        """Values that are all a constant times the same value, and a constant more: that one is carried instead."""
        origins: dict[Node, list[Node]] = {}
        for node in self.carried:
            origin = _origin(node)
            if origin is not None:
                origins.setdefault(origin, []).append(node)
        for origin, made in origins.items():
            if len(made) > 1 and origin not in self.carried and origin.op is not Op.INPUT:
                for node in made:
                    del self.carried[node]
                self._carry_from(origin, origin.stage + 1, taken)

    def _is_quickly_made(self, node: Node) -> bool:
        """One operation on values that are carried anyway: making it again costs less than keeping it."""
        rest = {arg for arg in node.args if not arg.is_constant}
        return len(node.args) == 2 and node.op in (Op.SUM, Op.PRODUCT) and rest <= set(self.carried)

    def _carry_from(self, node: Node, number: int, taken: set[str]) -> None:
        if node.op is Op.CONSTANT:
            return
        if node.op is Op.INPUT:
            name, made = self.leaves.get(node, (self.held.get(node, ""), 0))
            if name and made < number:
                self.known.add(_stem(name))
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
        scope.taken |= {"work", "known", "second", "choice", *joint_identifiers(self.goal.arm)}
        for leaf, (name, made) in self.leaves.items():
            scope.names[leaf] = name if made == number else f"known->{name}"
        for i in range(3):
            scope.names[self.goal.position[i]] = f"p[{i}]"
            for j in range(3):
                scope.names[self.goal.rotation[i][j]] = f"r[{i}][{j}]"
        for leaf, name in self.held.items():
            scope.names[leaf] = name if number == 0 else f"known->{name}"
        for node, name in self.carried.items() if carried else ():
            if node.stage < number:
                scope.names[node] = f"known->{name}"
            else:
                self.builder.names.setdefault(node, name)
        scope.plan_uses(roots)
        return scope

    def _held_leaves(self, index: int) -> list[tuple[Node, str]]:
        """What a joint that is held makes known, and how stage 0 reads it."""
        label = self.goal.solver.labels[index]
        if index in self.goal.held_pairs:
            pair = self.goal.held_pairs[index]
            return [(pair.cosine, f"{label}.c"), (pair.sine, f"{label}.s")]
        return [(self.goal.held_slides[index], f"{label}_slide")]

    def _stage(self, number: int, steps: list[Step], shift: int) -> StageText:
        outgoing = [node for node in self.carried if node.stage == number]
        prepared = self.stages[number + 1][0] if number + 1 < len(self.stages) else None
        roots = [node for step in steps for node in step_roots(step)]
        if prepared is not None:
            roots += _prepared_roots(prepared)
        scope = self.scope(number, roots + outgoing)
        retraced = self.derivation.plan.retraced
        printer = Statements(scope, self.goal, self.options, self.unread, self.kept, retraced)
        if number == 0:
            printer.held_joints()
        printer.steps(steps)
        if prepared is not None:
            printer.prepare(prepared)
        for node in outgoing:
            scope.put(f"known->{self.carried[node]} = {scope.value(node)};")
        name = "start" if number == 0 else steps[0].angle  # type: ignore[union-attr]
        meanings = tuple(getattr(steps[0], "meaning", "").split("|")) if number else ()
        notes = tuple(step.note for step in steps)
        roots_here = steps[0].roots if number else 1
        return StageText(name, number, roots_here, shift, notes, meanings, tuple(scope.lines), self._turning(steps))

    def _turning(self, steps: list[Step]) -> tuple[int, ...]:
        """The turning joints whose angles the steps settle."""
        joints: set[int | None] = {step.joint for step in steps if isinstance(step, DirectionStep | BalanceStep)}
        for step in steps:
            if isinstance(step, RefineStep):
                joints |= {variable.joint for variable in step.variables if isinstance(variable.after, Pair)}
        return tuple(sorted(joint for joint in joints if joint is not None and joint < len(self.goal.chain.joints)))

    def mirror(self) -> tuple[Flip, ...]:
        """What makes the second solution of the last stage from its first; nothing where that does not do."""
        return mirror_of(self.stages[-1]) or ()

    # -- what is carried ---------------------------------------------------------------------------------------------
    def known_fields(self) -> list[WorkField]:
        """The members of the structure of what later stages read."""
        p = self.options.prefix
        rows = [WorkField(self._declared(stem), note) for stem, note in self._stems() if stem in self.kept.known]
        rows += [
            WorkField(f"{p}_real {name};", self.builder.notes.get(node, "")) for node, name in self.carried.items()
        ]
        return rows

    def work_fields(self) -> list[WorkField]:
        """The members of the work structure that this plan needs."""
        p = self.options.prefix
        owned = {_stem(name) for joint in self._joint_pairs().values() for name in joint[:1]}
        rows = [
            WorkField(self._declared(stem), note)
            for stem, note in self._stems()
            if stem in self.kept.reached and stem not in owned
        ]
        for steps in self.stages:
            if steps and isinstance(steps[0], QuarticStep):
                rows.append(WorkField(f"{p}_turns_found {steps[0].angle}_roots;", "all of them"))
            elif steps and isinstance(steps[0], SlideQuarticStep):
                rows.append(WorkField(f"{p}_slides_found {steps[0].angle}_roots;", "all of them"))
        return rows

    def _stems(self) -> list[tuple[str, str]]:
        """Every value that a step makes known or the seed holds, without the parts of pairs; and a note."""
        names = [(name, "held: from the seed") for name in self.held.values()]
        names += [(name, "") for name, _ in self.leaves.values()]
        return list({_stem(name): note for name, note in reversed(names)}.items())[::-1]

    def _declared(self, stem: str) -> str:
        p = self.options.prefix
        return f"{p}_pair {stem};" if stem in self.pair_stems else f"{p}_real {stem};"

    def _joint_pairs(self) -> dict[int, tuple[str, Pair]]:
        """Per turning joint of the arm the pair that its angle is found from, and what it is called."""
        found: dict[int, Pair] = dict(self.goal.held_pairs)
        for step in self.derivation.plan.steps:
            if isinstance(step, DirectionStep | BalanceStep) and step.joint is not None:
                found[step.joint] = step.pair
            elif isinstance(step, RefineStep):
                found.update({v.joint: v.after for v in step.variables if isinstance(v.after, Pair)})
        names = {**{leaf: name for leaf, (name, _) in self.leaves.items()}, **self.held}
        return {k: (names[pair.cosine], pair) for k, pair in sorted(found.items()) if k < len(self.goal.chain.joints)}

    # -- the check of a solution that was clamped --------------------------------------------------------------------
    def reach_misses(self) -> list[tuple[str, Node]]:
        """(what it is measured in, difference between the pose reached and the pose wanted), as the task reads it."""
        return self.derivation.misses()

    def reach_lines(self) -> list[str]:
        misses = self.reach_misses()
        scope = self.scope(len(self.stages), [node for _, node in misses], carried=False)
        read = set(reachable([node for _, node in misses]))
        for leaf, name in {**{leaf: name for leaf, (name, _) in self.leaves.items()}, **self.held}.items():
            scope.names[leaf] = f"work->{name}"
        for joint, (name, pair) in self._joint_pairs().items():
            if {pair.cosine, pair.sine} & read:
                self._declare_reached(scope, joint, _stem(name), pair)
        tests = []
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

    def _declare_reached(self, scope: Scope, joint: int, name: str, pair: Pair) -> None:
        p = self.options.prefix
        if pair in self.unread:
            scope.put(f"{p}_pair {name};")
            ends = f"work->turn[{joint}].c, work->turn[{joint}].s, {literal(0, self.options.real)}"
            scope.put(f"(void){p}_unit({ends}, &{name});")
        else:
            scope.put(f"const {p}_pair {name} = work->turn[{joint}];")
        scope.names[pair.cosine], scope.names[pair.sine] = f"{name}.c", f"{name}.s"


def _origin(node: Node) -> Node | None:
    """x of a value that is constant * x, or constant * x + constant."""
    if node.op is Op.SUM:
        rest = [arg for arg in node.args if not arg.is_constant]
        return _origin(rest[0]) if len(rest) == 1 and rest[0].op is Op.PRODUCT else None
    if node.op is Op.PRODUCT and node.args[0].is_constant != node.args[1].is_constant:
        return node.args[1] if node.args[0].is_constant else node.args[0]
    return None


def _stem(name: str) -> str:
    """Of the part of a pair the pair; of anything else itself."""
    return name.removesuffix(".c").removesuffix(".s")


def made_known(step: Step) -> list[Pair | Node]:
    """The values that a step makes known, temporary ones included."""
    if hasattr(step, "pair"):
        made: list[Pair | Node] = [step.pair]
        if isinstance(step, DirectionStep | BalanceStep) and step.doubt is not None:
            made.append(step.doubt)
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
