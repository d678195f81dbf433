"""Directions whose length a root before them has given already.

A wrist's bend comes from the root of x^2 + y^2, and its roll from the direction of (x s, y s), s the sine of the bend: the
same root brings (x, y) to length 1, with the right sign, and no other is taken.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from codegen.inverse.plan import BalanceStep, DirectionStep, Least, Step
from codegen.program import Node, Op


@dataclass(frozen=True, slots=True)
class KnownLength:
    """(signs[0] x, signs[1] y) / root is the direction; root is the signed root of x^2 + y^2."""

    balance: BalanceStep
    x: Node
    y: Node
    signs: tuple[int, int]


def known_length(step: Step, before: Sequence[Step]) -> KnownLength | None:
    """What a step of one stage can take from the steps before it in that stage; None where there is nothing."""
    if not isinstance(step, DirectionStep) or step.least is not Least.ANGLE_SQUARED or step.turned is not None:
        return None
    for balance in before:
        if isinstance(balance, BalanceStep) and balance.size is None and balance.y is balance.root:
            x, y = (_without(side, balance.pair.sine) for side in (step.x, step.y))
            if x is not None and y is not None and _is_sum_of_squares(balance.square, x[1], y[1]):
                return KnownLength(balance, x[1], y[1], (x[0], y[0]))
    return None


def _without(node: Node, factor: Node) -> tuple[int, Node] | None:
    """(sign, rest) of a node that is plus or minus the rest times the factor."""
    sign = 1
    if node.op is Op.SUM and len(node.args) == 1:
        sign, node = node.signs[0], node.args[0]
    if node.op is not Op.PRODUCT or factor not in node.args:
        return None
    rest = [arg for arg in node.args if arg is not factor]
    return (sign, rest[0]) if len(rest) == 1 else None


def _is_sum_of_squares(node: Node, x: Node, y: Node) -> bool:
    if node.op is not Op.SUM or node.signs != (1, 1):
        return False
    wanted = {(x, x), (y, y)}
    return {arg.args for arg in node.args if arg.op is Op.PRODUCT} == wanted
