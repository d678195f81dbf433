"""Statements and blocks of a function."""

from __future__ import annotations

from pycparser import c_ast

from codegen.javascript.expressions import Expressions, Scope, js_name
from codegen.javascript.types import ArrayOf, NotTranslatable, Number, Record, Type

_INDENT = "  "


def block_lines(body: c_ast.Node | list[c_ast.Node], scope: Scope) -> list[str]:
    """What stands between the braces, indented; names declared in it are not seen outside."""
    items = body if isinstance(body, list) else (body.block_items or []) if isinstance(body, c_ast.Compound) else [body]
    inner = scope.inner()
    return [_INDENT + line for item in items for line in statement_lines(item, inner)]


def statement_lines(node: c_ast.Node, scope: Scope) -> list[str]:
    expressions = Expressions(scope)
    match node:
        case c_ast.Decl():
            return [declaration(node, scope)]
        case c_ast.Return():
            return ["return;" if node.expr is None else f"return {_returned(node.expr, scope)};"]
        case c_ast.If():
            return _choice(node, scope)
        case c_ast.For():
            return _loop(node, scope)
        case c_ast.Compound():
            return ["{", *block_lines(node, scope), "}"]
        case c_ast.Break():
            return ["break;"]
        case c_ast.Continue():
            return ["continue;"]
        case c_ast.EmptyStatement():
            return []
        case c_ast.Assignment(op="="):
            return _assignment(node, scope)
        case c_ast.Cast(expr=c_ast.ID()):
            return []  # (void)name; says that it is not read
        case c_ast.UnaryOp(op="p++" | "p--"):
            return [f"{expressions.value(node.expr).text}{node.op[1:]};"]
    return [f"{expressions.value(node).text};"]


def declaration(node: c_ast.Decl, scope: Scope) -> str:
    """A variable with its value, or with zeros where C leaves it open."""
    wanted = scope.types.of(node.type)
    if isinstance(wanted, ArrayOf) and wanted.length is None:
        raise NotTranslatable(f"the length of {node.name}")
    text = scope.types.fresh(wanted) if node.init is None else _initial(node.init, wanted, scope)
    scope.names[node.name] = wanted
    cell = isinstance(wanted, Number) and node.name in scope.cells
    fixed = cell or "const" in getattr(node.type, "quals", ()) or isinstance(wanted, ArrayOf | Record)
    return f"{'const' if fixed else 'let'} {js_name(node.name)} = {f'[{text}]' if cell else text};"


def _initial(node: c_ast.Node, wanted: Type, scope: Scope) -> str:
    text = Expressions(scope).as_type(node, wanted).text
    if isinstance(wanted, Record) and not isinstance(node, c_ast.InitList | c_ast.FuncCall):
        return f"new {wanted.name}().become({text})"
    return text


def _returned(node: c_ast.Node, scope: Scope) -> str:
    result = scope.types.functions[scope.function].result
    if isinstance(result, Record) and isinstance(node, c_ast.ID):
        return js_name(node.name)  # a local of its own
    return _initial(node, result, scope)


def _assignment(node: c_ast.Assignment, scope: Scope) -> list[str]:
    return [f"{Expressions(scope).assignment(node).text};"]


def _choice(node: c_ast.If, scope: Scope) -> list[str]:
    lines = [f"if ({Expressions(scope).condition(node.cond).text}) {{", *block_lines(node.iftrue, scope)]
    if node.iffalse is None:
        return [*lines, "}"]
    if isinstance(node.iffalse, c_ast.If):
        further = _choice(node.iffalse, scope)
        return [*lines, f"}} else {further[0]}", *further[1:]]
    return [*lines, "} else {", *block_lines(node.iffalse, scope), "}"]


def _loop(node: c_ast.For, scope: Scope) -> list[str]:
    inner = scope.inner()
    begin = ""
    if isinstance(node.init, c_ast.DeclList):
        if len(node.init.decls) != 1:
            raise NotTranslatable("a loop over two variables")
        begin = declaration(node.init.decls[0], inner).removesuffix(";")
    elif node.init is not None:
        begin = Expressions(inner).value(node.init).text
    expressions = Expressions(inner)
    test = "" if node.cond is None else expressions.condition(node.cond).text
    step = "" if node.next is None else expressions.value(node.next).text
    return [f"for ({begin}; {test}; {step}) {{", *block_lines(node.stmt, inner), "}"]
