"""The plan of a sweep as C: where the other joints stand for an angle of the swept joint, on one branch."""

from __future__ import annotations

import re
from dataclasses import dataclass

from codegen.emit.expression import Constants, Scope
from codegen.geometry import Pair
from codegen.inverse.plan import BalanceStep, DirectionStep, SlideRootsStep, SlideStep, Step
from codegen.inverse.sweep import Sweep
from codegen.names import joint_identifiers
from codegen.options import Options
from codegen.program import Node

_OWN_NAMES = {"quest", "branch", "angle", "sample", "p", "r", "spare"}


@dataclass(frozen=True, slots=True)
class PlacingText:
    """lines    the body of the function that fills a sample
    notes       what its steps do
    pairs       (joint, offset as a constant, empty where there is none) of turning joints
    slides      the same of sliding ones
    has_sizes   a square is measured against a value of its own
    """

    lines: tuple[str, ...]
    notes: tuple[str, ...]
    pairs: tuple[tuple[int, str], ...]
    slides: tuple[tuple[int, str], ...]
    has_sizes: bool

    @property
    def reads_point(self) -> bool:
        return any(re.search(r"\bp\[", line) for line in self.lines)

    @property
    def reads_rotation(self) -> bool:
        return any(re.search(r"\br\[", line) for line in self.lines)


def placing_text(sweep: Sweep, options: Options, constants: Constants) -> PlacingText:
    printer = _Printer(sweep, options, constants)
    printer.given()
    for step in sweep.plan.steps:
        printer.step(step)
    printer.result()
    steps = sweep.plan.steps
    return PlacingText(
        tuple(printer.scope.lines),
        (*sweep.plan.structure, *(step.note for step in steps)),
        tuple((index, printer.offset(index)) for index in sweep.plan.pairs),
        tuple((index, printer.offset(index)) for index in sweep.plan.slides),
        any(isinstance(step, BalanceStep) and step.size is not None for step in steps),
    )


class _Printer:
    def __init__(self, sweep: Sweep, options: Options, constants: Constants) -> None:
        self._sweep = sweep
        self._p = options.prefix
        self._options = options
        self._digits = sum(step.roots > 1 for step in sweep.plan.steps)
        self.scope = Scope(sweep.goal.solver.builder, constants, options)
        self.scope.taken |= {*_OWN_NAMES, *joint_identifiers(sweep.goal.arm)}
        for i in range(3):
            self.scope.names[sweep.goal.position[i]] = f"p[{i}]"
            for j in range(3):
                self.scope.names[sweep.goal.rotation[i][j]] = f"r[{i}][{j}]"
        self.scope.plan_uses([*(node for step in sweep.plan.steps for node in _read(step)), sweep.miss])

    def offset(self, index: int) -> str:
        """Of a joint's variable, as a constant."""
        node = self._sweep.goal.chain.joints[index].offset
        return "" if node.is_exactly(0) else self.scope.constants.text(node)

    def given(self) -> None:
        """The swept joint, and joints that are held."""
        goal, label = self._sweep.goal, self._sweep.label
        self._make_known(self._sweep.pair, f"{self._p}_turn(angle)", label)
        for index in goal.arm.held_indices:
            offset = self.offset(index)
            value = f"quest->seed[{index}]" + (f" + {offset}" if offset else "")
            if index in goal.held_pairs:
                self._make_known(goal.held_pairs[index], f"{self._p}_turn({value})", goal.solver.label(index))
            else:
                name = f"{goal.solver.label(index)}_slide"
                self._declare_slide(goal.held_slides[index], name, value)

    def _make_known(self, pair: Pair, text: str, name: str) -> None:
        if pair.cosine in self.scope.uses or pair.sine in self.scope.uses or name in self._kept():
            self.scope.put(f"const {self._p}_pair {name} = {text};")
        self.scope.names[pair.cosine], self.scope.names[pair.sine] = f"{name}.c", f"{name}.s"

    def _kept(self) -> set[str]:
        """Pairs that the sample holds."""
        return {pair.cosine.name.removesuffix(".c") for pair in self._sweep.plan.pairs.values()}

    def _declare_slide(self, node: Node, name: str, text: str) -> None:
        self.scope.put(f"const {self._p}_real {name} = {text};")
        self.scope.names[node] = name

    def step(self, step: Step) -> None:
        match step:
            case DirectionStep():
                self._direction(step.pair, step.x, step.y)
            case BalanceStep():
                self._root(step, step.size)
                self._direction(step.pair, step.x, step.y)
            case SlideStep():
                numerator, denominator = self.scope.value(step.numerator), self.scope.factor(step.denominator)
                self._declare_slide(step.value, step.value.name, f"({numerator}) / {denominator}")
            case SlideRootsStep():
                self._root(step, None)
                root = self.scope.names[step.root]
                middle = "" if step.middle.is_exactly(0) else f"{self.scope.value(step.middle)} + "
                self._declare_slide(step.value, step.value.name, f"{middle}{root}")
            case _:
                raise TypeError(f"a sweep without {type(step).__name__}")

    def _direction(self, pair: Pair, x: Node, y: Node) -> None:
        name = pair.cosine.name.removesuffix(".c")
        ends = f"{self.scope.value(x)}, {self.scope.value(y)}"
        self._make_known(pair, f"{self._p}_direction({ends})", name)

    def _root(self, step: BalanceStep | SlideRootsStep, size: Node | None) -> None:
        self._digits -= 1
        square = self.scope.value(step.square)
        part = square
        if size is not None:
            part = f"{self._p}_part_of({square}, {self.scope.value(size)})"
        elif isinstance(step, SlideRootsStep):
            part = f"{self._p}_part_of({square}, REACH * REACH)"
        self.scope.put(f"spare = {self._p}_smaller({part}, spare);")
        digit = f"(branch >> {self._digits}u) & 1u" if self._digits else "branch & 1u"
        name = f"{step.angle}_root"
        self.scope.put(f"const {self._p}_real {name} = {self._p}_either_root({square}, {digit});")
        self.scope.names[step.root] = name

    def result(self) -> None:
        self.scope.put(f"sample->miss = {self.scope.value(self._sweep.miss)};")
        for index, pair in self._sweep.plan.pairs.items():
            self.scope.put(f"sample->turn[{index}] = {self.scope.names[pair.cosine].removesuffix('.c')};")
        for index, slide in self._sweep.plan.slides.items():
            self.scope.put(f"sample->slide[{index}] = {self.scope.names[slide]};")


def _read(step: Step) -> list[Node]:
    """The values that a step's statements read."""
    match step:
        case DirectionStep():
            return [step.x, step.y]
        case BalanceStep():
            return [step.square, step.square, step.x, step.y, *([] if step.size is None else [step.size])]
        case SlideStep():
            return [step.numerator, step.denominator]
        case SlideRootsStep():
            return [step.square, step.square, step.middle]
        case _:
            return []
