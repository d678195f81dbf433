"""Expressions: C's numbers and conversions, in JavaScript.

Every number of JavaScript is a double, so arithmetic of doubles stands as it is; whole numbers of 32 bits are brought
back to 32 bits where a sum or a product may leave them, 64-bit words are BigInts, cut to 64 bits.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from pycparser import c_ast

from codegen.javascript.types import (
    BOOL,
    INT,
    REAL,
    UNSIGNED,
    VOID,
    WORD,
    ArrayOf,
    Kind,
    NotTranslatable,
    Number,
    PointerTo,
    Record,
    Type,
    Types,
)

_COMPARISONS = {"==": "===", "!=": "!==", "<": "<", ">": ">", "<=": "<=", ">=": ">="}
LOOSE, TEST, LOGIC, COMPARISON, SUM, PRODUCT, ATOM = range(7)
_RANKS = {"+": SUM, "-": SUM, "*": PRODUCT, "/": PRODUCT}
_RESERVED = frozenset(
    re.findall(
        r"\w+",
        """
        arguments async await break case catch class const continue debugger default delete do else enum eval export
        extends false finally for function get if implements import in instanceof interface let new null of package
        private protected public return set static super switch this throw true try typeof undefined var void while
        with yield
        Array ArrayBuffer BigInt BigUint64Array Cell Float64Array Infinity Math NaN Number Object Place fill
        """,
    )
)  # words of JavaScript, and names that the translation itself uses


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


def js_name(name: str) -> str:
    """A C identifier as one of JavaScript."""
    return f"{name}_" if name in _RESERVED else name


@dataclass
class Scope:
    """What names stand for at a place of the file: their types, and which are held in a Cell as their address is taken."""

    types: Types
    names: dict[str, Type]
    cells: frozenset[str] = frozenset()
    function: str = ""  # the one whose body this is

    def inner(self) -> Scope:
        """A block within this one."""
        return Scope(self.types, dict(self.names), self.cells, self.function)

    def type_of(self, name: str) -> Type:
        if name not in self.names:
            raise NotTranslatable(f"name {name}")
        return self.names[name]


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


class Expressions:
    """Translates expressions in one scope."""

    def __init__(self, scope: Scope) -> None:
        self.scope = scope

    def value(self, node: c_ast.Node) -> Value:
        match node:
            case c_ast.Constant():
                return _constant(node)
            case c_ast.ID():
                return self._identifier(node.name)
            case c_ast.ArrayRef():
                return self._element(node)
            case c_ast.StructRef():
                return self._member(node)
            case c_ast.FuncCall():
                return self._call(node)
            case c_ast.UnaryOp():
                return self._unary(node)
            case c_ast.BinaryOp():
                return self._binary(node)
            case c_ast.TernaryOp():
                return self._ternary(node)
            case c_ast.Cast():
                return self._cast(node)
            case c_ast.Assignment():
                return self.assignment(node)
        raise NotTranslatable(f"expression {type(node).__name__}")

    def as_type(self, node: c_ast.Node, wanted: Type) -> Value:
        if isinstance(node, c_ast.InitList):
            return self._list(node, wanted)
        if isinstance(wanted, ArrayOf) and isinstance(node, c_ast.UnaryOp) and node.op == "&":
            return self._rest_of_array(node.expr)
        return converted(self.value(node), wanted)

    def _rest_of_array(self, node: c_ast.Node) -> Value:
        """The address of an entry where an array is wanted: the array from there on."""
        if not isinstance(node, c_ast.ArrayRef):
            raise NotTranslatable(f"the address of {type(node).__name__} as an array")
        row, first = self.value(node.name), self.value(node.subscript)
        return Value(f"{row.tight}.subarray({first.text})", row.type, ATOM)

    def _list(self, node: c_ast.InitList, wanted: Type) -> Value:
        if isinstance(wanted, ArrayOf):
            texts = [self.as_type(item, wanted.element).text for item in node.exprs]
            text = ", ".join(texts)
            return Value(f"Float64Array.of({text})" if wanted.element == REAL else f"[{text}]", wanted, ATOM)
        if not isinstance(wanted, Record):
            raise NotTranslatable(f"a list for {wanted}")
        members = self.scope.types.members[wanted.name]
        texts = [self.as_type(item, member).text for item, member in zip(node.exprs, members.values(), strict=True)]
        return Value(f"new {wanted.name}({', '.join(texts)})", wanted, ATOM)

    # -- places ------------------------------------------------------------------------------------------------------
    def _identifier(self, name: str) -> Value:
        if name in ("true", "false"):
            return Value(name, BOOL, ATOM)
        if name in self.scope.types.constants and name not in self.scope.names:
            return Value(name, INT, ATOM, self.scope.types.constants[name] >= 0)
        wanted = self.scope.type_of(name)
        held = name in self.scope.cells and isinstance(wanted, Number)
        return Value(js_name(name) + (".v" if held else ""), wanted, ATOM)

    def _element(self, node: c_ast.ArrayRef) -> Value:
        row = self.value(node.name)
        if not isinstance(row.type, ArrayOf | PointerTo):
            raise NotTranslatable(f"an index into {row.type}")
        element = row.type.element if isinstance(row.type, ArrayOf) else row.type.target
        return Value(f"{row.tight}[{self.value(node.subscript).text}]", element, ATOM)

    def _member(self, node: c_ast.StructRef) -> Value:
        whole = self.value(node.name)
        record = whole.type.target if isinstance(whole.type, PointerTo) else whole.type
        return Value(f"{whole.tight}.{node.field.name}", self.scope.types.member(record, node.field.name), ATOM)

    def _address(self, node: c_ast.Node) -> Value:
        """Structs and arrays are their own addresses; a number's is a Cell or a Place."""
        value = self.value(node)
        pointer = PointerTo(value.type)
        if not isinstance(value.type, Number):
            return Value(value.text, pointer, value.rank)
        match node:
            case c_ast.ID():
                return Value(js_name(node.name), pointer, ATOM)
            case c_ast.ArrayRef():
                row, index = self.value(node.name), self.value(node.subscript)
                return Value(f"new Place({row.text}, {index.text})", pointer, ATOM)
            case c_ast.StructRef():
                return Value(f'new Place({self.value(node.name).text}, "{node.field.name}")', pointer, ATOM)
        raise NotTranslatable(f"the address of {type(node).__name__}")

    # -- operators ---------------------------------------------------------------------------------------------------
    def _unary(self, node: c_ast.UnaryOp) -> Value:
        match node.op:
            case "&":
                return self._address(node.expr)
            case "*":
                return self._pointed_at(node.expr)
            case "!":
                return Value(f"!{self.condition(node.expr).tight}", BOOL, PRODUCT)
            case "++" | "--":
                return self._step(node)
            case "p++" | "p--":
                raise NotTranslatable("the value before a step")
        value = _promoted(self.value(node.expr))
        if node.op == "+":
            return value
        if value.kind is Kind.REAL:
            return Value(f"{node.op}{value.tight}", REAL, PRODUCT)
        return _result(f"{node.op}{value.tight}", value.type)

    def _pointed_at(self, node: c_ast.Node) -> Value:
        pointer = self.value(node)
        if not isinstance(pointer.type, PointerTo):
            raise NotTranslatable(f"* of {pointer.type}")
        target = pointer.type.target
        return Value(pointer.tight + (".v" if isinstance(target, Number) else ""), target, ATOM)

    def _step(self, node: c_ast.UnaryOp) -> Value:
        value = self.value(node.expr)
        if value.kind not in (Kind.INT, Kind.UNSIGNED):
            raise NotTranslatable(f"{node.op} of {value.type}")
        return Value(f"{node.op}{value.text}", value.type)

    def _binary(self, node: c_ast.BinaryOp) -> Value:
        if node.op in ("&&", "||"):
            return self._both(node)
        return _operation(node.op, self.value(node.left), self.value(node.right))

    def _both(self, node: c_ast.BinaryOp) -> Value:
        """A chain of one operator needs no brackets; one in the other keeps them."""
        left, right = self.condition(node.left), self.condition(node.right)
        chained = isinstance(node.left, c_ast.BinaryOp) and node.left.op == node.op
        first = left.text if chained else left.beside(COMPARISON)
        return Value(f"{first} {node.op} {right.beside(COMPARISON)}", BOOL, LOGIC)

    def _ternary(self, node: c_ast.TernaryOp) -> Value:
        above, otherwise = self.value(node.iftrue), self.value(node.iffalse)
        if above.kind is not None and otherwise.kind is not None and above.kind is not otherwise.kind:
            above, otherwise = _balanced(above, otherwise)
        test = self.condition(node.cond).beside(LOGIC)
        return Value(f"{test} ? {above.beside(SUM)} : {otherwise.beside(SUM)}", above.type, TEST)

    def _cast(self, node: c_ast.Cast) -> Value:
        wanted = self.scope.types.of(node.to_type)
        value = self.value(node.expr)
        if not isinstance(wanted, Number):
            return Value(value.text, wanted, value.rank)
        return converted(value, wanted)

    def condition(self, node: c_ast.Node) -> Value:
        return converted(self.value(node), BOOL)

    # -- calls and assignments ---------------------------------------------------------------------------------------
    def _call(self, node: c_ast.FuncCall) -> Value:
        function = self.scope.types.functions.get(node.name.name)
        if function is None:
            raise NotTranslatable(f"a call of {node.name.name}")
        nodes = node.args.exprs if node.args else []
        texts = [self.as_type(item, wanted).text for item, wanted in zip(nodes, function.arguments, strict=True)]
        return Value(f"{js_name(node.name.name)}({', '.join(texts)})", function.result, ATOM)

    def assignment(self, node: c_ast.Assignment) -> Value:
        target = self.value(node.lvalue)
        if node.op == "=":
            source = self.as_type(node.rvalue, target.type)
            if isinstance(target.type, Record):
                return Value(f"{target.text}.become({source.text})", VOID, ATOM)
            return Value(f"{target.text} = {source.text}", target.type)
        op = node.op.removesuffix("=")
        if target.kind is Kind.REAL:
            return Value(f"{target.text} {node.op} {self.as_type(node.rvalue, REAL).text}", REAL)
        result = converted(_operation(op, target, self.value(node.rvalue)), target.type)
        return Value(f"{target.text} = {result.text}", target.type)


def _constant(node: c_ast.Constant) -> Value:
    if node.type.endswith("double") or node.type == "float":
        return Value(node.value.rstrip("fF"), REAL, ATOM)
    digits = node.value.rstrip("uUlL")
    if int(digits, 0) > 0xFFFFFFFF:
        return Value(f"{digits}n", WORD, ATOM)
    return Value(digits, UNSIGNED if node.value != digits else INT, ATOM, int(digits, 0) < 2**31)


def _promoted(value: Value) -> Value:
    return converted(value, INT) if value.kind is Kind.BOOL else value


def _balanced(left: Value, right: Value) -> tuple[Value, Value]:
    """Both in the type that the usual arithmetic conversions give."""
    left, right = _promoted(left), _promoted(right)
    if left.kind is None or right.kind is None:
        raise NotTranslatable(f"an operation on {left.type} and {right.type}")
    wanted = Number(max(left.kind, right.kind, key=lambda kind: kind.value))
    return converted(left, wanted), converted(right, wanted)


def _operation(op: str, left: Value, right: Value) -> Value:
    if op in _COMPARISONS and BOOL in (left.type, right.type) and left.type == right.type:
        return Value(f"{left.tight} {_COMPARISONS[op]} {right.tight}", BOOL, COMPARISON)
    if op in ("<<", ">>"):  # the result has the left operand's type (ISO/IEC 9899:2011, 6.5.7 p3)
        return _shift(op, _promoted(left), _promoted(right))
    left, right = _balanced(left, right)
    if op in _COMPARISONS:
        return Value(f"{left.beside(SUM)} {_COMPARISONS[op]} {right.beside(SUM)}", BOOL, COMPARISON)
    if op == "*" and left.kind in (Kind.INT, Kind.UNSIGNED):
        return _result(f"Math.imul({left.text}, {right.text})", left.type)
    if left.kind is Kind.REAL:
        return _real_operation(op, left, right)
    return _result(f"{left.tight} {op} {right.tight}", left.type)


def _real_operation(op: str, left: Value, right: Value) -> Value:
    """In the order that the C has: a sum of sums keeps its brackets where they change that order."""
    rank = _RANKS[op]
    return Value(f"{left.beside(rank)} {op} {right.beside(rank + 1)}", REAL, rank)


def _shift(op: str, left: Value, right: Value) -> Value:
    if left.kind is Kind.WORD:
        return _result(f"{left.tight} {op} {converted(right, WORD).tight}", WORD, exact=op == ">>")
    js = ">>>" if op == ">>" and left.kind is Kind.UNSIGNED else op
    return _result(f"{left.tight} {js} {right.tight}", left.type)


def _result(text: str, wanted: Type, exact: bool = False) -> Value:
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
