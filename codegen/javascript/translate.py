"""From the two files of an arm's C, in doubles, to one JavaScript expression that gives its functions."""

from __future__ import annotations

from pycparser import CParser, c_ast

from codegen.javascript.expressions import Scope, js_name
from codegen.javascript.preprocess import preprocessed
from codegen.javascript.records import record_lines
from codegen.javascript.statements import block_lines, declaration
from codegen.javascript.types import Function, NotTranslatable, Number, Record, Types

_TYPEDEFS = "typedef _Bool bool; typedef int int32_t; typedef unsigned uint32_t; typedef unsigned long uint64_t;\n"
_HELPERS = """\
class Place {
  constructor(holder, key) {
    this.holder = holder;
    this.key = key;
  }
  get 0() {
    return this.holder[this.key];
  }
  set 0(value) {
    this.holder[this.key] = value;
  }
}
function fill(target, source) {
  source.forEach((value, i) => {
    if (Array.isArray(value) || ArrayBuffer.isView(value)) {
      fill(target[i], value);
    } else if (typeof value === "object") {
      target[i].become(value);
    } else {
      target[i] = value;
    }
  });
}
""".splitlines()

# What JavaScript has itself: the same bits for every double, and sooner than by whole numbers.
_NATIVE = {
    "sqrt": "return x > 0 ? Math.sqrt(x) : 0;",
    "abs": "return Math.abs(x);",
    "is_finite": "return Number.isFinite(x);",
}
_INTERFACE = ("forward", "inverse", "inverse_all", "inverse_nearest", "branch_of", "jacobian", "atan2")


def javascript(files: dict[str, str], prefix: str) -> str:
    """An expression whose value is an object of the functions of `prefix`_kin.h, by their names without the prefix,
    and of `pose()`, which makes an arm_pose. Where C takes a pointer to a number, give an array of one.

    files  {file name: text} of C that was generated in doubles with its own mathematics
    Raises NotTranslatable where the C holds something that this translation does not know.
    """
    text = preprocessed(files[f"{prefix}_kin.h"], files[f"{prefix}_kin.c"])
    tree = CParser().parse(_TYPEDEFS + text)
    lines = [*_HELPERS, *_File(prefix).lines(tree)]
    return "\n".join(["(() => {", '  "use strict";', *(f"  {line}" for line in lines), "})()"])


class _File:
    """Translates the declarations of a file, in their order."""

    def __init__(self, prefix: str) -> None:
        self._prefix = prefix
        self._types = Types()
        self._scope = Scope(self._types, {})

    def lines(self, tree: c_ast.FileAST) -> list[str]:
        found = [line for node in tree.ext for line in self._declaration(node)]
        return [*found, *self._interface()]

    def _declaration(self, node: c_ast.Node) -> list[str]:
        match node:
            case c_ast.Typedef():
                return self._typedef(node)
            case c_ast.FuncDef():
                return self._function(node)
            case c_ast.Decl(type=c_ast.FuncDecl()):
                self._prototype(node)
                return []
            case c_ast.Decl(type=c_ast.Enum()):
                return self._enum(node.type)
            case c_ast.Decl():
                return [declaration(node, self._scope)]
        raise NotTranslatable(f"declaration {type(node).__name__}")

    def _typedef(self, node: c_ast.Typedef) -> list[str]:
        if node.name in self._types.named:
            return []
        wanted = self._types.named[node.name] = self._types.of(node)
        if isinstance(node.type.type, c_ast.Enum):
            return self._constants(node.type.type)
        return record_lines(wanted, self._types) if isinstance(wanted, Record) else []

    def _enum(self, node: c_ast.Enum) -> list[str]:
        self._types.of(node)
        return self._constants(node)

    def _constants(self, node: c_ast.Enum) -> list[str]:
        return [f"const {row.name} = {self._types.constants[row.name]};" for row in node.values.enumerators]

    def _prototype(self, node: c_ast.Decl) -> list[c_ast.Decl]:
        parameters = [row for row in (node.type.args.params if node.type.args else []) if isinstance(row, c_ast.Decl)]
        arguments = tuple(self._types.of(row.type) for row in parameters)
        self._types.functions[node.name] = Function(arguments, self._types.of(node.type.type))
        return parameters

    def _function(self, node: c_ast.FuncDef) -> list[str]:
        name = node.decl.name
        parameters = self._prototype(node.decl)
        head = f"function {js_name(name)}({', '.join(js_name(row.name) for row in parameters)}) {{"
        native = _NATIVE.get(name.removeprefix(f"{self._prefix}_"))
        if native is not None:
            return [head.replace(f"({parameters[0].name})", "(x)"), f"  {native}", "}"]
        names = dict(zip((row.name for row in parameters), self._types.functions[name].arguments, strict=True))
        cells = frozenset(_addressed(node.body))
        if any(isinstance(names[name], Number) for name in cells & names.keys()):
            raise NotTranslatable(f"the address of an argument of {name}")
        return [head, *block_lines(node.body, Scope(self._types, self._scope.names | names, cells, name)), "}"]

    def _interface(self) -> list[str]:
        functions = [f"  {name}: {self._prefix}_{name}," for name in _INTERFACE]
        return [
            "return {",
            *functions,
            f"  pose: () => new {self._prefix}_pose(),",
            "};",
        ]


def _addressed(node: c_ast.Node) -> set[str]:
    """Names whose address is taken."""
    found = {node.expr.name} if isinstance(node, c_ast.UnaryOp) and _takes_address(node) else set()
    return found.union(*(_addressed(child) for _, child in node.children()))


def _takes_address(node: c_ast.UnaryOp) -> bool:
    return node.op == "&" and isinstance(node.expr, c_ast.ID)
