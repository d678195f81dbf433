"""Whether the second solution of a stage is the mirror image of its first.

A wrist's two solutions are (a, b, c) and (a + pi, -b, c + pi): the root changes its sign, and every cosine and sine made
from it changes its sign or stays. So the angles of the second solution are those of the first, negated or half a turn
on: no arc tangent is taken twice.
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.geometry import Pair
from codegen.inverse.plan import BalanceStep, DirectionStep, SlideStep, Step
from codegen.program import Node, Op

_EVEN, _ODD = 0, 1


@dataclass(frozen=True, slots=True)
class Flip:
    """A joint whose cosine, sine or both change their sign."""

    joint: int
    cosine: bool
    sine: bool

    def image(self, prefix: str) -> str:
        """The joint's angle in the second solution, in C, from its angle in the first."""
        own = f"angle[{self.joint}]"
        if not self.cosine:
            return f"-{own}"
        return f"{prefix}_opposite({own if self.sine else '-' + own})"


def mirror_of(steps: list[Step]) -> tuple[Flip, ...] | None:
    """What changes between the two solutions of a stage; None where more than signs changes."""
    parities: dict[Node, int | None] = {}
    flips: list[Flip] = []
    for step in steps:
        pair: Pair | None = None
        if isinstance(step, BalanceStep):
            parities[step.root] = _ODD
            pair = step.pair
        elif isinstance(step, DirectionStep):
            pair = step.pair
        elif not (isinstance(step, SlideStep) and _same(step, parities)):
            return None
        if pair is not None:
            assert isinstance(step, BalanceStep | DirectionStep)
            cosine, sine = _parity(step.x, parities), _parity(step.y, parities)
            if cosine is None or sine is None:
                return None
            parities[pair.cosine], parities[pair.sine] = cosine, sine
            if step.joint is not None and (cosine, sine) != (_EVEN, _EVEN):
                flips.append(Flip(step.joint, cosine == _ODD, sine == _ODD))
    return tuple(flips) if steps and isinstance(steps[0], BalanceStep) else None


def _same(step: SlideStep, parities: dict[Node, int | None]) -> bool:
    """Whether a slide's value is the same for both roots."""
    numerator = _parity(step.numerator, parities)
    return numerator is not None and numerator == _parity(step.denominator, parities)


def _parity(node: Node, known: dict[Node, int | None]) -> int | None:
    """How a value changes with the sign of the root: not at all, its sign only, or otherwise (None)."""
    if node not in known:
        known[node] = _computed(node, [_parity(arg, known) for arg in node.args])
    return known[node]


def _computed(node: Node, args: list[int | None]) -> int | None:
    if not args:
        return _EVEN
    if node.op is Op.SUM:
        return args[0] if len(set(args)) == 1 else None
    if any(parity is None for parity in args):
        return None
    if node.op in (Op.PRODUCT, Op.QUOTIENT):
        return sum(parity for parity in args if parity is not None) % 2
    if node.op is Op.CHOICE:
        return args[1] if args[0] == _EVEN and args[1] == args[2] else None
    return _EVEN if node.op is Op.SIZE or args[0] == _EVEN else None
