"""Run nodes in Python: with 60 digits, or in any other arithmetic that has +, -, *, / and a square root."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from codegen.exact import MP
from codegen.program import Node, Op, reachable


def evaluate(
    roots: list[Node],
    inputs: Mapping[Node, Any],
    number: Callable[[Any], Any] = MP.mpf,
    root: Callable[[Any], Any] = MP.sqrt,
) -> list[Any]:
    """The values of the roots for the given inputs; `number` turns a 60 digit constant into the arithmetic used."""
    values: dict[Node, Any] = dict(inputs)
    for node in reachable(roots):
        if node not in values:
            values[node] = node_value(node, values, number, root)
    return [values[node] for node in roots]


def _where(test: Any, positive: Any, other: Any) -> Any:
    return positive if test > 0 else other


def node_value(
    node: Node,
    values: Mapping[Node, Any],
    number: Callable[[Any], Any],
    root: Callable[[Any], Any],
    where: Callable[[Any, Any, Any], Any] = _where,
) -> Any:
    args = [values[arg] for arg in node.args]
    match node.op:
        case Op.CONSTANT:
            return number(node.value)
        case Op.SUM:
            total = args[0] if node.signs[0] > 0 else -args[0]
            for sign, arg in zip(node.signs[1:], args[1:], strict=True):
                total = total + arg if sign > 0 else total - arg
            return total
        case Op.PRODUCT:
            return args[0] * args[1]
        case Op.QUOTIENT:
            return args[0] / args[1]
        case Op.ROOT:
            return root(args[0])
        case Op.SIZE:
            return abs(args[0])
        case Op.CHOICE:
            return where(*args)
        case _:
            raise KeyError(f"no value for the input {node.name}")
