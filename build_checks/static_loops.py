"""Every loop of the C runs a constant number of times at most: read from clang's syntax tree, not by eye.

Accepted is one shape only: for (unsigned i = constant; i < constant; i++), with any comparison, a constant step, and no
assignment to i in the body. In place of a constant may stand the counter of an accepted loop around it, and beside the
comparison another condition that ends the loop sooner. `while`, `do` and `goto` are findings whatever they do.
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


def _walk(node: Node, place: _Place, counters: frozenset[str] = frozenset()) -> Iterator[Finding]:
    """`counters`: identities of the counters of the accepted loops around the node."""
    place.read(node.get("loc", {}))
    place.read(node.get("range", {}).get("begin", {}))
    kind = node.get("kind")
    if kind in _NEVER:
        yield place.finding(_NEVER[kind], "has no constant bound that can be read from its head")
    elif kind == "ForStmt":
        loop = _Loop(node, counters)
        if loop.fault:
            yield place.finding("for", loop.fault)
        else:
            counters = counters | {loop.counter}
    for child in node.get("inner", []):
        yield from _walk(child, place, counters)


class _Loop:
    """A for loop inside loops with the counters `around`.

    counter  the identity of its counter; "" when it has none of its own
    fault    why it is not of the accepted shape; None when it is
    """

    def __init__(self, node: Node, around: frozenset[str]) -> None:
        start, _, self._condition, self._step, self._body = node["inner"]
        self._around = around
        self.counter = self._declared(start)
        self.fault = self._find_fault()

    def _find_fault(self) -> str | None:
        if not self.counter:
            return "does not start an integer counter of its own at a constant"
        if not self._compares(self._condition):
            return "does not compare its counter with a constant"
        if not self._steps():
            return "does not step its counter by a constant"
        if any(_writes(node, self.counter) for node in _nodes(self._body)):
            return "writes its counter in the body"
        return None

    def _declared(self, start: Node) -> str:
        """The one variable declared in the loop's head, an integer with a constant start."""
        declared = [node for node in start.get("inner", []) if node.get("kind") == "VarDecl"]
        if start.get("kind") != "DeclStmt" or len(declared) != 1:
            return ""
        kind, values = declared[0]["type"]["qualType"], declared[0].get("inner", [])
        integer = "float" not in kind and "double" not in kind
        return str(declared[0]["id"]) if integer and len(values) == 1 and self._is_constant(values[0]) else ""

    def _is_constant(self, node: Node) -> bool:
        """An expression of literals, enumerators, sizes and counters around."""
        if node.get("kind") in _CONSTANT_LEAVES:
            return True
        if node.get("kind") == "DeclRefExpr":
            named = node["referencedDecl"]
            return named["kind"] == "EnumConstantDecl" or named["id"] in self._around
        children = node.get("inner", [])
        return bool(children) and all(map(self._is_constant, children))

    def _compares(self, condition: Node) -> bool:
        if condition.get("kind") == "ParenExpr":
            return self._compares(condition["inner"][0])
        if condition.get("kind") != "BinaryOperator":
            return False
        left, right = condition["inner"]
        if condition["opcode"] == "&&":
            return self._compares(left) or self._compares(right)
        pairs = ((left, right), (right, left)) if condition["opcode"] in _COMPARISONS else ()
        return any(_is_variable(one, self.counter) and self._is_constant(other) for one, other in pairs)

    def _steps(self) -> bool:
        if self._step.get("kind") == "UnaryOperator":
            return self._step["opcode"] in _STEPS and _is_variable(self._step["inner"][0], self.counter)
        if self._step.get("kind") == "CompoundAssignOperator" and self._step["opcode"] in ("+=", "-="):
            left, right = self._step["inner"]
            return _is_variable(left, self.counter) and all(map(_is_literal, _leaves(right)))
        return False


def _is_literal(node: Node) -> bool:
    return node.get("kind") in _CONSTANT_LEAVES


def _leaves(node: Node) -> Iterator[Node]:
    return (each for each in _nodes(node) if not each.get("inner"))


def _is_variable(node: Node, counter: str) -> bool:
    if node.get("kind") in ("ImplicitCastExpr", "ParenExpr"):
        return _is_variable(node["inner"][0], counter)
    return node.get("kind") == "DeclRefExpr" and bool(node["referencedDecl"]["id"] == counter)


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
