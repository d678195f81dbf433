"""Every loop of the C runs a constant number of times at most: read from clang's syntax tree, not by eye.

Accepted is one shape only: for (unsigned i = constant; i < constant; i++), with <, <= or !=, a constant step, and no
assignment to i in the body. `while`, `do` and `goto` are findings whatever they do.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from typing import Any, TypeAlias

from build_checks.static_findings import Finding, laid_out, run_tool, sources

Node: TypeAlias = dict[str, Any]

_NEVER = {"WhileStmt": "while", "DoStmt": "do", "GotoStmt": "goto", "IndirectGotoStmt": "goto *"}
_CONSTANT_LEAVES = frozenset(("IntegerLiteral", "UnaryExprOrTypeTraitExpr", "CharacterLiteral"))
_COMPARISONS = frozenset(("<", "<=", "!=", ">", ">="))
_STEPS = frozenset(("++", "--"))


def loop_findings(files: Mapping[str, str]) -> tuple[Finding, ...]:
    """Every loop whose bound cannot be seen to be constant."""
    with laid_out(files) as folder:
        found = []
        for name in sources(files):
            run = run_tool(["clang", "-std=c99", "-fsyntax-only", "-Xclang", "-ast-dump=json", name], folder)
            found += list(_walk(json.loads(run.stdout), _Place(name)))
    return tuple(sorted(set(found)))


class _Place:
    """clang's tree gives a file and a line only where they differ from the ones before."""

    def __init__(self, file: str) -> None:
        self.file = file
        self.line = 0

    def read(self, place: Node) -> None:
        expanded = place.get("expansionLoc", place)
        self.file = expanded.get("file", self.file)
        self.line = expanded.get("line", self.line)

    def finding(self, rule: str, what: str) -> Finding:
        return Finding("loops", self.file.removeprefix("./"), self.line, rule, what)


def _walk(node: Node, place: _Place) -> Iterator[Finding]:
    place.read(node.get("loc", {}))
    place.read(node.get("range", {}).get("begin", {}))
    kind = node.get("kind")
    if kind in _NEVER:
        yield place.finding(_NEVER[kind], "has no constant bound that can be read from its head")
    elif kind == "ForStmt" and (reason := _unbounded(node)):
        yield place.finding("for", reason)
    for child in node.get("inner", []):
        yield from _walk(child, place)


def _unbounded(loop: Node) -> str | None:
    """Why a for loop is not of the accepted shape; None when it is."""
    start, _, condition, step, body = loop["inner"]
    counter = _counter(start)
    if counter is None:
        return "does not start an integer counter of its own at a constant"
    if not _compares(condition, counter):
        return "does not compare its counter with a constant"
    if not _steps(step, counter):
        return "does not step its counter by a constant"
    if any(_writes(node, counter) for node in _nodes(body)):
        return "writes its counter in the body"
    return None


def _counter(start: Node) -> str | None:
    """The identity of the one variable declared in the loop's head, an integer with a constant start."""
    declared = [node for node in start.get("inner", []) if node.get("kind") == "VarDecl"]
    if start.get("kind") != "DeclStmt" or len(declared) != 1:
        return None
    variable = declared[0]
    integer = "float" not in variable["type"]["qualType"] and "double" not in variable["type"]["qualType"]
    values = variable.get("inner", [])
    return str(variable["id"]) if integer and len(values) == 1 and _is_constant(values[0]) else None


def _is_constant(node: Node) -> bool:
    """An expression of literals, enumerators and sizes."""
    if node.get("kind") in _CONSTANT_LEAVES:
        return True
    if node.get("kind") == "DeclRefExpr":
        return bool(node["referencedDecl"]["kind"] == "EnumConstantDecl")
    children = node.get("inner", [])
    return bool(children) and all(map(_is_constant, children))


def _compares(condition: Node, counter: str) -> bool:
    if condition.get("kind") != "BinaryOperator" or condition.get("opcode") not in _COMPARISONS:
        return False
    left, right = condition["inner"]
    return (_is_variable(left, counter) and _is_constant(right)) or (
        _is_variable(right, counter) and _is_constant(left)
    )


def _is_variable(node: Node, counter: str) -> bool:
    if node.get("kind") in ("ImplicitCastExpr", "ParenExpr"):
        return _is_variable(node["inner"][0], counter)
    return node.get("kind") == "DeclRefExpr" and node["referencedDecl"]["id"] == counter


def _steps(step: Node, counter: str) -> bool:
    if step.get("kind") == "UnaryOperator":
        return step.get("opcode") in _STEPS and _is_variable(step["inner"][0], counter)
    if step.get("kind") == "CompoundAssignOperator":
        left, right = step["inner"]
        return step.get("opcode") in ("+=", "-=") and _is_variable(left, counter) and _is_constant(right)
    return False


def _writes(node: Node, counter: str) -> bool:
    """An assignment to the counter, or its address taken."""
    kind, opcode = node.get("kind"), node.get("opcode")
    assigns = kind == "CompoundAssignOperator" or (kind == "BinaryOperator" and opcode == "=")
    changes = kind == "UnaryOperator" and opcode in (*_STEPS, "&")
    return (assigns or changes) and _is_variable(node["inner"][0], counter)


def _nodes(node: Node) -> Iterator[Node]:
    yield node
    for child in node.get("inner", []):
        yield from _nodes(child)
