"""Typed straight-line mathematics: the one form that every reader shares.

A `Builder` makes immutable nodes and never makes the same one twice, so a shared subexpression is one value. Zeros, ones
and signs that follow from the arm's structure (an offset that is zero, a right angle) vanish as the nodes are made; every
other constant keeps its name, so a changed length never changes the shape of the program. The C emitter, the evaluator,
the operation counter and the explainer read these nodes; none of them derives anything.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import Enum
from typing import Any

from codegen.exact import MP, Real

_NOISE = MP.mpf(10) ** -50


class Op(Enum):
    CONSTANT = "constant"
    INPUT = "input"
    SUM = "sum"  # of signed terms
    PRODUCT = "product"
    QUOTIENT = "quotient"
    ROOT = "square root"
    SIZE = "absolute value"
    CHOICE = "choice"  # args (test, a, b): a where test > 0, else b


@dataclass(frozen=True, eq=False, slots=True)
class Node:
    """One value.

    structural  a constant that follows from the arm's structure alone: a small integer, never a measured number
    signs       of a SUM's terms
    stage       the first stage of an inverse at which the value is known; 0 for everything else
    """

    serial: int
    op: Op
    args: tuple[Node, ...] = ()
    signs: tuple[int, ...] = ()
    value: Real = None
    structural: bool = False
    name: str = ""
    text: str = ""
    stage: int = 0

    @property
    def label(self) -> str:
        """A constant in the words of a formula."""
        return self.name or self.text

    @property
    def is_constant(self) -> bool:
        return self.op is Op.CONSTANT

    def is_exactly(self, value: int) -> bool:
        return self.structural and self.value == value

    @property
    def is_negation(self) -> bool:
        return self.op is Op.SUM and self.signs == (-1,)


@dataclass
class Builder:
    """Makes nodes, each only once, and remembers the names and reasons that readers print."""

    nodes: dict[tuple[Any, ...], Node] = field(default_factory=dict)
    names: dict[Node, str] = field(default_factory=dict)
    notes: dict[Node, str] = field(default_factory=dict)
    topics: dict[Node, str] = field(default_factory=dict)
    topic: str = "value"
    _taken: set[str] = field(default_factory=set)

    def _intern(self, key: tuple[Any, ...], **fields: Any) -> Node:
        known = self.nodes.get(key)
        if known is None:
            known = self.nodes[key] = Node(serial=len(self.nodes), **fields)
            self.topics[known] = self.topic
        return known

    # -- leaves ------------------------------------------------------------------------------------------------------
    def integer(self, value: int) -> Node:
        """A constant of the arm's structure."""
        return self._intern(("structural", value), op=Op.CONSTANT, value=value, structural=True, text=str(value))

    def constant(self, name: str, value: Real, text: str = "") -> Node:
        """A named measured number; `text` says what it is."""
        return self._intern(("constant", name), op=Op.CONSTANT, value=MP.mpf(value), name=name, text=text or name)

    def constant_named(self, name: str) -> Node | None:
        return self.nodes.get(("constant", name))

    def input(self, name: str, stage: int = 0) -> Node:
        return self._intern(("input", name), op=Op.INPUT, name=name, stage=stage)

    def named(self, node: Node, name: str, note: str = "") -> Node:
        """Give a value the name a reader sees. Leaves and negations of leaves keep their own."""
        if node.is_negation:
            self.named(node.args[0], f"minus_{name}", note)
            return node
        if node.op in (Op.CONSTANT, Op.INPUT) or node in self.names:
            return node
        unique, count = name, 1
        while unique in self._taken:
            count += 1
            unique = f"{name}_{count}"
        self._taken.add(unique)
        self.names[node] = unique
        if note:
            self.notes[node] = note
        return node

    # -- arithmetic --------------------------------------------------------------------------------------------------
    def _derived(self, text: str, value: Real) -> Node:
        return self._intern(("derived", text), op=Op.CONSTANT, value=value, text=text)

    def add(self, *terms: Node) -> Node:
        return self.signed_sum(*((1, term) for term in terms))

    def sub(self, left: Node, right: Node) -> Node:
        return self.signed_sum((1, left), (-1, right))

    def neg(self, node: Node) -> Node:
        return self.signed_sum((-1, node))

    def signed_sum(self, *terms: tuple[int, Node]) -> Node:
        """The sum of signed terms; constants are folded into one, which stands last."""
        flat = self._merged(_cancelled(_flattened(terms)))
        constants = [term for term in flat if term[1].is_constant]
        rest = [term for term in flat if not term[1].is_constant]
        folded = self._folded(constants)
        if folded is not None:
            rest.append(folded)
        if not rest:
            return self.integer(0)
        if len(rest) == 1 and rest[0][0] == 1:
            return rest[0][1]
        if len(rest) == 1 and rest[0][1].is_constant:
            return self._negated_constant(rest[0][1])
        if rest[0][0] < 0:  # a positive term first reads better and saves a negation
            rest.sort(key=lambda term: -term[0])
        args, signs = tuple(t[1] for t in rest), tuple(t[0] for t in rest)
        key = ("sum", tuple(sorted((a.serial, s) for a, s in zip(args, signs, strict=True))))
        return self._intern(key, op=Op.SUM, args=args, signs=signs, stage=_stage(args))

    def _merged(self, terms: list[tuple[int, Node]]) -> list[tuple[int, Node]]:
        """Terms that are a constant times the same value, as one."""
        by_value: dict[Node, list[tuple[int, Node]]] = {}
        for term in terms:
            value = _scaled_value(term[1])
            if value is not None:
                by_value.setdefault(value, []).append(term)
        if all(len(alike) == 1 for alike in by_value.values()):
            return terms
        merged: list[tuple[int, Node]] = []
        for term in terms:
            value = _scaled_value(term[1])
            alike = by_value.get(value, [term]) if value is not None else [term]
            if len(alike) == 1:
                merged.append(term)
            elif term is alike[0] and value is not None:
                factor = self.signed_sum(*((sign, _constant_factor(node)) for sign, node in alike))
                merged.append((1, self.mul(factor, value)))
        return [term for term in merged if not term[1].is_exactly(0)]

    def _negated_constant(self, node: Node) -> Node:
        if node.structural:
            return self.integer(-int(node.value))
        if node.text.startswith("-(") and node.text.endswith(")"):
            return self._derived(node.text[2:-1], -node.value)
        return self._derived(f"-({node.label})", -node.value)

    def _folded(self, constants: list[tuple[int, Node]]) -> tuple[int, Node] | None:
        """All constants of a sum as one; None when they add nothing."""
        measured = [(s, n) for s, n in constants if not n.structural]
        whole = sum(s * int(n.value) for s, n in constants if n.structural)
        if not measured:
            return (1 if whole > 0 else -1, self.integer(abs(whole))) if whole else None
        if len(measured) == 1 and not whole:
            return measured[0]
        total = sum((s * n.value for s, n in measured), MP.mpf(whole))
        if abs(total) <= _NOISE * sum((abs(n.value) for _, n in measured), MP.mpf(abs(whole))):
            return None  # an identity such as cos sin - sin cos: what is left is rounding of the 60 digits
        texts = [("-" if s < 0 else "+") + " " + _bracketed(n.label) for s, n in measured]
        if whole:
            texts.append(f"{'-' if whole < 0 else '+'} {abs(whole)}")
        return 1, self._derived(" ".join(texts).removeprefix("+ "), total)

    def mul(self, left: Node, right: Node) -> Node:
        for one, other in ((left, right), (right, left)):
            if one.is_exactly(0):
                return one
            if one.is_exactly(1):
                return other
            if one.is_exactly(-1):
                return self.neg(other)
            if one.is_negation:
                return self.neg(self.mul(one.args[0], other))
        if left.is_constant and right.is_constant:
            if left.structural and right.structural:
                return self.integer(int(left.value) * int(right.value))
            return self._derived(f"{_bracketed(left.label)}*{_bracketed(right.label)}", left.value * right.value)
        scaled = self._rescaled(left, right)
        if scaled is not None:
            return scaled
        args = (left, right) if left.serial <= right.serial else (right, left)
        key = ("product", args[0].serial, args[1].serial)
        return self._intern(key, op=Op.PRODUCT, args=args, stage=_stage(args))

    def _rescaled(self, left: Node, right: Node) -> Node | None:
        """constant * (constant * x) as one constant times x; constant * (x + constant) with the constants as one.

        So constants meet and cancel with all their digits, before anything is rounded.
        """
        if right.is_constant:
            left, right = right, left
        if left.is_constant and _holds_constant(right):
            terms = list(zip(right.signs, right.args, strict=True))
            rest = self.signed_sum(*(term for term in terms if not term[1].is_constant))
            offset = self.signed_sum(*(term for term in terms if term[1].is_constant))
            return self.add(self.mul(left, rest), self.mul(left, offset))
        if left.is_constant and right.op is Op.PRODUCT and right not in self.names:
            for one, other in (right.args, right.args[::-1]):
                if one.is_constant:
                    return self.mul(self.mul(left, one), other)
        return None

    def div(self, left: Node, right: Node) -> Node:
        """left / right; a constant divisor becomes a factor."""
        if right.is_constant:
            if right.is_exactly(1):
                return left
            if right.is_exactly(-1):
                return self.neg(left)
            divisor = f"({right.label})" if set("*/ ") & set(right.label) else _bracketed(right.label)
            return self.mul(left, self._derived(f"1/{divisor}", 1 / MP.mpf(right.value)))
        if left.is_exactly(0):
            return left
        return self._intern(
            ("quotient", left.serial, right.serial), op=Op.QUOTIENT, args=(left, right), stage=_stage((left, right))
        )

    def sqrt(self, node: Node) -> Node:
        if node.is_constant:
            if node.structural and node.value in (0, 1):
                return node
            return self._derived(f"sqrt({node.label})", MP.sqrt(node.value))
        return self._intern(("root", node.serial), op=Op.ROOT, args=(node,), stage=node.stage)

    def size(self, node: Node) -> Node:
        if node.is_constant:
            return node if node.value >= 0 else self._negated_constant(node)
        return self._intern(("size", node.serial), op=Op.SIZE, args=(node,), stage=node.stage)

    def sign(self, node: Node) -> Node:
        """The sign of a constant: +1 or -1, but no part of the arm's structure."""
        return self._derived(f"sign of {_bracketed(node.label)}", MP.mpf(1 if node.value >= 0 else -1))

    def choice(self, test: Node, above: Node, otherwise: Node) -> Node:
        """above where test > 0, else otherwise."""
        args = (test, above, otherwise)
        return self._intern(("choice", *(a.serial for a in args)), op=Op.CHOICE, args=args, stage=_stage(args))

    def square(self, node: Node) -> Node:
        return self.mul(node, node) if not node.is_negation else self.square(node.args[0])

    def half(self, node: Node) -> Node:
        return self.mul(node, self._derived("1/2", MP.mpf(1) / 2))

    def fresh_stage(self, node_name: str, stage: int) -> Node:
        """A value that a solvable form makes known at the given stage."""
        return self.input(node_name, stage)


def _stage(args: tuple[Node, ...]) -> int:
    return max(arg.stage for arg in args)


def _bracketed(text: str) -> str:
    return f"({text})" if " " in text or text.startswith("-") else text


def _flattened(terms: tuple[tuple[int, Node], ...]) -> list[tuple[int, Node]]:
    """Open negations, and open inner sums whose constants then fold with another constant."""
    opened: list[tuple[int, Node]] = []
    for sign, node in terms:
        if node.is_exactly(0):
            continue
        if node.is_negation:
            opened.append((-sign, node.args[0]))
        else:
            opened.append((sign, node))
    opened = _opened_where_cancelling(opened)
    with_constants = sum(1 for _, n in opened if n.is_constant or _holds_constant(n))
    if with_constants < 2:
        return opened
    flat: list[tuple[int, Node]] = []
    for sign, node in opened:
        if _holds_constant(node):
            flat.extend((sign * s, a) for s, a in zip(node.signs, node.args, strict=True))
        else:
            flat.append((sign, node))
    return flat


def _opened_where_cancelling(terms: list[tuple[int, Node]]) -> list[tuple[int, Node]]:
    """Open an inner sum that holds a term which another term takes away again, or can be joined with."""
    flat: list[tuple[int, Node]] = []
    for sign, node in terms:
        inner = [(sign * s, a) for s, a in zip(node.signs, node.args, strict=False)]  # only a sum has signs
        values = {_scaled_value(other) for _, other in terms if other is not node} - {None}
        if any((-s, a) in terms or _scaled_value(a) in values for s, a in inner):
            flat.extend(inner)
        else:
            flat.append((sign, node))
    return flat


def _scaled_value(node: Node) -> Node | None:
    """x of a product constant * x."""
    if node.op is Op.PRODUCT and node.args[0].is_constant != node.args[1].is_constant:
        return node.args[1] if node.args[0].is_constant else node.args[0]
    return None


def _constant_factor(node: Node) -> Node:
    return node.args[0] if node.args[0].is_constant else node.args[1]


def _holds_constant(node: Node) -> bool:
    return node.op is Op.SUM and any(arg.is_constant for arg in node.args)


def _cancelled(terms: list[tuple[int, Node]]) -> list[tuple[int, Node]]:
    """Drop pairs of terms that cancel exactly."""
    kept: list[tuple[int, Node]] = []
    for sign, node in terms:
        if (-sign, node) in kept and not node.structural:
            kept.remove((-sign, node))
        else:
            kept.append((sign, node))
    return kept


def reachable(roots: list[Node]) -> list[Node]:
    """All nodes that the roots need, each after its arguments."""
    seen: set[Node] = set()
    order: list[Node] = []

    def visit(node: Node) -> None:
        if node in seen:
            return
        seen.add(node)
        for arg in node.args:
            visit(arg)
        order.append(node)

    for root in roots:
        visit(root)
    return order


def substituted(builder: Builder, roots: list[Node], mapping: dict[Node, Node]) -> list[Node]:
    """The same values with some leaves replaced; what becomes a constant or vanishes does so."""
    done: dict[Node, Node] = dict(mapping)
    for node in reachable(roots):
        if node in done:
            continue
        args = tuple(done[arg] for arg in node.args)
        if args == node.args:
            done[node] = node
        elif node.op is Op.SUM:
            done[node] = builder.signed_sum(*zip(node.signs, args, strict=True))
        elif node.op is Op.PRODUCT:
            done[node] = builder.mul(*args)
        elif node.op is Op.QUOTIENT:
            done[node] = builder.div(*args)
        elif node.op is Op.ROOT:
            done[node] = builder.sqrt(*args)
        elif node.op is Op.SIZE:
            done[node] = builder.size(*args)
        elif node.op is Op.CHOICE:
            done[node] = builder.choice(*args)
    return [done[root] for root in roots]
