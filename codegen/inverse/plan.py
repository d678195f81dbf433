"""A plan: the order in which joints are solved, by which solvable form, and what each choice means.

A step makes one joint (or the angle of a group) known. Steps with two or more roots take digits of the branch number. All
values are nodes of one program; the plan holds no formulas of its own.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import Enum

from codegen.geometry import Pair
from codegen.program import Node

SeedAngle = tuple[tuple[int, int], ...]  # (joint index, sign): the seed's angles that add up; empty: zero


class Least(Enum):
    """What a step's values are measured in: how small they must be before rounding alone can explain them."""

    NOTHING = "never free"
    ANGLE = "entries of unit vectors"
    ANGLE_SQUARED = "products of two entries of unit vectors"
    LENGTH = "lengths"
    LENGTH_SQUARED = "products of two lengths"
    AREA = "a length times the arm's own size"


@dataclass(frozen=True, slots=True)
class Absorption:
    """What a joint solved before takes up where the joint of this step keeps its seed: its pair along (x, y)."""

    joint: int | None
    pair: Pair
    x: Node
    y: Node


@dataclass(frozen=True, slots=True)
class DirectionStep:
    """The pair (c, s) along (x, y): one root, from two equations linear in the pair.

    joint  the joint that it settles; None for the angle of a group, or where a later step settles the joint
    Where x and y both vanish the pose leaves the angle free: it keeps its seed.
    turned the squared size of what the joint turns, by which its direction may be off
    rough  that comes from an approximate root: no larger than such a root leaves unknown, it says nothing of the joint,
           which then starts from its seed
    doubt  how far off the angle may be by rounding alone, rad, and 1 where it is free; made known by the step, and there
           only where a later root hangs on it
    """

    joint: int | None
    angle: str
    pair: Pair
    x: Node
    y: Node
    least: Least
    seed: SeedAngle
    note: str
    absorbed: Absorption | None = None
    turned: Node | None = None
    rough: bool = False
    doubt: Node | None = None
    roots: int = 1


@dataclass(frozen=True, slots=True)
class BalanceStep:
    """c A + s B = C: two roots, by the sign of A s - B c (Paul 1981; Craig, "transcendental equations").

    size    A^2 + B^2; None where A and B are constants, scaled to 1: the joint is then never free
    square  A^2 + B^2 - C^2 in a form that keeps its digits; root is its signed square root, made known by the step
    x, y    size times (c, s): (A C - B root, B C + A root)
    side    A s - B c
    flat    times a few roundings: a square up to this is zero but for rounding, and taking it as zero costs no accuracy;
            None where the square keeps its digits down to zero and every one of them counts
    doubt   as in DirectionStep
    doubts  of earlier joints: their rounding alone may make the square negative by so much of what it can be
    """

    joint: int | None
    angle: str
    pair: Pair
    size: Node | None
    target: Node
    square: Node
    root: Node
    x: Node
    y: Node
    least: Least
    seed: SeedAngle
    side: Node
    meaning: str
    note: str
    flat: Node | None = None
    doubt: Node | None = None
    doubts: tuple[Node, ...] = ()
    roots: int = 2


@dataclass(frozen=True, slots=True)
class SlideStep:
    """numerator / denominator: one root. Where the denominator vanishes the slide is free and keeps its seed."""

    joint: int | None
    angle: str
    value: Node
    numerator: Node
    denominator: Node
    note: str
    roots: int = 1


@dataclass(frozen=True, slots=True)
class SlideRootsStep:
    """middle +- sqrt(square): two roots, by the sign of value - middle.

    flat    times a few roundings: a square up to this is zero but for rounding (BalanceStep)
    doubts  as there, of the reach squared
    """

    joint: int
    angle: str
    value: Node
    middle: Node
    square: Node
    root: Node
    side: Node
    meaning: str
    note: str
    flat: Node
    doubts: tuple[Node, ...] = ()
    roots: int = 2


BY_SLOPE = "crossing direction of the root, then its order"
BY_SIDE = "side of the Jacobian that the root lies on, then its order"


@dataclass(frozen=True, slots=True)
class QuarticStep:
    """Up to four roots of a trigonometric polynomial f0 + f1 c + f2 s + f3 c^2 + f4 c s, numbered as the header says.

    The two equations that the polynomial came from have a Jacobian by the two joints, J, and a determinant in the inner
    joint's pair, D; at a root its slope is 2 D det(J) (implicit differentiation). So the sign of det(J) is known for each
    root: it numbers them, for it changes at folds of the arm only, while D may change its sign at any pose.

    det     D, where the sign of det(J) is taken; None: roots are numbered by the slope itself
    side    det(J) where all joints are known, for finding a branch's number
    bit     +1 or -1, known once a root is chosen: the sign of its det(J)
    """

    joint: int
    angle: str
    pair: Pair
    coefficients: tuple[Node, Node, Node, Node, Node]
    known: Pair  # the pair where all joints are known, for finding a branch's number
    seed: SeedAngle
    note: str
    bit: Node
    det: Node | None = None
    side: Node | None = None
    meaning: str = BY_SLOPE
    roots: int = 4


@dataclass(frozen=True, slots=True)
class SlideQuarticStep:
    """Up to four roots of f0 + f1 x + f2 x^2 + f3 x^3 + f4 x^4 within +-bound."""

    joint: int
    angle: str
    value: Node
    coefficients: tuple[Node, Node, Node, Node, Node]
    known: Node
    note: str
    meaning: str = BY_SLOPE
    roots: int = 4


@dataclass(frozen=True, slots=True)
class Variable:
    """What a refinement changes: a pair or a slide; its value before, during and after."""

    joint: int
    name: str
    before: Pair | Node
    during: Pair | Node
    after: Pair | Node


@dataclass(frozen=True, slots=True)
class RefineStep:
    """Newton steps on two equations in two joints: the roots of an elimination polished on what they came from.

    slopes  d residual / d variable
    scales  squared sizes that slopes of the two equations have on this arm: against these the steps are damped
    side    the sign that the determinant of the slopes has at the root wanted, where that is known
    """

    variables: tuple[Variable, Variable]
    residuals: tuple[Node, Node]
    slopes: tuple[tuple[Node, Node], tuple[Node, Node]]
    note: str
    scales: tuple[Node, Node]
    side: Node | None = None
    passes: int = 5
    roots: int = 1


Step = DirectionStep | BalanceStep | SlideStep | SlideRootsStep | QuarticStep | SlideQuarticStep | RefineStep


@dataclass(frozen=True, slots=True)
class Plan:
    """How one task of one arm is solved.

    steps      in order
    pairs      per turning joint that is not held: the pair of its variable plus its offset
    slides     per sliding joint that is not held: its variable plus its offset
    structure  what was found in the chain, in words a reviewer can check
    """

    steps: tuple[Step, ...]
    pairs: dict[int, Pair] = field(default_factory=dict)
    slides: dict[int, Node] = field(default_factory=dict)
    structure: tuple[str, ...] = ()

    @property
    def approximate(self) -> bool:
        """Whether some root is an approximate one of a quartic, polished."""
        return any(isinstance(step, RefineStep) for step in self.steps)

    @property
    def retraced(self) -> bool:
        """Whether a solution may have to be brought nearer by steps.

        Formulas lose digits where roots are polished. And where the size of a balance hangs on an earlier root, two folds
        may meet: the first joint then takes what the pose's rounding leaves, and the second cannot make up for it. So it is
        where a joint is nearly free, and a later root hangs on it.
        """
        return self.approximate or any(
            (isinstance(step, BalanceStep) and step.size is not None and step.size.stage > 0)
            or (isinstance(step, BalanceStep | SlideRootsStep) and bool(step.doubts))
            for step in self.steps
        )

    @property
    def branches(self) -> int:
        count = 1
        for step in self.steps:
            count *= step.roots
        return count
