"""Each kind of step as C statements."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from fractions import Fraction

from codegen.emit.expression import Scope
from codegen.emit.numbers import literal
from codegen.emit.tolerances import SLACK
from codegen.geometry import Pair
from codegen.inverse.goal import Goal
from codegen.inverse.known_length import KnownLength, known_length
from codegen.inverse.plan import (
    Absorption,
    BalanceStep,
    DirectionStep,
    Least,
    QuarticStep,
    RefineStep,
    SeedAngle,
    SlideQuarticStep,
    SlideRootsStep,
    SlideStep,
    Step,
    Variable,
)
from codegen.options import Options
from codegen.program import Node

SQUARED = {  # the same for squares
    Least.ANGLE: "LEAST_ANGLE * LEAST_ANGLE",
    Least.LENGTH: "LEAST_LENGTH * LEAST_LENGTH",
    Least.AREA: "LEAST_LENGTH * LEAST_LENGTH * REACH * REACH",
}
LINEAR = {Least.ANGLE_SQUARED: Least.ANGLE, Least.LENGTH_SQUARED: Least.LENGTH}  # of what is one of the factors
LEASTS = {
    Least.ANGLE: "LEAST_ANGLE",
    Least.ANGLE_SQUARED: "LEAST_ANGLE * LEAST_ANGLE",
    Least.LENGTH: "LEAST_LENGTH",
    Least.LENGTH_SQUARED: "LEAST_LENGTH * LEAST_LENGTH",
    Least.AREA: "LEAST_LENGTH * REACH",
}


def step_roots(step: Step) -> list[Node]:
    """The values that a step's statements read."""
    match step:
        case DirectionStep():
            read = step.rough or step.doubt is not None
            own = [step.turned, step.x, step.y] if read and step.turned is not None else [step.x, step.y]
            return own if step.absorbed is None else [*own, step.absorbed.x, step.absorbed.y]
        case BalanceStep():
            extra = [node for node in (step.size, step.flat) if node is not None]
            target = [] if step.size is None or step.target.is_exactly(0) else [step.target]
            return [*extra, *target, *step.doubts, step.square, step.x, step.y]
        case SlideStep():
            return [step.numerator, step.denominator]
        case SlideRootsStep():
            return [*step.doubts, step.flat, step.middle, step.square]
        case QuarticStep():
            return [] if step.det is None or step.det.is_constant else [step.det]
        case RefineStep():
            side = [] if step.side is None else [step.side]
            return [*side, *step.scales, *step.residuals, *step.slopes[0], *step.slopes[1]]
        case _:
            return []


@dataclass(frozen=True, slots=True)
class Kept:
    """Names of values that outlive their stage: read by a later stage, and read by the check of the pose reached."""

    known: frozenset[str] = frozenset()
    reached: frozenset[str] = frozenset()


@dataclass
class Statements:
    """Prints steps into a scope."""

    scope: Scope
    goal: Goal
    options: Options
    unread: frozenset[Pair] = frozenset()
    kept: Kept = field(default_factory=Kept)
    retraced: bool = False  # solutions that miss are brought nearer: what they are found from may be rough

    def __post_init__(self) -> None:
        self.p = self.options.prefix
        self.zero = literal(0, self.options.real)
        self.slack = "WIDE_SLACK" if self.retraced else "SLACK"

    def put(self, line: str) -> None:
        self.scope.put(line)

    def steps(self, steps: Sequence[Step]) -> None:
        """The steps of one stage."""
        for number, step in enumerate(steps):
            self.step(step, known_length(step, steps[:number]))

    def step(self, step: Step, length: KnownLength | None = None) -> None:
        for line in _comment_lines(step.note):
            self.put(line)
        match step:
            case DirectionStep():
                self._direction(step, length)
            case BalanceStep():
                self._balance(step)
            case SlideStep():
                self._slide(step)
            case SlideRootsStep():
                self._slide_roots(step)
            case QuarticStep() | SlideQuarticStep():
                self._quartic_choice(step)
            case RefineStep():
                self._refine(step)

    # -- held joints -------------------------------------------------------------------------------------------------
    def held_joints(self) -> None:
        for index in self.goal.arm.held_indices:
            label = self.goal.solver.labels[index]
            joint = self.goal.chain.joints[index]
            variable = self._with_offset(f"work->seed[{index}]", joint.offset)
            if joint.turns:
                self.put(f"const {self.p}_pair {label} = {self.p}_turn({variable});  /* held: from the seed */")
                self.put(f"work->turn[{index}] = {label};")
                self._keep_known(label)
            else:
                self.put(f"const {self.p}_real {label}_slide = {variable};  /* held: from the seed */")
                self.put(f"if (!{self.p}_within({label}_slide, FAR)) {{")
                self.put("    return false;")
                self.put("}")
                self._store(f"{label}_slide")
            self.put(f"{self.p}_keep(work, {index}u);")

    def _with_offset(self, text: str, offset: Node, sign: str = "+") -> str:
        if offset.is_exactly(0):
            return text
        return f"{text} {sign} {self.scope.constants.text(offset)}"

    # -- forms -------------------------------------------------------------------------------------------------------
    def _name(self, pair: Pair) -> str:
        return pair.cosine.name.removesuffix(".c")

    def _seed_pair(self, seed: SeedAngle, settled: int | None = None) -> str:
        """The pair that a free angle takes from the seed; the joint `settled` has its value in q by now."""
        if not seed:
            return f"{self.p}_turn({self.zero})"
        terms = []
        for index, sign in seed:
            text = f"work->{'q' if index == settled else 'seed'}[{index}]"
            text = self._with_offset(text, self.goal.chain.joints[index].offset)
            text = f"({text})" if " " in text and sign < 0 else text
            terms.append(("-" if sign < 0 else "+", text))
        first = ("-" if terms[0][0] == "-" else "") + terms[0][1]
        return f"{self.p}_turn({' '.join([first, *(f'{s} {t}' for s, t in terms[1:])])})"

    def _direction(self, step: DirectionStep, length: KnownLength | None) -> None:
        if length is not None:
            self._direction_of_known_length(step, length)
            return
        x, y, name = self.scope.value(step.x), self.scope.value(step.y), self._name(step.pair)
        least = LEASTS.get(step.least)
        if least is None and step.pair in self.unread:
            self.put(f"const {self.p}_pair {name} = {{{x}, {y}}};  /* not of length 1: only its angle is read */")
            self._store(name, step.joint)
            return
        self.put(f"{self.p}_pair {name};")
        if step.rough:
            self._direction_or_seed(step, name, (x, y))
        elif least is None:
            self.put(f"(void){self.p}_unit({x}, {y}, {self.zero}, &{name});")
        elif step.joint is None:
            self.put(f"if (!{self.p}_unit({x}, {y}, {least}, &{name})) {{  /* the pose leaves it free: by the seed */")
            self.put(f"    {name} = {self._seed_pair(step.seed)};")
            self.put("    work->marks |= MARK_FREE | MARK_EDGE;")
            if step.absorbed is not None:
                self._absorb(step.absorbed)
            self.put("}")
        else:
            self.put(f"if (!{self.p}_unit({x}, {y}, {least}, &{name})) {{")
            self.put("    /* the pose leaves it free: it keeps its seed */")
            self._keep_seed(step.joint, step.seed, name, step.absorbed)
        if not step.rough:
            self._doubt(step.doubt, step.turned, step.least)
        self._store(name, step.joint)
        if step.absorbed is not None:
            self._store(self._name(step.absorbed.pair), step.absorbed.joint)

    def _direction_of_known_length(self, step: DirectionStep, length: KnownLength) -> None:
        name, root = self._name(step.pair), f"{self._name(length.balance.pair)}_root"
        sides = [self.scope.factor(side) for side in (length.x, length.y)]
        x, y = (f"{'-' if sign < 0 else ''}{side}" for sign, side in zip(length.signs, sides, strict=True))
        self.put(f"{self.p}_pair {name};")
        self.put(f"if ({self.p}_exceeds({self.p}_abs({root}), {LEASTS[Least.ANGLE]})) {{  /* the length, with its sign */")
        self.put(f"    const {self.p}_real scale = {literal(1, self.options.real)} / {root};")
        self.put(f"    {name}.c = {x} * scale;")
        self.put(f"    {name}.s = {y} * scale;")
        self.put("} else {  /* the pose leaves it free: it keeps its seed */")
        self._keep_seed(step.joint, step.seed, name, step.absorbed)
        self._store(name, step.joint)
        if step.absorbed is not None:
            self._store(self._name(step.absorbed.pair), step.absorbed.joint)

    def _direction_or_seed(self, step: DirectionStep, name: str, target: tuple[str, str]) -> None:
        """What an approximate root may make up out of rounding is not read."""
        assert step.turned is not None
        turned, length = self.scope.value(step.turned), step.least is Least.LENGTH
        if step.doubt is not None:
            self.put(f"{self.p}_real {step.doubt.name};")
        self.put(f"if ({turned} > LEAST_ROUGH * LEAST_ROUGH{' * REACH * REACH' if length else ''}) {{")
        self.put(f"    (void){self.p}_unit({target[0]}, {target[1]}, {self.zero}, &{name});")
        if step.doubt is not None:
            self.put(f"    {step.doubt.name} = {self.p}_doubt({turned}, LEAST_ROUGH{' * REACH' if length else ''});")
        self.put("} else {  /* it hardly moves what it is to be found from: it starts at its seed */")
        self.put(f"    {name} = {self._seed_pair(step.seed)};")
        self.put("    work->marks |= MARK_EDGE | MARK_NEARLY_FREE;")
        if step.doubt is not None:
            self.put(f"    {step.doubt.name} = FAR;  /* any */")
        self.put("}")
        if step.doubt is not None:
            self._store(step.doubt.name)

    def _keep_seed(self, joint: int | None, seed: SeedAngle, name: str, absorbed: Absorption | None = None) -> None:
        self.put("    work->marks |= MARK_FREE | MARK_EDGE;")
        if joint is not None:
            self.put(f"    {self.p}_keep_free(work, {joint}u);")
        self.put(f"    {name} = {self._seed_pair(seed, joint)};")
        if absorbed is not None:
            self._absorb(absorbed)
        self.put("}")

    def _absorb(self, absorbed: Absorption) -> None:
        """Inside the branch of a joint that keeps its seed: the joint before it takes up the rest."""
        outer = dict(self.scope.names), self.scope.indent
        self.scope.indent += "    "
        other = self._name(absorbed.pair)
        x, y = self.scope.value(absorbed.x), self.scope.value(absorbed.y)
        self.put(f"(void){self.p}_unit({x}, {y}, {self.zero}, &{other});  /* takes up the rest */")
        self.scope.names, self.scope.indent = outer

    def _store(self, name: str, joint: int | None = None) -> None:
        """Keep a pair for its joint's angle, and any value that a later stage or the check of the pose reads."""
        if joint is not None:
            self.put(f"work->turn[{joint}] = {name};")
        elif name in self.kept.reached:
            self.put(f"work->{name} = {name};")
        self._keep_known(name)

    def _keep_known(self, name: str) -> None:
        if name in self.kept.known:
            self.put(f"known->{name} = {name};")

    def _balance(self, step: BalanceStep) -> None:
        name = self._name(step.pair)
        self.put(f"{self.p}_pair {name};")
        self.put(f"{self.p}_real {name}_root;")
        square, flat = self.scope.value(step.square), self._flat(step)
        for side in (step.x, step.y):
            self._ready_without(side, step.root)
        if step.size is None:
            self._root(name, square, self._slack(step.doubts), flat)
            self.put(f"{name}.c = {self.scope.text(step.x)};")
            self.put(f"{name}.s = {self.scope.text(step.y)};")
            self._bring_to_length(step, name)
        else:
            self._balance_or_free(step, name, (square, flat))
        self._doubt(step.doubt, step.size, step.least, f"{name}_hidden" if _may_be_hidden(step) else "")
        self._store(name, step.joint)

    def _bring_to_length(self, step: BalanceStep, name: str) -> None:
        """Of a pair whose length is 1 but for rounding, or but for what earlier joints leave in doubt."""
        if step.doubts:
            self.put(f"(void){self.p}_unit({name}.c, {name}.s, {self.zero}, &{name});")
        else:
            self.put(f"{self.p}_tidy(&{name});")

    def _doubt(self, doubt: Node | None, square: Node | None, least: Least, hidden: str = "") -> None:
        """How far off an angle may be that was found from a direction; its squared length is given."""
        if doubt is None or square is None:
            return
        text = f"{self.p}_doubt({self.scope.value(square)}, {LEASTS[LINEAR.get(least, least)]})"
        text = f"{hidden} ? FAR : {text}" if hidden else text
        self.put(f"const {self.p}_real {doubt.name} = {text};")
        self._store(doubt.name)

    def _slack(self, doubts: tuple[Node, ...]) -> str:
        """How negative a square may be in parts of what it can be."""
        if not doubts:
            return self.slack
        return f"({' + '.join([self.slack, *(self.scope.value(doubt) for doubt in doubts)])})"

    def _flat(self, step: BalanceStep | SlideRootsStep) -> str:
        if step.flat is None or step.flat.is_exactly(0):
            return self.zero
        return "FLAT" if step.flat.is_exactly(1) else f"FLAT * {self.scope.factor(step.flat)}"

    def _ready_without(self, node: Node, leaf: Node) -> None:
        """Name what the node needs apart from a leaf that is not known yet."""
        if node in self.scope.names:
            return
        for arg in node.args:
            if arg is not leaf and leaf not in _leaves_of(arg):
                self.scope.value(arg)
            else:
                self._ready_without(arg, leaf)

    def _balance_or_free(self, step: BalanceStep, name: str, values: tuple[str, str]) -> None:
        assert step.size is not None
        square, flat = values
        target = self.scope.value(step.target)
        size, least, least_square = self.scope.value(step.size), LEASTS[step.least], SQUARED[step.least]
        slack = f"{self._slack(step.doubts)} * {size}"
        if not step.target.is_exactly(0):
            slack += f" + {least} * {self.p}_abs({target})"
        if _may_be_hidden(step):
            self.put(f"const {self.p}_real {name}_slack = {slack};")
            slack = f"{name}_slack"
            self._seed_where_hidden(step, name, (square, size))
            self.put(f"}} else if ({self.p}_exceeds({size}, {least_square})) {{")
        else:
            self.put(f"if ({self.p}_exceeds({size}, {least_square})) {{")
        self.scope.indent += "    "
        self._root(name, square, slack, flat)
        self.put(f"const {self.p}_real scale = {literal(1, self.options.real)} / {size};")
        self.put(f"{name}.c = ({self.scope.text(step.x)}) * scale;")
        self.put(f"{name}.s = ({self.scope.text(step.y)}) * scale;")
        self._bring_to_length(step, name)
        self.scope.indent = self.scope.indent[4:]
        if not step.target.is_exactly(0):
            self.put(f"}} else if ({self.p}_abs({target}) > {least}) {{")
            self.put("    return false;  /* out of reach */")
        self.put("} else {  /* the pose leaves it free: it keeps its seed */")
        self._keep_seed(step.joint, step.seed, name)

    def _seed_where_hidden(self, step: BalanceStep, name: str, values: tuple[str, str]) -> None:
        """Where an earlier root at its own fold leaves more unknown than A, B and C amount to; a branch left open."""
        square, size = values
        rough = " * ".join(["LEAST_ROUGH"] * 2 + ["REACH"] * {Least.ANGLE: 0, Least.LENGTH: 2}.get(step.least, 4))
        self.put(f"const bool {name}_hidden = ({square} < -{name}_slack)")
        self.put(f"        && {self.p}_within({square}, {rough}) && {self.p}_within({size}, {rough});")
        self.put(f"if ({name}_hidden) {{  /* rounding hides it: it starts at its seed */")
        self.put(f"    {name} = {self._seed_pair(step.seed)};")
        self.put("    work->marks |= MARK_EDGE | MARK_NEARLY_FREE;")

    def _root(self, name: str, square: str, slack: str, flat: str) -> None:
        self.put(f"if (!{self.p}_signed_root(work, {square}, {slack}, {flat}, second, &{name}_root)) {{")
        self.put("    return false;  /* out of reach */")
        self.put("}")

    def _slide(self, step: SlideStep) -> None:
        name = step.value.name
        joint = step.joint
        if step.denominator.is_constant:
            self.put(f"const {self.p}_real {name} = {self._scaled(step.numerator, step.denominator)};")
            self._settle_slide(joint, name)
        else:
            numerator = self.scope.value(step.numerator)
            denominator = self.scope.value(step.denominator)
            self.put(f"{self.p}_real {name};")
            self.put(f"if ({self.p}_abs({denominator}) > LEAST_ANGLE) {{")
            self.put(f"    {name} = ({numerator}) / ({denominator});")
            if joint is not None:
                self.put("    " + self._slide_text(joint, name))
            self.put("} else {  /* it keeps its seed; whether the others make up for that is checked */")
            self.put("    work->marks |= MARK_FREE | MARK_EDGE;")
            if joint is not None:
                offset = self.goal.chain.joints[joint].offset
                self.put(f"    {name} = {self._with_offset(f'work->seed[{joint}]', offset)};")
                self.put(f"    {self.p}_keep(work, {joint}u);")
            else:
                self.put(f"    {name} = {self.zero};")
            self.put("}")
        self._store(name)

    def _scaled(self, numerator: Node, denominator: Node) -> str:
        """A quotient by a constant, which may go into every term: then the numerator as such is read nowhere."""
        quotient = self.scope.builder.div(numerator, denominator)
        if quotient is numerator and self.scope.uses[numerator] > 1:
            return self.scope.value(numerator)
        self.scope.ready(quotient)
        return self.scope.text(quotient)

    def _slide_text(self, joint: int, name: str) -> str:
        value = self._with_offset(name, self.goal.chain.joints[joint].offset, "-")
        return f"{self.p}_settle_slide(work, {joint}u, {value});"

    def _settle_slide(self, joint: int | None, name: str) -> None:
        if joint is not None:
            self.put(self._slide_text(joint, name))

    def _slide_roots(self, step: SlideRootsStep) -> None:
        name, root = step.value.name, step.root.name
        square, middle = self.scope.value(step.square), self.scope.value(step.middle)
        self.put(f"{self.p}_real {root};")
        slack = f"{self._slack(step.doubts)} * REACH * REACH"
        self.put(f"if (!{self.p}_signed_root(work, {square}, {slack}, {self._flat(step)}, second, &{root})) {{")
        self.put("    return false;  /* out of reach */")
        self.put("}")
        value = root if step.middle.is_exactly(0) else f"{middle} + {root}"
        self.put(f"const {self.p}_real {name} = {value};")
        self._settle_slide(step.joint, name)
        self._store(name)

    # -- four roots --------------------------------------------------------------------------------------------------
    def prepare(self, step: Step) -> None:
        """At the end of the stage before: all roots at once."""
        if isinstance(step, QuarticStep | SlideQuarticStep):
            kind = "turn" if isinstance(step, QuarticStep) else "slide"
            for line in _comment_lines(f"{step.note}: all its roots"):
                self.put(line)
            texts = [self.scope.value(node) for node in step.coefficients]
            self.put(f"const {self.p}_quartic {step.angle}_equation = {{{{{', '.join(texts)}}}}};")
            self.put(f"{self.p}_{kind}_roots(&{step.angle}_equation, &work->{step.angle}_roots);")

    def _quartic_choice(self, step: QuarticStep | SlideQuarticStep) -> None:
        name = self._name(step.pair) if isinstance(step, QuarticStep) else step.value.name
        root = "choice"
        if isinstance(step, QuarticStep) and step.det is not None:
            root = self._root_of_side(step)
        self.put(f"if (!work->{step.angle}_roots.there[{root}]) {{")
        self.put("    return false;  /* there is no such root */")
        self.put("}")
        self.put("work->marks |= MARK_EDGE;  /* its roots are approximate: the pose reached is checked */")
        if isinstance(step, QuarticStep):
            self.put(f"const {self.p}_pair {name} = work->{step.angle}_roots.turn[{root}];")
        else:
            self.put(f"const {self.p}_real {name} = work->{step.angle}_roots.slide[{root}];")

    def _root_of_side(self, step: QuarticStep) -> str:
        """The number of the root among those that rise and fall: `choice` has the side of the Jacobian as its low bit."""
        assert step.det is not None
        one = literal(1, self.options.real)
        if step.bit in self.scope.uses:
            self.put(f"const {self.p}_real {step.bit.name} = ((choice & 1u) == 0u) ? {one} : -{one};")
        if step.det.is_constant:
            return "choice" if step.det.value > 0 else "choice ^ 1u"
        self.put(f"const unsigned {step.angle}_root = ({self.scope.value(step.det)} > {self.zero}) ? choice : (choice ^ 1u);")
        return f"{step.angle}_root"

    def _refine(self, step: RefineStep) -> None:
        for variable in step.variables:
            self._start_variable(variable)
        scales = ", ".join(self.scope.value(node) for node in step.scales)
        self.put(f"const {self.p}_real scales[2] = {{{scales}}};")
        if step.side is not None:
            self.put(f"{self.p}_real determinant = {self.zero};")
        self.put(f"for (int pass = 0; pass < {step.passes}; ++pass) {{")
        self.scope.indent += "    "
        known = dict(self.scope.names)
        first, second = (self.scope.value(node) for node in step.residuals)
        slopes = [self.scope.value(node) for row in step.slopes for node in row]
        self.put(f"{self.p}_real change[2];")
        result = "(void)" if step.side is None else "determinant = "
        self.put(f"{result}{self.p}_newton2({', '.join([*slopes, first, second])}, scales, change);")
        for k, variable in enumerate(step.variables):
            self._change_variable(variable, k)
        self.scope.names = known
        self.scope.indent = self.scope.indent[4:]
        self.put("}")
        self._stay_near(step.variables[1], step.side)
        for variable in step.variables:
            self._finish_variable(variable)

    def _stay_near(self, variable: Variable, side: Node | None) -> None:
        """The root of the outer joint was one: polishing must not have run to another, which lies on the other side."""
        if side is not None:
            self._stay_on_side(variable, self.scope.text(side))
            return
        if isinstance(variable.during, Pair):
            assert isinstance(variable.before, Pair)
            before, after = self._name(variable.before), self._name(variable.during)
            nearly = literal(1 - 4 * SLACK * self.options.real.rounding, self.options.real)
            far = f"{before}.c * {after}.c + {before}.s * {after}.s < {nearly}"
        else:
            assert isinstance(variable.before, Node)
            distance = f"{self.p}_abs({variable.during.name} - {variable.before.name})"
            far = f"{distance} > {literal(Fraction(1, 8), self.options.real)} * REACH"
        self.put(f"if ({far}) {{  /* it ran to another root: there is none here */")
        self.put("    return false;")
        self.put("}")

    def _stay_on_side(self, variable: Variable, side: str) -> None:
        assert isinstance(variable.before, Pair)
        assert isinstance(variable.during, Pair)
        before, after = self._name(variable.before), self._name(variable.during)
        self.put(f"const {self.p}_real kept = {before}.c * {after}.c + {before}.s * {after}.s;")
        nearly = literal(1 - 4 * SLACK * self.options.real.rounding, self.options.real)
        least = literal(_KEPT, self.options.real)
        wrong = f"(({side}) * determinant < {self.zero})" if " " in side else f"({side} * determinant < {self.zero})"
        self.put(f"if ((kept < {nearly}) && ((kept < {least}) || {wrong})) {{")
        self.put("    return false;  /* it ran to another root: there is none here */")
        self.put("}")

    def _start_variable(self, variable: Variable) -> None:
        if isinstance(variable.before, Pair):
            assert isinstance(variable.during, Pair)
            self.put(f"{self.p}_pair {self._name(variable.during)} = {self._name(variable.before)};")
        else:
            assert isinstance(variable.during, Node)
            self.put(f"{self.p}_real {variable.during.name} = {variable.before.name};")

    def _change_variable(self, variable: Variable, k: int) -> None:
        if isinstance(variable.during, Pair):
            self.put(f"{self.p}_turn_by(&{self._name(variable.during)}, change[{k}]);")
        else:
            self.put(f"{variable.during.name} += change[{k}];")

    def _finish_variable(self, variable: Variable) -> None:
        if isinstance(variable.after, Pair):
            assert isinstance(variable.during, Pair)
            name = self._name(variable.after)
            self.put(f"const {self.p}_pair {name} = {self._name(variable.during)};")
            self._store(name, variable.joint if variable.joint < len(self.goal.chain.joints) else None)
        else:
            assert isinstance(variable.during, Node)
            name = variable.after.name
            self.put(f"const {self.p}_real {name} = {variable.during.name};")
            self._settle_slide(variable.joint, name)
            self._store(name)


_KEPT = Fraction(31, 32)  # cosine of how far polishing may move a root, which rounding does near a fold of two folds


def _may_be_hidden(step: BalanceStep) -> bool:
    """Whether what an earlier root leaves unknown may be more than A, B and C amount to."""
    return step.size is not None and step.size.stage > 0 and not step.target.is_exactly(0)


def _leaves_of(node: Node) -> set[Node]:
    if not node.args:
        return {node}
    return set().union(*(_leaves_of(arg) for arg in node.args))


def _comment_lines(text: str) -> list[str]:
    return [f"/* {text} */"]
