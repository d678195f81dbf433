"""The solvable forms: each takes equations whose values are known and makes one more joint known.

Sources. Pairs from one equation A c + B s = C, and from two linear ones: Paul, Robot Manipulators (1981), chapter 3; Craig,
Introduction to Robotics, appendix C. Quartic in the half angle: Pieper, The Kinematics of Manipulators under Computer
Control (1968).
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

from codegen.geometry import Pair, Rigid, Space, Vector
from codegen.inverse.oracle import Oracle
from codegen.inverse.plan import (
    BY_SIDE,
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
)
from codegen.inverse.polynomial import Poly
from codegen.inverse.segment import Use
from codegen.program import Builder, Node


@dataclass(frozen=True, slots=True)
class Balance:
    """The equation A c + B s = C of one turning joint, before it is solved.

    square  A^2 + B^2 - C^2 where a better form of it is known
    exact   that form keeps its digits down to zero, where the axes of two joints line up

    With lengths on both sides (AREA) a point is brought to a distance. Where C is negative the distance is the shortest
    that there is, near zero when the two links are alike: there a square near zero must keep its digits.
    """

    cosine_part: Node
    sine_part: Node
    target: Node
    least: Least
    square: Node | None = None
    exact: bool = False

    @property
    def fixed(self) -> bool:
        return self.cosine_part.is_constant and self.sine_part.is_constant


@dataclass
class Solver:
    """Collects the steps of one plan and the values that they make known."""

    builder: Builder
    space: Space
    oracle: Oracle
    joints: int
    steps: list[Step] = field(default_factory=list)
    pairs: dict[int, Pair] = field(default_factory=dict)
    slides: dict[int, Node] = field(default_factory=dict)
    structure: list[str] = field(default_factory=list)
    labels: dict[int, str] = field(default_factory=dict)
    known_pairs: dict[int, Pair] = field(default_factory=dict)
    known_slides: dict[int, Node] = field(default_factory=dict)
    known_headings: dict[Pair, Pair] = field(default_factory=dict)
    stage: int = 0

    # -- names -------------------------------------------------------------------------------------------------------
    def label(self, index: int) -> str:
        return self.labels.get(index, f"joint{index + 1}")

    def heading(self, topic: str) -> None:
        """Names of values made from here on start with this word."""
        self.builder.topic = topic.split(",")[0].replace(" ", "_")

    # -- what a step makes known -------------------------------------------------------------------------------------
    def _new_stage(self, roots: int) -> None:
        if roots > 1:
            self.stage += 1

    def new_pair(self, name: str) -> Pair:
        pair = Pair(
            self.builder.fresh_stage(f"{name}.c", self.stage),
            self.builder.fresh_stage(f"{name}.s", self.stage),
        )
        self.oracle.declare_pair(pair)
        return pair

    def new_slide(self, name: str) -> Node:
        node = self.builder.fresh_stage(f"{name}_slide", self.stage)
        self.oracle.declare_real(node)
        return node

    def own_pair(self, use: Use) -> Pair:
        """The pair of a use of a joint already solved."""
        pair = self.pairs[use.joint.index]
        return pair if use.sign > 0 else self.space.opposite(pair)

    def own_slide(self, use: Use) -> Node:
        slide = self.slides[use.joint.index]
        return slide if use.sign > 0 else self.builder.neg(slide)

    def is_real(self, use: Use) -> bool:
        """Whether the arm has this joint; a free turn of the tool is a joint of the derivation only."""
        return use.joint.index < self.joints

    def seed_of(self, use: Use) -> SeedAngle:
        """Where a free joint's angle comes from; a joint that only the derivation knows has no seed."""
        return ((use.joint.index, 1),) if self.is_real(use) else ()

    def motion(self, use: Use) -> Rigid:
        """The rigid motion of a joint already solved."""
        if use.turns:
            return Rigid(self.space.about_z(self.own_pair(use)), self.space.origin)
        return self.space.slide_z(self.own_slide(use))

    # -- forms -------------------------------------------------------------------------------------------------------
    def direction(
        self, use: Use, x: Node, y: Node, least: Least, note: str, settles: bool = True, turned: Node | None = None
    ) -> Pair:
        """The joint from (c, s) along (x, y)."""
        if use.sign < 0:
            y = self.builder.neg(y)
        name = self.label(use.joint.index)
        pair = self.new_pair(name if settles else f"{name}_rough")
        joint = use.joint.index if settles and self.is_real(use) else None
        self.steps.append(DirectionStep(joint, name, pair, x, y, least, self.seed_of(use), note, turned=turned))
        self.pairs[use.joint.index] = pair
        return self.own_pair(use)

    def start_at_seed_below(self, least: Least) -> None:
        """The direction just found says nothing where the squared size of what it turns is as small as a rough root's
        error."""
        step = self.steps[-1]
        assert isinstance(step, DirectionStep)
        self.steps[-1] = replace(step, rough=True, least=least)

    def never_free(self) -> None:
        """What the joint just solved turns is never near its axis: rounding leaves it in no doubt."""
        step = self.steps[-1]
        assert isinstance(step, DirectionStep)
        self.steps[-1] = replace(step, turned=None)

    def absorb(self, use: Use, x: Node, y: Node) -> None:
        """Where the joint just solved keeps its seed, `use`, solved before it, goes along (x, y) instead."""
        step = self.steps[-1]
        assert isinstance(step, DirectionStep)
        if use.sign < 0:
            y = self.builder.neg(y)
        joint = use.joint.index if self.is_real(use) else None
        self.steps[-1] = replace(step, absorbed=Absorption(joint, self.pairs[use.joint.index], x, y))

    def heading_angle(self, name: str, x: Node, y: Node, seed: SeedAngle, note: str) -> Pair:
        """The angle of a whole group of joints, by the same form."""
        pair = self.new_pair(name)
        self.steps.append(DirectionStep(None, name, pair, x, y, Least.ANGLE, seed, note))
        return pair

    def balance(self, use: Use, equation: Balance, note: str) -> Pair:
        """The joint from A c + B s = C: two roots."""
        b = self.builder
        a_part, b_part, target = equation.cosine_part, equation.sine_part, equation.target
        if use.sign < 0:
            b_part = b.neg(b_part)
        size: Node | None = None
        flat: Node = b.integer(1)
        if equation.fixed:
            scale = self._signed_size(a_part, b_part)
            a_part, b_part = self._scaled_part(a_part, scale), self._scaled_part(b_part, scale)
            target = b.div(target, scale)
            below, above = b.sub(b.integer(1), target), b.add(b.integer(1), target)
            square = b.mul(below, above) if equation.square is None else b.div(equation.square, b.square(scale))
            if equation.least is Least.AREA:
                flat = b.mul(target, b.sign(scale))
        else:
            size = b.add(b.square(a_part), b.square(b_part))
            square = b.sub(size, b.square(target)) if equation.square is None else equation.square
            flat = b.mul(target, b.size(target)) if equation.least is Least.AREA else size
        name = self.label(use.joint.index)
        b.named(target, f"{name}_target", "what the pair of the joint must add up to" if size is None else "")
        b.named(square, f"{name}_square")
        if size is not None:
            b.named(size, f"{name}_size")
        self._new_stage(2)
        root = b.fresh_stage(f"{name}_root", self.stage)
        self.oracle.declare_real(root)
        pair = self.new_pair(name)
        self.steps.append(
            BalanceStep(
                joint=use.joint.index if self.is_real(use) else None,
                angle=name,
                pair=pair,
                size=size,
                target=target,
                square=square,
                root=root,
                x=b.sub(b.mul(a_part, target), b.mul(b_part, root)),
                y=b.add(b.mul(b_part, target), b.mul(a_part, root)),
                least=equation.least,
                seed=self.seed_of(use),
                side=b.sub(b.mul(a_part, pair.sine), b.mul(b_part, pair.cosine)),
                meaning=self._side_meaning(use, a_part, b_part),
                note=note,
                flat=None if equation.exact else flat,
            )
        )
        self.pairs[use.joint.index] = pair
        return self.own_pair(use)

    def _signed_size(self, a_part: Node, b_part: Node) -> Node:
        """sqrt(A^2 + B^2), or the one part that is there with its own sign: the shape then does not hang on a sign."""
        if b_part.is_exactly(0):
            return a_part
        if a_part.is_exactly(0):
            return b_part
        return self.builder.sqrt(self.builder.add(self.builder.square(a_part), self.builder.square(b_part)))

    def _scaled_part(self, part: Node, scale: Node) -> Node:
        return self.builder.integer(1) if part is scale else self.builder.div(part, scale)

    def _side_meaning(self, use: Use, a_part: Node, b_part: Node) -> str:
        name = self.label(use.joint.index)
        if a_part.is_exactly(1) and b_part.is_exactly(0):
            return f"sin({name}) >= 0|sin({name}) < 0"
        if b_part.is_exactly(1) and a_part.is_exactly(0):
            return f"cos({name}) <= 0|cos({name}) > 0"
        return f"{name}: first of the two roots|{name}: second of the two roots"

    def slide(self, use: Use, numerator: Node, denominator: Node, note: str, settles: bool = True) -> Node:
        """The slide of a joint from an equation linear in it."""
        b = self.builder
        if use.sign < 0:
            numerator = b.neg(numerator)
        name = self.label(use.joint.index)
        value = self.new_slide(name if settles else f"{name}_rough")
        joint = use.joint.index if settles else None
        self.steps.append(SlideStep(joint, name, value, numerator, denominator, note))
        self.slides[use.joint.index] = value
        return self.own_slide(use)

    def slide_roots(self, use: Use, middle: Node, square: Node, flat: Node, note: str) -> Node:
        """The slide from d^2 - 2 middle d + ... = 0, as middle +- sqrt(square); `flat` as in the step."""
        b = self.builder
        if use.sign < 0:
            middle = b.neg(middle)
        self._new_stage(2)
        name = self.label(use.joint.index)
        root = b.fresh_stage(f"{name}_root", self.stage)
        value = self.new_slide(name)
        meaning = f"{name} slid further out|{name} slid further in"
        self.steps.append(
            SlideRootsStep(use.joint.index, name, value, middle, square, root, b.sub(value, middle), meaning, note, flat)
        )
        self.slides[use.joint.index] = value
        return self.own_slide(use)

    def quartic(self, use: Use, poly: Poly, note: str) -> None:
        """The joint from a polynomial of degree two in (c, s), or of degree up to four in its slide."""
        b, zero, name = self.builder, self.space.zero, self.label(use.joint.index)
        index = use.joint.index
        if use.turns:
            monomials = ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1))
            f = [poly.coefficient(m, zero) for m in monomials]
            if use.sign < 0:
                f[2], f[4] = b.neg(f[2]), b.neg(f[4])
            self._new_stage(4)
            pair = self.new_pair(f"{name}_rough")
            self.pairs[index] = pair
            coefficients = (f[0], f[1], f[2], f[3], f[4])
            bit = b.fresh_stage(f"{name}_side", self.stage)
            self.oracle.declare_real(bit)
            self.steps.append(
                QuarticStep(index, name, pair, coefficients, self.known_pairs[index], self.seed_of(use), note, bit)
            )
            return
        g = [poly.coefficient((k, 0), zero) for k in range(5)]
        if use.sign < 0:
            g[1], g[3] = b.neg(g[1]), b.neg(g[3])
        self._new_stage(4)
        value = self.new_slide(f"{name}_rough")
        self.slides[index] = value
        self.steps.append(
            SlideQuarticStep(index, name, value, (g[0], g[1], g[2], g[3], g[4]), self.known_slides[index], note)
        )

    def number_by_jacobian(self, det: Node, side: Node) -> Node:
        """Number the roots of the quartic just found by the sign of a Jacobian determinant (QuarticStep); returns that sign."""
        step = self.steps[-1]
        assert isinstance(step, QuarticStep)
        self.steps[-1] = replace(step, det=det, side=side, meaning=BY_SIDE)
        return step.bit

    def refine(self, step: RefineStep) -> None:
        self.steps.append(step)

    def structure_found(self, text: str) -> None:
        self.structure.append(text)

    # -- small geometry ----------------------------------------------------------------------------------------------
    def turn_onto(self, use: Use, source: Vector, goal: Vector, least: Least, note: str, settles: bool = True) -> Pair:
        """The turn about z that takes `source` to `goal`, whose heights and radii already agree."""
        b = self.builder
        x = b.add(b.mul(source[0], goal[0]), b.mul(source[1], goal[1]))
        y = b.sub(b.mul(source[0], goal[1]), b.mul(source[1], goal[0]))
        turned = b.add(b.square(source[0]), b.square(source[1]))
        return self.direction(use, x, y, least, note, settles, turned)
