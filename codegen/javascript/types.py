"""The types that generated C uses, and what each is in JavaScript.

A number is a number; a 64-bit word is a BigInt; an array is an array, of doubles a Float64Array; a struct is an object
that is made once and filled in place, so that a pointer to it is the object itself. A pointer to a number is whatever
holds the number as its entry 0: an array, or a `Place` within one or within a struct.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import Enum

from pycparser import c_ast


class Kind(Enum):
    """Numbers, by rank of the usual arithmetic conversions (ISO/IEC 9899:2011, 6.3.1.8)."""

    VOID = 0
    BOOL = 1
    INT = 2  # int and what is promoted to it
    UNSIGNED = 3  # 32 bits
    WORD = 4  # 64 bits, unsigned
    REAL = 5


@dataclass(frozen=True, slots=True)
class Number:
    kind: Kind


@dataclass(frozen=True, slots=True)
class ArrayOf:
    element: Type
    length: int | None


@dataclass(frozen=True, slots=True)
class PointerTo:
    target: Type


@dataclass(frozen=True, slots=True)
class Record:
    """A struct or union, by its name."""

    name: str
    union: bool = False


Type = Number | ArrayOf | PointerTo | Record
REAL, BOOL, INT, UNSIGNED = Number(Kind.REAL), Number(Kind.BOOL), Number(Kind.INT), Number(Kind.UNSIGNED)
WORD, VOID = Number(Kind.WORD), Number(Kind.VOID)

_NAMES = {
    "double": REAL,
    "bool": BOOL,
    "_Bool": BOOL,
    "int": INT,
    "int32_t": INT,
    "signed char": INT,
    "unsigned": UNSIGNED,
    "unsigned int": UNSIGNED,
    "uint32_t": UNSIGNED,
    "unsigned char": INT,
    "uint64_t": WORD,
    "void": VOID,
}


@dataclass(frozen=True, slots=True)
class Function:
    """What a function takes and gives."""

    arguments: tuple[Type, ...]
    result: Type


class NotTranslatable(Exception):
    """Generated C holds something that this translation does not know: a fault of the tool."""


@dataclass
class Types:
    """What the file's own declarations have named so far."""

    named: dict[str, Type] = field(default_factory=lambda: dict(_NAMES))
    members: dict[str, dict[str, Type]] = field(default_factory=dict)  # of each struct or union
    constants: dict[str, int] = field(default_factory=dict)  # of enums
    functions: dict[str, Function] = field(default_factory=dict)

    def of(self, node: c_ast.Node) -> Type:
        """The type that a declaration's tree spells."""
        match node:
            case c_ast.TypeDecl():
                return self.of(node.type)
            case c_ast.Typename() | c_ast.Decl() | c_ast.Typedef():
                return self.of(node.type)
            case c_ast.IdentifierType():
                return self._by_name(" ".join(node.names))
            case c_ast.PtrDecl():
                return PointerTo(self.of(node.type))
            case c_ast.ArrayDecl():
                return ArrayOf(self.of(node.type), None if node.dim is None else self.integer(node.dim))
            case c_ast.Struct() | c_ast.Union():
                return self._record(node)
            case c_ast.Enum():
                self._enum(node)
                return INT
        raise NotTranslatable(f"type {type(node).__name__}")

    def _by_name(self, name: str) -> Type:
        if name not in self.named:
            raise NotTranslatable(f"type {name}")
        return self.named[name]

    def _record(self, node: c_ast.Struct | c_ast.Union) -> Record:
        record = Record(node.name, isinstance(node, c_ast.Union))
        if node.decls:
            self.members[record.name] = {member.name: self.of(member.type) for member in node.decls}
        return record

    def _enum(self, node: c_ast.Enum) -> None:
        value = -1
        for row in node.values.enumerators if node.values else ():
            value = value + 1 if row.value is None else self.integer(row.value)
            self.constants[row.name] = value

    def integer(self, node: c_ast.Node) -> int:
        """A constant expression."""
        match node:
            case c_ast.Constant():
                return int(node.value.rstrip("uUlL"), 0)
            case c_ast.ID():
                return self.constants[node.name]
            case c_ast.BinaryOp(op="+"):
                return self.integer(node.left) + self.integer(node.right)
            case c_ast.BinaryOp(op="-"):
                return self.integer(node.left) - self.integer(node.right)
            case c_ast.BinaryOp(op="*"):
                return self.integer(node.left) * self.integer(node.right)
            case c_ast.UnaryOp(op="-"):
                return -self.integer(node.expr)
        raise NotTranslatable(f"constant expression {type(node).__name__}")

    def member(self, record: Type, name: str) -> Type:
        if not isinstance(record, Record):
            raise NotTranslatable(f"member {name} of {record}")
        return self.members[record.name][name]

    def fresh(self, wanted: Type) -> str:
        """JavaScript that makes a value of the type, all zero."""
        match wanted:
            case Number(kind=Kind.WORD):
                return "0n"
            case Number(kind=Kind.BOOL):
                return "false"
            case Number():
                return "0"
            case PointerTo():
                return "null"
            case Record():
                return f"new {wanted.name}()"
            case ArrayOf(element=element) if element == REAL:
                return f"new Float64Array({wanted.length})"
            case ArrayOf():
                return f"Array.from({{ length: {wanted.length} }}, () => {self.fresh(wanted.element)})"

    def filled(self, wanted: Type, target: str, source: str) -> list[str]:
        """Statements that copy a value into one that is there."""
        match wanted:
            case Record():
                return [f"{target}.become({source});"]
            case ArrayOf():
                return [f"fill({target}, {source});"]
            case Number() | PointerTo():
                return [f"{target} = {source};"]
        raise NotTranslatable(f"a copy of {wanted}")
