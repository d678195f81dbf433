"""Values: C's numbers and conversions, in JavaScript.

Every number of JavaScript is a double, so arithmetic of doubles stands as it is; whole numbers of 32 bits are brought
back to 32 bits where a sum or a product may leave them, 64-bit words are BigInts, cut to 64 bits.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from pycparser import c_ast

from codegen.javascript.types import BOOL, INT, REAL, UNSIGNED, WORD, Kind, NotTranslatable, Number, Type

_COMPARISONS = {"==": "===", "!=": "!==", "<": "<", ">": ">", "<=": "<=", ">=": ">="}
LOOSE, TEST, LOGIC, COMPARISON, SUM, PRODUCT, ATOM = range(7)
_RANKS = {"+": SUM, "-": SUM, "*": PRODUCT, "/": PRODUCT}


@dataclass(frozen=True, slots=True)
class Value:
    """JavaScript text and the C type of what it gives.

    rank      how tightly its outermost operator binds
    constant  a whole number of 31 bits, the same in every type
    """

    text: str
    type: Type
    rank: int = LOOSE
    constant: bool = False

    @property
    def kind(self) -> Kind | None:
        return self.type.kind if isinstance(self.type, Number) else None

    @property
    def tight(self) -> str:
        """As what an operator of one operand, an index or a member stands at."""
        return self.beside(ATOM)

    def beside(self, rank: int) -> str:
        """As an operand: in brackets where its own operator binds less tightly."""
        return self.text if self.rank >= rank else f"({self.text})"


def converted(value: Value, wanted: Type) -> Value:
    """As by assignment to the wanted type."""
    if not isinstance(wanted, Number) or value.kind in (None, wanted.kind):
        return value
    source = value.kind
    match wanted.kind:
        case Kind.VOID:
            return value
        case Kind.BOOL:
            return Value(f"{value.beside(SUM)} !== {'0n' if source is Kind.WORD else '0'}", BOOL, COMPARISON)
        case Kind.WORD:
            return _word(value)
        case Kind.REAL:
            text = f"Number({value.text})" if source in (Kind.BOOL, Kind.WORD) else value.text
            return Value(text, REAL, ATOM if text != value.text else value.rank)
        case Kind.INT:
            return Value(f"Number({value.text})", INT, ATOM) if source is Kind.BOOL else _cut(value, "| 0", INT)
        case Kind.UNSIGNED:
            return _cut(value, ">>> 0", UNSIGNED)
    raise NotTranslatable(f"a conversion to {wanted}")


def _cut(value: Value, cut: str, wanted: Type) -> Value:
    if value.constant:
        return Value(value.text, wanted, ATOM, True)
    if value.kind is Kind.WORD:
        return Value(f"Number({value.text} & 0xFFFFFFFFn) {cut}", wanted)
    return Value(f"{value.tight} {cut}", wanted)


def _word(value: Value) -> Value:
    if value.kind is Kind.REAL:
        return Value(f"BigInt(Math.trunc({value.text}))", WORD, ATOM)
    if re.fullmatch(r"0x[0-9A-Fa-f]+|\d+", value.text):
        return Value(f"{value.text}n", WORD, ATOM)
    return Value(f"BigInt.asUintN(64, BigInt({value.text}))", WORD, ATOM)


def constant_value(node: c_ast.Constant) -> Value:
    if node.type.endswith("double") or node.type == "float":
        return Value(node.value.rstrip("fF"), REAL, ATOM)
    digits = node.value.rstrip("uUlL")
    if int(digits, 0) > 0xFFFFFFFF:
        return Value(f"{digits}n", WORD, ATOM)
    return Value(digits, UNSIGNED if node.value != digits else INT, ATOM, int(digits, 0) < 2**31)


def promoted(value: Value) -> Value:
    return converted(value, INT) if value.kind is Kind.BOOL else value


def balanced(left: Value, right: Value) -> tuple[Value, Value]:
    """Both in the type that the usual arithmetic conversions give."""
    left, right = promoted(left), promoted(right)
    if left.kind is None or right.kind is None:
        raise NotTranslatable(f"an operation on {left.type} and {right.type}")
    wanted = Number(max(left.kind, right.kind, key=lambda kind: kind.value))
    return converted(left, wanted), converted(right, wanted)


def operation(op: str, left: Value, right: Value) -> Value:
    if op in _COMPARISONS and BOOL in (left.type, right.type) and left.type == right.type:
        return Value(f"{left.tight} {_COMPARISONS[op]} {right.tight}", BOOL, COMPARISON)
    if op in ("<<", ">>"):  # the result has the left operand's type (ISO/IEC 9899:2011, 6.5.7 p3)
        return _shift(op, promoted(left), promoted(right))
    left, right = balanced(left, right)
    if op in _COMPARISONS:
        return Value(f"{left.beside(SUM)} {_COMPARISONS[op]} {right.beside(SUM)}", BOOL, COMPARISON)
    if op == "*" and left.kind in (Kind.INT, Kind.UNSIGNED):
        return in_its_type(f"Math.imul({left.text}, {right.text})", left.type)
    if left.kind is Kind.REAL:
        return _real_operation(op, left, right)
    return in_its_type(f"{left.tight} {op} {right.tight}", left.type)


def _real_operation(op: str, left: Value, right: Value) -> Value:
    """In the order that the C has: a sum of sums keeps its brackets where they change that order."""
    rank = _RANKS[op]
    return Value(f"{left.beside(rank)} {op} {right.beside(rank + 1)}", REAL, rank)


def _shift(op: str, left: Value, right: Value) -> Value:
    if left.kind is Kind.WORD:
        return in_its_type(f"{left.tight} {op} {converted(right, WORD).tight}", WORD, exact=op == ">>")
    js = ">>>" if op == ">>" and left.kind is Kind.UNSIGNED else op
    return in_its_type(f"{left.tight} {js} {right.tight}", left.type)


def in_its_type(text: str, wanted: Type, exact: bool = False) -> Value:
    """Brought back to the digits of its type."""
    if exact:
        return Value(text, wanted)
    match wanted:
        case Number(kind=Kind.INT):
            return Value(f"({text}) | 0", wanted)
        case Number(kind=Kind.UNSIGNED):
            return Value(f"({text}) >>> 0", wanted)
        case Number(kind=Kind.WORD):
            return Value(f"BigInt.asUintN(64, {text})", wanted, ATOM)
    return Value(text, wanted)
