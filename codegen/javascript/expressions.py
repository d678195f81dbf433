"""Expressions of C, walked in one scope."""

from __future__ import annotations

import re
from dataclasses import dataclass

from pycparser import c_ast

from codegen.javascript.types import (
    BOOL,
    INT,
    REAL,
    VOID,
    ArrayOf,
    Kind,
    NotTranslatable,
    Number,
    PointerTo,
    Record,
    Type,
    Types,
)
from codegen.javascript.values import (
    ATOM,
    COMPARISON,
    LOGIC,
    PRODUCT,
    SUM,
    TEST,
    Value,
    balanced,
    constant_value,
    converted,
    in_its_type,
    operation,
    promoted,
)

_RESERVED = frozenset(
    re.findall(
        r"\w+",
        """
        arguments async await break case catch class const continue debugger default delete do else enum eval export
        extends false finally for function get if implements import in instanceof interface let new null of package
        private protected public return set static super switch this throw true try typeof undefined var void while
        with yield
        Array ArrayBuffer BigInt BigUint64Array Float64Array Infinity Math NaN Number Object Place fill
        """,
    )
)  # words of JavaScript, and names that the translation itself uses


def js_name(name: str) -> str:
    """A C identifier as one of JavaScript."""
    return f"{name}_" if name in _RESERVED else name


@dataclass
class Scope:
    """What names stand for at a place of the file: their types, and which are held in an array of one.

    cells     those whose address is taken
    function  the one whose body this is; empty outside
    """

    types: Types
    names: dict[str, Type]
    cells: frozenset[str] = frozenset()
    function: str = ""

    def inner(self) -> Scope:
        """A block within this one."""
        return Scope(self.types, dict(self.names), self.cells, self.function)

    def type_of(self, name: str) -> Type:
        if name not in self.names:
            raise NotTranslatable(f"name {name}")
        return self.names[name]


class Expressions:
    """Translates expressions in one scope."""

    def __init__(self, scope: Scope) -> None:
        self.scope = scope

    def value(self, node: c_ast.Node) -> Value:
        match node:
            case c_ast.Constant():
                return constant_value(node)
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
        return Value(js_name(name) + ("[0]" if held else ""), wanted, ATOM)

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
        """Structs and arrays are their own addresses; a number's is what holds it as its entry 0."""
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
        value = promoted(self.value(node.expr))
        if node.op == "+":
            return value
        if value.kind is Kind.REAL:
            return Value(f"{node.op}{value.tight}", REAL, PRODUCT)
        return in_its_type(f"{node.op}{value.tight}", value.type)

    def _pointed_at(self, node: c_ast.Node) -> Value:
        pointer = self.value(node)
        if not isinstance(pointer.type, PointerTo):
            raise NotTranslatable(f"* of {pointer.type}")
        target = pointer.type.target
        return Value(pointer.tight + ("[0]" if isinstance(target, Number) else ""), target, ATOM)

    def _step(self, node: c_ast.UnaryOp) -> Value:
        value = self.value(node.expr)
        if value.kind not in (Kind.INT, Kind.UNSIGNED):
            raise NotTranslatable(f"{node.op} of {value.type}")
        return Value(f"{node.op}{value.text}", value.type)

    def _binary(self, node: c_ast.BinaryOp) -> Value:
        if node.op in ("&&", "||"):
            return self._both(node)
        return operation(node.op, self.value(node.left), self.value(node.right))

    def _both(self, node: c_ast.BinaryOp) -> Value:
        """A chain of one operator needs no brackets; one in the other keeps them."""
        left, right = self.condition(node.left), self.condition(node.right)
        chained = isinstance(node.left, c_ast.BinaryOp) and node.left.op == node.op
        first = left.text if chained else left.beside(COMPARISON)
        return Value(f"{first} {node.op} {right.beside(COMPARISON)}", BOOL, LOGIC)

    def _ternary(self, node: c_ast.TernaryOp) -> Value:
        above, otherwise = self.value(node.iftrue), self.value(node.iffalse)
        if above.kind is not None and otherwise.kind is not None and above.kind is not otherwise.kind:
            above, otherwise = balanced(above, otherwise)
        test = self.condition(node.cond).beside(LOGIC)
        return Value(f"{test} ? {above.beside(SUM)} : {otherwise.beside(SUM)}", above.type, TEST)

    def _cast(self, node: c_ast.Cast) -> Value:
        wanted = self.scope.types.of(node.to_type)
        value = self.value(node.expr)
        if isinstance(wanted, Number):
            return converted(value, wanted)
        if isinstance(wanted, PointerTo) and _pointed_at(value.type) == _row_of(wanted.target):
            return Value(f"[{value.text}]", wanted, ATOM)  # one row, as rows
        return Value(value.text, wanted, value.rank)

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
        result = converted(operation(op, target, self.value(node.rvalue)), target.type)
        return Value(f"{target.text} = {result.text}", target.type)


def _pointed_at(pointer: Type) -> Type | None:
    """What the entries of an array or of what a pointer leads to are."""
    if isinstance(pointer, ArrayOf):
        return pointer.element
    return pointer.target if isinstance(pointer, PointerTo) else None


def _row_of(rows: Type) -> Type | None:
    """What the entries of a row are; None where it is no row."""
    return rows.element if isinstance(rows, ArrayOf) else None
